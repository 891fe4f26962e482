"""Repulsion of the nuclei against what programs print, and the check of a geometry against it."""

from __future__ import annotations

import numpy as np
import pytest

from thermo_pp.formulas.repulsion import nuclear_repulsion, repulsion_slope
from thermo_pp.readers import repulsion
from thermo_pp.units import BOHR_ANGSTROM

WATER = np.array(
    [
        [0.0, 0.0, -0.068516219320],
        [0.0, -0.790689573744, 0.543701060715],
        [0.0, 0.790689573744, 0.543701060715],
    ]
)


def test_two_protons() -> None:
    # by hand: one bohr apart, 1 hartree; each coordinate along the axis changes it by 1 hartree/bohr
    x = [[0.0, 0.0, 0.0], [0.0, 0.0, BOHR_ANGSTROM]]
    assert nuclear_repulsion([1, 1], x) == pytest.approx(1.0, abs=1e-14, rel=0.0)
    slope = repulsion_slope([1, 1], x)
    assert slope == pytest.approx(2.0 / BOHR_ANGSTROM, abs=1e-12, rel=0.0)


def test_ghosts_and_atoms() -> None:
    assert nuclear_repulsion([8], [[0.0, 0.0, 0.0]]) == 0.0
    alone = nuclear_repulsion([8, 1], WATER[:2])
    with_ghost = nuclear_repulsion([8, 1, 0], WATER)
    assert with_ghost == pytest.approx(alone, abs=1e-12, rel=0.0)
    assert nuclear_repulsion([8, 1], np.zeros((2, 3))) == np.inf


def test_a_geometry_is_its_own() -> None:
    z = [8, 1, 1]
    printed = f"{nuclear_repulsion(z, WATER):.10f}"
    assert repulsion.differs(printed, z, WATER, 0.0) is None
    assert repulsion.differs(printed, z, WATER.round(4), 5e-5) is None
    assert repulsion.differs(printed, z, WATER.round(4), 0.0) is not None
    for z_other, x in (
        ([8, 1, 2], WATER),
        ([8, 1], WATER[:2]),
        (z, WATER + np.outer([0, 0, 1], [0, 1e-4, 0])),
    ):
        why = repulsion.differs(printed, z_other, x, 5e-7)
        assert why is not None
        assert printed in why
    assert repulsion.differs(printed, z, np.zeros((3, 3)), 5e-7) is not None
