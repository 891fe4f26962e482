"""Errors as a user meets them: every sentence of a message, and what an error must carry."""

from __future__ import annotations

import pickle
from pathlib import Path

import pytest
from declared_study import TEXT, edited, load

from thermo_pp.errors import Finding, ReadError, StudyError, ThermoError
from thermo_pp.nearest import MOST_LISTED
from thermo_pp.study.keys import Keys, SpeciesKeys, StudyKeys, TreatmentKeys
from thermo_pp.study.load import Study

ALL_SPECIES = "known species: A, W, W2, C, P, TS1, TS2"
IN_STEPS = "known species: W, W2, A, C, P"
EXACTLY_ONE = (
    'give exactly one of through = "TS", barrier = "none", rate = "...", '
    'arrhenius = { A = "...", E = "..." } and falloff = { ... }'
)
LIMIT = (
    "a collision or diffusion limit needs two molecules that meet: split the step, name its saddle "
    "point (through) or declare its rate constant (rate)"
)
QUANTITY_K = 'write one number and its unit, for instance "298.15 K" or "25 degC"'
HELD = 'write a concentration ("2e-4 mol/L"), a partial pressure ("20 mbar") or "equilibrium"'


def names(table: type[Keys]) -> str:
    """The keys of a table, in the order of the model, as far as they are listed."""
    keys = table.__struct_fields__
    return ", ".join(keys[:MOST_LISTED]) + (", ..." if len(keys) > MOST_LISTED else "")


