"""Flux linkage and inductance against current, and the currents at which the core saturates."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import pchip_interpolate

from femag.design import CURRENTS, Design, design_hash
from femag.errors import InputError, number
from femag.field.bounds import (
    FINE_ORDER,
    Bounds,
    FieldSolution,
    Sides,
    both_sides,
    coenergy_on,
    for_many_solutions,
)
from femag.field.continuation import (
    CommonMesh,
    State,
    idle_solution,
    relative_half_width,
    solution_near,
    solutions_in_a_row,
)
from femag.field.design_problem import field_problem
from femag.result import library_versions

Array = NDArray[np.float64]

DROPS = (0.1, 0.2, 0.3)
"""Falls of the incremental inductance that are looked for."""
ROOT_ACCURACY = 1e-4
"""How near to a drop the incremental inductance is brought, over its initial value."""
ROOT_STEPS = 20
TRIALS = 2001
"""Places in a bracket at which the interpolant is looked at."""
MOST_POINTS = 10_000
SMALL = 1e-6
"""Current for the initial inductance over the smallest on the curve."""


@dataclass(frozen=True)
class CurvePoint:
    """The field at one current.

    Parameters
    ----------
    current : float
        A.
    coenergy : Bounds
        Co-energy W', J; with magnets theirs is in it.
    flux_linkage_of_sides : tuple of float
        Flux linkage in Wb from the flux side and from the potential side: estimates, no bounds.
    incremental_inductance_of_sides : tuple of float
        d(flux linkage)/dI in H from the tangent problem of either side: estimates.
    magnet_flux_linkage : float
        Flux linkage without current, Wb; 0 without magnets.
    iterations : tuple of int
        Iterations of Newton's method on the flux side and on the potential side.
    """

    current: float
    coenergy: Bounds
    flux_linkage_of_sides: tuple[float, float]
    incremental_inductance_of_sides: tuple[float, float]
    magnet_flux_linkage: float = 0.0
    iterations: tuple[int, int] = (0, 0)

    @property
    def flux_linkage(self) -> float:
        """Flux linkage, Wb: mean of both sides."""
        return sum(self.flux_linkage_of_sides) / 2

    @property
    def incremental_inductance(self) -> float:
        """Incremental inductance, H: mean of both sides."""
        return sum(self.incremental_inductance_of_sides) / 2

    @property
    def apparent_inductance(self) -> float:
        """What the current adds to the flux linkage, over the current, H; its limit at 0 A."""
        if self.current == 0.0:
            return self.incremental_inductance
        return (self.flux_linkage - self.magnet_flux_linkage) / self.current


@dataclass(frozen=True)
class Saturation:
    """A current at which the incremental inductance has dropped.

    Parameters
    ----------
    drop : float
        Share by which it has dropped from its initial value (with magnets: its largest).
    current : float or None
        A; None where the curve does not reach so far.
    """

    drop: float
    current: float | None


@dataclass(frozen=True)
class InductanceCurve:
    """Flux linkage and inductances of a design against current.

    Parameters
    ----------
    design : Design
        The design, with the tolerance that was used; its own current plays no part.
    points : tuple of CurvePoint
        In the order of the currents that were asked for.
    initial_inductance : float
        Incremental inductance at small current, H; with magnets the largest on the curve.
    saturation : tuple of Saturation
        Currents of 10, 20 and 30 % drop.
    unknowns, refinements : int
        Unknowns of both sides; number of refinements of the mesh.
    seconds : float
        Wall time.
    versions : dict of str to str
        Versions of this package, Python and the libraries behind the numbers.
    design_hash : str
        Digest of everything in the design that can move a result.
    solutions : tuple of FieldSolution
        Fields at every current but 0, by rising magnitude, if they were to be kept.
    """

    design: Design
    points: tuple[CurvePoint, ...]
    initial_inductance: float
    saturation: tuple[Saturation, ...]
    unknowns: int
    refinements: int
    seconds: float
    versions: dict[str, str] = field(repr=False)
    design_hash: str
    solutions: tuple[FieldSolution, ...] = field(default=(), repr=False, compare=False)

    @property
    def currents(self) -> Array:
        """Currents, A, (points,)."""
        return np.array([point.current for point in self.points])


def inductance_curve(
    design: Design,
    currents: Sequence[float],
    tolerance: float | None = None,
    drops: Sequence[float] = DROPS,
    progress: Callable[[int, int], None] | None = None,
    keep_fields: bool = False,
) -> InductanceCurve:
    """Return flux linkage, inductances and bounded co-energy at each current, on one mesh.

    Parameters
    ----------
    design : Design
        What to solve; its own current plays no part.
    currents : sequence of float
        A, in any order: two or more of one sign, and 0 if wanted.
    tolerance : float, optional
        Wanted half width of each co-energy's bounds over what the current adds to it; the
        design's own when left out.
    drops : sequence of float
        Shares by which the incremental inductance has dropped at the currents of saturation.
    progress : callable, optional
        Called with the number of points that are done and of all.
    keep_fields : bool
        Whether the fields are to be kept with the curve.

    Raises
    ------
    InputError
        If currents, drops or the tolerance cannot be used.
    ToleranceError
        If the tolerance is out of reach.
    NumericalError
        If a mesh or a system fails.
    """
    started = time.perf_counter()
    asked = _checked_currents(currents)
    if tolerance is not None:
        design = replace(design, tolerance=tolerance)
    rising = sorted((current for current in asked if current != 0.0), key=abs)
    mesh = CommonMesh(field_problem(design), design.tolerance)
    mesh.probe((rising[0], rising[-1]))
    sides, points, states, solutions = _points(mesh, rising, progress, keep_fields)
    initial, saturation = _saturation(sides, states, _checked_drops(drops))
    by_current = {point.current: point for point in points}
    if 0.0 in asked:
        by_current[0.0] = _point_at_rest(sides, SMALL * rising[0])
    return InductanceCurve(
        design=design,
        points=tuple(by_current[current] for current in asked),
        initial_inductance=initial,
        saturation=saturation,
        unknowns=sides.unknowns,
        refinements=mesh.refinements,
        seconds=time.perf_counter() - started,
        versions=library_versions(),
        design_hash=design_hash(design),
        solutions=tuple(solutions),
    )


def _points(
    mesh: CommonMesh,
    currents: Sequence[float],
    progress: Callable[[int, int], None] | None,
    keep_fields: bool,
) -> tuple[Sides, list[CurvePoint], list[State], list[FieldSolution]]:
    """Return the sides that serve every current; point, state and, if kept, fields of each."""
    while True:
        points: list[CurvePoint] = []
        states: list[State] = []
        solutions: list[FieldSolution] = []
        sides = for_many_solutions(mesh.sides)
        fine = _fine_sides(sides)
        for solution, state in solutions_in_a_row(sides, currents):
            coenergy = solution.coenergy if fine is None else coenergy_on(fine, solution)
            if relative_half_width(solution, coenergy) > mesh.tolerance:
                mesh.refine_for(solution)
                break
            points.append(_point(solution, state, coenergy))
            states.append(state)
            if keep_fields:
                solutions.append(solution)
            if progress is not None:
                progress(len(points), len(currents))
        else:
            return sides, points, states, solutions


def _fine_sides(sides: Sides) -> Sides | None:
    """Return the sides with quadrature for the final energies of saturating materials."""
    if not sides.laws.saturating:
        return None
    return both_sides(sides.problem, sides.mesh, FINE_ORDER, numbered_as=sides)


def _point(solution: FieldSolution, state: State, coenergy: Bounds) -> CurvePoint:
    idle = solution.idle
    return CurvePoint(
        current=solution.current,
        coenergy=coenergy,
        flux_linkage_of_sides=solution.flux_linkage_of_sides,
        incremental_inductance_of_sides=state.incremental_inductance_of_sides,
        magnet_flux_linkage=0.0 if idle is None else float(np.mean(idle.flux_linkage_of_sides)),
        iterations=(len(solution.flux.history), len(solution.potential.history)),
    )


def _point_at_rest(sides: Sides, small: float) -> CurvePoint:
    """Return the point without current; its incremental inductance is that at a small one (A)."""
    idle = idle_solution(sides)
    _, state = solution_near(sides, small, idle=idle)
    incremental = state.incremental_inductance_of_sides
    if idle is None:
        return CurvePoint(0.0, Bounds(0.0, 0.0, "J"), (0.0, 0.0), incremental)
    fine = _fine_sides(sides)
    coenergy = idle.coenergy if fine is None else coenergy_on(fine, idle)
    linkages = idle.flux_linkage_of_sides
    return CurvePoint(0.0, coenergy, linkages, incremental, float(np.mean(linkages)))


def _saturation(
    sides: Sides, states: Sequence[State], drops: Sequence[float]
) -> tuple[float, tuple[Saturation, ...]]:
    """Return the initial inductance in H and the first current at which each drop is reached.

    The initial inductance is that at small current; with magnets the largest on the curve.
    """
    known = list(states)
    if sides.laws.has_magnets:
        initial = max(state.incremental_inductance for state in known)
    else:
        known.insert(0, solution_near(sides, SMALL * states[0].current)[1])
        initial = known[0].incremental_inductance
    idle = idle_solution(sides)
    return initial, tuple(
        Saturation(drop, _root(sides, known, (1.0 - drop) * initial, initial, idle))
        for drop in drops
    )


def _root(
    sides: Sides, known: list[State], wanted: float, initial: float, idle: FieldSolution | None
) -> float | None:
    """Return the first current in A at which the incremental inductance falls to `wanted` (H).

    Each trial is where a monotone interpolant through the known states falls to it, kept off the
    ends of the bracket. Every state that is found joins the known ones.
    """
    for _ in range(ROOT_STEPS):
        high = next((k for k, s in enumerate(known) if s.incremental_inductance < wanted), 0)
        if high == 0:
            return None
        ends = known[high - 1], known[high]
        excess = [end.incremental_inductance - wanted for end in ends]
        best = min(range(2), key=lambda k: abs(excess[k]))
        if abs(excess[best]) <= ROOT_ACCURACY * initial:
            return ends[best].current
        current = _crossing(known, high, wanted)
        known.insert(high, solution_near(sides, current, ends, idle)[1])
    return known[high].current


def _crossing(known: Sequence[State], high: int, wanted: float) -> float:
    """Return where the states' interpolant falls to `wanted` (H) before the state `high`."""
    near = known[max(high - 3, 0) : high + 3]
    strengths = np.array([abs(state.current) for state in near])
    inductances = np.array([state.incremental_inductance for state in near])
    low, top = abs(known[high - 1].current), abs(known[high].current)
    trials = np.linspace(low, top, TRIALS)[1:-1]
    below = np.flatnonzero(pchip_interpolate(strengths, inductances, trials) < wanted)
    return float(np.copysign(trials[below[0] if len(below) else -1], known[high].current))


def _checked_currents(currents: Sequence[float]) -> list[float]:
    accepted = f"two currents or more of one sign, {CURRENTS[0]:g} A to {CURRENTS[1]:g} A; also 0 A"
    found = [number(current, "currents", accepted) + 0.0 for current in currents]
    driven = np.array([current for current in found if current != 0.0])
    one_sign = bool(np.all(driven > 0.0) or np.all(driven < 0.0))
    inside = np.all((np.abs(driven) >= CURRENTS[0]) & (np.abs(driven) <= CURRENTS[1]))
    differ = len(set(found)) == len(found) <= MOST_POINTS
    if not (len(driven) >= 2 and differ and one_sign and inside):
        raise InputError("not usable", key="currents", value=currents, accepted=accepted)
    return found


def _checked_drops(drops: Sequence[float]) -> list[float]:
    accepted = "shares above 0 and below 1, such as 0.2"
    for drop in drops:
        if not 0.0 < number(drop, "drops", accepted) < 1.0:
            raise InputError("not usable", key="drops", value=drop, accepted=accepted)
    return list(drops)
