"""A study set against measurements: curves, fits, shifts that reconcile them, rival studies."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from thermo_pp.conditions import Held, StandardState
from thermo_pp.errors import Finding, StudyError
from thermo_pp.measured.fits import Fit, Form, NoFitError, fit
from thermo_pp.measured.observed import Observed, StudyLike, by_amounts, curve, observe
from thermo_pp.measured.reconcile import Joint, alone, together
from thermo_pp.measured.results import (
    Comparison,
    CurveBeside,
    JointShift,
    PointBeside,
    Rival,
    StateShift,
)
from thermo_pp.measured.rows import Expression, Measurements, Point, Row
from thermo_pp.measured.words import words
from thermo_pp.units import GAS_J_MOL_K

FloatArray = NDArray[np.float64]
CONTROLLING = 0.1
"""Least control of a state whose shift is looked for."""
UNLIKELY = 0.001
"""Chance of a fit's chi-square below which the points scatter more than their errors say."""
SHOWN_KJ_MOL = 0.001


@dataclass(frozen=True)
class Deviations:
    """Standard deviations of electronic energies, independent of each other.

    Attributes
    ----------
    minimum_kj_mol : float
        Of every species that is no saddle point; 0 where it is taken as exact.
    saddle_kj_mol : float
        Of every saddle point.
    """

    minimum_kj_mol: float
    saddle_kj_mol: float

    def covariance(self, names: Sequence[str], saddles: Sequence[str]) -> FloatArray:
        """Return the covariance of the energies `names`, (kJ/mol)^2."""
        spread = [self.saddle_kj_mol if name in saddles else self.minimum_kj_mol for name in names]
        return np.diag(np.square(np.array(spread, dtype=np.float64)))


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
        Of the energies, of the study and of its rivals; without them there are no bands, no joint
        shift and no ranking.
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
    if rivals:
        _check_ranking(measurements, deviations, known)
    flat = observe(study, points, expressions, weighted=False)
    weighted = observe(study, points, expressions, weighted=True) if known else None
    joint = None
    if weighted is not None and deviations is not None:
        joint = together(weighted, _covariance(study, weighted, deviations))
    curves = [
        *_point_curves(study, points, deviations),
        *(_curve(study, [row], deviations) for row in expressions),
    ]
    result = Comparison(
        measurements,
        tuple(_points(study, points, deviations)),
        tuple(curves),
        tuple(_states(study, flat, weighted, deviations)),
        None if joint is None or weighted is None else _joint(study, weighted, joint, deviations),
        _ranked(study, measurements, deviations, rivals, joint),
        findings=tuple(
            dict.fromkeys((*study.findings, *measurements.findings, *_findings(study, curves, rivals)))
        ),
    )
    return replace(result, words=words(result))


def _check_ranking(
    measurements: Measurements, deviations: Deviations | None, known: bool
) -> None:
    if deviations is None:
        raise StudyError(
            "rival studies are ranked with the energies' standard deviations, and none is given",
            where="--rival",
            mend='say how well the energies are known: --deviation "4 kJ/mol"',
        )
    if not known:
        raise StudyError(
            "rival studies are ranked by the likelihood of the measurements, which have no errors",
            where=measurements.file,
            mend="give the column sigma, or 'sigma A' and 'sigma E' of an expression",
        )


def _covariance(study: StudyLike, observed: Observed, deviations: Deviations) -> FloatArray:
    return deviations.covariance(observed.names, study.mechanism.saddles)


def _points(
    study: StudyLike, points: Sequence[Point], deviations: Deviations | None
) -> list[PointBeside]:
    """Return every point with the computed rate constant beside it, in the order of the file."""
    found: dict[Point, PointBeside] = {}
    for group in by_amounts(points):
        t = np.array([point.temperature_k for point in group])
        beside = curve(study, group[0], group[0].held, t)
        slope = beside.at()
        spread = _spread(study, beside.rates.energies.names, slope.by_energy, deviations)
        for k, point in enumerate(group):
            found[point] = PointBeside(
                point,
                float(np.exp(slope.log[k]) / point.unit.factor),
                point.log - float(slope.log[k]),
                None if spread is None else float(spread[k]),
            )
    return [found[point] for point in points]


def _spread(
    study: StudyLike,
    names: Sequence[str],
    by_energy: FloatArray,
    deviations: Deviations | None,
) -> FloatArray | None:
    """Return the first-order standard deviation of ln k computed."""
    if deviations is None:
        return None
    covariance = deviations.covariance(names, study.mechanism.saddles)
    return np.sqrt(np.einsum("ti,ij,tj->t", by_energy, covariance, by_energy))


def _point_curves(
    study: StudyLike, points: Sequence[Point], deviations: Deviations | None
) -> list[CurveBeside]:
    """Return a curve, with fits, for every set of points of one definition and order.

    Pseudo-first-order constants at different amounts are different sets; those of a higher order
    are one, because the amounts are divided out.
    """
    groups: dict[object, list[Point]] = {}
    for number, group in enumerate(by_amounts(points)):
        first = group[0]
        apart = number if first.unit.order == 1 else None
        key = (first.definition, first.unit, frozenset(first.orders.items()), apart)
        groups.setdefault(key, []).extend(group)
    return [_curve(study, group, deviations) for group in groups.values()]


