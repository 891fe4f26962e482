"""A study set against measurements: curves, fits, shifts that reconcile them, rival studies."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.errors import Finding, StudyError
from thermo_pp.measured.beside import curve_beside, point_curves, points_beside
from thermo_pp.measured.deviations import Deviations, energy_doubt
from thermo_pp.measured.observed import Observed, StudyLike, observe
from thermo_pp.measured.reconcile import Joint, alone, together
from thermo_pp.measured.results import (
    Comparison,
    CurveBeside,
    EnergyDoubt,
    JointShift,
    Rival,
    StateShift,
)
from thermo_pp.measured.rows import Measurements
from thermo_pp.measured.words import words
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
CONTROLLING = 0.1
"""Least control of a state whose shift is looked for."""
UNLIKELY = 0.001
"""Chance of a fit's chi-square below which the points scatter more than their errors say."""
SHOWN_KJ_MOL = 0.001


def compare(
    study: StudyLike,
    measurements: Measurements,
    deviations: Deviations | None = None,
    rivals: Mapping[str, StudyLike] | None = None,
) -> Comparison:
    """Set a study against measurements.

    Parameters
    ----------
    study : StudyLike
    measurements : Measurements
    deviations : Deviations or None
        Of the energies, of the study and of its rivals, in place of what each has in ``[doubt]``;
        without either there are no bands, no joint shift and no ranking.
    rivals : mapping of str to StudyLike, or None
        Other studies under their files' names.

    Raises
    ------
    StudyError
        A row that the study cannot be set against, with its file and line; rivals without standard
        deviations of the energies or without errors of the measurements.
    """
    from threadpoolctl import threadpool_limits

    with threadpool_limits(1), np.errstate(over="ignore"):
        return _compare(study, measurements, deviations, rivals or {})


def _compare(
    study: StudyLike,
    measurements: Measurements,
    deviations: Deviations | None,
    rivals: Mapping[str, StudyLike],
) -> Comparison:
    points, expressions = measurements.points, measurements.expressions
    known = any(point.sigma is not None for point in points) or any(
        row.uncertain for row in expressions
    )
    doubt = energy_doubt(study, deviations)
    if rivals:
        _check_ranking(measurements, doubt, known)
    flat = observe(study, points, expressions, weighted=False)
    weighted = observe(study, points, expressions, weighted=True) if known else None
    observations = 0 if weighted is None else len(weighted.measured)
    joint = None
    if weighted is not None and doubt is not None:
        joint = together(weighted, doubt.covariance)
    curves = [
        *point_curves(study, points, doubt),
        *(curve_beside(study, [row], doubt) for row in expressions),
    ]
    result = Comparison(
        measurements,
        doubt,
        None if deviations is None or study.uncertainty is None else study.uncertainty.where,
        tuple(points_beside(study, points, doubt)),
        tuple(curves),
        tuple(_states(flat, weighted, doubt)),
        None if joint is None or doubt is None else _joint(joint, doubt, observations),
        _ranked(study, measurements, deviations, rivals, joint),
        findings=tuple(
            dict.fromkeys(
                (*study.findings, *measurements.findings, *_findings(study, curves, rivals, doubt))
            )
        ),
    )
    return replace(result, words=words(result))


def _check_ranking(measurements: Measurements, doubt: EnergyDoubt | None, known: bool) -> None:
    if doubt is None:
        raise StudyError(
            "rival studies are ranked with the energies' standard deviations, and none is given",
            where="--rival",
            mend='say how well the energies are known: --deviation "4 kJ/mol", or [doubt] in the study',
        )
    if not known:
        raise StudyError(
            "rival studies are ranked by the likelihood of the measurements, which have no errors",
            where=measurements.file,
            mend="give the column sigma, or 'sigma A' and 'sigma E' of an expression",
        )


def _states(
    flat: Observed, weighted: Observed | None, doubt: EnergyDoubt | None
) -> list[StateShift]:
    """Return what each controlling state alone would have to move, the largest control first."""
    controls = np.zeros(len(flat.names))
    for block in flat.blocks:
        slope = block.curve.at()
        rt = GAS_J_MOL_K * block.curve.rates.energies.temperature_k / 1000.0
        here = -slope.by_energy * rt[:, np.newaxis]
        largest = here[np.argmax(np.abs(here), axis=0), np.arange(len(controls))]
        controls = np.where(np.abs(largest) > np.abs(controls), largest, controls)
    spread = None if doubt is None else doubt.deviation_kj_mol
    found = []
    for k in np.argsort(-np.abs(controls), kind="stable"):
        if abs(controls[k]) < CONTROLLING:
            break
        name = flat.names[int(k)]
        mean = alone(flat, name)
        best = None if weighted is None else alone(weighted, name)
        rows = float(np.sum(1.0 / np.diag(flat.covariance)))
        found.append(
            StateShift(
                name,
                float(controls[k]),
                None if mean is None else mean.shift_kj_mol,
                None if mean is None else float(np.sqrt(mean.chi_square / rows)),
                None if best is None else best.shift_kj_mol,
                None if best is None else best.sigma_kj_mol,
                None if best is None else best.chi_square,
                None if spread is None else float(spread[k]),
            )
        )
    return found


