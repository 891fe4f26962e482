"""Ensembles: several conformers, or spin states, in equilibrium, as one species.

From left to right: ``alike`` finds structures that are there twice and both hands of one, ``hands``
says how often each counts, ``checks`` that all are one molecule; ``block`` has the numbers of many
at once, ``nearest`` lends frequencies, ``levels`` compares levels of theory, ``distribution`` has
the populations, ``model`` is the species; ``found`` makes those of a folder, ``results`` their
numbers for a table.
"""

from thermo_pp.ensemble.distribution import MISSED_KJ_MOL, Distribution
from thermo_pp.ensemble.found import ensemble_of, ensembles_in
from thermo_pp.ensemble.levels import check_energies
from thermo_pp.ensemble.model import Ensemble, Member
from thermo_pp.ensemble.nearest import Lent, with_nearest_modes
from thermo_pp.ensemble.results import ComputedEnsemble, Ensembles, results

__all__ = [
    "MISSED_KJ_MOL",
    "ComputedEnsemble",
    "Distribution",
    "Ensemble",
    "Ensembles",
    "Lent",
    "Member",
    "check_energies",
    "ensemble_of",
    "ensembles_in",
    "results",
    "with_nearest_modes",
]
