"""Sourced tables: literals with their origin, no code."""
