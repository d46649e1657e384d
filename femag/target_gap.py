"""The gap that gives a wanted inductance at a current, in the field."""

from __future__ import annotations

import math
import time
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import Any

import numpy as np
from scipy.interpolate import pchip_interpolate

from femag.design import Design, design_hash
from femag.errors import InputError, NumericalError, number
from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.bounds import Bounds, FieldSolution
from femag.field.design_problem import field_problem
from femag.geometry import Gap, with_gap_length
from femag.hand import FORMULAS, hand_estimates
from femag.mesh import THINNEST
from femag.quantities import SectionMean, section_means
from femag.quantities.sensitivity import coenergy_derivative
from femag.result import library_versions
from femag.tolerance_budget import ToleranceBudget, tolerance_budget

MOST_SOLUTIONS = 12
SHARE = 0.5
"""Share of the tolerance that the middle of the bounds may be off; the bounds have the rest."""
TABLE = 60
"""Gaps at which every hand formula is tabulated."""
COARSEST_DIGIT = 7
"""Decimals of a gap in m that is found: 0.1 um, finer where the tolerance asks for it."""
STEP = 1e-4
"""Change of the gap for its derivative, over the gap."""


@dataclass(frozen=True)
class HandGap:
    """The gap that one hand formula asks for.

    Parameters
    ----------
    name : str
        Name of the formula.
    gap : float or None
        m; None where the formula reaches the target with no gap.
    """

    name: str
    gap: float | None


@dataclass(frozen=True)
class TargetGap:
    """A gap that meets a target, and what it rests on.

    Parameters
    ----------
    design : Design
        The design with that gap, at the target's current.
    target : float
        Wanted energy inductance, H.
    gap : float
        Total length, m.
    inductance : Bounds
        Energy inductance 2 W'/I^2 of the design, H.
    slope : float
        Its derivative by the gap, H/m, from the derivative of the energies.
    solutions : int
        Field solutions that the search took.
    known_hand : tuple of HandGap or None
        What every hand formula asks for, where the search has asked them.
    section_means : tuple of SectionMean
        Mean flux density through cuts of the core at the target's current, T.
    solution : FieldSolution
        The fields.
    seconds : float
        Wall time.
    versions : dict of str to str
        Versions of this package, Python and the libraries behind the numbers.
    design_hash : str
        Digest of everything in the design that can move a result.
    """

    design: Design
    target: float
    gap: float
    inductance: Bounds
    slope: float
    solutions: int
    known_hand: tuple[HandGap, ...] | None = field(repr=False, compare=False)
    section_means: tuple[SectionMean, ...]
    solution: FieldSolution = field(repr=False, compare=False)
    seconds: float
    versions: dict[str, str] = field(repr=False)
    design_hash: str

    @property
    def flux_density(self) -> float:
        """The greatest section mean, T."""
        return max(mean.flux_density for mean in self.section_means)

    @cached_property
    def hand(self) -> tuple[HandGap, ...]:
        """What every hand formula asks for."""
        return self.known_hand or _hand_gaps(self.design, self.target)

    @cached_property
    def tolerance_budget(self) -> ToleranceBudget:
        """What the design's tolerances, or customary ones, do to the inductance."""
        return tolerance_budget(self.design, self.solution)


class OutOfReach(InputError):
    """No gap gives the inductance.

    Parameters
    ----------
    problem : str
        What is wrong.
    too_few_turns : bool
        Whether the core gives less even without gap; else it gives more with the longest.
    inductance : float
        What the core gives at most without gap, or at least with the longest, H.
    solutions : int
        Field solutions that it took to find out.
    **parts
        As of `InputError`.
    """

    def __init__(
        self, problem: str, too_few_turns: bool, inductance: float, solutions: int, **parts: Any
    ) -> None:
        super().__init__(problem, **parts)
        self.too_few_turns, self.inductance = too_few_turns, inductance
        self.solutions = solutions