def _curve(
    study: StudyLike, rows: Sequence[Row], deviations: Deviations | None
) -> CurveBeside:
    """Return the computed curve over the study's temperatures beside rows that belong together."""
    first = rows[0]
    amounts = [dict(row.held) for row in rows]
    held: Mapping[str, Held] = amounts[0] if all(one == amounts[0] for one in amounts) else {}
    grid = np.array(study.conditions.temperature_k)
    beside = curve(study, first, held, grid)
    slope = beside.at()
    conditions = beside.rates.model.conditions
    common = CurveBeside(
        name="",
        lines=tuple(row.line for row in rows),
        definition=first.definition,
        unit=first.unit.text,
        unit_factor=first.unit.factor,
        range_k=(0.0, 0.0),
        amounts={n: one.text for n, one in conditions.held.items() if one.form != "equilibrium"},
        temperature_k=grid,
        computed=np.exp(slope.log - np.log(first.unit.factor)),
        arrhenius_energy_kj_mol=slope.energy_kj_mol,
        log_deviation=_spread(study, beside.rates.energies.names, slope.by_energy, deviations),
        orders=beside.orders(),
    )
    if isinstance(first, Expression):
        return replace(
            common,
            name=f"expression, line {first.line}",
            range_k=(first.from_k, first.to_k),
            expression=first,
            measured=np.exp(first.log(grid) - np.log(first.unit.factor)),
            measured_log_deviation=first.log_deviation(grid),
            measured_energy_kj_mol=first.energy_kj_mol(grid),
            measured_energy_deviation_kj_mol=first.energy_deviation_kj_mol(grid),
        )
    points = [row for row in rows if isinstance(row, Point)]
    fits, left_out = _fits(points, study.treatment.standard_state)
    t = [point.temperature_k for point in points]
    lines = common.lines
    name = f"point, line {lines[0]}" if len(lines) == 1 else f"points, lines {min(lines)}-{max(lines)}"
    return replace(common, name=name, range_k=(min(t), max(t)), fits=fits, not_fitted=left_out)


def _fits(
    points: Sequence[Point], state: StandardState
) -> tuple[tuple[Fit, ...], dict[str, str]]:
    """Return the fits of points, and why forms were left out."""
    t = np.array([point.temperature_k for point in points])
    logs = np.array([point.log for point in points])
    sigma = None
    if points[0].sigma is not None:
        sigma = np.array([(point.sigma or 0.0) / point.rate_constant for point in points])
    fits: list[Fit] = []
    left_out: dict[str, str] = {}
    forms: tuple[Form, ...] = ("arrhenius", "eyring", "power", "series", "parallel")
    for form in forms:
        try:
            fits.append(fit(form, t, logs, sigma, points[0].unit.order, state))
        except NoFitError as error:
            left_out[form] = str(error)
    return tuple(fits), left_out


def _states(
    study: StudyLike,
    flat: Observed,
    weighted: Observed | None,
    deviations: Deviations | None,
) -> list[StateShift]:
    """Return what each controlling state alone would have to move, the largest control first."""
    controls = np.zeros(len(flat.names))
    for block in flat.blocks:
        slope = block.curve.at()
        rt = GAS_J_MOL_K * block.curve.rates.energies.temperature_k / 1000.0
        here = -slope.by_energy * rt[:, np.newaxis]
        largest = here[np.argmax(np.abs(here), axis=0), np.arange(len(controls))]
        controls = np.where(np.abs(largest) > np.abs(controls), largest, controls)
    spread = None
    if deviations is not None:
        spread = np.sqrt(np.diag(_covariance(study, flat, deviations)))
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


def _joint(
    study: StudyLike, observed: Observed, joint: Joint, deviations: Deviations | None
) -> JointShift | None:
    from scipy.stats import chi2

    if deviations is None:
        return None
    spread = np.sqrt(np.diag(_covariance(study, observed, deviations)))
    moved = {
        name: k
        for k, name in enumerate(observed.names)
        if abs(joint.shift_kj_mol[k]) > SHOWN_KJ_MOL
    }
    count = len(observed.measured)
    return JointShift(
        {name: float(joint.shift_kj_mol[k]) for name, k in moved.items()},
        {name: float(joint.shift_kj_mol[k] / spread[k]) for name, k in moved.items()},
        joint.length,
        joint.chi_square_before,
        joint.chi_square,
        count,
        float(chi2.sf(joint.chi_square, count)),
    )


def _ranked(
    study: StudyLike,
    measurements: Measurements,
    deviations: Deviations | None,
    rivals: Mapping[str, StudyLike],
    own: Joint | None,
) -> tuple[Rival, ...]:
    """Return the study and its rivals in the order of their likelihood."""
    if not rivals or own is None or deviations is None:
        return ()
    found = [(study.mechanism.where, study.title, own)]
    for file, rival in rivals.items():
        observed = observe(rival, measurements.points, measurements.expressions, weighted=True)
        found.append((file, rival.title, together(observed, _covariance(rival, observed, deviations))))
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
    study: StudyLike, curves: Sequence[CurveBeside], rivals: Mapping[str, StudyLike]
) -> list[Finding]:
    findings = []
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
            if name in other and (own[name].form, own[name].value) != (other[name].form, other[name].value)
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
