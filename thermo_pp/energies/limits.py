"""Limits: reference and correlation energy extrapolated to the limit of the basis set."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.energies.basis_sets import family_and_cardinal
from thermo_pp.energies.terms import Term, check_same_level, of_method
from thermo_pp.errors import StudyError
from thermo_pp.formulas.extrapolation import (
    exponential_decay,
    power_decay,
    root_exponential_decay,
    two_point_limit,
)
from thermo_pp.names import Reference
from thermo_pp.pairing import pair
from thermo_pp.records import Calculation, MethodEnergy
from thermo_pp.species.energy import EnergyPart

_DECAYS: dict[Reference, Callable[[ArrayLike], NDArray[np.float64]]] = {
    "exp(-1.63 X)": exponential_decay,
    "(X+1) exp(-9 sqrt X)": root_exponential_decay,
}


def extrapolated(
    frequencies: Calculation,
    small: Calculation,
    large: Calculation,
    *,
    power: float,
    reference: Reference,
    where: str,
    method: str | None = None,
    cardinals: tuple[int, int] | None = None,
) -> Term:
    """Return the limits of the reference and of the correlation energy as two parts.

    Parameters
    ----------
    frequencies : Calculation
        Whose molecule and geometry the outputs must have.
    small, large : Calculation
        The same correlated method in two basis sets of one family.
    power : float
        Of the cardinal number in the correlation energy, 3 as published.
    reference : {"largest", "exp(-1.63 X)", "(X+1) exp(-9 sqrt X)"}
        How the reference energy is extrapolated; ``"largest"``: not, that of `large` is taken.
    where : str
    method : str or None
        Which of the energies in the files.
    cardinals : (int, int) or None
        Where the names of the basis sets do not tell them.

    Raises
    ------
    StudyError
        Another molecule or geometry, an output without its reference energy, one method or core
        that is not the other's, basis sets of two families, the same or falling cardinal numbers.
    """
    small, large = of_method(small, method, where), of_method(large, method, where)
    used = (small, large)
    findings = [
        finding for calc in used for finding in pair(frequencies, calc, where=where).findings
    ]
    mend = "extrapolate one method in two basis sets, else alike"
    check_same_level(small, large, "basis", where, mend)
    x_small, x_large = _cardinals(used, cardinals, where)
    references = [_reference(calc, where) for calc in used]
    totals = [float(calc.energy_hartree or 0.0) for calc in used]
    below = [one.value_hartree for one in references]
    correlation = [totals[0] - below[0], totals[1] - below[1]]
    lines = tuple(calc.where.get("energy_hartree") for calc in used)
    files = tuple(calc.path for calc in used)
    scale = f"({x_small},{x_large})"
    if reference == "largest":
        base = EnergyPart(
            slot="extrapolate.reference",
            name=f"HF/{large.basis}",
            value_hartree=below[1],
            factor=1.0,
            origin="printed",
            files=files[1:],
            lines=(references[1].line,),
        )
    else:
        decay = _DECAYS[reference]
        base = EnergyPart(
            slot="extrapolate.reference",
            name=f"HF/CBS{scale}",
            value_hartree=float(
                two_point_limit(below[0], below[1], decay(x_small), decay(x_large))
            ),
            factor=1.0,
            origin="derived",
            files=files,
            lines=tuple(one.line for one in references),
        )
    f_small, f_large = power_decay(x_small, power), power_decay(x_large, power)
    rest = EnergyPart(
        slot="extrapolate.correlation",
        name=f"{large.method} correlation/CBS{scale}",
        value_hartree=float(two_point_limit(correlation[0], correlation[1], f_small, f_large)),
        factor=1.0,
        origin="derived",
        files=files,
        lines=lines,
    )
    calculations = {"extrapolate.small": (small,), "extrapolate.large": (large,)}
    return Term((base, rest), calculations, tuple(findings))


def _reference(calc: Calculation, where: str) -> MethodEnergy:
    """Return the Hartree-Fock energy under a correlated one."""
    found = calc.method_energies.get("HF")
    if found is None or calc.energy_label == "HF":
        reason = (
            "has no correlation energy"
            if calc.energy_label in ("HF", "DFT")
            else f"has no Hartree-Fock energy that the reader of {calc.program} tells apart"
        )
        raise StudyError(
            f"{calc.path} {reason}",
            where=where,
            mend="extrapolate outputs of a correlated method, NWChem's or Psi4's",
        )
    return found


def _cardinals(
    used: tuple[Calculation, Calculation], declared: tuple[int, int] | None, where: str
) -> tuple[int, int]:
    """Return the cardinal numbers, from the names of the basis sets or as declared."""
    known = [family_and_cardinal(calc.basis) for calc in used]
    names = [calc.basis or "not stated" for calc in used]
    if known[0] is not None and known[1] is not None:
        if known[0][0] != known[1][0]:
            raise StudyError(
                f"the basis sets {names[0]} and {names[1]} are of two families",
                where=where,
                mend="extrapolate two members of one family",
            )
        numbers = (known[0][1], known[1][1])
        if declared is not None and declared != numbers:
            raise StudyError(
                f"cardinals {list(declared)} are declared, the basis sets {names[0]} and "
                f"{names[1]} have {list(numbers)}",
                where=where,
                mend="leave cardinals out",
            )
    elif declared is None:
        unknown = names[0] if known[0] is None else names[1]
        raise StudyError(
            f"the cardinal number of the basis set {unknown} does not follow from its name",
            where=where,
            mend="give cardinals = [3, 4], in the order of the files",
        )
    else:
        numbers = declared
    if numbers[0] >= numbers[1]:
        what = "the same cardinal number" if numbers[0] == numbers[1] else "falling cardinals"
        raise StudyError(
            f"{names[0]} and {names[1]} have {what}: {numbers[0]} and {numbers[1]}",
            where=where,
            mend="name the output in the smaller basis set first, then that in a larger one",
        )
    return numbers
