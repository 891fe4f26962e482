"""Energies of the evaluations of a Gaussian step: one SCF each, and what follows it.

The wanted one is the best the method asks for: a CCSD(T) job also prints MP2, MP3, MP4 and CCSD
energies, a double hybrid its SCF first, an ONIOM job the parts of its sum; TD-DFT, CIS and EOM print
the excited states' total energies beside that of the ground state. Numbers may be in Fortran's D
form. Projected ones (``PMP2``) are not wanted.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from thermo_pp.readers.gaussian.steps import Step
from thermo_pp.readers.text import Text

_DONE = re.compile(rb"SCF Done: +E\(([^\n]+?)\) *= *(-?\d*\.\d+(?:[DE][+-]?\d+)?) +")
_OLD_SEMIEMPIRICAL = re.compile(rb"\n Energy= *(-?\d*\.\d+) +NIter=")
_VALUE = rb" *= *(-?\d*\.\d+(?:[DE][+-]?\d+)?)"
_CORRELATED: dict[str, tuple[bytes, re.Pattern[bytes]]] = {
    "MP2": (b"EUMP2 =", re.compile(rb"EUMP2" + _VALUE)),
    "MP3": (b"EUMP3=", re.compile(rb"EUMP3" + _VALUE)),
    "MP4(DQ)": (b"UMP4(DQ)=", re.compile(rb"UMP4\(DQ\)" + _VALUE)),
    "MP4(SDQ)": (b"UMP4(SDQ)=", re.compile(rb"UMP4\(SDQ\)" + _VALUE)),
    "MP4(SDTQ)": (b"UMP4(SDTQ)=", re.compile(rb"UMP4\(SDTQ\)" + _VALUE)),
    "MP5": (b"MP5 =", re.compile(rb"MP5" + _VALUE)),
    "CISD": (b"E(CI)=", re.compile(rb"E\(CI\)" + _VALUE)),
    "CCSD": (b"E(CORR)=", re.compile(rb"E\((?:CORR|Corr)\)" + _VALUE)),
    "QCISD(T)": (b"QCISD(T)=", re.compile(rb"QCISD\(T\)" + _VALUE)),
    "BD(T)": (b"BD(T)=", re.compile(rb"BD\(T\)" + _VALUE)),
    "CCSD(T)": (b"CCSD(T)=", re.compile(rb"CCSD\(T\)" + _VALUE)),
}
_FROM_AMPLITUDES = ("CCD", "CCSD", "QCISD", "BD", "CID")
_AS_LABELS = {
    "MP4SDTQ": "MP4(SDTQ)", "MP4": "MP4(SDTQ)", "MP4SDQ": "MP4(SDQ)", "MP4DQ": "MP4(DQ)",
    "MP4D": "MP4(DQ)", "CCSD-T": "CCSD(T)", "QCISD-T": "QCISD(T)", "CID": "CISD", "CI": "CISD",
    "ADC(2)": "MP2", "CIS(D)": "MP2", "EOM-CCSD": "CCSD", "SAC-CI": "CCSD",
}  # fmt: skip
RANK = ("HF", "DFT", "MP2", "MP3", "CISD", "CCD", "MP4(DQ)", "MP4(SDQ)", "CCSD", "QCISD", "BD",
        "MP4(SDTQ)", "MP5", "QCISD(T)", "BD(T)", "CCSD(T)")  # fmt: skip
"""Labels, worst first."""
_SEMIEMPIRICAL = re.compile(r"(?:AM1|PM3\w*|PM6\w*|PM7\w*|MNDO\w*|CNDO|INDO|ZINDO|PDDG|DFTBA?)")
_ROUTE_METHOD = re.compile(
    r"(?<![\w(-])(?:RO|R|U)?(CCSD\(T\)|CCSD-T|CCSD|CCD|QCISD\(T\)|QCISD|BD\(T\)|BD|MP5|MP4\(?S?D?T?Q?\)?|"
    r"MP3|MP2|CISD|EOM-?CCSD)(?![\w)])",
    re.IGNORECASE,
)
_ROUTE_DETAIL = re.compile(
    r"(?<![\w(-])(?:RO|R|U)?(CCSD|QCISD|BD)\s*=?\s*\(([^)]*)\)", re.IGNORECASE
)
_DOUBLE_HYBRID = b" E2("
_DOUBLE = re.compile(rb"E2\([^)]+\)" + _VALUE + rb" +E\(([^)]+)\)" + _VALUE)
_SCALED = b" ScalE2="
_SETTINGS = b"\n IExCor="
_NOT_SCALED = b"=  1.000000  1.000000"
_ONIOM = b"ONIOM: extrapolated energy ="
_UNCONVERGED = b"Convergence criterion not met"
_NOT_READ = re.compile(rb"Counterpoise: corrected energy|Counterpoise corrected energy")
_EXCITED = re.compile(
    r"(?<![\w-])(?:td|tda|cis|eom-?ccsd|sac-?ci)(?![\w-])|(?<=[ =,(])cis\(d\)", re.IGNORECASE
)
_CAS = re.compile(r"CASSCF|^CAS|RASSCF|GVB|^CIS\(D\)", re.IGNORECASE)


@dataclass(frozen=True)
class Energy:
    """An electronic energy: hartree, its label, where it stands, the SCF it goes back to."""

    value: float
    label: str
    at: int
    scf_at: int
    scf_name: str

    @property
    def rank(self) -> int:
        """Order of the label: a higher one is a better energy."""
        return RANK.index(self.label) if self.label in RANK else 1


def method_name(step: Step) -> str | None:
    """Return the method as archive or route name it, upper case and without the reference's letter."""
    if step.archive is not None:
        name = step.archive.method.upper().removesuffix(" TD-FC").removesuffix("-TD-FC")
        name = re.sub(r"[- ]?(?:FC|FU|FULL|FC1|RW)$", "", name.removesuffix(" TDA-FC"))
        return plain(name)
    details = _ROUTE_DETAIL.search(step.route)
    if details is not None and re.search(r"(?<![\w-])T(?![\w-])", details.group(2), re.IGNORECASE):
        return f"{details.group(1).upper()}(T)"
    match = _ROUTE_METHOD.search(step.route)
    return None if match is None else match.group(1).upper().replace("EOMCCSD", "EOM-CCSD")


