"""Kinetics: from energies over temperature to the effective rate and what controls it."""
