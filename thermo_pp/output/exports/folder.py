"""The folder of exports."""

from __future__ import annotations

from pathlib import Path

from thermo_pp.output.cantera_phase import cantera_text
from thermo_pp.output.exports.ase_rows import ase_text
from thermo_pp.output.exports.qcschema import lacking, qcschema_text
from thermo_pp.output.exports.structures import file_stem, structures
from thermo_pp.output.files import write_file
from thermo_pp.output.tables import printable
from thermo_pp.study.answers import Answers


def write_exports(answers: Answers, folder: Path) -> None:
    """Write ``species.json`` (ASE), ``qcschema/``, ``gas.yaml`` (Cantera), and what was left out.

    Parameters
    ----------
    answers : Answers
    folder : Path
        Made where it is not there.
    """
    folder.mkdir(exist_ok=True)
    lines = [_HEAD]
    found = list(structures(answers))
    if found:
        write_file(folder / "species.json", ase_text(answers))
        lines += _calculations(answers, folder / "qcschema")
    else:
        lines.append(
            "- species.json and qcschema/ are not there: no species is read from an output"
        )
    if answers.phase is not None:
        write_file(folder / "gas.yaml", cantera_text(answers.phase))
    else:
        lines.append(f"- gas.yaml is not there: {printable(answers.left_out['phase'])}")
    write_file(folder / "README.md", "\n".join(lines))


_HEAD = """\
# Exports

- species.json: a database of ASE, a row a structure (`ase db species.json`)
- qcschema/: a document of QCSchema version 1 for each calculation
- gas.yaml: the minima as an ideal gas for Cantera

## Left out
"""


def _calculations(answers: Answers, folder: Path) -> list[str]:
    """Write a document for each calculation of each structure; return what was left out, and why."""
    folder.mkdir(exist_ok=True)
    places = {name: place for place, name in enumerate(answers.study.species, start=1)}
    left_out = []
    for name, number, model in structures(answers):
        stem = file_stem(places[name], name, number)
        known = answers.study.calculations
        further = [known[file] for file in model.files if file in known]
        jobs = {job.path: job for job in (model.calculation, *further)}
        for count, job in enumerate(jobs.values(), start=1):
            if (reason := lacking(job)) is None:
                write_file(folder / f"{stem}-job{count}.json", qcschema_text(job))
            else:
                left_out.append(f"- {printable(job.path)}: the output does not say {reason}")
    return left_out