def plain(name: str) -> str:
    """Return a method without R, U or RO before it."""
    upper = name.upper()
    if upper.startswith("RO") and not upper.startswith(("ROLYP", "RO3LYP")):
        return upper[2:]
    return upper[1:] if upper[:1] in ("R", "U") and not upper.startswith("REV") else upper


def is_excited(step: Step) -> bool:
    """Tell whether the step computes excited states."""
    named = step.archive is not None and re.search(
        r"TD-F|TDA-F|CIS|EOM|SAC-CI", step.archive.method.upper()
    )
    return bool(named) or _EXCITED.search(step.route) is not None


def energy(step: Step, index: int, places: list[int]) -> Energy:
    """Return the energy of evaluation `index` of a step, `places` those of its SCFs.

    Raises
    ------
    ReadError
        An SCF that did not converge, an energy that the method asks for and that is not there, a
        method whose energies are not read.
    """
    last = step.end if step.archive is None else step.archive.at
    end = places[index + 1] if index + 1 < len(places) else last
    part = step.text.part(places[index], end)
    before = step.text.part(places[index - 1] if index else step.start, places[index])
    at = before.last(_UNCONVERGED)
    if at >= 0:
        raise part.error(
            at,
            "the SCF did not converge, so there is no energy",
            mend="rerun with more iterations or another starting guess",
        )
    match = _DONE.match(part.data, places[index] + 1)
    if match is None:
        raise part.expected(places[index] + 1, "the energy of the SCF")
    name = match.group(1).decode("utf-8", "replace")
    scf = _number(match.group(2))
    scf_at = places[index] + 1
    method = method_name(step)
    _refuse(step, part, method)
    if "ONIOM" in (method or "") or "oniom" in step.route.lower():
        oniom = part.last(_ONIOM)
        if oniom < 0:
            raise part.error(
                scf_at, "an ONIOM job without its sum after this line", mend="rerun it"
            )
        value = part.number(oniom + len(_ONIOM), "the ONIOM energy")
        return Energy(value, "ONIOM", oniom, scf_at, name)
    scaled = _is_scaled(step)
    double = part.last(_DOUBLE_HYBRID) if scaled is not False else -1
    if double >= 0:
        found = _DOUBLE.search(part.data, double, part.end)
        if found is None:
            raise part.expected(double, "the energy of a double hybrid")
        return Energy(_number(found.group(3)), "DFT", double, scf_at, name)
    reference = plain(name)
    wanted = _AS_LABELS.get(method or "", method or "")
    if reference != "HF" and scaled:
        raise part.error(
            scf_at,
            "a functional with scaled MP2, but no energy of a double hybrid (looked for ' E2(')",
            mend="check that the job ran to its end",
        )
    if reference in ("HF",):
        best = _correlated(part, wanted)
        if best is not None:
            return Energy(best[0], wanted if wanted in RANK else best[2], best[1], scf_at, name)
        return Energy(scf, "HF", scf_at, scf_at, name)
    label = "semiempirical" if _SEMIEMPIRICAL.fullmatch(reference) else "DFT"
    used = [step.text.line(at + 1) for at in step.part.all(_SETTINGS)]
    if label == "DFT" and used and all(" DFT=F " in line for line in used):
        raise part.error(
            scf_at,
            f"an energy of {name!r}, but no functional is used (DFT=F)",
            mend="the output is damaged here, or of a method not known to this reader",
        )
    return Energy(scf, label, scf_at, scf_at, name)