def gap_for(
    design: Design,
    inductance: float,
    current: float | None = None,
    tolerance: float | None = None,
    start: float | None = None,
) -> TargetGap:
    """Return the gap at which the energy inductance 2 W'/I^2 has a value.

    The design's first gap is changed, its kind, pieces and filling kept; a design without a gap
    gets one in the post. Newton's method on the reluctance 1/L, which hardly bends with the gap,
    held between gaps that are known to be too short and too long; more gap is always less
    inductance. Gaps are whole tenths of a micrometre, or finer where rounding would take more than
    a quarter of the tolerance.

    Parameters
    ----------
    design : Design
        What to change.
    inductance : float
        Wanted, H.
    current : float, optional
        A; the design's own when left out.
    tolerance : float, optional
        Largest distance of the bounds from the target over the target; the design's when left out.
    start : float, optional
        Gap to try first, m; the middle of what the hand formulas ask for when left out.

    Raises
    ------
    OutOfReach
        If the target cannot be reached: it says what the core gives without and with most gap.
    NumericalError
        If a field cannot be solved.
    """
    started = time.perf_counter()
    accepted = "an inductance above 0, such as '250 uH'"
    if not 0.0 < number(inductance, "inductance", accepted) < np.inf:
        raise InputError("not usable", key="inductance", value=inductance, accepted=accepted)
    design = _gapped(design, current, tolerance)
    hand = _hand_gaps(design, inductance) if start is None else None
    search = _Search(design, inductance, hand or (), start)
    found, solution, slope = search.run()
    return TargetGap(
        design=found,
        target=inductance,
        gap=found.gaps[0].length,
        inductance=inductance_bounds(solution),
        slope=slope,
        solutions=search.solutions,
        known_hand=hand,
        section_means=section_means(found, solution),
        solution=solution,
        seconds=time.perf_counter() - started,
        versions=library_versions(),
        design_hash=design_hash(found),
    )


def _gapped(design: Design, current: float | None, tolerance: float | None) -> Design:
    """Return the design with a gap, and with another current and tolerance if they are given."""
    if any(gap.magnet is not None for gap in design.gaps):
        raise InputError("a magnet in the gap", key="gap.magnet", accepted="a gap without a magnet")
    return replace(
        design,
        current=design.current if current is None else current,
        tolerance=design.tolerance if tolerance is None else tolerance,
        gaps=design.gaps or (Gap(1e-3 * design.core.window_height),),
    )


def with_gap(design: Design, length: float) -> Design:
    """Return a design whose first gap has another total length in m."""
    gaps = with_gap_length(design.gaps, length, design.core.window_height)
    return replace(design, gaps=gaps)


