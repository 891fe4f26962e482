"""Levels of theory side by side: one level for all species, or the numbers cannot be compared."""

from __future__ import annotations

from collections.abc import Sequence

from thermo_pp.errors import Finding
from thermo_pp.records import Calculation

FIELDS: tuple[tuple[str, str], ...] = (
    ("method", "method"),
    ("basis", "basis set"),
    ("dispersion", "dispersion correction"),
    ("solvent", "solvent model"),
    ("grid", "integration grid"),
    ("frozen_core", "frozen core"),
)
"""Field of a Calculation -> what it is called: together they are the level of theory."""
MOST_NAMED = 8
"""How many files a finding names of each group."""


def level_findings(
    calculations: Sequence[Calculation], what: str = "energies"
) -> tuple[Finding, ...]:
    """Compare the levels of theory of calculations whose numbers are set against each other.

    Parameters
    ----------
    calculations : sequence of Calculation
        Energies or frequencies of one study, not both: they may be of different levels.
    what : str
        ``"energies"`` or ``"frequencies"``, for the message.

    Returns
    -------
    tuple of Finding
        ``mixed-level`` (error) for each field that differs, naming the files of every value;
        ``unknown-level`` (note) for each field that some file does not state: it equals nothing and
        differs from nothing. Semiempirical methods and force fields have no basis set to state. The
        grid is compared between density functionals only, the frozen core between correlated
        methods and where there is a core.
    """
    unique = list({calc.path: calc for calc in calculations}.values())
    findings: list[Finding] = []
    for field, called in FIELDS:
        groups: dict[str, list[Calculation]] = {}
        unknown: list[Calculation] = []
        for calc in unique:
            if not _matters(field, calc):
                continue
            value = getattr(calc, field)
            if value is None:
                unknown.append(calc)
            else:
                groups.setdefault(_key(field, value), []).append(calc)
        if len(groups) > 1:
            findings.append(_mixed(field, called, what, list(groups.values())))
        if unknown and len(unique) > 1:
            findings.append(_unknown(called, what, unknown, bool(groups)))
    return tuple(findings)


def _matters(field: str, calc: Calculation) -> bool:
    """Tell whether the field belongs to the level of this calculation."""
    if field == "basis":
        return calc.basis is not None or not _parametrised(calc)
    if field == "grid":
        return calc.energy_label in ("DFT", None)
    if field == "frozen_core":
        has_core = any(int(z) > 2 for z in calc.numbers)
        return calc.energy_label not in ("DFT", "HF") and has_core
    return True


def _parametrised(calc: Calculation) -> bool:
    """Tell whether the method is one with a basis of its own (semiempirical, a force field): there is none to state."""
    if calc.energy_label is None:  # a MOPAC job that prints no energy in hartree
        return calc.grid == "none" and calc.frozen_core == "none"
    return calc.energy_label in ("semiempirical", "force field")


def _key(field: str, value: str) -> str:
    """Return what is compared: names of basis sets and methods do not differ by case."""
    return " ".join(value.casefold().split()) if field in ("method", "basis") else value


def _mixed(field: str, called: str, what: str, groups: list[list[Calculation]]) -> Finding:
    groups = sorted(groups, key=len, reverse=True)
    odd = groups[-1][0]
    parts = [f"{getattr(group[0], field)} in {_files(group)}" for group in groups]
    return Finding(
        "mixed-level",
        "error",
        odd.path,
        odd.where.get(field),
        f"the {called} of the {what} differs: {'; '.join(parts)}",
        "use one level of theory for all species: rerun those that differ",
    )


def _unknown(called: str, what: str, unknown: list[Calculation], some_known: bool) -> Finding:
    stated = "not all files" if some_known else "none of the files"
    verb = "do" if some_known else "does"
    return Finding(
        "unknown-level",
        "note",
        unknown[0].path,
        None,
        f"{stated} {verb} say which {called} the {what} have: unknown in {_files(unknown)}",
        "check in the inputs that it is the same for all",
    )


def _files(group: list[Calculation]) -> str:
    more = f" and {len(group) - MOST_NAMED} more" if len(group) > MOST_NAMED else ""
    return ", ".join(calc.path for calc in group[:MOST_NAMED]) + more


def level_words(calc: Calculation) -> str | None:
    """Return the level of theory in words, what is not known left out; None where nothing is.

    ``"B3LYP/def2-SVPD, grid fine"``; "none" is not said, a frozen core is.
    """
    words = ["/".join(part for part in (calc.method, calc.basis) if part)]
    for field, called in FIELDS[2:]:
        value = getattr(calc, field)
        if value not in (None, "none") and _matters(field, calc):
            words.append(f"{value} core" if field == "frozen_core" else f"{called} {value}")
    return ", ".join(word for word in words if word) or None


def folder_level_findings(calculations: Sequence[Calculation]) -> tuple[Finding, ...]:
    """Compare the levels of a folder: of frequency jobs, and apart from them of single points.

    Several levels that each have a single point of the same molecules are alternatives
    (``several-levels``, a note); where some molecules lack one, the levels are mixed.
    """
    frequencies = [calc for calc in calculations if calc.wavenumbers_cm is not None]
    single = [
        calc
        for calc in calculations
        if calc.wavenumbers_cm is None and calc.energy_hartree is not None
    ]
    groups: dict[tuple[str | None, ...], list[Calculation]] = {}
    for calc in single:
        groups.setdefault(_level(calc), []).append(calc)
    found = list(level_findings(frequencies, "frequencies"))
    molecules = [sorted(calc.formula for calc in group) for group in groups.values()]
    if len(groups) < 2 or any(other != molecules[0] for other in molecules):
        return (*found, *level_findings(single, "single points"))
    levels = "; ".join(str(level_words(group[0])) for group in groups.values())
    found.append(
        Finding(
            "several-levels",
            "note",
            None,
            None,
            f"the same molecules have single points at {len(groups)} levels: {levels}",
            "name the files of one level in a study",
        )
    )
    for group in groups.values():
        found += level_findings(group, "single points")
    return tuple(found)


def stated_level(calc: Calculation) -> dict[str, str]:
    """Return the fields of the level that matter and that the file states, as they are compared."""
    return {
        field: _key(field, str(getattr(calc, field)))
        for field, _ in FIELDS
        if _matters(field, calc) and getattr(calc, field) is not None
    }


def _level(calc: Calculation) -> tuple[str | None, ...]:
    """Return the fields of the level as they are compared."""
    values = []
    for field, _ in FIELDS:
        value = getattr(calc, field) if _matters(field, calc) else ""
        values.append(None if value is None else _key(field, value))
    return tuple(values)
