"""The mechanism: species and steps as names and integers, without energies."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType

from thermo_pp.errors import Finding, StudyError
from thermo_pp.names import Tunnelling
from thermo_pp.nearest import nearest, suggestion
from thermo_pp.rate_laws import Arrhenius, Crossing, Falloff, Height

_TERM = re.compile(r"(?:([0-9]{1,3})\s+)?(\S+)")


@dataclass(frozen=True)
class Step:
    """One reversible step.

    Attributes
    ----------
    equation : str
        As the user wrote it.
    reactants, products : mapping of str to int
        Species and how many of each, in the order written.
    through : str or None
        The saddle point; None where the step has none.
    barrierless : bool
        ``barrier = "none"``.
    rate : tuple or None
        Declared forward rate constant: (A, n, E_a): k = A (T/298.15 K)^n exp(-E_a/RT), A in
        (mol/L)^(1-m) s^-1, E_a in kJ/mol.
    height : Height or None
        Of a saddle that is not located.
    falloff : Falloff or None
        Declared forward rate constant that depends on how much there is of a collider.
    crossing : Crossing or None
        The step changes the spin state at the point that it goes through.
    viscosity : tuple of (temperature / K, Pa s) pairs or None
        One pair: constant.
    permittivity : tuple of (temperature / K, relative permittivity) pairs or None
        The same, for the encounter of ions.
    tunnelling : {"none", "wigner", "eckart"}
    where : str
        ``study.toml [steps.3]``, for messages; steps count from 1.
    """

    equation: str
    reactants: Mapping[str, int]
    products: Mapping[str, int]
    through: str | None = None
    barrierless: bool = False
    rate: Arrhenius | None = None
    height: Height | None = None
    falloff: Falloff | None = None
    crossing: Crossing | None = None
    viscosity: tuple[tuple[float, float], ...] | None = None
    permittivity: tuple[tuple[float, float], ...] | None = None
    tunnelling: Tunnelling = "none"
    where: str = ""

    def __post_init__(self) -> None:
        object.__setattr__(self, "reactants", MappingProxyType(dict(self.reactants)))
        object.__setattr__(self, "products", MappingProxyType(dict(self.products)))

    @property
    def is_declared(self) -> bool:
        """Whether the rate constant itself is declared."""
        return self.rate is not None or self.falloff is not None

    @property
    def species(self) -> tuple[str, ...]:
        """Every species of both sides once, the saddle point left out."""
        return tuple(dict.fromkeys((*self.reactants, *self.products)))

    @property
    def molecules(self) -> tuple[int, int]:
        """How many molecules stand left and right."""
        return sum(self.reactants.values()), sum(self.products.values())

    def sides(self, forward: bool = True) -> tuple[Mapping[str, int], Mapping[str, int]]:
        """Return what the step uses and what it makes, run forward or backward."""
        return (self.reactants, self.products) if forward else (self.products, self.reactants)

    def change(self) -> dict[str, int]:
        """Return what the step makes (positive) and uses (negative), zeros left out."""
        names = self.species
        change = {name: self.products.get(name, 0) - self.reactants.get(name, 0) for name in names}
        return {name: count for name, count in change.items() if count}


@dataclass(frozen=True)
class RatePoint:
    """Where the rate of a network that need not be linear is asked for.

    Attributes
    ----------
    text : str
        As the study has it: ``"start"``, ``"steady state"`` or a percentage.
    conversion : float or None
        Share of the reactant that is lost there, 0 at the start; None at the steady state of the flow.
    law : mapping of str to int
        The rate is divided by these concentrations to these powers; empty: it is the rate itself.
    """

    text: str
    conversion: float | None
    law: Mapping[str, int] = field(default_factory=dict)

    @property
    def order(self) -> int:
        """Overall order of the constant that the law makes of the rate; 0 is the rate itself."""
        return sum(self.law.values())


@dataclass(frozen=True)
class Mechanism:
    """Steps and what the question is.

    Attributes
    ----------
    steps : tuple of Step
    composition : mapping of str to mapping of str to int
        Element counts of every species that a step uses, saddle points included.
    reactant : str or None
    products : tuple of str
    catalyst : str or None
        Then the question is a turnover frequency.
    paths : tuple of tuple of int
        Declared paths, as 0-based step numbers; empty where they are found from the steps.
    charge : mapping of str to int
        Charge of every species that has one; 0 where it is not listed.
    path_names : tuple of str
        Names of the declared paths, as many as `paths`.
    where : str
        The study file, for messages.
    point : RatePoint or None
        Where the rate is asked for, beside the constants of a linear network.
    """

    steps: tuple[Step, ...]
    composition: Mapping[str, Mapping[str, int]]
    reactant: str | None = None
    products: tuple[str, ...] = ()
    catalyst: str | None = None
    paths: tuple[tuple[int, ...], ...] = field(default=())
    charge: Mapping[str, int] = field(default_factory=dict)
    path_names: tuple[str, ...] = ()
    where: str = "the mechanism"
    point: RatePoint | None = None

    @property
    def saddles(self) -> tuple[str, ...]:
        """The saddle points, each once, in the order of the steps."""
        return tuple(dict.fromkeys(step.through for step in self.steps if step.through is not None))

    @property
    def species(self) -> tuple[str, ...]:
        """Every species that is no saddle point, in the order of first use."""
        return tuple(dict.fromkeys(name for step in self.steps for name in step.species))

    def content(self, counts: Mapping[str, int]) -> dict[str, int]:
        """Return elements and charge (key ``"charge"``) of a sum of species, zeros left out."""
        total: dict[str, int] = {}
        for name, count in counts.items():
            for element, number in self.composition[name].items():
                total[element] = total.get(element, 0) + count * number
            total["charge"] = total.get("charge", 0) + count * self.charge.get(name, 0)
        return {key: number for key, number in total.items() if number}


def parse_equation(text: str, *, where: str) -> tuple[dict[str, int], dict[str, int]]:
    """Split ``"SO3 + 2 W = C2"`` into what stands left and right of ``=``.

    A count is a whole number and a space before the name; names hold no space. ``A + A`` is ``2
    A``.

    Raises
    ------
    StudyError
        No or more than one ``=``, an empty side, a term that is not a name.
    """
    sides = text.split("=")
    mend = 'write for instance "SO3 + W = C1"; spaces around + and =, counts as in "2 W"'
    if len(sides) != 2:
        raise StudyError(
            f"the equation {text!r} does not have exactly one '='", where=where, mend=mend
        )
    left, right = (_parse_side(side, text, where, mend) for side in sides)
    return left, right


def parse_sum(text: str, *, where: str) -> dict[str, int]:
    """Split ``"2 W + M"`` into species and counts; StudyError where a term is not a species."""
    return _parse_side(text, text, where, 'write for instance "W", "2 W" or "O2 + M"')


def _parse_side(side: str, text: str, where: str, mend: str) -> dict[str, int]:
    """Return the counts of one side of the equation `text`."""
    counts: dict[str, int] = {}
    for term in re.split(r"\s\+\s", f" {side.strip()} "):
        match = _TERM.fullmatch(term.strip())
        if match is None or int(match.group(1) or 1) < 1:
            what = f"{term.strip()!r} in {text!r} is not a species"
            if not term.strip():
                what = f"a species is missing in {text!r}"
            raise StudyError(what, where=where, mend=mend)
        counts[match.group(2)] = counts.get(match.group(2), 0) + int(match.group(1) or 1)
    return counts


def write_sum(counts: Mapping[str, int]) -> str:
    """Write a sum of species.

    >>> write_sum({"SO3": 1, "W": 2})
    'SO3 + 2 W'
    """
    terms = [name if count == 1 else f"{count} {name}" for name, count in counts.items() if count]
    return " + ".join(terms) or "nothing"


def write_reaction(change: Mapping[str, int]) -> str:
    """Write a net reaction from what it makes (positive) and uses (negative).

    >>> write_reaction({"A": -1, "W": -2, "C": 1})
    'A + 2 W = C'
    """
    used = {name: -count for name, count in change.items() if count < 0}
    made = {name: count for name, count in change.items() if count > 0}
    return f"{write_sum(used)} = {write_sum(made)}"


def check_names(
    steps: Sequence[Step], known: Collection[str], *, where: str, elsewhere: Collection[str] = ()
) -> None:
    """Check that steps and species name each other; those used `elsewhere` need no step.

    Raises
    ------
    StudyError
        A step names a species that is not declared, a saddle point stands in an equation, or no
        step uses a species.
    """
    for step in steps:
        for name in step.species:
            if name not in known:
                mend = suggestion(name, known, "species")
                if "+" in name.strip("+-"):
                    mend = 'write a space on each side of "+"; ' + mend
                what = f"unknown species {name!r} in {step.equation!r}"
                raise StudyError(what, where=f"{step.where} equation", mend=mend)
        if step.through is not None and step.through not in known:
            what = f"unknown saddle point {step.through!r}"
            mend = suggestion(step.through, known, "species")
            raise StudyError(what, where=f"{step.where} through", mend=mend)
    through = {step.through: step for step in reversed(steps) if step.through is not None}
    for step in steps:
        for name in step.species:
            if name in through:
                raise StudyError(
                    f"{name!r} is a saddle point ({through[name].equation!r} goes through it) "
                    f"and stands in {step.equation!r}",
                    where=f"{step.where} equation",
                    mend="steps make and use minima only; name the minimum, or mend `through`",
                )
    used = {name for step in steps for name in step.species} | set(through) | set(elsewhere)
    for name in known:
        if name not in used:
            close = nearest(name, used)
            hint = "" if close is None else f" (a step uses {close!r})"
            raise StudyError(
                f"no step uses the species {name!r}",
                where=f"{where} [species.{name}]",
                mend=f"add the step it belongs to, or take the species out{hint}",
            )


def check_mechanism(mechanism: Mechanism) -> tuple[Finding, ...]:
    """Check every step: elements and charge, saddle points too, and what may be barrierless.

    Returns
    -------
    tuple of Finding
        ``same-step-twice`` (warning): two steps without a saddle point of their own do the same.

    Raises
    ------
    StudyError
        A step or its saddle point does not balance, a step changes nothing, or a barrierless step
        whose sides do not have one or two molecules, two on one side at least.
    """
    findings: list[Finding] = []
    seen: dict[tuple[object, ...], Step] = {}
    for step in mechanism.steps:
        _check_balance(step, mechanism)
        if not step.change():
            raise StudyError(
                f"the step {step.equation!r} changes nothing",
                where=f"{step.where} equation",
                mend="both sides are the same; mend the equation",
            )
        if step.barrierless:
            _check_barrierless(step)
        sides = [frozenset(side.items()) for side in step.sides()]
        key = (frozenset(sides), step.through)
        if key in seen:
            findings.append(
                Finding(
                    "same-step-twice",
                    "warning",
                    mechanism.where,
                    None,
                    f"{step.equation!r} and {seen[key].equation!r} are the same step: "
                    "it counts twice in every rate",
                    "take one of the two out, unless there really are two channels",
                )
            )
        seen.setdefault(key, step)
    return tuple(findings)


def _check_balance(step: Step, mechanism: Mechanism) -> None:
    left, right = mechanism.content(step.reactants), mechanism.content(step.products)
    if left != right:
        raise StudyError(
            f"the step {step.equation!r} does not balance: "
            f"the right side has {_difference(left, right)}",
            where=f"{step.where} equation",
            mend="mend the equation, or the files and charges of its species",
        )
    if step.through is None:
        return
    saddle = mechanism.content({step.through: 1})
    if saddle != left:
        raise StudyError(
            f"the saddle point {step.through!r} is not made of what {step.equation!r} has: "
            f"it has {_difference(left, saddle)}",
            where=f"{step.where} through",
            mend="name the saddle point of this step, or add what it is made of to both sides",
        )


def _difference(want: Mapping[str, int], have: Mapping[str, int]) -> str:
    """Say how `have` differs from `want`: ``"2 H too many, 1 O too few"``."""
    words = []
    for key in sorted({*want, *have}, key=lambda key: (key == "charge", key)):
        excess = have.get(key, 0) - want.get(key, 0)
        if excess and key == "charge":
            words.append(f"charge {have.get(key, 0)} instead of {want.get(key, 0)}")
        elif excess:
            words.append(f"{abs(excess)} {key} too {'many' if excess > 0 else 'few'}")
    return ", ".join(words)


def _check_barrierless(step: Step) -> None:
    left, right = step.molecules
    if max(left, right) > 2 or max(left, right) < 2:
        sides = f"{_count(left)} on its left side and {_count(right)} on its right side"
        raise StudyError(
            f"the step {step.equation!r} cannot be barrierless: it has {sides}",
            where=f"{step.where} barrier",
            mend="a collision or diffusion limit needs two molecules that meet: split the step, "
            "name its saddle point (through) or declare its rate constant (rate)",
        )


def _count(number: int) -> str:
    return "1 molecule" if number == 1 else f"{number} molecules"