class _Search:
    """Newton's method on 1/L between a gap that is too short and one that is too long."""

    def __init__(
        self, design: Design, target: float, hand: Sequence[HandGap], start: float | None
    ) -> None:
        self.design, self.target, self.hand, self.start = design, target, hand, start
        self.solutions = 0
        self.short, self.long = (
            _in_digits(gap, design.tolerance)
            for gap in (_shortest_gap(design), _longest_gap(design))
        )

    def run(self) -> tuple[Design, FieldSolution, float]:
        """Return design, fields and slope of the inductance (H/m) at the gap that is found."""
        gap = self._first_gap()
        low, high = self.short, self.long
        while self.solutions < MOST_SOLUTIONS:
            gap = _in_digits(gap, self.design.tolerance)
            design = with_gap(self.design, gap)
            solution, slope = self._solved(design)
            bounds = inductance_bounds(solution)
            if self._is_met(bounds):
                return design, solution, slope
            if bounds.value > self.target:
                low = gap
            else:
                high = gap
            if high <= self.short or low >= self.long:
                raise self._out_of_reach(bounds)
            change = (1.0 / bounds.value - 1.0 / self.target) * bounds.value**2 / slope
            gap = self._inside(gap + change, low, high)
        raise NumericalError(f"no gap found in {self.solutions} solutions; last {gap * 1e3:g} mm")

    def _is_met(self, bounds: Bounds) -> bool:
        """Whether the middle is so near that both bounds are within the tolerance."""
        return abs(bounds.value / self.target - 1.0) <= SHARE * self.design.tolerance

    def _inside(self, gap: float, low: float, high: float) -> float:
        """Return a gap in the bracket; its ends only where they have not been tried."""
        if gap <= low:
            return low if low == self.short else float(np.sqrt(low * high))
        if gap >= high:
            return high if high == self.long else float(np.sqrt(low * high))
        return gap

    def _solved(self, design: Design) -> tuple[FieldSolution, float]:
        """Return the fields and the derivative of the inductance by the gap, H/m."""
        tolerance = (1.0 - SHARE) * design.tolerance
        solution, _ = adapted_solution(field_problem(design), design.current, tolerance)
        self.solutions += 1
        step = STEP * design.gaps[0].length
        sides = coenergy_derivative(solution, design, _longer, step)
        return solution, float(np.mean(sides)) * 2.0 / design.current**2

    def _first_gap(self) -> float:
        """Return the gap to try first: as asked, or the middle of what the formulas ask for."""
        if self.start is not None:
            return min(max(self.start, self.short), self.long)
        asked = [entry.gap for entry in self.hand if entry.gap]
        return min(max(float(np.median(asked)) if asked else 0.0, self.short), self.long)

    def _out_of_reach(self, bounds: Bounds) -> OutOfReach:
        """Return the error that says what can be had, from the bounds at the last gap."""
        most = bounds
        if bounds.value > self.target:
            problem = "less than this core gives with the longest gap"
            accepted = f"a gap shorter than {self.long * 1e3:g} mm; fewer turns"
        else:
            bare = replace(self.design, gaps=())
            ungapped, _ = adapted_solution(field_problem(bare), bare.current, 1e-2)
            self.solutions += 1
            most = inductance_bounds(ungapped)
            problem = "more than this core gives"
            accepted = f"less than {most} at {bare.current:g} A, without gap"
        return OutOfReach(
            problem, bounds.value < self.target, most.value, self.solutions,
            key="inductance", value=self.target, accepted=accepted,
        )  # fmt: skip


def _longer(design: Design, change: float) -> Design:
    return with_gap(design, design.gaps[0].length + change)


def _in_digits(gap: float, tolerance: float) -> float:
    """Return a gap in few digits, so that rounding takes a quarter of the tolerance at most.

    The inductance changes by no larger share than the gap.
    """
    needed = -math.floor(math.log10(0.5 * tolerance * gap))
    return round(gap, max(COARSEST_DIGIT, needed))


def _shortest_gap(design: Design) -> float:
    """Return the shortest gap in m that can be meshed."""
    turned = design.core.turned
    extent = np.hypot(turned.ring_outer_radius, design.core.window_height)
    return float(4.0 * THINNEST * extent * design.gaps[0].pieces)


def _longest_gap(design: Design) -> float:
    """Return the longest gap in m that is looked at: most of the post, or half the window."""
    share = 0.95 if design.gaps[0].leg == "post" else 0.45
    return share * design.core.window_height


def _hand_gaps(design: Design, target: float) -> tuple[HandGap, ...]:
    """Return the gap that each formula asks for, to a thousandth."""
    short, long = _shortest_gap(design), _longest_gap(design)
    lengths = np.geomspace(short, long, TABLE)
    tables = np.array([_hand_inductances(with_gap(design, float(length))) for length in lengths])
    gaps = []
    for formula, column in zip(FORMULAS, tables.T, strict=True):
        falling = np.minimum.accumulate(column)  # some formulas turn up again at long gaps
        gap = None
        if falling[0] > target > falling[-1]:
            reluctance, place = np.unique(-np.log(falling), return_index=True)
            log_gap = pchip_interpolate(reluctance, np.log(lengths[place]), -np.log(target))
            gap = float(np.exp(log_gap))
        gaps.append(HandGap(formula.name, gap))
    return tuple(gaps)


def _hand_inductances(design: Design) -> list[float]:
    estimates = hand_estimates(
        design.core, design.gaps, design.turns, design.current, design.material
    )
    return [estimate.inductance for estimate in estimates]
