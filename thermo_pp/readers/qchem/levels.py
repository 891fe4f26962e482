"""Level of theory of a Q-Chem energy, from the echo of the input and from what the SCF says of itself."""

from __future__ import annotations

import re

from thermo_pp.readers.level import Level
from thermo_pp.readers.line_marks import first_match
from thermo_pp.readers.qchem.energies import Energy, method_at, method_name
from thermo_pp.readers.text import Text

_BASIS = re.compile(rb"^ Requested basis set is[ \t]+([^\r\n]+)", re.MULTILINE)
_UNNAMED = ("non-standard", "gen", "general", "mixed", "user", "unknown")
_GRID = re.compile(
    rb"^ Using (SG-\d)[^\n]*quadrature|^ Using [^\n]*Lebedev \((\d+,\d+)\) quadrature", re.MULTILINE
)
_XC = re.compile(rb"^ (?:Exchange: |XC ?(?:functional)?: )[^\r\n]*", re.MULTILINE | re.IGNORECASE)
_FROZEN = re.compile(rb"[ \t]*- Frozen occupied[ \t]+(?:\d+[ \t]+)*(\d+)[ \t]*\r?\n")
_DISPERSION = {
    "empirical_grimme": "D2",
    "empirical_chg": "CHG",
    "empirical_grimme3": "D3",
    "d3": "D3",
    "d3_zero": "D3",
    "d3_bj": "D3(BJ)",
    "d3_cso": "D3(CSO)",
    "d3_zerom": "D3M",
    "d3_bjm": "D3M(BJ)",
    "d3_op": "D3(OP)",
    "d4": "D4",
}
_IN_NAME = re.compile(r"-(?:d\d?|d3\(.*\)|v|rv)$|vv10")
_OFF = ("none", "false", "0")


def level(text: Text, energy: Energy) -> Level:
    """Return the level of theory of an energy."""
    job = energy.job
    at = {"method": method_at(text, job)}
    start, end = job.echo, energy.at
    name = method_name(job)
    method: str = energy.label
    if energy.label == "DFT":
        method = name.upper()
        if name in ("gen", "user") or "xc_functional" in job.sections:
            printed = first_match(_XC, b"xchange", text, start, end)
            method = "user-defined functional"
            if printed is not None:
                line = text.line(printed.start()).strip()
                method, at["method"] = line.partition(":")[2].strip(), printed.start()
    elif energy.label == "MP2" and "ri" in name:
        method = "RI-MP2"
    basis = None
    match = first_match(_BASIS, b"Requested basis set", text, start, end)
    if match is not None:
        at["basis"] = match.start(1)
        basis = match.group(1).decode("utf-8", "replace").strip()
    elif job.rem.get("basis") is not None:
        at["basis"], basis = job.echo, job.rem["basis"].upper()
    if basis is not None and basis.lower() in _UNNAMED:
        basis = None
    grid = None
    if (
        energy.label == "DFT"
        and (used := first_match(_GRID, b" Using ", text, start, end)) is not None
    ):
        at["grid"] = used.start()
        grid = (used.group(1) or b"(%s)" % (used.group(2) or b"")).decode()
    frozen: str | None = "none"
    if energy.label not in ("HF", "DFT"):
        frozen = _frozen_core(text, energy, at)
    dispersion, solvent = _dispersion(text, energy, name), _solvent(text, energy, at)
    return Level(method, basis, dispersion, solvent, grid, frozen, at)


def _dispersion(text: Text, energy: Energy, name: str) -> str | None:
    asked = energy.job.rem.get("dft_d", "none")
    if asked not in _OFF:
        return _DISPERSION.get(asked, asked)
    if energy.label != "DFT":
        return "none"
    if _IN_NAME.search(name):
        return "part of the functional"
    if text.data.find(b"mpirical dispersion", energy.job.echo, energy.at) >= 0:
        return None
    return "none"


def _solvent(text: Text, energy: Energy, at: dict[str, int]) -> str | None:
    """Return the model with the solvent's name or dielectric constant, "none" in the gas phase."""
    job = energy.job
    asked = job.rem.get("solvent_method", "none")
    if asked in _OFF and "smx_solvation" not in job.rem:
        for mark in (b"olvent model", b"==== cosmo data ====", b"solvation free energ"):
            if text.data.find(mark, job.echo, energy.at) >= 0:
                return None
        return "none"
    at["solvent"] = job.echo
    model = asked.upper() if asked not in _OFF else "SM8"
    words: dict[str, str] = {}
    for name in ("solvent", "smx", "pcm"):
        for line in job.sections.get(name, b"").decode("utf-8", "replace").lower().splitlines():
            parts = line.replace("=", " ").split()
            if len(parts) >= 2:
                words[parts[0]] = parts[1]
    theory = words.get("theory")
    if model == "PCM" and theory:
        model = theory.upper()
    what = words.get("solvent") or (
        f"dielectric {words['dielectric']}" if "dielectric" in words else None
    )
    return f"{model}({what})" if what else model


def _frozen_core(text: Text, energy: Energy, at: dict[str, int]) -> str | None:
    job = energy.job
    table = first_match(_FROZEN, b"- Frozen occupied", text, energy.scf_at, job.end)
    if table is not None:
        at["frozen_core"] = table.start()
        return "frozen" if int(table.group(1)) else "none"
    asked = job.rem.get("n_frozen_core", job.rem.get("core"))
    if asked in ("0", "false", "none"):
        at["frozen_core"] = job.echo
        return "none"
    said = text.data.find(b"Core orbitals will be frozen", job.start, energy.at)
    if said >= 0 and asked in (None, "fc", "true", "frozen"):
        at["frozen_core"] = said
        return "frozen"
    if asked is not None and asked.isdigit():
        at["frozen_core"] = job.echo
        return f"frozen: {asked} orbitals"
    return "frozen" if asked == "fc" else None