CASES = {  # name: (changes, where, what, mend)
    "unknown key": (
        [("[conditions]", '[treatment]\nlow_mods = "harmonic"\n[conditions]')],
        "[treatment] low_mods",
        "unknown key 'low_mods'",
        f"did you mean 'low_modes'? known keys: {names(TreatmentKeys)}",
    ),
    "unknown key of a species": (
        [('entropy = "256 J/mol/K"', 'entrophy = "256 J/mol/K"')],
        "[species.A] entrophy",
        "unknown key 'entrophy'",
        f"did you mean 'entropy'? known keys: {names(SpeciesKeys)}",
    ),
    "unknown table": (
        [("[effective]", "[efective]")],
        "[efective]",
        "unknown key 'efective'",
        f"did you mean 'effective'? known keys: {names(StudyKeys)}",
    ),
    "unknown choice": (
        [("[conditions]", '[treatment]\nphase = "gsa"\n[conditions]')],
        "[treatment] phase",
        "unknown phase 'gsa'",
        "did you mean 'gas'? known choices: gas, solution",
    ),
    "wrong kind of value": (
        [('title = "Loss of A with the help of W"', "title = 5")],
        "title",
        "expected a text, found 5",
        "title: stands over every table; the file's name unless given",
    ),
    "scale factor of zero": (
        [("[conditions]", "[treatment]\nfrequency_scale = 0.0\n[conditions]")],
        "[treatment] frequency_scale",
        "0.0 is not above 0",
        "treatment.frequency_scale: factor of the wavenumbers in thermal terms",
    ),
    "scale factor that is no number": (
        [("[conditions]", "[treatment]\nfrequency_scale = nan\n[conditions]")],
        "[treatment] frequency_scale",
        "frequency_scale is not a finite number",
        "treatment.frequency_scale: factor of the wavenumbers in thermal terms",
    ),
    "misspelt species in a step": (
        [('"A + W = C"', '"A + V = C"')],
        "[steps.2] equation",
        "unknown species 'V' in 'A + V = C'",
        ALL_SPECIES,
    ),
    "nearest species": (
        [('"W + W = W2"', '"W + W = w2"')],
        "[steps.1] equation",
        "unknown species 'w2' in 'W + W = w2'",
        f"did you mean 'W2'? {ALL_SPECIES}",
    ),
    "no space beside the plus": (
        [('"A + W = C"', '"A+W = C"')],
        "[steps.2] equation",
        "unknown species 'A+W' in 'A+W = C'",
        f'write a space on each side of "+"; did you mean \'A\'? {ALL_SPECIES}',
    ),
    "misspelt saddle point": (
        [('through = "TS2"', 'through = "TS3"')],
        "[steps.4] through",
        "unknown saddle point 'TS3'",
        f"did you mean 'TS1'? {ALL_SPECIES}",
    ),
    "species that no step uses": (
        [("[[steps]]", '[species.W3]\ncomposition = "H2O"\nenthalpy = "0 kJ/mol"\n'
          'entropy = "0 J/mol/K"\n[[steps]]')],
        "[species.W3]",
        "no step uses the species 'W3'",
        "add the step it belongs to, or take the species out (a step uses 'W')",
    ),
    "saddle point as a reactant": (
        [('"C = P"', '"TS2 = P"')],
        "[steps.3] equation",
        "'TS2' is a saddle point ('C + W = P + W' goes through it) and stands in 'TS2 = P'",
        "steps make and use minima only; name the minimum, or mend `through`",
    ),
    "unbalanced step": (
        [('"A + W = C"', '"A + 2 W = C"')],
        "[steps.2] equation",
        "the step 'A + 2 W = C' does not balance: the right side has 2 H too few, 1 O too few",
        "mend the equation, or the files and charges of its species",
    ),
    "unbalanced charge": (
        [('composition = "H2SO4"\nenthalpy = "-90', 'composition = "H2SO4+"\nenthalpy = "-90')],
        "[steps.3] equation",
        "the step 'C = P' does not balance: the right side has charge 1 instead of 0",
        "mend the equation, or the files and charges of its species",
    ),
    "saddle point of other atoms": (
        [('composition = "H4SO5"', 'composition = "H2SO5"')],
        "[steps.4] through",
        "the saddle point 'TS2' is not made of what 'C + W = P + W' has: it has 2 H "
        "too few",
        "name the saddle point of this step, or add what it is made of to both sides",
    ),
    "step that changes nothing": (
        [('"A + W = C"\nbarrier', '"A + W = W + A"\nbarrier')],
        "[steps.2] equation",
        "the step 'A + W = W + A' changes nothing",
        "both sides are the same; mend the equation",
    ),
    "step without a rate": (
        [('equation = "A + W = C"\nbarrier = "none"', 'equation = "A + W = C"')],
        "[steps.2]",
        "the step 'A + W = C' says nothing of its rate",
        EXACTLY_ONE,
    ),
    "step with two rates": (
        [('through = "TS1"', 'through = "TS1"\nbarrier = "none"')],
        "[steps.3]",
        "the step 'C = P' has through and barrier",
        EXACTLY_ONE,
    ),
    "barrierless with three reactants": (
        [('"C + W = P + W"\nthrough = "TS2"', '"A + W + W = P + W"\nbarrier = "none"'),
         ('"C = P"\nthrough = "TS1"', '"C + W = P + W"\nthrough = "TS2"'),
         ('[species.TS1]\ncomposition = "H2SO4"\nenthalpy = "80 kJ/mol"\n'
          'entropy = "310 J/mol/K"\n', "")],
        "[steps.4] barrier",
        "the step 'A + W + W = P + W' cannot be barrierless: it has 3 molecules on its left side "
        "and 2 molecules on its right side",
        LIMIT,
    ),
    "barrierless with one molecule on each side": (
        [('"C = P"\nthrough = "TS1"', '"C = P"\nbarrier = "none"'),
         ('"C + W = P + W"\nthrough = "TS2"', '"C + W = P + W"\nthrough = "TS2"'),
         ('[species.TS1]\ncomposition = "H2SO4"\nenthalpy = "80 kJ/mol"\n'
          'entropy = "310 J/mol/K"\n', "")],
        "[steps.3] barrier",
        "the step 'C = P' cannot be barrierless: it has 1 molecule on its left side and 1 molecule "
        "on its right side",
        LIMIT,
    ),
    "barrier below zero": (
        [('"A + W = C"\nbarrier = "none"', '"A + W = C"\nbarrier = "-12 kJ/mol"')],
        "[steps.2] barrier",
        "the barrier '-12 kJ/mol' is below 0",
        'it counts from the higher side; write barrier = "none" for a step without one',
    ),
    "tunnelling without a saddle point": (
        [('"A + W = C"\nbarrier = "none"', '"A + W = C"\nbarrier = "none"\ntunnelling = "wigner"')],
        "[steps.2] tunnelling",
        "the step 'A + W = C' has no saddle point, so nothing tunnels",
        'name the saddle point (through = "TS"), or take the key out',
    ),
    "imaginary mode of a minimum": (
        [("[species.A]", '[species.A]\nimaginary_mode = "1200 cm^-1"')],
        "[species.A] imaginary_mode",
        "a minimum has no imaginary mode",
        "take the key out, or let a step go through this species",
    ),
    "conformers beside an output": (
        [("[species.A]", '[species.A]\nconformers = [{ frequencies = "a.out" }]')],
        "[species.A]",
        "A has both conformers and composition",
        'name its output (frequencies = "..."), several (conformers = [{ frequencies = "..." }, ...]) '
        'or declare it (composition = "...", enthalpy = "...", entropy = "...")',
    ),
    "a key that belongs to each conformer": (
        [
            (
                'composition = "SO3"\nenthalpy = "0 kJ/mol"\nentropy = "256 J/mol/K"',
                'conformers = [{ frequencies = "a.out" }]\nenergy = "b.out"',
            )
        ],
        "[species.A] energy",
        "energy belongs to each conformer",
        "write it in the tables of conformers",
    ),
    "conformers without an output": (
        [
            (
                'composition = "SO3"\nenthalpy = "0 kJ/mol"\nentropy = "256 J/mol/K"',
                "conformers = [{ degeneracy = 2 }]",
            ),
            *[
                (f"[species.{name}]\n", f"[species.{name}]\nrelative_to = {{ A = 1 }}\n")
                for name in ("W", "W2", "C", "P", "TS1", "TS2")
            ],
        ],
        "[species.A] conformers.1",
        "A.1 has neither frequencies, energy nor composition",
        'name its output: { frequencies = "..." }',
    ),
    "conformers read beside declared ones": (
        [
            (
                'composition = "SO3"\nenthalpy = "0 kJ/mol"\nentropy = "256 J/mol/K"',
                'conformers = [{ composition = "SO3", enthalpy = 0, entropy = 256 }, '
                '{ composition = "SO3", frequencies = "a.out", enthalpy = 0, entropy = 256 }]',
            )
        ],
        "[species.A] conformers.2",
        "A.2 has both frequencies and composition",
        "take one of them out",
    ),
    "a declared key of a conformer that is read": (
        [
            (
                'composition = "SO3"\nenthalpy = "0 kJ/mol"\nentropy = "256 J/mol/K"',
                'conformers = [{ composition = "SO3", enthalpy = 0 }]',
            )
        ],
        "[species.A] conformers.1",
        "the key 'entropy' is missing",
        "a declared species has composition, enthalpy and entropy",
    ),
    "declared conformers of different molecules": (
        [
            (
                'composition = "SO3"\nenthalpy = "0 kJ/mol"\nentropy = "256 J/mol/K"',
                'conformers = [{ composition = "SO3", enthalpy = 0, entropy = 256 }, '
                '{ composition = "SO2", enthalpy = 0, entropy = 256 }]',
            )
        ],
        "[species.A] conformers",
        "A: A.1 is O3S1, but A.2 is O2S1",
        "conformers of one species have the same atoms",
    ),
    "spin states of one structure": (
        [("[species.A]", "[species.A]\nspin_states = true")],
        "[species.A] spin_states",
        "spin_states is for a species with several conformers",
        "take the key out, or list conformers",
    ),
    "rate constant of another order": (
        [('rate = "2e7 L/mol/s"', 'rate = "2e7 s^-1"')],
        "[steps.5] rate",
        "'2e7 s^-1' is not a quantity in L/mol/s",
        "write one number and its unit, for instance 1.0 L/mol/s",
    ),
    "rate constant below zero": (
        [('rate = "2e7 L/mol/s"', 'rate = "-2e7 L/mol/s"')],
        "[steps.5] rate",
        "'-2e7 L/mol/s' is not above 0",
        "write a value above 0",
    ),
    "no equals sign": (
        [('"A + W = C"', '"A + W -> C"')],
        "[steps.2] equation",
        "the equation 'A + W -> C' does not have exactly one '='",
        'write for instance "SO3 + W = C1"; spaces around + and =, counts as in "2 W"',
    ),
    "0 K": (
        [('["280 K", "25 degC"]', '["0 K"]')],
        "[conditions] temperatures",
        "temperature '0 K' is not above 0 K",
        'write for instance "298.15 K"',
    ),
    "a power for a number": (
        [('["280 K", "25 degC"]', '["10**10**10 K"]')],
        "[conditions] temperatures",
        "'10**10**10 K' is not one number and a unit",
        QUANTITY_K,
    ),
    "no unit": (
        [('["280 K", "25 degC"]', '["280"]')],
        "[conditions] temperatures",
        "'280' has no unit",
        QUANTITY_K,
    ),
    "no temperatures in the list": (
        [('["280 K", "25 degC"]', "[]")],
        "[conditions] temperatures",
        "the list is empty",
        "add an entry",
    ),
    "temperatures missing": (
        [('temperatures = ["280 K", "25 degC"]', "")],
        "[conditions]",
        "the key 'temperatures' is missing",
        'write temperatures = { from = "280 K", to = "360 K", step = "5 K" }, or a list',
    ),
    "a temperature twice": (
        [('["280 K", "25 degC"]', '["298.15 K", "280 K", "25 degC"]')],
        "[conditions] temperatures",
        "'298.15 K' and '25 degC' are the same in the list of temperatures",
        "take one of the two out",
    ),
    "an unknown pressure unit": (
        [("[conditions]", '[treatment]\nstandard_state = "1 bra"\n[conditions]')],
        "[treatment] standard_state",
        "'1 bra' is neither a pressure nor a concentration",
        'write a pressure or a concentration: "1 bar", "1 atm" or "1 mol/L"',
    ),
    "unknown held species": (
        [('W2 = "equilibrium" }', 'W4 = "equilibrium" }')],
        "[conditions] held.W4",
        "unknown species 'W4'",
        f"did you mean 'W'? {IN_STEPS}",
    ),
    "saddle point held": (
        [('W2 = "equilibrium" }', 'TS1 = "1e-9 mol/L" }')],
        "[conditions] held.TS1",
        "unknown species 'TS1'",
        IN_STEPS,
    ),
    "negative concentration": (
        [('"1e-3 mol/L"', '"-1e-3 mol/L"')],
        "[conditions] held.W",
        "concentration '-1e-3 mol/L' is not above 0",
        HELD,
    ),
    "no concentration": (
        [('"1e-3 mol/L"', '"1e-3 kJ/mol"')],
        "[conditions] held.W",
        "'1e-3 kJ/mol' is neither a pressure nor a concentration",
        HELD,
    ),
    "equilibrium that no step reaches": (
        [('"W + W = W2"\nbarrier', '"C + W2 = P + W2"\nbarrier')],
        "[conditions] held.W2",
        "W2 is held at equilibrium, but no step among held species makes it from those held at "
        "stated values",
        "add the step (for instance 'W + W = W2'), or state its concentration",
    ),
    "reactant that is the product": (
        [('product = "P"', 'product = "A"')],
        "[effective] product",
        "the product 'A' is the reactant too",
        "name what is made, once",
    ),
    "unknown product": (
        [('product = "P"', 'product = "Q"')],
        "[effective] product",
        "'Q' is not made or used by any step",
        IN_STEPS,
    ),
    "saddle point as the product": (
        [('product = "P"', 'product = "TS1"')],
        "[effective] product",
        "'TS1' is not made or used by any step",
        IN_STEPS,
    ),
    "reactant and catalyst": (
        [('reactant = "A"', 'reactant = "A"\ncatalyst = "W"')],
        "[effective]",
        "both a reactant and a catalyst",
        "give exactly one of reactant and catalyst",
    ),
    "held by pressure in solution": (
        [("[conditions]", '[treatment]\nphase = "solution"\n[conditions]'),
         ('"1e-3 mol/L"', '"20 mbar"'),
         ('"W + W = W2"\nbarrier = "none"', '"W + W = W2"\nrate = "1e9 L/mol/s"'),
         ('"A + W = C"\nbarrier = "none"', '"A + W = C"\nrate = "1e9 L/mol/s"')],
        "[conditions] held.W",
        "'20 mbar' is a partial pressure, and the phase is a solution",
        'write a concentration, for instance "0.5 mol/L"',
    ),
    "no viscosity in solution": (
        [("[conditions]", '[treatment]\nphase = "solution"\n[conditions]')],
        "[steps.1] viscosity",
        "the step 'W + W = W2' has no viscosity",
        'the diffusion limit needs one: viscosity = "0.89 mPa s", or pairs over temperature',
    ),
    "viscosity of a gas": (
        [('"A + W = C"\nbarrier = "none"', '"A + W = C"\nbarrier = "none"\nviscosity = "1 mPa s"')],
        "[steps.2] viscosity",
        "a viscosity has no use here: the phase is a gas",
        "take the viscosity out",
    ),
    "read and declared": (
        [("[species.A]", '[species.A]\nfrequencies = "a.out"')],
        "[species.A]",
        "A has both frequencies and composition",
        'name its output (frequencies = "..."), several (conformers = [{ frequencies = "..." }, ...]) '
        'or declare it (composition = "...", enthalpy = "...", entropy = "...")',
    ),
    "neither read nor declared": (
        [('[species.A]\ncomposition = "SO3"\nenthalpy = "0 kJ/mol"\nentropy = "256 J/mol/K"',
          "[species.A]")],
        "[species.A]",
        "A has neither frequencies, conformers nor composition",
        'name its output (frequencies = "..."), several (conformers = [{ frequencies = "..." }, ...]) '
        'or declare it (composition = "...", enthalpy = "...", entropy = "...")',
    ),
    "declared without an entropy": (
        [('entropy = "256 J/mol/K"', "")],
        "[species.A]",
        "the key 'entropy' is missing",
        "a declared species has composition, enthalpy and entropy",
    ),
    "a key that declared species do not have": (
        [("[species.A]", "[species.A]\nsymmetry_number = 6")],
        "[species.A] symmetry_number",
        "symmetry_number has no meaning for a species that is declared",
        "take the key out",
    ),
    "enthalpy without a unit": (
        [('enthalpy = "-90 kJ/mol"', 'enthalpy = "-90"')],
        "[species.P] enthalpy",
        "'-90' has no unit",
        "write one number and its unit, for instance \"12.5 kJ/mol\", \"3 kcal/mol\" or "
        '"0.01 hartree"',
    ),
    "relative to itself": (
        [("[species.C]", "[species.C]\nrelative_to = { P = 1 }"),
         ("[species.P]", "[species.P]\nrelative_to = { C = 1 }")],
        "[species.P] relative_to.C",
        "P is relative to itself, by way of C",
        "let relative_to lead to species that are read, or that have no relative_to",
    ),
    "relative to an unknown species": (
        [("[species.C]", "[species.C]\nrelative_to = { A = 1, V = 1 }")],
        "[species.C] relative_to.V",
        "unknown species 'V'",
        ALL_SPECIES,
    ),
    "a path with a step that is not there": (
        [("[effective]", '[[paths]]\nname = "x"\nsteps = [2, 6]\n[effective]')],
        "[paths.1] steps",
        "there is no step 6",
        "steps count from 1 to 5; a negative number runs one backward",
    ),
    "a path that does not hang together": (
        [("[effective]", '[[paths]]\nname = "x"\nsteps = [2, 5]\n[effective]')],
        "[paths.1] steps",
        "step 5 ('A + W2 = P + W') does not go on from C",
        "list the steps in their order, the first from the reactant or catalyst",
    ),
    "a folder that is not there": (
        [('title = "Loss', 'outputs = "nowhere"\ntitle = "Loss')],
        "outputs",
        "there is no folder '{folder}/nowhere'",
        "name the folder of the outputs, from the folder of the study file",
    ),
}  # fmt: skip


