"""Checks of what cclib makes of a file: nothing is handed on that the file itself does not bear out."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.formulas.rotor import rotor_kind
from thermo_pp.readers.text import Text
from thermo_pp.units import BOHR_ANGSTROM, HARTREE_J, LIGHT_M_S, PLANCK_J_S

FloatArray = NDArray[np.float64]

RANKS = {"HF": 0, "DFT": 0, "MP2": 1, "MP3": 2, "MP4": 3, "CCD": 4, "CCSD": 5, "CCSD(T)": 6}
"""The energies that are read, and which is the better one of one geometry."""
HARTREE_PER_CM = PLANCK_J_S * LIGHT_M_S * 100.0 / HARTREE_J
_ZERO_POINT_UNITS = {
    "hartree": 1.0,
    "kcal/mol": 627.5095,
    "kJ/mol": 2625.4996,
    "eV": 27.211386,
    "cm^-1": 1.0 / HARTREE_PER_CM,
}
_NUMBER = re.compile(rb"[+-]?\d+\.\d*(?:[EeDd][+-]?\d+)?")
_ZERO = re.compile(rb"zero[- ]?point|\bZPE\b|\bZPVE\b", re.IGNORECASE)
_REPULSION = rb"nuclear repulsion(?: energy)?[^\d\n]{0,30}(\d+\.\d+)"
_NULL_CM = 1.0
"""A translation or rotation that was projected out is printed below this."""
_HIGHER = re.compile(
    rb"(CASPT2|NEVPT2|CASSCF|RASSCF|MRCI|MR-?CI|QCISD\(T\)|QCISD|BCCD|CCSDT|CC2|CC3|CCSD\(T\)|CCSD|CCD\b|MP4|MP3|MP2)"
    rb"[^\n]{0,24}\benergy\b|\b(?:total|final)\s+(CASPT2|CASSCF|RASSCF|MRCI|CCSD\(T\)|CCSD|CC2|CC3|MP4|MP3|MP2)\b",
    re.IGNORECASE,
)
_TRIPLES = re.compile(rb"triples \(T\)|\(T\) +(?:contribution|correction|energy)", re.IGNORECASE)
_ASIDE = re.compile(rb"SCS|SOS|excit|correlation energy", re.IGNORECASE)
_SHIFTED_CM, _SHIFTED_SHARE = 2.0, 0.005
"""By how much wavenumbers from a printed Hessian may be others than the printed ones."""


def printed_at(text: Text, value: float, doubt: float = 1e-9) -> list[int]:
    """Return the offsets at which a number is printed, fixed or with an exponent, to at least five digits.

    One that is not finite is printed nowhere.
    """
    if not math.isfinite(value):
        return []
    found = []
    for start, number in _candidates(text, value):
        if abs(abs(number) - abs(value)) <= doubt * abs(value) + 1e-12:
            found.append(start)
    return sorted(set(found))


def _candidates(text: Text, value: float) -> Iterator[tuple[int, float]]:
    size = abs(value)
    prefixes = {f"{size:.8f}"[:-3], f"{size:.3f}"[:-1], f"{size:.4f}"}
    mantissa, _, _ = f"{size:.10e}".partition("e")
    prefixes |= {mantissa[:7], "0." + mantissa.replace(".", "")[:6]}
    for prefix in prefixes:
        for at in text.all(prefix.encode()):
            match = _NUMBER.match(text.data, at)
            if match is not None:
                yield at, float(match.group().lower().replace(b"d", b"e"))


def positions_at(text: Text, positions: FloatArray) -> int | None:
    """Return where the last geometry's first coordinate that is not 0 is printed last, in angstrom or bohr."""
    value = float(next((one for one in positions.ravel() if abs(one) > 0.05), 0.0))
    places = printed_at(text, value, 1e-6) + printed_at(text, value / BOHR_ANGSTROM, 1e-6)
    return max(places, default=None) if value else None


def closest(positions: FloatArray) -> float:
    """Return the shortest distance of two atoms, angstrom; infinity for an atom."""
    distances = np.linalg.norm(positions[:, None] - positions[None], axis=-1)
    distances.flat[:: len(positions) + 1] = np.inf
    return float(distances.min())


def check_repulsion(text: Text, numbers: NDArray[np.int64], positions: FloatArray) -> None:
    """Compare the geometry with the nuclear repulsion where the file prints one and knows no core potentials."""
    printed = [float(match.group(1)) for match in re.finditer(_REPULSION, text.data, re.IGNORECASE)]
    if not printed or re.search(rb"\bECP|pseudopotential|core potential", text.data, re.IGNORECASE):
        return
    distances = np.linalg.norm(positions[:, None] - positions[None], axis=-1) / BOHR_ANGSTROM
    distances.flat[:: len(numbers) + 1] = np.inf
    own = float((0.5 * np.outer(numbers, numbers) / distances).sum())
    if min(abs(one - own) for one in printed) > 2e-5 * own + 1e-6:
        raise text.error(
            0,
            f"no nuclear repulsion that is printed here is that of the geometry that cclib reads, {own:.6f}",
            mend="the output is damaged, or holds several molecules",
        )


def energy_line(text: Text, hartree: float) -> tuple[float, int]:
    """Return an energy as it is printed, in hartree, and where it is last; ReadError where it is not.

    A line that names a scaled method or an excited state does not count.
    """
    places = [at for at in printed_at(text, hartree) if not _ASIDE.search(text.line(at).encode())]
    if not places:
        raise text.error(
            0,
            f"the energy that cclib reads, {hartree:.8f} hartree, is not printed as one in this file",
            mend="give a format with a reader of its own (docs/readers.md)",
        )
    match = _NUMBER.match(text.data, places[-1])
    assert match is not None
    digits = float(match.group().lower().replace(b"d", b"e"))
    return (-digits if hartree < 0.0 else digits), places[-1]


