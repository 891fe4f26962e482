"""Naming: species names from file names, and texts that a TOML file can hold."""

from __future__ import annotations

import json
import re
from collections import Counter
from collections.abc import Sequence
from pathlib import PurePath

from thermo_pp.records import Calculation

PACKED = frozenset({".gz", ".bz2", ".xz", ".zst"})
# fmt: off
JOB_WORDS = frozenset({
    "opt", "optfreq", "freq", "freqs", "frequency", "frequencies", "vib", "vibs", "hess", "hessian",
    "sp", "energy", "scf", "job", "calc", "run", "out", "output", "log", "input", "main", "orca",
    "gaussian", "nwchem", "psi4", "xtb", "qchem", "gamess", "mopac",
})
# fmt: on
"""Words of file names that tell the job and not the molecule."""


def species_names(calculations: Sequence[Calculation]) -> list[str]:
    """Return a name for each calculation: of letters, digits, ``_`` and ``-``, no two the same.

    From the file's name without its endings and without words such as ``opt`` and ``freq`` at its
    end; where nothing is left, or where two files are called the same, the folder's name comes
    first; where that does not help, a number is added.
    """
    names = [_short(calc.path) or calc.formula for calc in calculations]
    often = Counter(name.casefold() for name in names)
    generic = [not _short(calc.path) for calc in calculations]
    for k, calc in enumerate(calculations):
        folder = _clean(PurePath(calc.path).parent.name)
        if folder and (generic[k] or often[names[k].casefold()] > 1):
            names[k] = folder if generic[k] else f"{folder}-{names[k]}"
    used: set[str] = set()
    for k, name in enumerate(names):
        number = 2
        while names[k].casefold() in used:
            names[k] = f"{name}-{number}"
            number += 1
        used.add(names[k].casefold())
    return names


def _short(path: str) -> str:
    """Return the file's name without endings and job words; empty where no more is left."""
    name = PurePath(path).name
    while PurePath(name).suffix.lower() in PACKED:
        name = PurePath(name).stem
    words = re.split(r"([-_. ]+)", PurePath(name).stem)
    while len(words) > 2 and words[-1].casefold() in JOB_WORDS:
        words = words[:-2]
    if len(words) == 1 and words[0].casefold() in JOB_WORDS:
        return ""
    return _clean("".join(words))


def _clean(text: str) -> str:
    return re.sub(r"-{2,}", "-", re.sub(r"[^A-Za-z0-9_-]+", "-", text)).strip("-_")


def toml_text(text: str) -> str:
    """Write a text as TOML has it, in quotes.

    >>> toml_text('a "b"')
    '"a \\\\"b\\\\""'
    """
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def can_be_written(text: str) -> bool:
    """Tell whether a text has a form in UTF-8."""
    try:
        text.encode()
    except UnicodeEncodeError:
        return False
    return True


def harmless(text: str) -> str:
    """Return a text that can stand in a comment: what is not printable is written out."""
    return "".join(
        each if each.isprintable() else each.encode("unicode_escape").decode() for each in text
    )