@pytest.mark.parametrize("case", CASES)
def test_every_sentence_of_an_error(case: str, tmp_path: Path) -> None:
    changes, where, what, mend = CASES[case]
    with pytest.raises(StudyError) as caught:
        load(tmp_path, edited(*changes))
    error = caught.value
    assert error.where == f"{tmp_path / 'study.toml'} {where}"
    assert error.what == what.replace("{folder}", str(tmp_path))
    assert error.mend == mend
    assert str(error) == f"{error.where}: {error.what}\n  mend: {error.mend}"


def test_the_study_that_the_cases_spoil_is_sound(tmp_path: Path) -> None:
    study = load(tmp_path, TEXT)
    assert [finding for finding in study.findings if finding.severity != "note"] == []


def test_no_steps(tmp_path: Path) -> None:
    start = TEXT.index("[[steps]]")
    end = TEXT.index("[effective]")
    with pytest.raises(StudyError) as caught:
        load(tmp_path, TEXT[:start] + TEXT[end:])
    assert caught.value.what == "the key 'steps' is missing"
    assert caught.value.where == str(tmp_path / "study.toml")
    assert caught.value.mend == (
        "steps: a table `[[steps]]` for every step; required unless there is a `[formation]`"
    )


def test_no_way_from_reactant_to_product(tmp_path: Path) -> None:
    text = edited(
        ('"C = P"\nthrough = "TS1"', '"D = P"\nthrough = "TS1"'),
        ('"C + W = P + W"', '"D + W = P + W"'),
        ('"A + W2 = P + W"', '"A + W2 = C + W"'),
        ("[species.P]", '[species.D]\ncomposition = "H2SO4"\nenthalpy = "0 kJ/mol"\n'
         'entropy = "300 J/mol/K"\n[species.P]'),
    )  # fmt: skip
    with pytest.raises(StudyError) as caught:
        load(tmp_path, text)
    assert caught.value.what == "no way from A to P: A leads to C and no further"
    assert caught.value.where == f"{tmp_path / 'study.toml'} [effective] product"
    assert caught.value.mend == "add the step that makes P, or name another product"


