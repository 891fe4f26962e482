"""Which energy an evaluation of an ORCA output has.

The final energy is the best one: correlated over SCF, with dispersion, of a double hybrid the whole.
Traps: with excited states (TD-DFT, CIS, EOM) it is that of one excited state, and the ground state's
has to be put together; with several multiconfigurational roots it is an average; an extrapolation to
the basis-set limit prints final energies of each basis set and its own result elsewhere.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from thermo_pp.readers.orca.layout import Final, Layout
from thermo_pp.readers.text import Text

RANK = ("MP2", "MP3", "MP4", "CCSD", "CCSD(T)")
"""Labels of correlated energies, worst first; any other correlated one stands between."""

_EXCITED = (b"TD-DFT", b"TDDFT", b"TDA", b"CIS-", b"CIS/", b"ORCA CIS", b"EOM", b"ADC2", b"ADC(2",
            b"EXCITED STATES", b"ROCIS", b"ABSORPTION SPECTRUM")  # fmt: skip
_MULTICONFIGURATION = (b"CASSCF", b"NEVPT2", b"ORCA MRCI", b"CASPT2", b"MRMP", b"ICE-CI", b"ICECI")
_MULTICONFIGURATION_WORDS = (
    "CASSCF",
    "NEVPT2",
    "SC-NEVPT2",
    "FIC-",
    "DLPNO-NEVPT2",
    "MRCI",
    "CASPT2",
)
_SCF_TOTAL = b"\nTotal Energy       :"
_AFTER_CDS = b"\nTotal Energy after SMD CDS correction"
_CORRECTION = re.compile(rb"(?:Dispersion correction|gCP correction|SRB correction) +(-?\d+\.\d+)")
_OF_STATE = re.compile(rb"\n *E\(SCF\) *= *(-?\d+\.\d+) Eh *\n *DE\(\w+\) *= *(-?\d+\.\d+) Eh")
_MP2_TOTAL = b"MP2 TOTAL ENERGY"
_CC_TOTAL = re.compile(rb"\nE\((TOT|[A-Z][^\s]*)\) +\.\.\. +(-?\d+\.\d+)")
_TREATMENT = b"\nCorrelation treatment"
_TRIPLES = b"\nPerturbative triple excitations"
_MDCI = (b"ORCA-MATRIX DRIVEN CI", b"ORCA-MDCI", b"COUPLED CLUSTER ENERGY", b"ORCA-AUTOCI")
_EXTRAPOLATED = b"Estimated CBS total energy"
_NUMBER = re.compile(rb"[^:=\n]*[:=] *(-?\d+\.\d+)")
_SCF_FAILED = b"SCF NOT CONVERGED AFTER"
_CC_FAILED = (b"iterations have NOT converged", b"CC NOT CONVERGED")
_BEFORE_TOTAL = 20000
"""Within so many bytes before the total energy it says whether the SCF converged."""
_WITHOUT_SCF = re.compile(
    r"(?:NATIVE-)?(?:GFN\d?-?(?:FF|XTB)|XTB\d?|XTBFF|GFN-XTB|G-?XTB)|AM1|PM3|MNDO|ZINDO(?:/[12S])?"
)
"""Names of methods on an input line that have no SCF of the program's own kind."""
_AGREE = 3e-7
_STEP = 1.1e-8


@dataclass(frozen=True)
class Energy:
    """The electronic energy of an evaluation.

    Attributes
    ----------
    final : Final
        The final energy that the evaluation ends with.
    value : float or None
        hartree; None where the file does not have the ground state's.
    label : str
        ``"HF"``, ``"DFT"``, ``"MP2"``, ``"CCSD(T)"`` ...
    at : int
        Offset at which the value stands.
    excited : int or None
        Where excited states stand.
    doubt : (str, int) or None
        What is doubtful about it, in words, and where.
    """

    final: Final
    value: float | None
    label: str
    at: int
    excited: int | None = None
    doubt: tuple[str, int] | None = None

    @property
    def rank(self) -> int:
        """Order of the label: a higher one is a better energy."""
        if self.value is None:
            return -1
        if self.label in ("HF", "DFT"):
            return 1
        if self.label in RANK:
            return 2 + 2 * RANK.index(self.label)
        return 0 if _WITHOUT_SCF.fullmatch(self.label) else 1 + 2 * RANK.index("CCSD")


