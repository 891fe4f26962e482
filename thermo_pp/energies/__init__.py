"""Energies: an electronic energy put together from several outputs, every part checked.

From left to right: ``basis_sets`` knows cardinal numbers, ``terms`` what a part is and what it is
checked for; ``limits``, ``solvation`` and ``counterpoise`` make the parts that are no single point;
``recipe`` sets the parts of several species side by side.
"""
