"""The reader of MOPAC: text and AUX against their tables and against each other, traps, damage."""

from __future__ import annotations

import json
import re
from pathlib import Path

import numpy as np
import pytest
from fixture_files import FIXTURES, expected, file_id, files

from thermo_pp.audit import audit_alone
from thermo_pp.errors import ReadError
from thermo_pp.formulas.normal_modes import normal_modes
from thermo_pp.readers import mopac
from thermo_pp.records import Calculation
from thermo_pp.sources import Source, open_source

GOOD = files("mopac", "good")
HERE = FIXTURES / "mopac" / "good"
FORCE = HERE / "water_force.out"
PAIRS = [
    path
    for path in GOOD
    if path.suffix == ".out" and path.with_name(f"{path.stem}_aux.aux").exists()
]
SHARED = Path(__file__).parents[2] / "shared" / "data" / "other-programs"


def calculation(path: Path) -> Calculation:
    return mopac.read(open_source(path, str(path)))


def codes(calc: Calculation) -> list[str]:
    return [finding.code for finding in calc.findings]


def altered(path: Path, pattern: str, new: str) -> Source:
    text, count = re.subn(pattern, new, path.read_text(encoding="utf-8"), count=1)
    assert count == 1
    return Source("damaged.out", text.encode())


@pytest.mark.parametrize("path", GOOD, ids=file_id)
def test_fields(path: Path) -> None:
    expect, calc = expected(path), calculation(path)
    assert (calc.program, calc.program_version, calc.method) == (
        "mopac",
        "22.0.6",
        expect["method"],
    )
    assert (calc.charge, calc.multiplicity) == (expect["charge"], expect["multiplicity"])
    assert calc.optimised is expect.get("optimised")
    if "heat_of_formation_kcal_mol" in expect:
        heat = calc.printed["heat_of_formation"]
        assert (heat.value, heat.unit) == (float(expect["heat_of_formation_kcal_mol"]), "kcal/mol")
    if "masses_u" in expect:
        assert calc.masses_u.tolist() == [float(mass) for mass in expect["masses_u"]]
        assert calc.masses_origin == "printed"
    if "wavenumbers_cm" not in expect:
        assert calc.wavenumbers_cm is None
        return
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == expect["wavenumbers_cm"]
    if "wavenumbers_line" in expect:
        assert calc.where["wavenumbers_cm"] == expect["wavenumbers_line"]
    assert not {"printed-differs", "mode-count"} & {
        f.code for f in (*calc.findings, *audit_alone(calc))
    }


def test_a_heat_of_formation_is_no_energy() -> None:
    calc = calculation(FORCE)
    assert calc.energy_hartree is None
    assert calc.energy_label is None
    (finding,) = calc.findings
    assert (finding.code, finding.severity) == ("no-energy", "warning")
    assert "zero-point and thermal energy" in finding.what


def test_the_total_energy_in_electronvolts() -> None:
    calc = calculation(HERE / "water_enpart.out")
    assert calc.energy_hartree == pytest.approx(-322.6792 / 27.211386245981, abs=1e-9, rel=0.0)
    assert calc.energy_label == "semiempirical"
    assert codes(calc) == []


@pytest.mark.parametrize("path", PAIRS, ids=file_id)
def test_text_and_aux_agree(path: Path) -> None:
    text, aux = calculation(path), calculation(path.with_name(f"{path.stem}_aux.aux"))
    assert text.numbers.tolist() == aux.numbers.tolist()
    assert text.masses_u.tolist() == aux.masses_u.tolist()
    assert _distances(text) == pytest.approx(_distances(aux), abs=3e-4, rel=0.0)
    if text.wavenumbers_cm is None or aux.wavenumbers_cm is None:
        assert text.wavenumbers_cm is aux.wavenumbers_cm
        return
    assert text.wavenumbers_cm == pytest.approx(aux.wavenumbers_cm, abs=0.01, rel=0.0)
    assert text.modes is not None
    assert aux.modes is not None
    for one, other in zip(text.modes, aux.modes, strict=True):
        lengths = [np.linalg.norm(mode, axis=1) for mode in (one, other)]
        assert lengths[0] == pytest.approx(lengths[1], abs=2e-3, rel=0.0)


def _distances(calc: Calculation) -> np.ndarray:
    x = calc.positions_angstrom
    return np.linalg.norm(x[:, None] - x, axis=-1)


