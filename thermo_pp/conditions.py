"""Conditions and treatment: temperatures, standard states, what is held. No energies."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from thermo_pp.errors import StudyError
from thermo_pp.names import (
    DEFAULT_LOW_MODES,
    DEFAULT_ONSET_CM,
    DEFAULT_STANDARD_STATE,
    Constant,
    LowModes,
    Masses,
    Phase,
    Rotor,
)
from thermo_pp.units import BAR_PA, FARADAY_C_MOL, GAS_J_MOL_K, quantity, split_quantity

FloatArray = NDArray[np.float64]


@dataclass(frozen=True)
class StandardState:
    """A standard state of an ideal gas or of an ideal solute.

    Attributes
    ----------
    form : {"pressure", "concentration"}
        p-form or c-form.
    value : float
        Pa, or mol/L.
    text : str
        As the user wrote it.
    """

    form: Literal["pressure", "concentration"]
    value: float
    text: str

    def log_ratio_to_bar(self, temperature_k: ArrayLike) -> FloatArray:
        """Return ln(p/1 bar), p the pressure of the ideal gas in this state, at each temperature.

        G rises by R T times this over its value at 1 bar, S falls by R times it, H stays. This is
        the one place where a standard state is applied.
        """
        t = np.asarray(temperature_k, dtype=np.float64)
        if self.form == "pressure":
            return np.full(t.shape, math.log(self.value / BAR_PA))
        return np.asarray(np.log(self.value * 1000.0 * GAS_J_MOL_K * t / BAR_PA))

    @property
    def log_ratio_slope(self) -> float:
        """T d(log_ratio_to_bar)/dT: 0 in p-form, 1 in c-form."""
        return 0.0 if self.form == "pressure" else 1.0


MOLAR = StandardState("concentration", 1.0, "1 mol/L")
"""The state in which rate constants are worked out; they do not depend on it."""


def standard_state(value: Any, *, where: str) -> StandardState:
    """Turn "1 bar", "1 atm", "1 mol/L" into a StandardState; StudyError where it is neither."""
    if isinstance(value, StandardState):
        return value
    mend = 'write a pressure or a concentration: "1 bar", "1 atm" or "1 mol/L"'
    return _pressure_or_concentration(value, "standard state", where=where, mend=mend)


def _pressure_or_concentration(value: Any, what: str, *, where: str, mend: str) -> StandardState:
    """Turn a text into a pressure or concentration above 0; StudyError where it is neither."""
    if not isinstance(value, str):
        raise StudyError(f"expected a {what}, found {value!r}", where=where, mend=mend)
    try:
        split_quantity(value, "Pa", where=where)
    except StudyError as error:
        raise StudyError(error.what, where=where, mend=mend) from None
    for form, unit in (("pressure", "Pa"), ("concentration", "mol/L")):
        try:
            number = quantity(value, unit, where=where)
        except StudyError:
            continue
        if number <= 0.0:
            raise StudyError(f"{what} {value!r} is not above 0", where=where, mend=mend)
        return StandardState(form, number, value)  # type: ignore[arg-type]
    raise StudyError(f"{value!r} is neither a pressure nor a concentration", where=where, mend=mend)


@dataclass(frozen=True)
class Treatment:
    """How a structure becomes H, S and G: the keys of ``[treatment]``.

    Attributes
    ----------
    standard_state : StandardState
    phase : {"gas", "solution"}
    low_modes : one of `names.LOW_MODES`
    onset_cm : float
        Onset of the soft-mode treatments, cm^-1.
    rotor : {"auto", "classical"}
    masses : {"program", "average"}
    real_below_cm : float or None
        Imaginary modes beyond the expected one and smaller than this are taken as real; None
        refuses all.
    frequency_scale, zero_point_scale : float
        Factors of the wavenumbers in thermal terms and in the zero-point energy.
    tunnelling_scale : float
        Factor of the imaginary wavenumber in tunnelling corrections.
    enantiopure : bool
        Only one hand of a chiral structure is present.
    entropy_correction_j_mol_k : float
        Added to the entropy of every structure in solution, because the user says so.
    """

    standard_state: StandardState = StandardState("pressure", BAR_PA, DEFAULT_STANDARD_STATE)
    phase: Phase = "gas"
    low_modes: LowModes = DEFAULT_LOW_MODES
    onset_cm: float = DEFAULT_ONSET_CM
    rotor: Rotor = "auto"
    masses: Masses = "program"
    real_below_cm: float | None = None
    frequency_scale: float = 1.0
    zero_point_scale: float = 1.0
    tunnelling_scale: float = 1.0
    enantiopure: bool = False
    entropy_correction_j_mol_k: float = 0.0


@dataclass(frozen=True)
class Held:
    """One species held at a constant free amount.

    Attributes
    ----------
    form : {"concentration", "pressure", "equilibrium", "potential"}
        What stays constant over temperature; "potential" is of electrons, whose activity against
        1 mol/L is exp(-F E/RT).
    value : float, shape (b,), or None
        mol/L, Pa, or V; None at equilibrium. An array has one amount for each temperature of a
        batch (maps over an amount).
    text : str
        As the user wrote it.
    """

    form: Literal["concentration", "pressure", "equilibrium", "potential"]
    value: float | FloatArray | None
    text: str

    def concentration_mol_l(self, temperature_k: ArrayLike) -> FloatArray:
        """Return the free concentration, mol/L, at each temperature; not for "equilibrium"."""
        t = np.asarray(temperature_k, dtype=np.float64)
        if self.value is None:
            raise ValueError("an equilibrium concentration follows from the mechanism")
        if self.form == "concentration":
            return np.full(t.shape, self.value)
        if self.form == "potential":
            return np.asarray(np.exp(-FARADAY_C_MOL * self.value / (GAS_J_MOL_K * t)))
        return np.asarray(self.value / (1000.0 * GAS_J_MOL_K * t))

    def log_slope(self, temperature_k: FloatArray, seen: Constant | None = None) -> FloatArray:
        """Return T d ln c/dT at each temperature, not for "equilibrium".

        `seen` says what counts as constant here in place of the form, for a gas.
        """
        form = (
            seen if seen is not None and self.form in ("concentration", "pressure") else self.form
        )
        if form == "potential":
            volts = np.asarray(self.value, dtype=np.float64)
            return np.asarray(FARADAY_C_MOL * volts / (GAS_J_MOL_K * temperature_k))
        return np.full(temperature_k.shape, -1.0 if form == "pressure" else 0.0)


@dataclass(frozen=True)
class Flow:
    """A stirred tank that flows.

    Attributes
    ----------
    residence_s : float
        Residence time.
    feed : dict of str to Held
        What flows in.
    """

    residence_s: float
    feed: dict[str, Held]


@dataclass(frozen=True)
class Conditions:
    """The keys of ``[conditions]``.

    Attributes
    ----------
    temperature_k : tuple of float
        In the order given.
    held : dict of str to Held
        Insertion order is the file's.
    driven : bool
        Whether held species may be out of balance with each other.
    initial : dict of str to Held
        What there is at the start of a time course.
    total : dict of str to Held
        All of a catalyst (and of what else is bound to it), whatever form it is in.
    flow : Flow or None
    quasi_steady : tuple of str
        Species whose quasi-steady state is set beside the time course.
    constant : {"concentration", "pressure"} or None
        What of a gas the study says stays when the temperature changes.
    total_gas : Held or None
        All of the gas, where the total pressure is stated.
    seen : {"concentration", "pressure"} or None
        What counts as constant in derivatives by temperature, in place of what is held so.
    """

    temperature_k: tuple[float, ...]
    held: dict[str, Held] = field(default_factory=dict)
    driven: bool = False
    initial: dict[str, Held] = field(default_factory=dict)
    total: dict[str, Held] = field(default_factory=dict)
    flow: Flow | None = None
    quasi_steady: tuple[str, ...] = ()
    constant: Constant | None = None
    total_gas: Held | None = None
    seen: Constant | None = None


def held(value: Any, *, where: str) -> Held:
    """Turn ``"2e-4 mol/L"``, ``"20 Torr"``, ``"equilibrium"`` and their like into a Held.

    Raises
    ------
    StudyError
        Neither a concentration nor a partial pressure, or not above 0: a species that is absent is
        not held.
    """
    mend = 'write a concentration ("2e-4 mol/L"), a partial pressure ("20 mbar") or "equilibrium"'
    if value == "equilibrium":
        return Held("equilibrium", None, "equilibrium")
    state = _pressure_or_concentration(value, "concentration", where=where, mend=mend)
    return Held(state.form, state.value, value)


def temperature(value: Any, *, where: str) -> float:
    """Turn ``298.15`` or ``"25 degC"`` into K; StudyError where it is not above 0 K."""
    kelvin = quantity(value, "K", where=where)
    if kelvin <= 0.0:
        raise StudyError(
            f"temperature {value!r} is not above 0 K",
            where=where,
            mend='write for instance "298.15 K"',
        )
    return kelvin


MOST_TEMPERATURES = 100_000


def temperatures(values: Iterable[Any], *, where: str) -> tuple[float, ...]:
    """Turn a list of temperatures into K, the order kept.

    Raises
    ------
    StudyError
        An empty list, one that is not above 0 K, the same temperature twice, or more than
        `MOST_TEMPERATURES`.
    """
    given = list(values)
    mend = 'write for instance ["280 K", "298.15 K"]'
    if not given:
        raise StudyError("the list of temperatures is empty", where=where, mend=mend)
    if len(given) > MOST_TEMPERATURES:
        mend = f"at most {MOST_TEMPERATURES} temperatures are taken"
        raise StudyError(f"{len(given)} temperatures", where=where, mend=mend)
    kelvin: dict[float, Any] = {}
    for value in given:
        number = temperature(value, where=where)
        if number in kelvin:
            first = kelvin[number]
            twice = (
                f"{value!r} stands twice"
                if first == value
                else f"{first!r} and {value!r} are the same"
            )
            raise StudyError(
                f"{twice} in the list of temperatures", where=where, mend="take one of the two out"
            )
        kelvin[number] = value
    return tuple(kelvin)


def temperature_range(start: Any, stop: Any, step: Any, *, where: str) -> tuple[float, ...]:
    """Return the temperatures from start to stop, stop included, in K.

    Raises
    ------
    StudyError
        A step that is not positive, a stop below the start, a stop that no whole number of steps
        reaches, or more than `MOST_TEMPERATURES` values.
    """
    first, last = temperature(start, where=where), temperature(stop, where=where)
    width = _temperature_step(step, where=where)
    if width <= 0.0 or last < first:
        mend = "let the step be above 0 and the end not below the start"
        raise StudyError(
            f"no temperatures from {start} to {stop} in steps of {step}", where=where, mend=mend
        )
    count = round((last - first) / width)
    if abs(first + count * width - last) > 1e-6 * width:
        mend = "choose a step that divides the range, or list the temperatures"
        raise StudyError(
            f"no whole number of steps of {step} leads from {start} to {stop}",
            where=where,
            mend=mend,
        )
    if count >= MOST_TEMPERATURES:
        mend = f"choose a wider step; at most {MOST_TEMPERATURES} temperatures are taken"
        raise StudyError(f"{count + 1} temperatures from {start} to {stop}", where=where, mend=mend)
    return tuple(round(first + k * width, 9) for k in range(count + 1))


def _temperature_step(value: Any, *, where: str) -> float:
    """Return a difference of temperatures in K; only kelvin can be meant."""
    if isinstance(value, str):
        number, unit = split_quantity(value, "K", where=where)
        if unit not in ("K", "kelvin"):
            raise StudyError(
                f"step {value!r} is not in K",
                where=where,
                mend='write the step in K, for instance "5 K"',
            )
        return number
    return quantity(value, "K", where=where)