def test_toml_syntax_error_names_its_line(tmp_path: Path) -> None:
    with pytest.raises(StudyError) as caught:
        load(tmp_path, edited(("[conditions]", "[conditions")))
    assert caught.value.where == f"{tmp_path / 'study.toml'}:3"
    assert caught.value.what.startswith("not TOML: ")
    assert "line" not in caught.value.what
    assert caught.value.mend == (
        "mend the syntax of this line; texts stand in quotes, lists in brackets"
    )


def test_a_file_that_is_not_utf8_names_its_line(tmp_path: Path) -> None:
    file = tmp_path / "study.toml"
    file.write_bytes(TEXT.encode().replace(b"[species.A]", b"# \xe9tat\n[species.A]"))
    with pytest.raises(StudyError) as caught:
        Study.load(file)
    assert str(caught.value) == f"{file}:7: byte 0xe9 is not UTF-8\n  mend: save the file as UTF-8"


def test_a_study_file_that_is_not_there(tmp_path: Path) -> None:
    file = tmp_path / "none.toml"
    with pytest.raises(StudyError) as caught:
        Study.load(file)
    assert str(caught.value) == (
        f"{file}: the study file cannot be read: No such file or directory\n"
        "  mend: name a study file (TOML); docs/study-file.md shows one"
    )