def check_highest(text: Text, label: str | None) -> None:
    """Refuse an energy where the file speaks of one of a higher level."""
    for match in _HIGHER.finditer(text.data):
        name = (match.group(1) or match.group(2)).decode().upper()
        rank = RANKS.get(name, max(RANKS.values()) + 1)
        if rank > RANKS.get(label or "HF", 0):
            raise text.error(
                match.start(),
                f"a {name} energy stands here, but cclib's is the one of {label or 'the SCF'}",
                mend="give a format with a reader of its own (docs/readers.md)",
            )
    triples = _TRIPLES.search(text.data)
    if triples is not None and label != "CCSD(T)":
        raise text.error(
            triples.start(),
            f"triple excitations stand here, but cclib's energy is {label or 'the SCF'}'s",
            mend="give a format with a reader of its own (docs/readers.md)",
        )


def vibrations(
    text: Text, wavenumbers: FloatArray, masses_u: FloatArray, positions: FloatArray
) -> NDArray[np.int64]:
    """Return the places of the 3N-6 (3N-5) vibrations in ascending order; ReadError where there are not as many."""
    atoms = len(masses_u)
    kind = rotor_kind(masses_u, positions)
    expected = {"atom": 0, "linear": 3 * atoms - 5, "nonlinear": 3 * atoms - 6}[kind]
    order = np.argsort(np.abs(wavenumbers), kind="stable")
    extra = len(wavenumbers) - expected
    null = np.abs(wavenumbers[order[: max(extra, 0)]])
    if extra < 0 or (extra and (len(wavenumbers) != 3 * atoms or null.max() > _NULL_CM)):
        raise text.error(
            0,
            f"{len(wavenumbers)} modes of {'an' if kind == 'atom' else 'a ' + kind} structure of {atoms} atoms in what "
            f"cclib reads, expected {expected}",
            mend="give the frequency job of the whole molecule, with translations and rotations projected out",
        )
    keep = order[max(extra, 0) :]
    if np.any(np.abs(wavenumbers[keep]) < _NULL_CM):
        raise text.error(0, "a vibration below 1 cm^-1 in what cclib reads", mend="check the modes")
    return np.array(keep[np.argsort(wavenumbers[keep], kind="stable")])


def check_signs(text: Text, wavenumbers: FloatArray) -> None:
    """Refuse modes all of which are real in a file that speaks of imaginary ones."""
    for match in re.finditer(rb"imaginary (?:freq|mode|vibr)", text.data, re.IGNORECASE):
        before = text.data[max(0, match.start() - 30) : match.start()].lower()
        if not np.any(wavenumbers < 0.0) and not re.search(
            rb"\b(?:0|no|non)\W*(?:\w+\W*)?$", before
        ):
            raise text.error(
                match.start(),
                "the file speaks of imaginary modes, and cclib reads none",
                mend="give a format with a reader of its own (docs/readers.md)",
            )


def check_zero_point(text: Text, wavenumbers: FloatArray, zero_point: float | None) -> int | None:
    """Compare the zero-point energy of the modes with the one that is printed, in any usual unit.

    Returns
    -------
    int or None
        Where it stands; None where the file prints none.
    """
    own = 0.5 * HARTREE_PER_CM * float(wavenumbers[wavenumbers > 0.0].sum())
    if zero_point is not None and abs(zero_point - own) > 2e-4 * own + 1e-6:
        raise text.error(
            0,
            f"the zero-point energy {zero_point:.6f} hartree that cclib reads is not that of its modes, {own:.6f}",
            mend="give a format with a reader of its own (docs/readers.md)",
        )
    spoken = False
    for match in _ZERO.finditer(text.data):
        end = text.data.find(b"\n", match.end())
        for _ in range(2):
            end = text.data.find(b"\n", end + 1) if end >= 0 else -1
        for number in _NUMBER.finditer(text.data, match.end(), text.end if end < 0 else end):
            value = float(number.group().lower().replace(b"d", b"e"))
            spoken = spoken or value != 0.0
            if any(
                abs(value - own * one) <= 2e-4 * abs(value) for one in _ZERO_POINT_UNITS.values()
            ):
                return match.start()
    if zero_point is not None or spoken:
        raise text.error(
            0,
            f"the zero-point energy of the modes, {own:.6f} hartree, is not printed in this file",
            mend="give a format with a reader of its own (docs/readers.md)",
        )
    return None


def check_hessian(
    text: Text,
    hessian: FloatArray,
    masses_u: FloatArray,
    positions: FloatArray,
    wavenumbers: FloatArray,
) -> None:
    """Compare the wavenumbers with those that the Hessian has with these masses."""
    own = normal_modes(hessian, masses_u, positions).wavenumbers_cm
    off = np.abs(own - wavenumbers) if len(own) == len(wavenumbers) else np.array([np.inf])
    if np.any(off > _SHIFTED_CM + _SHIFTED_SHARE * np.abs(wavenumbers)):
        raise text.error(
            0,
            f"the Hessian that cclib reads does not have its wavenumbers (off by up to {off.max():.1f} cm^-1)",
            mend="the masses or a unit are not the ones it takes; give a format with a reader of its own",
        )


def unit_modes(displacements: FloatArray, masses_u: FloatArray) -> FloatArray | None:
    """Return displacements of length 1; None where they are not plain ones (the centre of mass moves)."""
    lengths = np.sqrt((displacements**2).sum(axis=(1, 2)))
    if np.any(lengths < 1e-6):
        return None
    unit = displacements / lengths[:, None, None]
    drift = np.einsum("a,mac->mc", masses_u, unit) / masses_u.sum()
    return None if np.abs(drift).max(initial=0.0) > 0.02 else unit
