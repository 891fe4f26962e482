"""The lines of docs/pyscf.md: run as they stand, and what they write is read."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

from thermo_pp.readers import read

PAGE = Path(__file__).parents[1] / "docs" / "pyscf.md"


def test_the_example_writes_a_file_that_is_read(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    thermo = pytest.importorskip("pyscf.hessian.thermo")
    code = re.search(r"```python\n(.*?)```", PAGE.read_text(encoding="utf-8"), re.DOTALL)
    assert code is not None
    lines = code.group(1).partition("# from here on")[2].splitlines()[1:]
    assert len([line for line in lines if line and not line.startswith(" ")]) <= 10
    monkeypatch.chdir(tmp_path)
    names: dict[str, object] = {}
    exec(code.group(1), names)  # the documentation's own code
    calc = read(tmp_path / "water.json")
    mf, mol = names["mf"], names["mol"]
    assert (calc.program, calc.method, calc.basis) == ("PySCF", "HF", "sto-3g")
    assert calc.energy_hartree == mf.e_tot
    assert (calc.charge, calc.multiplicity, calc.formula) == (0, 1, "H2O")
    assert calc.wavenumbers_cm is not None
    matrix = names["hess"].reshape(3, 3, 3, 3).transpose(0, 2, 1, 3)
    masses = calc.masses_u
    monkeypatch.setattr(mol, "atom_mass_list", lambda isotope_avg=True: masses)
    theirs = thermo.harmonic_analysis(mol, matrix)["freq_wavenumber"]
    assert calc.wavenumbers_cm == pytest.approx(np.real(theirs), abs=0.1, rel=0.0)