def _correlated(part: Text, wanted: str) -> tuple[float, int, str] | None:
    """Return value, place and label of the energy of `wanted`; None where an SCF is all there is.

    Raises
    ------
    ReadError
        The wanted energy is not there, or the method is unknown and correlated energies are printed.
    """
    if wanted == "HF":
        return None
    if wanted == "":
        printed = [label for label, (mark, _) in _CORRELATED.items() if part.has(mark)]
        if printed:
            raise part.error(
                part.find(_CORRELATED[printed[-1]][0]),
                f"a {printed[-1]} energy, but neither route nor archive name a method",
                mend="give the program's whole output",
            )
        return None
    if wanted in ("CIS", "TD-HF", "CIS(D)"):
        return None
    key = "CCSD" if wanted in _FROM_AMPLITUDES and wanted != "CID" else wanted
    if key not in _CORRELATED:
        raise part.error(
            part.start + 1,
            f"the method {wanted!r} is not known to this reader",
            mend="give an output of HF, DFT, MP2 to MP5, CISD, CCSD, QCISD, BD or one with triples",
        )
    mark, pattern = _CORRELATED[key]
    at = _last_in_text(part, mark)
    if key == "CCSD":
        at = max(at, _last_in_text(part, b"E(Corr)="))
    match = None if at < 0 else pattern.match(part.data, at)
    if match is None:
        raise part.error(
            part.start + 1 if at < 0 else at,
            f"the job is one of {wanted}, but no such energy is here (looked for {mark.decode()!r})",
            mend="check that the job ran to its end",
        )
    return _number(match.group(1)), at, key


def _last_in_text(part: Text, mark: bytes) -> int:
    """Return where a mark last stands outside an archive entry, which rounds its numbers; -1 without one."""
    at = part.last(mark)
    while at >= 0 and any(sign in part.line(at) for sign in "\\|"):
        at = part.last(mark, at)
    return at


def _is_scaled(step: Step) -> bool | None:
    """Tell whether a functional has an MP2 part, which the settings scale; None where they do not say."""
    at = step.part.all(_SCALED)[:1]
    return None if not at else step.text.data.find(_NOT_SCALED, at[0], at[0] + 40) < 0


def _refuse(step: Step, part: Text, method: str | None) -> None:
    if _CAS.search(method or "") is not None or re.search(
        r"(?<![\w-])cas(?:scf)? *\(", step.route, re.I
    ):
        raise part.error(
            step.route_at,
            "a multiconfigurational energy is not read",
            mend="give an output of a method with one reference",
        )
    if "counterpoise" in step.route.lower():
        raise part.error(
            step.route_at,
            "a counterpoise job, whose energies are of several molecules and bases",
            mend="give the single points of the molecule and its parts",
        )


def _number(word: bytes) -> float:
    return float(word.replace(b"D", b"e"))


ARCHIVED = {
    "HF": "HF", "DFT": "HF", "MP2": "MP2", "MP3": "MP3", "MP4(DQ)": "MP4DQ", "MP4(SDQ)": "MP4SDQ",
    "MP4(SDTQ)": "MP4SDTQ", "CCSD": "CCSD", "CCSD(T)": "CCSD(T)", "QCISD": "QCISD",
    "QCISD(T)": "QCISD(T)", "CCD": "CCD", "CISD": "CISD", "BD": "BD", "BD(T)": "BD(T)",
}  # fmt: skip
"""Label -> name of the same energy in the archive entry."""
