"""Doubt: what the uncertainty of the energies makes of every answer."""
