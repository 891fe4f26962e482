"""Formulas: pure functions, arrays in, arrays out; no file, record, setting or print."""