def energy(
    layout: Layout, final: Final, method: str | None, functional: bool, states: bool
) -> Energy:
    """Return the energy of the evaluation that ends with `final`.

    Parameters
    ----------
    layout : Layout
    final : Final
    method : str or None
        The method as the input names it.
    functional : bool
        Whether the input names a density functional.
    states : bool
        Whether the input asks for excited states.

    Raises
    ------
    ReadError
        An SCF or a coupled-cluster calculation that did not converge, triples that were asked for
        and are not there.
    """
    text = layout.text
    part = text.part(final.start, final.at)
    titles = layout.between(final.start, final.at)
    joined = b"\n".join(titles)
    matrix_driven = any(mark in joined for mark in _MDCI)
    check_converged(part, final, matrix_driven)
    scf = _last(_SCF_TOTAL, part)
    if scf is None:
        return Energy(final, final.value, _other(part, final, method), final.at)
    density = _is_density(part, method, functional)
    cds = _last(_AFTER_CDS, part.part(scf[1])) if b"CPCM" in joined else None
    parts = [scf[0] if cds is None else cds[0]]
    sums = [parts[0], scf[0]]
    for title in layout.between(scf[1], part.end):
        match = _CORRECTION.match(title)
        if match is not None:
            parts.append(float(match.group(1)))
            sums.append(math.fsum(parts))
    label, best = ("DFT" if density else "HF"), None
    excited = states or any(mark in joined for mark in _EXCITED)
    if any(mark in joined for mark in _MULTICONFIGURATION) or (method or "").startswith(
        _MULTICONFIGURATION_WORDS
    ):
        return _multiconfigurational(layout, final, part)
    if matrix_driven and not density:
        label, best = _coupled_cluster(part.part(scf[1]), method, excited)
    elif b"MP2" in joined:
        best = _last(_MP2_TOTAL, part)
        if best is not None:
            if not density:
                named = f"{method} {part.line(best[1])}"
                scaled = next((word for word in ("SCS-", "SOS-") if word in named), "")
                label = f"{scaled}MP2"
        elif not density:
            raise part.error(
                final.at, "an MP2 calculation without a total energy", mend="check that it ran"
            )
    elif method == "HF-3C":
        label = "HF"
    if best is not None:
        sums += [best[0], best[0] + math.fsum(parts[1:])]
    if not excited:
        doubt = None
        if min(abs(final.value - each) for each in sums) > _AGREE:
            doubt = _differs(final, sums[-1]), final.at
        return Energy(final, final.value, label, final.at, None, doubt)
    return _ground_state(layout, final, part, label, best, sums, scf[1])


def check_converged(part: Text, final: Final, correlated: bool) -> None:
    """Refuse an evaluation whose SCF or coupled-cluster iterations did not converge."""
    heading = part.last(b"\nTOTAL SCF ENERGY")
    at = part.part(max(heading - _BEFORE_TOTAL, part.start)).find(_SCF_FAILED)
    if at < 0 and correlated:
        at = max(part.last(mark) for mark in _CC_FAILED)
    if at < 0 and final.converged:
        return
    raise part.error(
        final.at if at < 0 else at,
        "the SCF or what follows it did not converge, so there is no energy",
        mend="rerun with more iterations or another starting guess",
    )


def extrapolated(layout: Layout, final: Final, label: str) -> Energy | None:
    """Return the energy extrapolated to the basis-set limit, None where the file has none."""
    text = layout.text
    found = _last(_EXTRAPOLATED, text)
    return None if found is None else Energy(final, found[0], f"{label}/CBS", found[1])


def _ground_state(
    layout: Layout,
    final: Final,
    part: Text,
    label: str,
    best: tuple[float, int] | None,
    sums: list[float],
    scf_at: int,
) -> Energy:
    """Return the energy of the state that excited states are counted from."""
    place = next(
        (
            at
            for at, title in zip(layout.offsets, layout.titles, strict=True)
            if part.start <= at < part.end and any(mark in title for mark in _EXCITED)
        ),
        final.at,
    )
    ground, at = (sums[-1], scf_at) if best is None else best
    if abs(final.value - ground) < _AGREE:
        return Energy(final, final.value, label, final.at, place)
    place_of_state = part.last(b"E(SCF)")
    of_state = _OF_STATE.search(part.data, max(part.start, place_of_state - 80), part.end)
    if place_of_state >= 0 and of_state is not None and best is None:
        reference, excitation = float(of_state.group(1)), float(of_state.group(2))
        step = 10.0 ** -len(of_state.group(2).partition(b".")[2])
        if abs(final.value - excitation - ground) > step + 2.0 * _STEP:
            return Energy(final, None, label, at, place)
        if abs(reference - ground) < _STEP:
            return Energy(final, reference, label, of_state.start(1), place)
        known = min(abs(reference - each) for each in sums) < _STEP
        return Energy(final, ground if known else None, label, at, place)
    lacking = best is None and label not in ("HF", "DFT")
    if lacking or not 0.0 < final.value - ground < 3.0:
        return Energy(final, None, label, at, place)
    return Energy(final, ground, label, at, place)


