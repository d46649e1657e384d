"""What the tolerances of parts do to the inductance: from its derivatives, and by sampling."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from femag.design import Design
from femag.errors import InputError, number
from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.bounds import FieldSolution
from femag.field.design_problem import field_problem
from femag.part_tolerances import CUSTOMARY, PartTolerances
from femag.quantities.off_nominal import Parameter, off_nominal_problem, parameters_of
from femag.quantities.parameter_slopes import sensitivities_of
from femag.units import exact_text

Array = NDArray[np.float64]

MOST_SAMPLES = 100_000
SAMPLE_SHARE = 0.2
"""Half width of a sample's bounds over the linear spread; their middle is closer still."""
FINEST = 2e-5
"""Smallest half width that is asked of a sample."""


@dataclass(frozen=True)
class Contribution:
    """What one tolerance does.

    Parameters
    ----------
    name : str
        The parameter.
    half_range : float
        Plus or minus so much: m, or a share.
    change : float
        Of the inductance at the upper end of the range, H, in a straight line.
    """

    name: str
    half_range: float
    change: float


@dataclass(frozen=True)
class ToleranceBudget:
    """What all tolerances do together, to first order.

    Parameters
    ----------
    inductance : float
        Nominal energy inductance, H.
    contributions : tuple of Contribution
        The largest first.
    is_customary : bool
        Whether the design has no tolerances of its own, so that customary ones stand in.
    """

    inductance: float
    contributions: tuple[Contribution, ...]
    is_customary: bool = False

    @property
    def worst_case(self) -> float:
        """Change with all parts at their worst ends, H."""
        return sum(abs(entry.change) for entry in self.contributions)

    @property
    def root_sum_square(self) -> float:
        """Change that as many parts exceed as exceed their own half range, H.

        For independent parts of one kind of distribution: the root of the sum of squares.
        """
        return math.sqrt(sum(entry.change**2 for entry in self.contributions))


@dataclass(frozen=True)
class SampledSpread:
    """Inductances of designs whose parts are off at random, each from full solutions.

    Parameters
    ----------
    names : tuple of str
        The parameters.
    changes : array, (samples, parameters)
        What was added to each: m, or a share; uniform within its half range.
    inductances : array, (samples,)
        Energy inductance of each sample, H.
    linear : array, (samples,)
        What the derivatives say for the same changes, H.
    seed : int
        Of the random numbers.
    """

    names: tuple[str, ...]
    changes: Array
    inductances: Array
    linear: Array
    seed: int

    @property
    def mean(self) -> float:
        """Mean of the samples, H."""
        return float(np.mean(self.inductances))

    @property
    def standard_deviation(self) -> float:
        """Of the samples, H."""
        return float(np.std(self.inductances, ddof=1))

    @property
    def linear_standard_deviation(self) -> float:
        """Of the straight line at the same samples, H."""
        return float(np.std(self.linear, ddof=1))

    @cached_property
    def limits(self) -> tuple[float, float]:
        """Inductances below and above which 2.5 % of the samples lie, H."""
        low, high = np.percentile(self.inductances, [2.5, 97.5])
        return float(low), float(high)


def tolerance_budget(
    design: Design, solution: FieldSolution, tolerances: PartTolerances | None = None
) -> ToleranceBudget:
    """Return what tolerances do to the inductance, from one solution and its derivatives.

    Parameters
    ----------
    design : Design
        Nominal.
    solution : FieldSolution
        Its fields.
    tolerances : PartTolerances, optional
        Instead of the design's own; customary ones where it has none.

    Raises
    ------
    InputError
        If there is a magnet, or a tolerance for something that the design has not.
    """
    given = tolerances or design.part_tolerances
    ranges = _half_ranges(design, given or CUSTOMARY, is_own=given is not None)
    found = sensitivities_of(design, solution, tuple(ranges))
    contributions = (
        Contribution(one.parameter.name, half, one.inductance * half)
        for one, half in zip(found, ranges.values(), strict=True)
    )
    return ToleranceBudget(
        inductance=inductance_bounds(solution).value,
        contributions=tuple(sorted(contributions, key=lambda entry: -abs(entry.change))),
        is_customary=given is None,
    )


