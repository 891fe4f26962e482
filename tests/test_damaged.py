"""Damaged outputs: never a wrong number, never a traceback, never a hang. 500 variants with a fixed seed."""

from __future__ import annotations

import numpy as np
import pytest
from damage import Variant, failure, fixtures, long_line, variants

from thermo_pp.readers import read_source
from thermo_pp.records import Calculation
from thermo_pp.sources import open_source

VARIANTS, SEED, PARTS = 500, 20261201, 10


@pytest.fixture(scope="module")
def originals() -> dict[str, Calculation]:
    return {str(path): read_source(open_source(path)) for path in fixtures()}


@pytest.mark.parametrize("part", range(PARTS))
def test_variants(part: int, originals: dict[str, Calculation]) -> None:
    paths = fixtures()
    order = np.random.default_rng(SEED).permutation(len(paths))
    rng = np.random.default_rng([SEED, part])
    rotated = [paths[int(k)] for k in np.roll(order, -part * (VARIANTS // PARTS))]
    wrong = []
    for variant in variants(rng, rotated, VARIANTS // PARTS):
        found = failure(variant, originals[str(variant.fixture)])
        if found is not None:
            wrong.append(f"{variant.name}: {found}")
    assert not wrong, "\n".join(wrong)


@pytest.mark.parametrize("program", ["nwchem", "psi4", "qcschema"])
def test_a_line_of_a_hundred_megabytes(program: str, originals: dict[str, Calculation]) -> None:
    path = next(path for path in fixtures() if path.parent.parent.name == program)
    variant = Variant(path, "long line", long_line(path.read_bytes()))
    assert failure(variant, originals[str(path)]) is None