def _coupled_cluster(
    part: Text, method: str | None, excited: bool
) -> tuple[str, tuple[float, int] | None]:
    """Return label and energy of the correlation module that is driven by matrices."""
    place = part.last(_TREATMENT)
    words = part.line(place + 1).split() if place >= 0 else []
    label = words[-1].upper() if words else (method or "").removesuffix("(T)")
    if not label:
        raise part.error(
            part.start,
            "a correlated energy of a kind that is not said (looked for 'Correlation treatment')",
            mend="give the program's whole output",
        )
    if re.fullmatch(r"[A-Z][A-Z0-9/()+-]*", label) is None:
        raise part.expected(max(place + 1, part.start), "the name of a correlation treatment")
    label = re.sub(r"^(?:DLPNO|LPNO|RI|RHF|UHF|ROHF)-", "", label)
    found = {match.group(1): match for match in _CC_TOTAL.finditer(part.data, part.start, part.end)}
    match = found.get(b"TOT")
    place = part.last(_TRIPLES)
    with_triples = [each for name, each in found.items() if name.endswith(b"(T)")]
    said = "" if place < 0 else part.line(place + 1).split()[-1]
    asked = said == "ON" if said in ("ON", "OFF") else bool(with_triples)
    if asked and not excited:
        if not with_triples:
            raise part.error(
                part.end, f"{label}(T) was asked for, but no such energy is here", mend="rerun it"
            )
        match = with_triples[-1]
        label += "(T)"
    return label, None if match is None else (float(match.group(2)), match.start(2))


def _multiconfigurational(layout: Layout, final: Final, part: Text) -> Energy:
    """Return the energy of a CASSCF of one state; of several states, or with more on top, none."""
    titles = b"\n".join(layout.between(final.start, final.at))
    more = re.search(rb"NEVPT2|MRCI|CASPT2|MRMP|ICE-?CI", titles)
    roots = re.search(
        rb"\n *(?:NROOTS|Number of roots)[ .=]+1 *\n", part.data[part.start : part.end]
    )
    if more is None and roots is not None:
        return Energy(final, final.value, "CASSCF", final.at)
    return Energy(final, None, "CASSCF", final.at)


def _other(part: Text, final: Final, method: str | None) -> str:
    """Return the label of an energy without an SCF of this program: semiempirical and tight binding."""
    if method is None or _WITHOUT_SCF.fullmatch(method) is None:
        raise part.error(
            final.at,
            "a final energy without a total SCF energy above it (looked for 'Total Energy       :')",
            mend="give the program's whole output; one of an external program is not read",
        )
    return method


def _is_density(part: Text, method: str | None, functional: bool) -> bool:
    """Tell whether the SCF is one of a density functional."""
    if part.has(b".... DFT(GTOs)"):
        return True
    if part.has(b".... Hartree-Fock(GTOs)"):
        return False
    if method is None and not functional:
        raise part.error(
            part.start,
            "neither 'DFT(GTOs)' nor 'Hartree-Fock(GTOs)' among the settings of this SCF",
            mend="give the program's whole output",
        )
    return functional


def _differs(final: Final, total: float) -> str:
    return f"the final energy {final.digits} is not the sum of its printed parts ({total:.8f})"


def _last(mark: bytes, part: Text) -> tuple[float, int] | None:
    """Return the number behind the last `mark` of a part, and where the mark stands."""
    place = part.last(mark)
    if place < 0:
        return None
    at = place + 1 if mark.startswith(b"\n") else place
    match = _NUMBER.match(part.data, at)
    if match is None:
        raise part.expected(at, "an energy")
    return float(match.group(1)), at


def is_without_scf(word: str) -> bool:
    """Tell whether a word of the input names a semiempirical or tight-binding method."""
    return _WITHOUT_SCF.fullmatch(word) is not None
