"""Scale factors beside the level of theory that they are applied to."""

from __future__ import annotations

from collections.abc import Sequence

from thermo_pp.audit.levels import level_findings, level_words
from thermo_pp.conditions import Treatment
from thermo_pp.data.scale_factors import PUBLISHED
from thermo_pp.errors import Finding
from thermo_pp.records import Calculation


def scale_findings(
    treatment: Treatment, frequencies: Sequence[Calculation], file: str | None
) -> tuple[Finding, ...]:
    """Name the level of theory of every frequency job that a scale factor is applied to.

    Parameters
    ----------
    treatment : Treatment
    frequencies : sequence of Calculation
        The frequency jobs.
    file : str or None
        The study file.

    Returns
    -------
    tuple of Finding
        ``scale-factor`` (note) with factors and level; ``scale-factor-levels`` (warning) where one
        factor is applied to several levels. Empty where nothing is scaled.
    """
    words = scale_words(treatment, frequencies)
    if words is None:
        return ()
    levels = _levels(frequencies)
    published = [
        f"; published for {method}/{basis}, {factor.use}: {factor.value} ± {factor.uncertainty} "
        f"({factor.source})"
        for (method, basis), factor in PUBLISHED.items()
        if any(_key(calc) == (method, basis) for calc in frequencies)
    ]
    found = [
        Finding(
            "scale-factor",
            "note",
            file,
            None,
            words.removesuffix(".") + "".join(published),
            "check that the factors belong to this level, and to what each of them scales",
        )
    ]
    if len(levels) > 1 and level_findings(frequencies, "frequencies"):
        found.append(
            Finding(
                "scale-factor-levels",
                "warning",
                file,
                None,
                f"one scale factor is applied to frequencies of {len(levels)} levels: "
                f"{'; '.join(levels)}",
                "use one level for all frequencies: a scale factor belongs to one",
            )
        )
    return tuple(found)


def scale_words(treatment: Treatment, frequencies: Sequence[Calculation]) -> str | None:
    """Return the scale factors and the level they are applied to, as a sentence; None where none is."""
    factors = [
        f"{factor:g} in {what}"
        for factor, what in (
            (treatment.frequency_scale, "thermal terms"),
            (treatment.zero_point_scale, "zero-point energies"),
        )
        if factor != 1.0
    ]
    if not factors or not frequencies:
        return None
    verb = "Scale factor" if len(factors) == 1 else "Scale factors"
    return f"{verb} {' and '.join(factors)}, applied to {'; '.join(_levels(frequencies))}."


def _levels(frequencies: Sequence[Calculation]) -> list[str]:
    return list(dict.fromkeys(level_words(calc) or "a level not stated" for calc in frequencies))


def _key(calc: Calculation) -> tuple[str, str]:
    basis = (calc.basis or "").casefold()
    basis = "6-31g(d)" if basis == "6-31g*" else basis
    return (calc.method or "").casefold(), basis
