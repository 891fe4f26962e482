"""Levels: the energies of an ensemble are of one level, or its populations mean nothing."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import chain

from thermo_pp.audit.levels import level_words, stated_level
from thermo_pp.errors import StudyError
from thermo_pp.records import Calculation


def check_energies(
    energies: Sequence[Mapping[str, Sequence[Calculation]]],
    own: Sequence[bool | None],
    *,
    name: str,
    where: str,
) -> None:
    """Make sure that all members have their energy from one level of theory.

    Parameters
    ----------
    energies : sequence of mapping of str to sequence of Calculation
        Whose energies each member has, by their place in it.
    own : sequence of bool
        It is that of the frequency job itself, no single point; None where there is no frequency
        job.
    name, where : str
        For messages.

    Raises
    ------
    StudyError
        Single points for some of the frequency jobs only, or two levels that differ in what both
        files state.
    """
    if len({alone for alone in own if alone is not None}) > 1:
        without = [
            next(chain.from_iterable(one.values())).path
            for one, alone in zip(energies, own, strict=True)
            if alone
        ]
        raise StudyError(
            f"{name}: some conformers have a single point, and {', '.join(without[:3])} "
            f"{'has' if len(without) == 1 else 'have'} none",
            where=where,
            mend="give the energy of the higher level for every conformer, or for none",
        )
    said: dict[tuple[str, str], tuple[str, Calculation]] = {}
    for one in energies:
        for slot, calc in ((slot, calc) for slot, calcs in one.items() for calc in calcs):
            for field, value in stated_level(calc).items():
                usual, first = said.setdefault((slot, field), (value, calc))
                if value != usual:
                    raise StudyError(
                        f"{name}: the energies of its conformers are of different levels: "
                        f"{level_words(first)} in {first.path}, {level_words(calc)} in {calc.path}",
                        where=where,
                        mend="give energies of one level for all conformers of a species",
                    )
