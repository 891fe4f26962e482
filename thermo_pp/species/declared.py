"""Declared: a species without an output, its enthalpy and entropy stated."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike

from thermo_pp.conditions import StandardState
from thermo_pp.data.elements import NUMBERS
from thermo_pp.errors import Finding, StudyError
from thermo_pp.names import DEFAULT_LOW_MODES, DEFAULT_TEMPERATURE_K, Kind, LowModes
from thermo_pp.species.result import SaddleMember, SpeciesModel, Thermochemistry
from thermo_pp.units import GAS_J_MOL_K

_CHARGE = re.compile(r"(?:\^(\d+)([+-])|([+-]+))$")
_TOKEN = re.compile(r"([A-Z][a-z]?)(\d*)|(\()|\)(\d*)")
_MEND = 'write a formula such as "H2SO4", "Ca(OH)2", "H3O+" or "SO4^2-"'


@dataclass(frozen=True, eq=False)
class Declared:
    """A species with declared enthalpy and entropy.

    H(T) = H + Cp (T - T0), S(T) = S + Cp ln(T/T0) in the standard state it was declared for;
    without a heat capacity both are constant.

    Attributes
    ----------
    name : str
    kind : {"minimum", "saddle"}
    composition : mapping of str to int
    charge : int
    enthalpy_kj_mol, entropy_j_mol_k : float
        Against the common zero of a study in which everything is declared; with `reference`,
        differences from the sum of its species.
    standard_state : StandardState
        That these values, and those of the reference, are meant for.
    heat_capacity_j_mol_k : float or None
    temperature_k : float
        T0, where enthalpy and entropy hold.
    ground_own_kj_mol : float or None
        Enthalpy at 0 K on the same zero as `enthalpy_kj_mol`.
    imaginary_cm : float or None
        Size of a saddle point's imaginary wavenumber, above 0.
    reference : tuple of (SpeciesModel, int)
        What ``relative_to`` names, resolved: species and how many of each.
    files : tuple of str
        Of the reference.
    findings : tuple of Finding
    """

    name: str
    kind: Kind
    composition: Mapping[str, int]
    charge: int
    enthalpy_kj_mol: float
    entropy_j_mol_k: float
    standard_state: StandardState
    heat_capacity_j_mol_k: float | None = None
    temperature_k: float = DEFAULT_TEMPERATURE_K
    ground_own_kj_mol: float | None = None
    imaginary_cm: float | None = None
    reference: tuple[tuple[SpeciesModel, int], ...] = ()
    files: tuple[str, ...] = ()
    findings: tuple[Finding, ...] = field(default=())

    @classmethod
    def make(
        cls,
        composition: str,
        *,
        name: str,
        kind: Kind,
        enthalpy_kj_mol: float,
        entropy_j_mol_k: float,
        standard_state: StandardState,
        heat_capacity_j_mol_k: float | None = None,
        temperature_k: float = DEFAULT_TEMPERATURE_K,
        ground_kj_mol: float | None = None,
        imaginary_cm: float | None = None,
        charge: int | None = None,
        reference: tuple[tuple[SpeciesModel, int], ...] = (),
        where: str = "",
    ) -> Declared:
        """Check what is declared.

        Parameters
        ----------
        composition : str
            A formula with the charge in it: ``"H3O+"``.
        ground_kj_mol : float or None
            Enthalpy at 0 K on the same zero as `enthalpy_kj_mol`.
        charge : int or None
            Beside a formula without one.
        reference : tuple of (SpeciesModel, int)
            Together they must have this composition and charge.
        where : str
            For messages. The other parameters as the attributes.

        Raises
        ------
        StudyError
            No formula, two different charges, a reference of another composition or charge.
        """
        where = where or name
        counts, own_charge = parse_composition(composition, where=where)
        if charge is not None and charge != own_charge:
            if own_charge != 0:
                raise StudyError(
                    f"{name}: {composition!r} says charge {own_charge}, charge says {charge}",
                    where=where,
                    mend="give the charge once",
                )
            own_charge = charge
        if reference:
            _check_reference(counts, own_charge, reference, name, where)
        notes = []
        if heat_capacity_j_mol_k is None:
            notes.append(
                Finding(
                    code="declared-constant",
                    severity="note",
                    file=None,
                    line=None,
                    what=f"{name}: no heat capacity; enthalpy and entropy are constant in T",
                    mend="give heat_capacity, and temperature where it is not 298.15 K",
                )
            )
        return cls(
            name=name,
            kind=kind,
            composition=counts,
            charge=own_charge,
            enthalpy_kj_mol=enthalpy_kj_mol,
            entropy_j_mol_k=entropy_j_mol_k,
            standard_state=standard_state,
            heat_capacity_j_mol_k=heat_capacity_j_mol_k,
            temperature_k=temperature_k,
            ground_own_kj_mol=ground_kj_mol,
            imaginary_cm=imaginary_cm,
            reference=reference,
            files=tuple(dict.fromkeys(file for model, _ in reference for file in model.files)),
            findings=tuple(notes),
        )

    @property
    def ground_kj_mol(self) -> float | None:
        """Enthalpy at 0 K, that of the reference included; None where either is not known."""
        total = self.ground_own_kj_mol
        for model, count in self.reference:
            other = model.ground_kj_mol
            total = None if total is None or other is None else total + count * other
        return total

    def saddle_members(self, temperature_k: ArrayLike) -> tuple[SaddleMember, ...]:
        """Return what tunnelling needs of a saddle point; nothing for a minimum."""
        if self.kind != "saddle":
            return ()
        found = self.at(temperature_k)
        return (
            SaddleMember(
                found.gibbs_kj_mol,
                found.slope_enthalpy_kj_mol,
                self.imaginary_cm,
                self.ground_kj_mol,
            ),
        )

    def at(
        self,
        temperature_k: ArrayLike,
        *,
        low_modes: LowModes | None = None,
        standard_state: StandardState | None = None,
    ) -> Thermochemistry:
        """Return H, S and G at the temperatures.

        Parameters
        ----------
        temperature_k : shape (t,) or ()
            K, above 0.
        low_modes : one of `names.LOW_MODES` or None
            For the reference; nothing else depends on it.
        standard_state : StandardState or None
            In place of the one declared for; the species counts as an ideal gas or solute.

        Returns
        -------
        Thermochemistry
            Arrays of shape (t,); electronic and zero-point energy are None.
        """
        t = np.atleast_1d(np.asarray(temperature_k, dtype=np.float64))
        if not np.all(t > 0.0):
            raise ValueError("temperatures must be above 0")
        own = self.standard_state
        state = standard_state or own
        cp = self.heat_capacity_j_mol_k or 0.0
        enthalpy = self.enthalpy_kj_mol + cp * (t - self.temperature_k) / 1000.0
        entropy = self.entropy_j_mol_k + cp * np.log(t / self.temperature_k)
        slope, heat_capacity = enthalpy, np.full(t.shape, cp)
        for model, count in self.reference:
            other = model.at(t, low_modes=low_modes, standard_state=own)
            enthalpy = enthalpy + count * other.enthalpy_kj_mol
            entropy = entropy + count * other.entropy_j_mol_k
            slope = slope + count * other.slope_enthalpy_kj_mol
            heat_capacity = heat_capacity + count * other.heat_capacity_j_mol_k
        entropy = entropy - GAS_J_MOL_K * (state.log_ratio_to_bar(t) - own.log_ratio_to_bar(t))
        bend = state.log_ratio_slope - own.log_ratio_slope
        return Thermochemistry(
            name=self.name,
            temperature_k=t,
            electronic_kj_mol=None,
            zero_point_kj_mol=None,
            enthalpy_kj_mol=enthalpy,
            entropy_j_mol_k=entropy,
            gibbs_kj_mol=enthalpy - t * entropy / 1000.0,
            heat_capacity_j_mol_k=heat_capacity,
            slope_enthalpy_kj_mol=slope - bend * GAS_J_MOL_K * t / 1000.0,
            low_modes=low_modes or DEFAULT_LOW_MODES,
            standard_state=state,
            findings=self.findings,
        )


def parse_composition(text: str, *, where: str) -> tuple[dict[str, int], int]:
    """Turn ``"H3O+"`` into atoms by element and the charge.

    Every sign at the end counts one (``"Ca++"``); ``"SO4^2-"`` is a charge of -2, ``"Fe3+"`` three
    atoms of iron and a charge of +1. ``"e-"`` is an electron: no atoms, charge -1.

    Raises
    ------
    StudyError
        Not a formula.
    """
    if text.strip() == "e-":
        return {}, -1
    formula, charge = text.strip(), 0
    match = _CHARGE.search(formula)
    if match is not None:
        formula = formula[: match.start()]
        signs = match.group(3) or match.group(2) * int(match.group(1))
        charge = signs.count("+") - signs.count("-")
    error = StudyError(f"{text!r} is not a formula", where=where, mend=_MEND)
    stack: list[Counter[str]] = [Counter()]
    at = 0
    while at < len(formula):
        token = _TOKEN.match(formula, at)
        if token is None:
            raise error
        symbol, count, opening, times = token.groups()
        if symbol is not None:
            if symbol not in NUMBERS:
                raise error
            stack[-1][symbol] += int(count or 1)
        elif opening:
            stack.append(Counter())
        else:
            if len(stack) == 1:
                raise error
            for inner, number in stack.pop().items():
                stack[-1][inner] += number * int(times or 1)
        at = token.end()
    if len(stack) != 1 or not stack[0] or min(stack[0].values()) < 1:
        raise error
    return dict(stack[0]), charge


def _check_reference(
    composition: Mapping[str, int],
    charge: int,
    reference: tuple[tuple[SpeciesModel, int], ...],
    name: str,
    where: str,
) -> None:
    """Make sure that the reference is the same atoms and charge."""
    atoms: Counter[str] = Counter()
    total = 0
    for model, count in reference:
        for symbol, number in model.composition.items():
            atoms[symbol] += count * number
        total += count * model.charge
    if {k: v for k, v in atoms.items() if v} != dict(composition) or total != charge:
        names = " + ".join(f"{count} {model.name}" for model, count in reference)
        raise StudyError(
            f"{name} and what it is relative to ({names}) differ in atoms or charge",
            where=where,
            mend="let relative_to add up to the same formula and charge",
        )
