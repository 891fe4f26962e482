"""Thermodynamic functions of any species: tables, polynomials and enthalpies of formation."""
