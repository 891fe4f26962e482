"""Measured rate constants: reading, fits, and the comparison with computed rates."""
