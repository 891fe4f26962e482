"""Tunnelling of a step: its factor and its share in the Arrhenius energy, or why it is refused."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import StudyError
from thermo_pp.formulas.tunnelling import Tunnelling, eckart, wigner
from thermo_pp.kinetics.shares import weighted_mean
from thermo_pp.mechanism import Step, write_sum
from thermo_pp.species import SaddleMember

FloatArray = NDArray[np.float64]


def tunnelling(
    step: Step,
    members: Sequence[SaddleMember],
    grounds_kj_mol: Mapping[str, float | None],
    temperature_k: FloatArray,
    scale: float,
) -> Tunnelling:
    """Return the tunnelling correction of one step, the same for both directions.

    Of a saddle point with several members it is ln sum_i kappa_i exp(-G_i/RT) less the same without
    kappa, each member with its own imaginary mode and heights.

    Parameters
    ----------
    step : Step
        With ``tunnelling`` other than "none".
    members : sequence of SaddleMember
    grounds_kj_mol : mapping of str to float or None
        Electronic and zero-point energies of the species of both sides.
    temperature_k : shape (t,)
    scale : float
        Factor of the imaginary wavenumbers.

    Raises
    ------
    StudyError
        No imaginary mode, a saddle point that does not lie above both sides, or, for "eckart", an
        energy at 0 K that is not known.
    """
    where = f"{step.where} tunnelling"
    found = []
    for member in members:
        if member.imaginary_cm is None:
            raise StudyError(
                f"no imaginary mode of the saddle point {step.through!r} is known",
                where=where,
                mend='give the declared saddle point one (imaginary_mode = "1200 cm^-1"), or write '
                'tunnelling = "none"',
            )
        nu = scale * member.imaginary_cm
        heights = [_height(step, member, side, grounds_kj_mol, where) for side in step.sides()]
        if step.tunnelling == "wigner":
            one = wigner(temperature_k, nu)
        else:
            one = eckart(temperature_k, nu, *_known(heights, step, member, grounds_kj_mol, where))
        found.append((one.log_kappa, one.energy_j_mol))
    return Tunnelling(*weighted_mean(members, found, temperature_k))


def _height(
    step: Step,
    member: SaddleMember,
    side: Mapping[str, int],
    grounds_kj_mol: Mapping[str, float | None],
    where: str,
) -> float | None:
    """Return how far the saddle point lies above one side at 0 K, J/mol; None where that is not known."""
    height = member.ground_kj_mol
    for name, count in side.items():
        ground = grounds_kj_mol[name]
        height = None if height is None or ground is None else height - count * ground
    if height is None:
        return None
    if height <= 0.0:
        raise StudyError(
            f"the barrier of {step.equation!r} is submerged: at 0 K {step.through} lies "
            f"{-height:.2f} kJ/mol below {write_sum(side)}, so there is nothing to tunnel through",
            where=where,
            mend="let the step start from the complex in front of the saddle point, or write "
            'tunnelling = "none"',
        )
    return 1000.0 * height


def _known(
    heights: Sequence[float | None],
    step: Step,
    member: SaddleMember,
    grounds_kj_mol: Mapping[str, float | None],
    where: str,
) -> list[float]:
    """Return both heights; StudyError names the species whose energy at 0 K is not known."""
    known = [height for height in heights if height is not None]
    if len(known) == len(heights):
        return known
    unknown = [name for name in step.species if grounds_kj_mol[name] is None]
    if member.ground_kj_mol is None:
        unknown.append(str(step.through))
    raise StudyError(
        f"the Eckart barrier of {step.equation!r} needs the energy at 0 K of {', '.join(unknown)}",
        where=where,
        mend='give declared species one (ground = "12.3 kJ/mol"), or write tunnelling = "wigner"',
    )