def _joint(joint: Joint, doubt: EnergyDoubt, observations: int) -> JointShift:
    from scipy.special import chdtrc

    spread = doubt.deviation_kj_mol
    moved = {
        name: k for k, name in enumerate(doubt.names) if abs(joint.shift_kj_mol[k]) > SHOWN_KJ_MOL
    }
    return JointShift(
        {name: float(joint.shift_kj_mol[k]) for name, k in moved.items()},
        {name: float(joint.shift_kj_mol[k] / spread[k]) for name, k in moved.items()},
        joint.length,
        joint.chi_square_before,
        joint.chi_square,
        observations,
        float(chdtrc(observations, joint.chi_square)),
    )


def _ranked(
    study: StudyLike,
    measurements: Measurements,
    deviations: Deviations | None,
    rivals: Mapping[str, StudyLike],
    own: Joint | None,
) -> tuple[Rival, ...]:
    """Return the study and its rivals in the order of their likelihood."""
    if not rivals or own is None:
        return ()
    found = [(study.mechanism.where, study.title, own)]
    for file, rival in rivals.items():
        doubt = energy_doubt(rival, deviations)
        if doubt is None:
            raise StudyError(
                "the rival has no [doubt], so nothing says how well its energies are known",
                where=file,
                mend='give it [doubt], or --deviation "4 kJ/mol", which counts for all studies',
            )
        observed = observe(rival, measurements.points, measurements.expressions, weighted=True)
        found.append((file, rival.title, together(observed, doubt.covariance)))
    found.sort(key=lambda one: -one[2].log_evidence)
    best = found[0][2].log_evidence
    odds = np.exp([one.log_evidence - best for _, _, one in found])
    return tuple(
        Rival(
            file,
            title,
            one.log_evidence,
            best - one.log_evidence,
            float(share),
            one.chi_square_before,
            one.chi_square,
            one.length,
        )
        for (file, title, one), share in zip(found, odds / odds.sum(), strict=True)
    )


def _findings(
    study: StudyLike,
    curves: Sequence[CurveBeside],
    rivals: Mapping[str, StudyLike],
    doubt: EnergyDoubt | None,
) -> list[Finding]:
    findings = []
    heights = [step.equation for step in study.mechanism.steps if step.height is not None]
    if doubt is not None and heights:
        findings.append(
            Finding(
                "heights-kept",
                "note",
                study.mechanism.where,
                None,
                f"the height of {', '.join(heights)} is kept as it is: bands and shifts are those of species and "
                "located saddle points",
                "see barrier ([doubt]) for what the deviation of a height does",
            )
        )
    for one in curves:
        best = [fit.chance for fit in one.fits if fit.chance is not None]
        if best and max(best) < UNLIKELY:
            findings.append(
                Finding(
                    "points-scatter",
                    "warning",
                    study.mechanism.where,
                    None,
                    f"{one.name}: no fit leaves residuals as small as the standard deviations say (chance of the best "
                    f"{max(best):.2g}), so the errors of the parameters are too small",
                    "check the standard deviations, or whether the points belong together",
                )
            )
        grid = one.temperature_k
        outside = (grid < one.range_k[0]) | (grid > one.range_k[1])
        if outside.any():
            findings.append(
                Finding(
                    "beyond-measured",
                    "note",
                    study.mechanism.where,
                    None,
                    f"{one.name}: measured from {one.range_k[0]:g} K to {one.range_k[1]:g} K; "
                    f"{int(outside.sum())} of the study's {len(grid)} temperatures lie outside",
                    "take the computed curve alone there, and fits as extrapolations",
                )
            )
    own = study.conditions.held
    for file, rival in rivals.items():
        other = rival.conditions.held
        differ = [
            name
            for name in own
            if name in other
            and (own[name].form, own[name].value) != (other[name].form, other[name].value)
        ]
        if differ:
            findings.append(
                Finding(
                    "rival-held",
                    "warning",
                    file,
                    None,
                    f"the rival holds {', '.join(differ)} at other amounts than the study",
                    "let all studies hold the same amounts, or give them in the measurement file ([NAME] / UNIT)",
                )
            )
    return findings