@pytest.mark.parametrize(
    "path", [p for p in GOOD if p.suffix == ".aux" and "opt" not in p.name], ids=file_id
)
def test_hessian_and_modes_of_an_aux_file_are_in_the_frame_of_its_geometry(path: Path) -> None:
    calc = calculation(path)
    assert calc.hessian_hartree_bohr2 is not None
    assert calc.modes is not None
    assert calc.wavenumbers_cm is not None
    own = normal_modes(calc.hessian_hartree_bohr2, calc.masses_u, calc.positions_angstrom)
    assert own.wavenumbers_cm == pytest.approx(calc.wavenumbers_cm, abs=0.15, rel=0.0)
    gaps = np.diff(calc.wavenumbers_cm, prepend=-1e9, append=1e9)
    single = (gaps[:-1] > 3.0) & (gaps[1:] > 3.0)
    overlap = np.abs(np.sum(own.modes * calc.modes, axis=(1, 2)))
    assert np.all(overlap[single] > 0.999)


@pytest.mark.parametrize("path", [p for p in GOOD if p.suffix == ".out"], ids=file_id)
def test_modes_of_the_text_are_in_the_frame_of_its_geometry(path: Path) -> None:
    """A vibration moves neither the centre of mass nor turns the molecule."""
    calc = calculation(path)
    if calc.modes is None or len(calc.numbers) < 2:
        return
    m, x = calc.masses_u, calc.positions_angstrom
    x = x - m @ x / m.sum()
    momentum = np.einsum("i,kij->kj", m, calc.modes)
    turning = np.einsum("i,kij->kj", m, np.cross(x, calc.modes))
    assert np.abs(momentum).max() < 5e-3
    assert np.abs(turning).max() < 5e-3


def test_the_saddle_point_has_one_imaginary_mode_along_its_axis() -> None:
    calc = calculation(HERE / "planar_ammonia.out")
    assert calc.imaginary_modes == 1
    assert calc.modes is not None
    assert np.abs(calc.modes[0][:, 2]).min() > 10.0 * np.abs(calc.modes[0][:, :2]).max()
    assert codes(calc) == ["no-energy", "not-stationary"]


def test_several_jobs_give_the_last_force_job() -> None:
    calc = calculation(HERE / "water_two_jobs.out")
    lines = ["", *(HERE / "water_two_jobs.out").read_text(encoding="utf-8").splitlines()]
    second = [i for i, line in enumerate(lines) if "CALCULATION RESULTS" in line][1]
    assert all(line >= second for key, line in calc.where.items() if key != "program_version")


def test_thermochemistry_is_that_of_the_first_temperature() -> None:
    printed = calculation(HERE / "water_large.out").printed
    assert (printed["temperature"].text, printed["entropy"].text) == ("298.00", "45.0509")
    assert printed["symmetry_number"].text == "2"
    assert "heat_capacity_v" not in printed, "MOPAC prints Cp"
    assert "thermal_enthalpy" not in printed, "without the zero-point energy"


def test_the_input_geometry_is_not_taken_for_a_final_one_that_is_lost() -> None:
    path = HERE / "formaldehyde_opt.out"
    text = path.read_text(encoding="utf-8")
    head, mark, tail = text.partition("FINAL HEAT OF FORMATION")
    assert mark
    for heading in ("CARTESIAN COORDINATES", "(ANGSTROMS)     (ANGSTROMS)", "ATOM   CHEMICAL"):
        assert heading in tail
        tail = tail.replace(heading, "x")
    tail = tail.replace("NUMBER   SYMBOL", "x")
    with pytest.raises(ReadError, match="no final geometry after this line"):
        mopac.read(Source("x.out", (head + mark + tail).encode()))


def test_solvent_and_charge() -> None:
    assert calculation(HERE / "hydroxyl_cosmo.out").solvent == "COSMO eps=78.4"
    assert calculation(FORCE).solvent == "none"
    assert mopac.output.job.charge(["PM7", "CHARGE=-1"]) == -1


