"""Torsions of a study's species: the keys of the file handed to those of a structure."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import msgspec

from thermo_pp.records import Calculation
from thermo_pp.sources import Source
from thermo_pp.species import parse_torsions
from thermo_pp.species.potentials import TorsionChoice
from thermo_pp.study.keys import TorsionKeys
from thermo_pp.study.values import given


def make_torsions(
    torsions: Sequence[TorsionKeys],
    calculation: Calculation,
    open_file: Callable[[str, str], Source],
    where: str,
) -> tuple[TorsionChoice, ...]:
    """Read the torsions of one species; see `species.torsion_keys.parse_torsions`.

    Parameters
    ----------
    torsions : sequence of TorsionKeys
    calculation : Calculation
        The frequency job.
    open_file : callable
        Name in the file and place of its key -> Source inside the study's folders.
    where : str
        File and key, for messages.
    """
    entries = [
        {
            key: value
            for key, value in msgspec.structs.asdict(one).items()
            if given(value) is not None
        }
        for one in torsions
    ]
    return parse_torsions(entries, calculation, open_file, where=where)