def sampled_spread(
    design: Design, samples: int, seed: int = 1, tolerances: PartTolerances | None = None
) -> SampledSpread:
    """Return inductances with every part off at random: Monte Carlo on full solutions.

    Every parameter is uniform within its half range and independent of the others: no more than
    the limits is known. The root of the sum of squares of a budget is then the square root of 3
    times the standard deviation, as far as the inductance is a straight line.

    Parameters
    ----------
    design : Design
        Nominal.
    samples : int
        2 or more; each is meshed and solved anew.
    seed : int
        Of the random numbers: the same samples for the same seed.
    tolerances : PartTolerances, optional
        Instead of the design's own; customary ones where it has none.

    Raises
    ------
    InputError
        If a sample's parts do not fit, or as in `tolerance_budget`.
    """
    accepted = f"a whole number from 2 to {MOST_SAMPLES}"
    count = number(samples, "samples", accepted)
    if not (2 <= count <= MOST_SAMPLES and count == int(count)):
        raise InputError("out of range", key="samples", value=samples, accepted=accepted)
    nominal, _ = adapted_solution(field_problem(design), design.current, design.tolerance)
    budget = tolerance_budget(design, nominal, tolerances)
    names = tuple(entry.name for entry in budget.contributions)
    half = np.array([entry.half_range for entry in budget.contributions])
    _check_some_gap_left(design, dict(zip(names, half.tolist(), strict=True)))
    slopes = np.array([entry.change for entry in budget.contributions]) / half
    changes = np.random.default_rng(seed).uniform(-1.0, 1.0, (int(count), len(half))) * half
    share = SAMPLE_SHARE * budget.root_sum_square / budget.inductance
    tolerance = float(np.clip(share, FINEST, design.tolerance))
    inductances = [_inductance(design, dict(zip(names, row, strict=True)), tolerance)
                   for row in changes.tolist()]  # fmt: skip
    linear = budget.inductance + changes @ slopes
    return SampledSpread(names, changes, np.array(inductances), linear, seed)


def _check_some_gap_left(design: Design, half_ranges: dict[str, float]) -> None:
    least = min((gap.length for gap in design.gaps), default=math.inf)
    if half_ranges.get("gap", 0.0) >= least:
        raise InputError(
            "samples would have no gap left", key="tolerance.gap",
            value=exact_text(half_ranges["gap"], "m", "m"),
            accepted=f"less than the gap, {1e3 * least:.4g} mm",
        )  # fmt: skip


def _inductance(design: Design, changes: dict[str, float], tolerance: float) -> float:
    problem = off_nominal_problem(design, changes)
    solution, _ = adapted_solution(problem, design.current, tolerance)
    return inductance_bounds(solution).value


def _half_ranges(design: Design, tolerances: PartTolerances, is_own: bool) -> dict[str, float]:
    """Return the half range of each parameter that has one; customary ones where they apply."""
    own = parameters_of(design)
    ranges = {p.name: tolerances.half_range(p.name) for p in own}
    if is_own:
        _check_all_apply(own, tolerances)
    ranges = {name: half for name, half in ranges.items() if half > 0.0}
    if not ranges:
        raise InputError(
            "no tolerance is above 0", key="tolerance",
            accepted=f"one of {', '.join(parameter.name for parameter in own)}",
        )  # fmt: skip
    return ranges


def _check_all_apply(own: tuple[Parameter, ...], tolerances: PartTolerances) -> None:
    known = {parameter.name.partition(".")[0] for parameter in own}
    for name, half in vars(tolerances).items():
        if half > 0.0 and name not in known:
            raise InputError(
                "this design has nothing that it is a tolerance of", key=f"tolerance.{name}",
                value=half, accepted=f"tolerances of {', '.join(sorted(known))}",
            )  # fmt: skip
