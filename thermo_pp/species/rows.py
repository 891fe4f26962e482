"""Rows: the shares of a result and what became of each mode, as the tables have them."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import StandardState, Treatment
from thermo_pp.formulas.rotor import NO_SPIN_WEIGHTS
from thermo_pp.names import LowModes
from thermo_pp.species.energy import Added
from thermo_pp.species.ideal_gas import IdealGas, Shares
from thermo_pp.species.modes import SortedModes
from thermo_pp.species.result import ModeTable, Part
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]


def part_rows(
    t: FloatArray,
    part: Shares,
    gas: IdealGas,
    treatment: Treatment,
    low_modes: LowModes,
    state: StandardState,
    added: tuple[Added, ...] = (),
    torsions: Sequence[str] = (),
) -> tuple[Part, ...]:
    """Return the shares of one structure, the standard state in translation.

    Parameters
    ----------
    t : shape (t,)
    part : Shares
        Of `gas` at those temperatures.
    gas, treatment, low_modes, state
        What it was computed with.
    added : tuple of Added
        What comes to H and S beside them.
    torsions : sequence of str
        How each torsion was computed.
    """
    modes = part.vibration
    onset = "" if low_modes == "harmonic" else f", onset {treatment.onset_cm:g} cm^-1"
    levels = gas.degeneracies
    electronic = f"{len(levels)} levels" if len(levels) > 1 else f"degeneracy {levels[0]:.0f}"
    shift = GAS_J_MOL_K * state.log_ratio_to_bar(t)
    moving = part.translation
    vibrating = (
        modes.enthalpy_j_mol.sum(axis=-1) + modes.zero_point_j_mol.sum(),
        modes.entropy_j_mol_k.sum(axis=-1),
        modes.heat_capacity_j_mol_k.sum(axis=-1),
    )
    rows = [
        _part(
            "translation",
            f"ideal gas, {state.text}",
            t,
            (moving.enthalpy_j_mol, moving.entropy_j_mol_k - shift, moving.heat_capacity_j_mol_k),
        ),
        _part("rotation", _rotor_words(gas), t, part.rotation),
        _part("vibration", low_modes + onset, t, vibrating),
        _part("electronic", electronic, t, part.electronic),
    ]
    for number, (turning, words) in enumerate(zip(part.torsions, torsions, strict=True), start=1):
        values = (
            turning.enthalpy_j_mol + turning.zero_point_j_mol,
            turning.entropy_j_mol_k,
            turning.heat_capacity_j_mol_k,
        )
        called = "torsion" if len(torsions) == 1 else f"torsion {number}"
        rows.insert(2 + number, _part(called, words, t, values))
    if np.any(np.asarray(gas.hands) > 1):
        none = np.zeros_like(t)
        rows.append(_part("handedness", "both hands", t, (none, part.handedness, none)))
    for share in added:
        constant = (
            np.array(share.enthalpy_j_mol),
            np.array(share.entropy_j_mol_k),
            np.array(0.0),
        )
        rows.append(_part(share.name, share.treated_as, t, constant))
    return tuple(rows)


def mode_table(
    part: Shares, modes: SortedModes, treatment: Treatment, low_modes: LowModes
) -> ModeTable:
    """Return what became of each mode, those that are no vibration in their place among them."""
    entered = modes.entered
    found = part.vibration

    def spread(values: FloatArray, missing: float) -> FloatArray:
        full = np.full((*values.shape[:-1], len(entered)), missing)
        full[..., entered] = values
        return full

    used = spread(found.wavenumbers_cm, np.nan)
    word = "oscillator" if low_modes in ("harmonic", "raised") else "interpolated"
    words = []
    for k, wavenumber in enumerate(modes.wavenumbers_cm):
        raised = low_modes == "raised" and used[k] > treatment.frequency_scale * abs(wavenumber)
        what = f"raised to {treatment.onset_cm:g} cm^-1" if raised else word
        if modes.reaction_coordinate[k]:
            what = "reaction coordinate, left out"
        elif modes.replaced[k]:
            what = f"replaced by torsion {modes.replaced[k]}"
        elif modes.made_real[k]:
            what += ", imaginary taken as real"
        words.append(what)
    return ModeTable(
        wavenumber_cm=modes.wavenumbers_cm,
        used_cm=used,
        treated_as=tuple(words),
        weight=spread(found.weight, np.nan),
        zero_point_kj_mol=spread(found.zero_point_j_mol, 0.0) / 1000.0,
        enthalpy_kj_mol=spread(found.enthalpy_j_mol, 0.0) / 1000.0,
        entropy_j_mol_k=spread(found.entropy_j_mol_k, 0.0),
        heat_capacity_j_mol_k=spread(found.heat_capacity_j_mol_k, 0.0),
    )


def _rotor_words(gas: IdealGas) -> str:
    if gas.rotor == "atom":
        return "atom"
    better = "level sum" if gas.rotor == "linear" else "classical with quantum correction"
    formula = better if gas.quantum_rotor else "classical"
    if gas.quantum_rotor and gas.spin_weights != NO_SPIN_WEIGHTS:
        formula += " with nuclear-spin weights"
    if gas.distortion_k > 0.0:
        formula += ", centrifugal distortion"
    if gas.spin_shares is not None:
        formula += ", {:.0%} in even and {:.0%} in odd levels".format(*gas.spin_shares)
    return f"{gas.rotor}, {formula}, symmetry number {np.max(gas.symmetry_number):.0f}"


def _part(
    name: str, words: str, t: FloatArray, share: tuple[FloatArray, FloatArray, FloatArray]
) -> Part:
    enthalpy, entropy, heat_capacity = (np.broadcast_to(values, t.shape) for values in share)
    gibbs = (enthalpy - t * entropy) / 1000.0
    return Part(name, words, enthalpy / 1000.0, entropy, gibbs, heat_capacity)