@pytest.mark.parametrize("kind", [ThermoError, ReadError, StudyError])
def test_an_error_goes_to_another_process_whole(kind: type[ThermoError]) -> None:
    error = kind("what", where="file:3", mend="do this")
    copy = pickle.loads(pickle.dumps(error))
    assert type(copy) is kind
    assert (copy.what, copy.where, copy.mend) == ("what", "file:3", "do this")
    assert str(copy) == "file:3: what\n  mend: do this"


def test_one_class_catches_all() -> None:
    assert issubclass(ReadError, ThermoError)
    assert issubclass(StudyError, ThermoError)
    assert not issubclass(ReadError, StudyError)


def test_a_finding_says_where() -> None:
    finding = Finding("code", "warning", "a.out", 12, "what", "mend")
    assert finding.where == "a.out:12"
    assert Finding("code", "note", "a.out", None, "what", "mend").where == "a.out"
    assert Finding("code", "note", None, None, "what", "mend").where == ""
    assert finding.as_dict() == {
        "code": "code",
        "severity": "warning",
        "file": "a.out",
        "line": 12,
        "what": "what",
        "mend": "mend",
    }


def test_a_finding_has_one_of_three_severities() -> None:
    with pytest.raises(ValueError, match=r"severity 'fatal' is none of note, warning, error"):
        Finding("code", "fatal", None, None, "what", "mend")  # type: ignore[arg-type]
