"""What stands twice in an output must agree: lost ends, headings, rows and lines are errors, not other values."""

from __future__ import annotations

from pathlib import Path

import pytest

from thermo_pp.errors import ReadError
from thermo_pp.readers import read_source
from thermo_pp.records import Printed
from thermo_pp.sources import Source

FIXTURES = Path(__file__).parents[1] / "fixtures"


def without_line(data: bytes, mark: bytes, which: int = 0) -> bytes:
    """Drop the `which`-th line with a mark (negative: from the end)."""
    lines = data.split(b"\n")
    places = [i for i, line in enumerate(lines) if mark in line]
    del lines[places[which]]
    return b"\n".join(lines)


LOST = [
    # fixture, mark of the line, which one, what the error says
    ("gaussian/good/water_linked_freq_and_ccsdt.log", b"Normal termination", 0, "has no end"),
    ("gaussian/good/water_opt_out_of_steps.log", b"SCF Done", -1, "an SCF without its energy"),
    ("gaussian/good/co2_mp2_numerical_freq.log", b"SCF Done", 0, "an SCF without its energy"),
    ("orca/good/water_scs_mp2.out", b"|  1> !", 0, "line 1 of the input is not in its echo"),
    ("orca/good/water_two_jobs.out", b"| 10> !", 0, "line 10 of the input is not in its echo"),
    ("orca/good/water_scs_mp2.out", b"END OF INPUT", 0, "without beginning or end"),
    ("orca/good/water_scaled_excited_modes.out", b"VIBRATIONAL FREQ", 0, "without their wavenumb"),
    ("psi4/good/water_ccsdt_energy.out", b" A1\t   11\t    1", 0, "alpha electrons on line"),
    ("psi4/good/water_ccsdt_energy.out", b"-----\t-----\t------", 0, "expected a rule"),
    (
        "psi4/good/water_pbe0_mixed_basis_energy.out",
        b"    Blend: 6-31G",
        0,
        "names of the basis sets",
    ),
    (
        "nwchem/good/water_b3lyp_opt_freq.out",
        b"NWChem DFT Module",
        -1,
        "no heading of its module",
    ),
    ("psi4/good/water_b97d_energy.out", b"Grimme's -D2", 0, "the name of the dispersion"),
    (
        "psi4/good/argon_mp2_energy.out",
        b"\t Total Energy     ",
        0,
        "no Total Energy in this DF-MP2",
    ),
    ("cclib/good/water_mp2.fchk", b"Real atomic weights", 0, "this array should have 9 numbers"),
]


@pytest.mark.parametrize(
    ("fixture", "mark", "which", "what"), LOST, ids=lambda value: str(value)[:40]
)
def test_a_lost_line(fixture: str, mark: bytes, which: int, what: str) -> None:
    data = (FIXTURES / fixture).read_bytes()
    original = read_source(Source("x.out", data))
    lost = Source("x.out", without_line(data, mark, which))
    assert original.energy_label is not None or "excited" in fixture
    with pytest.raises(ReadError, match=what) as caught:
        read_source(lost)
    assert caught.value.where.startswith("x.out:")


KEPT = [
    ("orca/good/water_scs_mp2.out", b"        INPUT FILE", 0),
    ("orca/good/water_two_jobs.out", b"Perturbative triple excitations", 0),
    ("orca/good/water_ts_search_with_hessian.out", b"OPTIMIZATION CYCLE   2", 0),
    ("gaussian/good/water_ccsdt_energy.log", b"1\\1\\GINC", 0),
    ("gaussian/good/water_opt_freq.log", b"SMD-Coulomb is used", -1),
    ("mopac/good/formaldehyde_opt.out", b"     CARTESIAN COORDINATES", -1),
]


@pytest.mark.parametrize(("fixture", "mark", "which"), KEPT, ids=lambda value: str(value)[:40])
def test_a_line_that_is_not_needed(fixture: str, mark: bytes, which: int) -> None:
    data = (FIXTURES / fixture).read_bytes()
    one = read_source(Source("x.out", data))
    two = read_source(Source("x.out", without_line(data, mark, which)))
    assert (two.energy_hartree, two.energy_label) == (one.energy_hartree, one.energy_label)
    assert two.solvent == one.solvent
    assert two.method == one.method
    assert two.positions_angstrom.tolist() == one.positions_angstrom.tolist()


