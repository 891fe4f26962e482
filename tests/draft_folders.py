"""Folders for tests of the draft: real outputs, and made-up structures written as QCSchema.

The Hessian of a made-up structure is a spring for every internal displacement, but downhill along
one direction for a saddle point: its modes are what a test says, its wavenumbers mean nothing.
"""

from __future__ import annotations

import json
import shutil
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

ROOT = Path(__file__).parents[1]
PLUME = ROOT / "fixtures" / "stack-plume" / "outputs"
NWCHEM = ROOT / "fixtures" / "nwchem" / "good"
PSI4 = ROOT / "fixtures" / "psi4" / "good"
BOHR = 0.529177210544
FloatArray = NDArray[np.float64]

HCN = ("NCH", [[0, 0, 1.15], [0, 0, 0], [0, 0, -1.07]])
HNC = ("NCH", [[0, 0, 0], [0, 0, 1.17], [0, 0, -1.0]])


def copied(folder: Path, names: Iterable[str], source: Path = PLUME) -> Path:
    """Copy fixtures into a folder."""
    folder.mkdir(parents=True, exist_ok=True)
    for name in names:
        shutil.copy(source / name, folder / name)
    return folder


def made_up(
    path: Path,
    symbols: str | Sequence[str],
    positions_angstrom: Any,
    energy: float,
    *,
    along: Any = None,
    charge: int = 0,
    multiplicity: int = 1,
    method: str = "hf",
    basis: str = "6-31g*",
    driver: str = "hessian",
    masses: Sequence[float] | None = None,
) -> Path:
    """Write a made-up calculation; `along`, shape (n, 3), makes it a saddle point."""
    x = np.array(positions_angstrom, dtype=np.float64)
    result: Any = energy
    if driver == "hessian":
        inner = _internal(x)
        hessian = 0.3 * inner
        if along is not None:
            d = inner @ np.array(along, dtype=np.float64).ravel()
            d /= np.linalg.norm(d)
            hessian = hessian - 0.4 * np.outer(d, d)
        result = hessian.ravel().tolist()
    molecule: dict[str, Any] = {
        "schema_name": "qcschema_molecule",
        "schema_version": 2,
        "symbols": list(symbols),
        "geometry": (x / BOHR).ravel().tolist(),
        "molecular_charge": charge,
        "molecular_multiplicity": multiplicity,
    }
    if masses is not None:
        molecule["masses"] = list(masses)
    document = {
        "schema_name": "qcschema_output",
        "schema_version": 1,
        "driver": driver,
        "model": {"method": method, "basis": basis},
        "molecule": molecule,
        "keywords": {},
        "success": True,
        "provenance": {"creator": "made up", "version": "1", "routine": "tests"},
        "return_result": result,
        "properties": {"return_energy": energy},
    }
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(json.dumps(document))
    return path


def _internal(x: FloatArray) -> FloatArray:
    """Return the projector on displacements that are no translation and no rotation."""
    x = x - x.mean(axis=0)
    moves = [np.tile(axis, (len(x), 1)).ravel() for axis in np.eye(3)]
    moves += [np.cross(axis, x).ravel() for axis in np.eye(3)]
    u, s, _ = np.linalg.svd(np.array(moves).T, full_matrices=False)
    u = u[:, s > 1e-6]
    return np.eye(x.size) - u @ u.T


def water(at: Sequence[float] = (0.0, 0.0, 0.0)) -> tuple[list[str], list[list[float]]]:
    """Return a water molecule."""
    place = np.array([[0, 0, 0.117], [0, 0.757, -0.469], [0, -0.757, -0.469]]) + np.array(at)
    return ["O", "H", "H"], place.tolist()


def methyl(halide: str, length: float, umbrella: float = 0.35) -> tuple[list[str], FloatArray]:
    """Return CH3X, the halide up the z axis, the hydrogens below by `umbrella`."""
    angles = np.arange(3) * 2.0 * np.pi / 3.0
    rim = np.sqrt(1.09**2 - umbrella**2)
    hydrogens = [[rim * np.cos(a), rim * np.sin(a), -umbrella] for a in angles]
    return ["C", "H", "H", "H", halide], np.array([[0, 0, 0], *hydrogens, [0, 0, length]])


def peroxide(dihedral_degrees: float) -> tuple[list[str], FloatArray]:
    """Return H2O2 with a dihedral angle."""
    angle = np.radians(dihedral_degrees)
    hydrogens = [
        [0.95, 0.0, -0.16],
        [0.95 * np.cos(angle), 0.95 * np.sin(angle), 1.45 + 0.16],
    ]
    return ["O", "O", "H", "H"], np.array([[0, 0, 0], [0, 0, 1.45], *hydrogens])
