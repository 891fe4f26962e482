"""The literals of every choice a user can make, so that ``--help`` needs no other module."""

from __future__ import annotations

from typing import Literal, get_args

Severity = Literal["note", "warning", "error"]
LowModes = Literal["harmonic", "raised", "rotor-entropy", "rotor-enthalpy"]
Rotor = Literal["auto", "classical"]
RotorKind = Literal["atom", "linear", "nonlinear"]
Kind = Literal["minimum", "saddle"]
UsedAs = Literal["minimum", "saddle", "crossing"]
"""What a structure is used as; a point where spin states cross is the saddle point of its step."""
Phase = Literal["gas", "solution"]
Masses = Literal["program", "average"]
Tunnelling = Literal["none", "wigner", "eckart"]
NuclearSpins = Literal["equilibrium", "normal", "ortho", "para"]
EnergyUnit = Literal["kJ/mol", "kcal/mol", "eV", "hartree"]
Format = Literal["table", "csv", "markdown", "latex", "html", "json", "xlsx"]
Origin = Literal["printed", "derived", "declared"]
Reference = Literal["largest", "exp(-1.63 X)", "(X+1) exp(-9 sqrt X)"]
"""How a reference energy goes to the limit of the basis set."""
Duplicates = Literal["count", "once"]
Thermal = Literal["own", "nearest"]
Constant = Literal["concentration", "pressure"]
"""What of a gas stays when the temperature changes."""
CONSTANTS: tuple[Constant, ...] = ("concentration", "pressure")
Broadening = Literal["lindemann", "troe", "iupac", "jpl"]
"""How a rate constant is broadened between its limits of low and high pressure."""
Definition = Literal["free", "pool", "relaxation", "cycle", "point"]
"""What a rate is the rate of; ``point``: at one declared point of a network that need not be linear."""
SelectivityKind = Literal["products", "enantiomeric", "diastereomeric", "isotopic"]
PolynomialForm = Literal["nasa7", "nasa9", "shomate"]

SEVERITIES: tuple[Severity, ...] = get_args(Severity)
"""From the mildest to the worst."""
LOW_MODES: tuple[LowModes, ...] = get_args(LowModes)
USED_AS: tuple[UsedAs, ...] = get_args(UsedAs)
ROTORS: tuple[Rotor, ...] = get_args(Rotor)
PHASES: tuple[Phase, ...] = get_args(Phase)
MASSES: tuple[Masses, ...] = get_args(Masses)
TUNNELLING: tuple[Tunnelling, ...] = get_args(Tunnelling)
NUCLEAR_SPINS: tuple[NuclearSpins, ...] = get_args(NuclearSpins)
ENERGY_UNITS: tuple[EnergyUnit, ...] = get_args(EnergyUnit)
FORMATS: tuple[Format, ...] = get_args(Format)
DUPLICATES: tuple[Duplicates, ...] = get_args(Duplicates)
THERMAL: tuple[Thermal, ...] = get_args(Thermal)
DEFINITIONS: tuple[Definition, ...] = ("free", "pool", "relaxation", "cycle")
"""Those that are constants of a network."""
ALL_DEFINITIONS: tuple[Definition, ...] = get_args(Definition)
POLYNOMIAL_FORMS: tuple[PolynomialForm, ...] = get_args(PolynomialForm)

DEFAULT_LOW_MODES: LowModes = "rotor-entropy"
DEFAULT_ONSET_CM = 100.0
DEFAULT_STANDARD_STATE = "1 bar"
DEFAULT_TEMPERATURE_K = 298.15