CHANGED = [
    ("orca/good/water_scs_mp2.out", b"! RI-SCS-MP2", b"! RI-SXS-MP2", "no keyword that is known"),
    ("psi4/good/water_b97d_energy.out", b"             75\n", b"             7x\n", "grid points"),
    ("gamess/good/carbon_monoxide_hessian.out", b"RELWFN=NONE", b"RELWFN=NYNE", "with RELWFN=NYNE"),
    (
        "gaussian/good/water_b2plyp_energy.log",
        b"   1          8 ",
        b"   1          7 ",
        "not the elements",
    ),
    (
        "nwchem/good/water_hf_freq.out",
        b"NWChem SCF Module\n                                 ---",
        b"NWChem SCF Module\n                                 \0--",
        "without the rule below it",
    ),
    ("cclib/good/water_mp2.fchk", b"Real atomic wei", b"Real atonic wei", "'Real atomic weights'"),
    (
        "gaussian/good/water_ccsdt_energy.log",
        b"    0.763239 ",
        b"    0.764239 ",
        "nuclear repulsion",
    ),
    ("orca/good/water_scs_mp2.out", b"9.08829376 Eh", b"9.08829476 Eh", None),
    ("orca/good/water_scs_mp2.out", b"9.08829376 Eh", b"9.08929376 Eh", "nuclear repulsion"),
    ("orca/good/water_scs_mp2.out", b"    1.442313", b"    1.442323", "in bohr do not agree"),
    ("qcschema/good/water_mp2_energy.json", b'"mp2"', b'"mw2"', "the energy is that of MP2"),
    ("qcschema/good/water_mp2_energy.json", b"0.1260471197", b"0.1290471197", "nuclear repulsion"),
    (
        "mopac/good/hydroxyl_cosmo_aux.aux",
        b"\n  O  H \n",
        b"\n  I  H \n",
        "elements of the formula",
    ),
    ("psi4/good/water_b2plyp_energy.out", b"            302\n", b"            30\n", "Lebedev"),
]


@pytest.mark.parametrize(
    ("fixture", "old", "new", "what"), CHANGED, ids=lambda value: str(value)[:40]
)
def test_a_changed_digit(fixture: str, old: bytes, new: bytes, what: str | None) -> None:
    data = (FIXTURES / fixture).read_bytes()
    assert old in data
    changed = Source("x.out", data.replace(old, new, 1))
    if what is None:  # within the rounding of the coordinates
        assert read_source(changed).energy_hartree is not None
        return
    with pytest.raises(ReadError, match=what):
        read_source(changed)


def test_a_damaged_word_beside_its_numbers() -> None:
    data = (FIXTURES / "orca/good/water_two_jobs.out").read_bytes()
    old = b"Perturbative triple excitations            ... ON"
    assert old in data
    calc = read_source(Source("x.out", data.replace(old, old[:-1] + b"X")))
    assert calc.energy_label == "CCSD(T)"


@pytest.mark.parametrize(
    ("fixture", "old", "new"),
    [
        # effective core potentials: the electrons do not make up for the nuclei
        (
            "gaussian/good/water_ccsdt_energy.log",
            b"5 alpha electrons        5 beta electrons",
            b"4 alpha electrons        4 beta electrons",
        ),
        (
            "gaussian/good/water_ccsdt_energy.log",
            b"# ccsd(t)/6-31g(d)",
            b"# ccsd(t)/6-31g(d) charge",
        ),
        ("orca/good/water_scs_mp2.out", b"|  6> *\n", b'|  6> * # %pointcharges "q.pc"\n'),
    ],
)
def test_no_check_where_other_charges_count(fixture: str, old: bytes, new: bytes) -> None:
    data = (FIXTURES / fixture).read_bytes()
    assert old in data
    at = data.index(b"9.08829376")
    moved = data[:at] + b"7" + data[at + 1 :]
    with pytest.raises(ReadError, match="nuclear repulsion"):
        read_source(Source("x.out", moved))
    calc = read_source(Source("x.out", moved.replace(old, new, 1)))
    assert calc.energy_hartree == read_source(Source("x.out", data)).energy_hartree


def test_a_digit_that_turns_into_an_exponent_is_damage() -> None:
    data = (FIXTURES / "gaussian/good/co2_mp2_numerical_freq.log").read_bytes()
    line = b"nuclear repulsion energy        57.8928914099"
    damaged = data.replace(line, line[:-6] + b"D14099", 1)
    assert damaged != data
    with pytest.raises(ReadError, match="expected the nuclear repulsion energy"):
        read_source(Source("x", damaged))
    assert Printed("57.8928D14099", "hartree", 1).step == float("inf")


@pytest.mark.parametrize("number", [b" 9.0000000E+999", b"            Inf", b"            nan"])
def test_a_wavenumber_that_is_not_finite_is_printed_nowhere(number: bytes) -> None:
    """Once every place of a checkpoint was one of it, which took all memory there is."""
    pytest.importorskip("cclib")
    data = (FIXTURES / "cclib/good/ammonia_saddle.fchk").read_bytes()
    damaged = data.replace(b"-1.07801466E+03", number, 1)
    assert damaged != data
    with pytest.raises(ReadError, match="is not printed in this file"):
        read_source(Source("x", damaged))


def test_electrons_that_give_no_multiplicity_are_damage() -> None:
    pytest.importorskip("cclib")
    data = (FIXTURES / "cclib/good/water_molpro.out").read_bytes()
    assert read_source(Source("x", data)).where["charge"] == 17
    damaged = data.replace(b"5+    5-", b"5+    8-", 1)
    with pytest.raises(ReadError, match="multiplicity -2 that cclib reads do not fit"):
        read_source(Source("x", damaged))
