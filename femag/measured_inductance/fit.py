"""Gap and permeability that bring the solved inductance to the measured one."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from femag.design import Design
from femag.errors import InputError, number
from femag.measured_inductance.least_squares import (
    Array,
    CostlyResiduals,
    Linearisation,
    is_small,
    least_squares,
    linearised,
    remaining_step,
)
from femag.measured_inductance.points import MeasuredPoints, measured_curve, solved_inductance
from femag.measured_inductance.unknowns import Unknown, altered, fitted_gap, unknown

MOST_SOLUTIONS = 30
"""Curves that a fit solves at most."""
KEPT_FOR_GAP = 10
"""Of these, kept for the gap alone in case that both cannot be told apart."""
LOOSEST = 0.25
"""Standard error of the logarithm of the permeability above which it is not fitted: ferrites are
sold to 20 or 25 % (data sheets), so that a looser fit tells nothing new."""
CAUTION = (
    "standard errors are those of the fit only: scatter of the points, not errors of the "
    "instrument's gain, of the core's dimensions and turns, or of the model"
)
"""What goes with the standard errors wherever they are printed."""
_ONLY_GAP = "only the gap was fitted: "


@dataclass(frozen=True)
class Fit:
    """A design with gap and permeability fitted to measured points.

    Parameters
    ----------
    design : Design
        With the fitted gap and material, and the tolerance that was used.
    gap : float or None
        Length in m of the gap in the post, or else of the spacer; None for an ungapped core.
    gap_error : float or None
        Its standard error, m; None where it was not fitted or lies at a bound.
    permeability_factor : float
        Permeability over that of the design that the fit began with; 1 where it was not fitted.
    permeability_error : float or None
        Its standard error; None where it was not fitted or lies at a bound.
    correlation : float or None
        Correlation of the errors of both logarithms; None unless both were fitted.
    residuals_before, residuals_after : tuple of float
        Solved over measured inductance less 1, at each point, before and after the fit.
    solutions : int
        Curves that were solved.
    note : str
        What the user has to know about the fit, in one line; mostly empty.

    Notes
    -----
    The standard errors come from the scatter of the points about the fitted curve and from the
    Jacobian: s^2 (J^T W J)^-1 with s^2 = sum of the weighted squares over (points - unknowns).
    They are those of the fit only, see `CAUTION`.
    """

    design: Design
    gap: float | None
    gap_error: float | None
    permeability_factor: float
    permeability_error: float | None
    correlation: float | None
    residuals_before: tuple[float, ...]
    residuals_after: tuple[float, ...]
    solutions: int
    note: str = ""


def fitted_design(
    design: Design,
    points: MeasuredPoints,
    *,
    tolerance: float | None = None,
    weights: Sequence[float] | None = None,
    progress: Callable[[int], None] | None = None,
) -> Fit:
    """Return the design with the gap and the permeability that fit the measured points best.

    The weighted squares of log(solved/measured inductance) are made least over the logarithms of
    the gap and of a factor on the permeability. Linear and Froehlich curves take the factor on
    their permeability, any other becomes B(H) = curve(factor H); the saturation stays. Without a
    gap only the factor is fitted. Where the points cannot tell the two apart only the gap is, and
    `Fit.note` says so.

    Parameters
    ----------
    design : Design
        Where the fit begins; its own current plays no part.
    points : MeasuredPoints
        What is fitted.
    tolerance : float, optional
        As of `femag.current_curve.inductance_curve`.
    weights : sequence of float, optional
        Weight of each point, above 0; only their ratios count. Equal when left out.
    progress : callable, optional
        Called with the number of curves that were begun; at most `MOST_SOLUTIONS`.

    Raises
    ------
    InputError
        If the weights or the tolerance cannot be used.
    ToleranceError, NumericalError
        If a curve cannot be solved.

    References
    ----------
    Standard errors of nonlinear least squares: G. A. F. Seber and C. J. Wild, Nonlinear
    Regression, Wiley 1989, section 2.1 (from memory).
    """
    if tolerance is not None:
        design = replace(design, tolerance=tolerance)
    roots = _roots_of_weights(points, weights)
    unknowns, note = _unknowns(design, points)
    model = partial(_log_ratios, design, points, roots)
    if progress is not None:
        progress(1)
    at_start = model(unknowns, np.zeros(len(unknowns)))
    counted = CostlyResiduals(
        partial(model, unknowns), MOST_SOLUTIONS - KEPT_FOR_GAP, spent=1, report=progress
    )
    start = linearised(counted, np.zeros(len(unknowns)), at_start, _box(unknowns)[1])
    end = _minimum(counted, start, unknowns, design.tolerance)
    if end is None:
        unknowns, note = unknowns[:1], f"{_ONLY_GAP}the points cannot tell it from the permeability"
        counted = replace(counted, function=partial(model, unknowns), most=MOST_SOLUTIONS)
        end = least_squares(counted, _of_gap_alone(start), *_box(unknowns))
    before, after = (np.expm1(each / roots) for each in (at_start, end.residuals))
    return _fit(design, unknowns, end, (before, after), counted.spent, note)


def _minimum(
    residuals: CostlyResiduals, start: Linearisation, unknowns: Sequence[Unknown], tolerance: float
) -> Linearisation | None:
    """Return the minimum, None where start or minimum show that gap and permeability are one."""
    if not _told_apart(start, tolerance**2):
        return None
    end = least_squares(residuals, start, *_box(unknowns))
    return end if _told_apart(end, max(_variance(end), tolerance**2)) else None


def _of_gap_alone(start: Linearisation) -> Linearisation:
    return replace(start, x=start.x[:1], jacobian=start.jacobian[:, :1])


def _unknowns(design: Design, points: MeasuredPoints) -> tuple[tuple[Unknown, ...], str]:
    """Return what is fitted, and why the permeability is not where it is left out."""
    if not design.gaps:
        return (unknown(design, "permeability"),), ""
    gap = unknown(design, "gap")
    if design.material.is_linear:
        return (gap,), f"{_ONLY_GAP}of a linear core the inductance is the same at any current"
    if len(points.current) < 3:
        return (gap,), f"{_ONLY_GAP}both need three points or more"
    return (gap, unknown(design, "permeability")), ""


def _log_ratios(
    design: Design,
    points: MeasuredPoints,
    roots: Array,
    unknowns: Sequence[Unknown],
    logarithms: Array,
) -> Array:
    """Return the logarithm of solved over measured inductance, times the roots of the weights."""
    tried = _design_at(design, unknowns, logarithms)
    solved = solved_inductance(points, measured_curve(tried, points))
    return np.asarray(roots * np.log(solved / np.array(points.inductance)))


def _design_at(design: Design, unknowns: Sequence[Unknown], logarithms: Array) -> Design:
    for each, logarithm in zip(unknowns, logarithms, strict=True):
        design = altered(design, each.name, float(np.exp(logarithm)))
    return design


def _box(unknowns: Sequence[Unknown]) -> tuple[Array, Array]:
    return np.array([each.lower for each in unknowns]), np.array([each.upper for each in unknowns])


def _variance(at: Linearisation) -> float:
    """Return the variance of the residuals about the fit."""
    points, unknowns = at.jacobian.shape
    return at.cost / float(points - unknowns)


def _told_apart(at: Linearisation, variance: float) -> bool:
    """Return whether residuals of this variance leave the permeability, if fitted, known at all."""
    if len(at.x) < 2:
        return True
    return bool(np.sqrt(_covariance(at.jacobian, variance)[1, 1]) <= LOOSEST)


def _covariance(jacobian: Array, variance: float) -> Array:
    """Return the covariance of the logarithms, infinite where the Jacobian has not full rank."""
    _, values, directions = np.linalg.svd(jacobian, full_matrices=False)
    if values[-1] <= 1e-12 * values[0]:
        return np.full((len(values), len(values)), np.inf)
    return np.asarray(variance * (directions.T / values**2) @ directions)


def _fit(
    design: Design,
    unknowns: Sequence[Unknown],
    end: Linearisation,
    residuals: tuple[Array, Array],
    solutions: int,
    note: str,
) -> Fit:
    """Return what the end of the search says."""
    lower, upper = _box(unknowns)
    free = (end.x > lower) & (end.x < upper)
    covariance = np.full((len(end.x), len(end.x)), np.nan)
    if np.any(free):
        covariance[np.ix_(free, free)] = _covariance(end.jacobian[:, free], _variance(end))
    errors = dict(zip((each.name for each in unknowns), np.sqrt(np.diag(covariance)), strict=True))
    factors = dict(zip((each.name for each in unknowns), np.exp(end.x), strict=True))
    fitted = _design_at(design, unknowns, end.x)
    gap = fitted_gap(fitted)
    factor = float(factors.get("permeability", 1.0))
    both = len(end.x) == 2 and bool(np.all(free)) and covariance[0, 0] > 0.0
    return Fit(
        design=fitted,
        gap=None if gap is None else gap.length,
        gap_error=None if gap is None else _error(gap.length, errors.get("gap")),
        permeability_factor=factor,
        permeability_error=_error(factor, errors.get("permeability")),
        correlation=_correlation(covariance) if both else None,
        residuals_before=tuple(residuals[0].tolist()),
        residuals_after=tuple(residuals[1].tolist()),
        solutions=solutions,
        note="; ".join(filter(None, (note, *_warnings(unknowns, end)))),
    )


def _error(value: float, of_logarithm: float | None) -> float | None:
    """Return the standard error of a value, None where there is none of its logarithm."""
    if of_logarithm is None or not np.isfinite(of_logarithm):
        return None
    return float(value * of_logarithm)


def _correlation(covariance: Array) -> float:
    return float(covariance[0, 1] / np.sqrt(covariance[0, 0] * covariance[1, 1]))


def _warnings(unknowns: Sequence[Unknown], end: Linearisation) -> list[str]:
    """Return what is wrong with the end of a search."""
    found = [
        f"the {each.name} went to a bound, {np.exp(x):.3g} of what the design says"
        for each, x in zip(unknowns, end.x, strict=True)
        if not each.lower < x < each.upper
    ]
    step = remaining_step(end, *_box(unknowns))
    if not end.by_differences or not is_small(step, end, 10.0):
        left = 100.0 * float(np.max(np.abs(step)))
        found.append(f"the search ended early, about {left:.1g} % from the best fit")
    return found


def _roots_of_weights(points: MeasuredPoints, weights: Sequence[float] | None) -> Array:
    """Return the square roots of the weights, whose mean is made 1."""
    accepted = f"{len(points.current)} numbers above 0, one for each point"
    given = [1.0] * len(points.current) if weights is None else weights
    values = np.array([number(weight, "weights", accepted) for weight in given])
    if len(values) != len(points.current) or not np.all((values > 0.0) & (values < np.inf)):
        raise InputError("not usable", key="weights", value=weights, accepted=accepted)
    return np.asarray(np.sqrt(values / np.mean(values)))
