"""The bundled study against the published rate law, and docs/stack-plume.md against both.

Published: SO3 + 2 H2O, first-order loss of SO3, 2.26(85)e-43 T exp(6544(106)/T) [H2O]^2 s^-1 (molecules, cm3),
250-360 K: Lovejoy, Hanson, Huey, J. Phys. Chem. 1996, 100, 19911 (abstract).
"""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

import thermo_pp as tp
from thermo_pp.kinetics.results import EffectiveRate, Rate

ROOT = Path(__file__).parents[1]
STUDY = ROOT / "fixtures" / "stack-plume" / "study.toml"
TEMPERATURES_K = [280.0, 298.15, 320.0, 340.0, 360.0]
R_KJ = 8.31446261815324e-3
WATER_CM3 = 2e-4 * 6.02214076e20  # 2e-4 mol/L


def published(t: np.ndarray) -> np.ndarray:
    return 2.26e-43 * t * np.exp(6544.0 / t) * WATER_CM3**2


@pytest.fixture(scope="module")
def result() -> EffectiveRate:
    return tp.Study.load(STUDY, temperatures=TEMPERATURES_K).effective()


def rate(result: EffectiveRate, name: str) -> Rate:
    found = result.rates[name]
    assert found is not None
    return found


def test_sign_and_size(result: EffectiveRate) -> None:
    t = result.temperature_k
    pool = rate(result, "pool")
    energies = R_KJ * (t - 6544.0)
    # MP2 energies, B3LYP frequencies, rigid rotors: a factor of 30 in k, 8 kJ/mol in E_a
    assert np.all(pool.arrhenius_energy_kj_mol < 0.0)
    assert pool.arrhenius_energy_kj_mol == pytest.approx(energies, abs=8.0, rel=0.0)
    assert np.abs(np.log10(pool.rate_constant / published(t))).max() < np.log10(30.0)


def test_second_order_in_water(result: EffectiveRate) -> None:
    """The published law is second order in water, by way of the assisted saddle."""
    for name in ("free", "pool"):
        found = rate(result, name)
        assert found.orders["W"] == pytest.approx(2.0, abs=0.02)
        assert found.control["TS2"] == pytest.approx(1.0, abs=0.01)
        assert np.all(found.control["W2"] == 0.0)


def test_no_energy_error_explains_the_sign(result: EffectiveRate) -> None:
    move = rate(result, "pool").sign_shift_kj_mol["TS2"]
    assert np.all(move > 40.0)


def test_table_in_the_docs(result: EffectiveRate) -> None:
    """Every number of the table is that of the run, to the digits shown."""
    text = (ROOT / "docs" / "stack-plume.md").read_text(encoding="utf-8")
    rows = re.findall(r"^\| ([\d.]+) \|(.*)\|$", text, re.MULTILINE)
    assert [float(row[0]) for row in rows] == TEMPERATURES_K
    t = result.temperature_k
    pool, free = rate(result, "pool"), rate(result, "free")
    columns = [
        pool.rate_constant,
        free.rate_constant,
        published(t),
        published(t) / pool.rate_constant,
        pool.arrhenius_energy_kj_mol,
        free.arrhenius_energy_kj_mol,
        R_KJ * (t - 6544.0),
    ]
    for k, (_, rest) in enumerate(rows):
        shown = [cell.strip() for cell in rest.split("|")]
        for cell, column in zip(shown, columns, strict=True):
            mantissa = cell.split("e")[0]
            step = 10.0 ** -len(mantissa.partition(".")[2])
            scale = 10.0 ** int(cell.partition("e")[2] or 0)
            assert float(cell) == pytest.approx(column[k], abs=0.51 * step * scale, rel=0.0)
