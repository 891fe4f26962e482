"""What each definition of the rate is called: in JSON and over tables."""

from __future__ import annotations

from thermo_pp.names import Definition

KEYS: dict[Definition, str] = {
    "free": "per_free_reactant",
    "pool": "per_pool",
    "relaxation": "relaxation",
    "cycle": "cycle",
    "point": "point",
}
TITLES: dict[Definition, str] = {
    "free": "Rate per free reactant",
    "pool": "Rate per pool (reactant and intermediates)",
    "relaxation": "Relaxation to equilibrium",
    "cycle": "Turnover of the catalyst",
    "point": "Rate at the point asked for",
}