@pytest.mark.parametrize(
    ("pattern", "new", "what"),
    [
        (r"MOLECULAR WEIGHT =   18\.02", "MOLECULAR WEIGHT =   20.02", "the masses taken here add up"),
        (r"(?s)(MASS-WEIGHTED.*?)1395\.0    2809\.7", r"\g<1>1395.0    ******", "frequencies of normal coordinates"),
        (r"(?s)(MASS-WEIGHTED.*?Root No\. +)1", r"\g<1>4", "expected root 1"),
        (r"(?s)(MASS-WEIGHTED.*?)   1   -0\.1817", r"\1   1   -9.1817", "not of unit length"),
        (r"TOT\. +-57\.800    2373\.5118     8\.0571    45\.0509",
         "TOT.  -57.800    2373.5118     8.0571    45.1509", "not the sum of its shares"),
        (r"     2       H          0\.0", "     2       Q          0.0", "Cartesian|position|atom"),
        (r"HEAT OF FORMATION =     -57\.799858 KCALS/MOLE\n\n          ZERO",
         "HEAT OF FORMATION =     *********** KCALS/MOLE\n\n          ZERO", "heat of formation"),
    ],
)  # fmt: skip
def test_damage_that_must_be_seen(pattern: str, new: str, what: str) -> None:
    with pytest.raises(ReadError, match=what) as caught:
        mopac.read(altered(FORCE, pattern, new))
    assert re.fullmatch(r"damaged\.out:\d+", caught.value.where)


@pytest.mark.parametrize(
    ("pattern", "new", "what"),
    [
        (r"NUM_ELECTRONS=08", "NUM_ELECTRONS=09", "the electrons make a charge of -1"),
        (r"ISOTOPIC_MASSES\[03\]=\n  15", "ISOTOPIC_MASSES[03]=\n  25", "the masses add up to"),
        (r"  2809\.68", "  nan    ", "numbers of VIB"),
        (r"  O  H  H", "  O  H  Qq", "no element"),
    ],
)
def test_damage_of_an_aux_file(pattern: str, new: str, what: str) -> None:
    with pytest.raises(ReadError, match=what):
        mopac.read(altered(HERE / "water_force_aux.aux", pattern, new))


def test_a_zero_point_energy_of_other_modes_is_a_finding() -> None:
    calc = mopac.read(
        altered(FORCE, r"ZERO POINT ENERGY      10\.094", "ZERO POINT ENERGY      10.294")
    )
    assert "printed-differs" in codes(calc)


@pytest.mark.parametrize("key", ["EXCITED", "C.I.=3", "ROOT=2", "IRC=1"])
def test_other_states_and_paths_are_refused(key: str) -> None:
    with pytest.raises(ReadError, match=r"configuration interaction|a path"):
        mopac.read(altered(FORCE, r"PM7 FORCE THERMO\(298,298\) LET AUX\n", f"PM7 FORCE {key}\n"))


@pytest.mark.parametrize("name", ["water_force.out", "water_force_aux.aux"])
def test_every_cut_is_an_error(name: str) -> None:
    data = (HERE / name).read_bytes()
    end = data.rindex(b"JOB ENDED NORMALLY" if name.endswith(".out") else b" END OF MOPAC")
    for part in range(1, 100):
        with pytest.raises(ReadError):
            mopac.read(Source("cut", data[: min(len(data) * part // 100, end)]))


def test_sniff() -> None:
    assert all(mopac.sniff(path.read_bytes()[:65536]) for path in GOOD)
    assert not mopac.sniff(b"MOPAC says PM7 CALCULATION RESULTS\n")


@pytest.mark.skipif(not SHARED.is_dir(), reason="../shared/data/other-programs is not here")
@pytest.mark.parametrize("name", ["h2o-force.out", "h2o-force.aux"])
def test_water_of_mopac_2016(name: str) -> None:
    values = json.loads((SHARED / "values.json").read_text(encoding="utf-8"))
    rows = values.get("files", values) if isinstance(values, dict) else values
    row = next(row for row in rows if row["path"] == f"MOPAC/{name}")
    calc = calculation(SHARED / "MOPAC" / name)
    assert (calc.method, calc.charge, calc.multiplicity) == ("PM7", 0, 1)
    if row["energy_hartree"] is None:
        assert calc.energy_hartree is None
    else:
        assert calc.energy_hartree == pytest.approx(row["energy_hartree"], abs=1e-9, rel=0.0)
        assert codes(calc) == ["energy-of-few-digits"]
    assert calc.wavenumbers_cm is not None
    assert calc.wavenumbers_cm.tolist() == row["frequencies_cm1"]
    assert calc.positions_angstrom[[0, -1]].tolist() == [
        row[f"geometry_{which}_atom"][1:] for which in ("first", "last")
    ]
    assert calc.modes is not None
