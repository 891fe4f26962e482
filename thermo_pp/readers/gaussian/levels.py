"""Level of theory of a Gaussian step: method and basis of its archive entry, else of its text."""

from __future__ import annotations

import re

from thermo_pp.readers.gaussian.energies import Energy, method_name, plain
from thermo_pp.readers.gaussian.steps import Step
from thermo_pp.readers.level import Level
from thermo_pp.readers.text import Text

_BASIS = re.compile(rb"\n Standard basis: ([^\n]*)")
_GENERAL = b"\n General basis read from cards:"
_COMPONENTS = re.compile(r" *\(\d+[DdCc], *\d+[FfCc]\) *$")
_ROUTE_BASIS = re.compile(r"/([^\s/:]+)")
_GRID = re.compile(rb"\n IRadAn= *(\d+)")
_ROUTE_GRID = re.compile(
    r"(?:integral|int)\s*[=(][^ ]*?(?:grid *= *)?(ultrafine\w*|superfine\w*|fine\w*|sg1\w*|coarse\w*|-?\d{4,})",
    re.IGNORECASE,
)
_DISPERSION_MARK = b"R6Disp: "
_DISPERSION = re.compile(rb"R6Disp: +(?:Grimme-)?(\S+?) Dispersion energy")
_ROUTE_DISPERSION = re.compile(r"empiricaldispersion|(?<![\w])em=", re.IGNORECASE)
_WITH_DISPERSION = re.compile(r"(?:97X?|PLYP|PE|\w\w)D[23]?(?![\w])")
_CONTINUUM = b"Polarizable Continuum Model"
_MODEL = re.compile(rb"\n +Model +: ([^\n]+)")
_SOLVENT = re.compile(rb"\n +Solvent +: ([^,\n]+)(?:, *Eps *= *(\d+\.\d+))?")
_FROZEN = re.compile(rb"\n NBasis= *\d+ +NAE= *\d+ +NBE= *\d+ +NFC= *(\d+)")


def level(step: Step, energy: Energy) -> Level:
    """Return the level of theory of an energy of a step."""
    at: dict[str, int] = {"method": energy.scf_at}
    method = _method(step, energy, at)
    density = energy.label in ("DFT", "ONIOM")
    return Level(
        method,
        _basis(step, at),
        _dispersion(step, energy, density, at),
        _solvent(step, energy, at),
        _grid(step, at) if density else None,
        _frozen_core(step, energy, at),
        at,
    )


def _method(step: Step, energy: Energy, at: dict[str, int]) -> str | None:
    archived = method_name(step)
    if step.archive is not None:
        at["method"] = step.archive.at
    if energy.label in ("ONIOM",):
        return archived
    if energy.label in ("DFT", "semiempirical", "HF"):
        if archived is not None and step.archive is not None and archived not in ("CIS", "CIS(D)"):
            return archived if energy.label != "HF" else "HF"
        at["method"] = energy.scf_at
        return plain(energy.scf_name)
    return archived if archived and archived.startswith(energy.label[:3]) else energy.label


def _basis(step: Step, at: dict[str, int]) -> str | None:
    if step.archive is not None and step.archive.basis:
        at["basis"] = step.archive.at
        return step.archive.basis
    match = step.part.line_match(_BASIS, b"\n Standard basis: ")
    if match is not None:
        at["basis"] = match.start() + 1
        return _COMPONENTS.sub("", match.group(1).decode("utf-8", "replace").strip()) or None
    general = step.part.find(_GENERAL)
    if general >= 0:
        at["basis"] = general + 1
        return "Gen"
    return None


def _grid(step: Step, at: dict[str, int]) -> str | None:
    """Return the grid: its name in the route, else the number that the program gives its default."""
    named = _ROUTE_GRID.search(step.route)
    if named is not None:
        at["grid"] = step.route_at
        return named.group(1).lower()
    match = step.part.line_match(_GRID, b"\n IRadAn=")
    if match is None:
        return None
    at["grid"] = match.start() + 1
    known = {4: "finegrid", 5: "ultrafine"}
    return known.get(int(match.group(1)), f"grid {int(match.group(1))}")


def _dispersion(step: Step, energy: Energy, density: bool, at: dict[str, int]) -> str | None:
    printed = step.text.all(_DISPERSION_MARK) if density else []
    before = (place for place in printed if step.start <= place < energy.scf_at)
    match = next((m for place in before if (m := _DISPERSION.match(step.text.data, place))), None)
    if match is not None:
        at["dispersion"] = match.start()
        return match.group(1).decode("utf-8", "replace")
    names = f"{method_name(step)} {plain(energy.scf_name)}"
    asked = _ROUTE_DISPERSION.search(step.route) or _WITH_DISPERSION.search(names)
    return None if asked or printed else "none"


def _solvent(step: Step, energy: Energy, at: dict[str, int]) -> str | None:
    asked = "scrf" in step.route.lower() and "scrf=check" not in step.route.lower()
    part: Text = step.text.part(step.start, energy.scf_at)
    printed = step.text.all(_CONTINUUM)
    place = next((place for place in printed if step.start <= place < energy.scf_at), None)
    if place is None:
        cavity = part.find(b"\n Solvent  ") >= 0 or part.find(b"\n Model  ") >= 0
        return None if asked or printed or cavity else "none"
    at["solvent"] = place
    end = min(place + 4000, part.end)
    model = _MODEL.search(part.data, place, end)
    solvent = _SOLVENT.search(part.data, place, end)
    if solvent is None:
        return None
    smd = step.part.find(b"SMD") >= 0
    name = "SMD" if smd else "PCM"
    if model is not None and not smd:
        name = model.group(1).decode("utf-8", "replace").partition("(")[0].strip().rstrip(".")
    called = solvent.group(1).decode("utf-8", "replace").strip().rstrip(".").lower()
    if called == "generic" and solvent.group(2) is not None:
        return f"{name}(dielectric {float(solvent.group(2)):g})"
    return f"{name}({called})"


def _frozen_core(step: Step, energy: Energy, at: dict[str, int]) -> str | None:
    if energy.label in ("HF", "semiempirical"):
        return "none"
    if energy.label == "DFT":
        return None
    found = None
    for found in _FROZEN.finditer(step.text.data, energy.scf_at, step.end):  # noqa: B007
        break
    if found is None:
        return None
    at["frozen_core"] = found.start() + 1
    return "none" if int(found.group(1)) == 0 else "frozen"
