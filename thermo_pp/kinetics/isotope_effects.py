"""Isotope effects: rate and equilibrium constants of a light mechanism over those of a heavy one."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from thermo_pp.data.elements import SYMBOLS
from thermo_pp.errors import Finding, StudyError
from thermo_pp.isotopes import Isotopologues
from thermo_pp.kinetics.model import Model, Rates
from thermo_pp.kinetics.results import freeze_arrays
from thermo_pp.mechanism import Step
from thermo_pp.names import Definition
from thermo_pp.rich import shown

if TYPE_CHECKING:
    import pandas as pd

    from thermo_pp.kinetics.asked import StudyLike

FloatArray = NDArray[np.float64]

SOFT_MODES_OFF = 0.02
"""An isotope effect that the soft-mode treatment changes by more, as a logarithm, is a finding."""


@dataclass(frozen=True, eq=False)
class StepEffect:
    """Isotope effects of one step, light over heavy.

    Attributes
    ----------
    equation : str
    equilibrium : shape (t,)
        Of the equilibrium constant.
    forward, reverse : shape (t,)
        Of the rate constants, with symmetry numbers, handedness and tunnelling where asked.
    equilibrium_without_symmetry, forward_without_symmetry : shape (t,)
        With the light isotopologues' symmetry numbers and handedness on both sides.
    tunnelling : shape (t,)
        The part that tunnelling has in them: a factor.
    harmonic_equilibrium : shape (t,)
        By reduced partition function ratios of harmonic oscillators, without symmetry.
    harmonic_forward : shape (t,) or None
        The same for the rate constant, without tunnelling, of a crossing with its probability; None without a
        saddle point.
    """

    equation: str
    equilibrium: FloatArray
    forward: FloatArray
    reverse: FloatArray
    equilibrium_without_symmetry: FloatArray
    forward_without_symmetry: FloatArray
    tunnelling: FloatArray
    harmonic_equilibrium: FloatArray
    harmonic_forward: FloatArray | None

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class RateEffect:
    """Isotope effect on one effective rate, light over heavy.

    Attributes
    ----------
    definition : {"free", "pool", "relaxation", "cycle"}
        Per free reactant is what isotopologues show that compete in one vessel, per pool what two
        runs side by side show.
    effect, without_symmetry : shape (t,)
    arrhenius_energy_difference_kj_mol : shape (t,)
        E_a of the heavy less that of the light.
    """

    definition: Definition
    effect: FloatArray
    without_symmetry: FloatArray
    arrhenius_energy_difference_kj_mol: FloatArray

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, eq=False)
class IsotopeEffects:
    """What one set of isotopes does to a mechanism.

    Attributes
    ----------
    label : str
    temperature_k : shape (t,)
    species : tuple of Isotopologues
        Those that have isotopes put in.
    steps : tuple of StepEffect
        Those that isotopes change.
    rates : tuple of RateEffect
        Empty where the study asks for no effective rate.
    findings : tuple of Finding
    """

    label: str
    temperature_k: FloatArray
    species: tuple[Isotopologues, ...]
    steps: tuple[StepEffect, ...]
    rates: tuple[RateEffect, ...]
    findings: tuple[Finding, ...]

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def table(self) -> pd.DataFrame:
        """Return one row a step or effective rate and temperature: isotope effects, light over heavy.

        Columns: ``kind`` (step, rate), ``name`` (equation or definition), ``temperature_k, effect`` (on
        the forward or the effective rate constant), ``without_symmetry``.
        """
        import pandas as pd

        named = [
            *(("step", s.equation, s.forward, s.forward_without_symmetry) for s in self.steps),
            *(("rate", r.definition, r.effect, r.without_symmetry) for r in self.rates),
        ]
        return pd.DataFrame(
            {
                "kind": kind,
                "name": name,
                "temperature_k": temperature,
                "effect": effect[k],
                "without_symmetry": bare[k],
            }
            for kind, name, effect, bare in named
            for k, temperature in enumerate(self.temperature_k)
        )

    def _repr_html_(self) -> str:
        return shown(self.table())


def isotope_effects(
    study: StudyLike, label: str, labelled: Mapping[str, Isotopologues], *, where: str
) -> IsotopeEffects:
    """Work out a study with light and with heavy species.

    Parameters
    ----------
    study : StudyLike
    label : str
        Name of the set of isotopes.
    labelled : mapping of str to Isotopologues
        The species that have isotopes put in.
    where : str
        For messages.

    Raises
    ------
    StudyError
        A step in which isotopes appear or vanish, or whatever the effective rate refuses.
    """
    from threadpoolctl import threadpool_limits

    for step in study.mechanism.steps:
        _check_isotopes(step, labelled, where)
    t = np.array(study.conditions.temperature_k)
    with threadpool_limits(1), np.errstate(over="ignore"):
        light, heavy, plain = (
            Model(
                study.mechanism,
                study.conditions,
                study.treatment,
                {**study.species, **{name: getattr(one, kind) for name, one in labelled.items()}},
            ).at(t)
            for kind in ("light", "heavy", "plain")
        )
        steps = [
            _step(step, number, light, heavy, plain, labelled)
            for number, step in enumerate(study.mechanism.steps)
            if _touched(step, labelled)
        ]
        rates = _rates(light, heavy, plain) if study.mechanism.products else ()
    findings = [finding for one in labelled.values() for finding in one.findings]
    findings += _unchanged(light, labelled, study.mechanism.where)
    findings += _soft_modes(steps, study.treatment.low_modes, study.mechanism.where)
    return IsotopeEffects(label, t, tuple(labelled.values()), tuple(steps), rates, tuple(findings))


def _rates(light: Rates, heavy: Rates, plain: Rates) -> tuple[RateEffect, ...]:
    for rates in (light, heavy, plain):
        rates.check()
    found = []
    for definition in light.definitions():
        one, two, three = (rates.rate(definition) for rates in (light, heavy, plain))
        found.append(
            RateEffect(
                definition=definition,
                effect=one.sign * two.sign * np.exp(one.log - two.log),
                without_symmetry=one.sign * three.sign * np.exp(one.log - three.log),
                arrhenius_energy_difference_kj_mol=(two.energy_j_mol - one.energy_j_mol) / 1000.0,
            )
        )
    return tuple(found)


def _step(
    step: Step,
    number: int,
    light: Rates,
    heavy: Rates,
    plain: Rates,
    labelled: Mapping[str, Isotopologues],
) -> StepEffect:
    t = light.energies.temperature_k

    def effect(of: str, other: Rates) -> FloatArray:
        return np.asarray(getattr(light.steps, of)[:, number] - getattr(other.steps, of)[:, number])

    def reduced(side: Mapping[str, int]) -> FloatArray:
        total = np.zeros(t.shape)
        for name, count in side.items():
            if name in labelled:
                total = total + count * labelled[name].log_reduced_ratio(t)
        return total

    harmonic = None
    if step.through is not None:
        harmonic = reduced(step.reactants) - reduced({step.through: 1})
        saddle = labelled.get(step.through)
        if saddle is not None:
            harmonic = harmonic + saddle.log_coordinate_ratio
        harmonic = harmonic + effect("log_transmission", heavy)
    forward, plain_forward = effect("log_forward", heavy), effect("log_forward", plain)
    reverse, plain_reverse = effect("log_reverse", heavy), effect("log_reverse", plain)
    return StepEffect(
        equation=step.equation,
        equilibrium=np.exp(forward - reverse),
        forward=np.exp(forward),
        reverse=np.exp(reverse),
        equilibrium_without_symmetry=np.exp(plain_forward - plain_reverse),
        forward_without_symmetry=np.exp(plain_forward),
        tunnelling=np.exp(effect("log_kappa", heavy)),
        harmonic_equilibrium=np.exp(reduced(step.reactants) - reduced(step.products)),
        harmonic_forward=None if harmonic is None else np.exp(harmonic),
    )


def _soft_modes(steps: Sequence[StepEffect], low_modes: str, file: str) -> tuple[Finding, ...]:
    """Tell where the treatment of soft modes is an isotope effect of its own."""
    if low_modes == "harmonic":
        return ()
    off = {
        step.equation: float(
            np.abs(np.log(step.equilibrium_without_symmetry / step.harmonic_equilibrium)).max()
        )
        for step in steps
    }
    worst = max(off, key=off.__getitem__, default=None)
    if worst is None or off[worst] < SOFT_MODES_OFF:
        return ()
    return (
        Finding(
            "isotopes-and-soft-modes",
            "warning",
            file,
            None,
            f"with {low_modes} the isotope effect on the equilibrium of {worst} is up to "
            f"{np.expm1(off[worst]):.0%} from that of harmonic oscillators: soft modes taken as "
            "rotors do not follow the product rule",
            'compute isotope effects with low_modes = "harmonic"',
        ),
    )


def _touched(step: Step, labelled: Mapping[str, Isotopologues]) -> bool:
    return any(name in labelled for name in (*step.species, step.through))


def _check_isotopes(step: Step, labelled: Mapping[str, Isotopologues], where: str) -> None:
    """Make sure that both sides and the saddle point of a step hold the same isotopes."""
    left, right = (_isotopes(side, labelled) for side in step.sides())
    ends = [(right, "on the right side")]
    if step.through is not None:
        ends.append((_isotopes({step.through: 1}, labelled), f"in {step.through}"))
    for there, words in ends:
        if there != left:
            raise StudyError(
                f"the step {step.equation!r} has {_listed(left)} put in on the left side and "
                f"{_listed(there)} {words}",
                where=where,
                mend="put the isotopes into every species that holds these atoms; a species that "
                "occurs with and without them needs a second entry of its own in the study",
            )


def _isotopes(
    counts: Mapping[str, int], labelled: Mapping[str, Isotopologues]
) -> Counter[tuple[int, int]]:
    """Return how many atoms of which (atomic number, mass number) were put into a sum of species."""
    found: Counter[tuple[int, int]] = Counter()
    for name, count in counts.items():
        if name not in labelled:
            continue
        one = labelled[name]
        for atom in np.flatnonzero(one.heavy.masses_u != one.light.masses_u):
            number = int(one.heavy.calculation.numbers[atom])
            found[number, round(one.heavy.masses_u[atom])] += count
    return found


def _listed(isotopes: Counter[tuple[int, int]]) -> str:
    words = [f"{count} {mass}{SYMBOLS[z]}" for (z, mass), count in sorted(isotopes.items())]
    return ", ".join(words) or "no isotope"


def _unchanged(
    light: Rates, labelled: Mapping[str, Isotopologues], file: str
) -> tuple[Finding, ...]:
    """Tell the steps whose rate constant does not follow the isotopes."""
    notes = []
    for number, step in enumerate(light.model.mechanism.steps):
        limited = bool(light.steps.limited[:, number].any())
        if not _touched(step, labelled) or not (limited or step.rate is not None):
            continue
        kind = "declared" if step.rate is not None else "the limit of encounters"
        notes.append(
            Finding(
                "rate-without-isotopes",
                "note",
                file,
                None,
                f"step {step.equation}: its rate constant is {kind}, the same for all isotopologues "
                "in the direction that it is given for",
                "declare one for each isotopologue where that matters",
            )
        )
    return tuple(notes)
