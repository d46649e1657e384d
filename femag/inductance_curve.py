"""Flux linkage and inductance against current, and the currents at which the core saturates."""

from __future__ import annotations

import time
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from femag.design import CURRENTS, Design, design_hash
from femag.errors import InputError, number
from femag.field.bounds import FINE_ORDER, Bounds, FieldSolution, Sides, both_sides, coenergy_on
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
ROOT_ACCURACY = 1e-5
"""How near to a drop the incremental inductance is brought, over its initial value."""
ROOT_STEPS = 20
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
    """

    current: float
    coenergy: Bounds
    flux_linkage_of_sides: tuple[float, float]
    incremental_inductance_of_sides: tuple[float, float]
    magnet_flux_linkage: float = 0.0

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
        """What the current adds to the flux linkage, over the current, H."""
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
) -> InductanceCurve:
    """Return flux linkage, inductances and bounded co-energy at each current, on one mesh.

    Parameters
    ----------
    design : Design
        What to solve; its own current plays no part.
    currents : sequence of float
        A, all above 0 or all below, at least two, in any order.
    tolerance : float, optional
        Wanted half width of each co-energy's bounds over what the current adds to it; the
        design's own when left out.
    drops : sequence of float
        Shares by which the incremental inductance has dropped at the currents of saturation.
    progress : callable, optional
        Called with the number of points that are done and of all.

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
    rising = sorted(asked, key=abs)
    mesh = CommonMesh(field_problem(design), design.tolerance)
    mesh.probe(tuple(dict.fromkeys((rising[0], rising[len(rising) // 2], rising[-1]))))
    points, states = _points(mesh, rising, progress)
    initial = _initial_inductance(mesh.sides, states)
    saturation = tuple(
        Saturation(drop, _saturation_current(mesh.sides, states, (1.0 - drop) * initial, initial))
        for drop in _checked_drops(drops)
    )
    by_current = {point.current: point for point in points}
    return InductanceCurve(
        design=design,
        points=tuple(by_current[current] for current in asked),
        initial_inductance=initial,
        saturation=saturation,
        unknowns=mesh.sides.unknowns,
        refinements=mesh.refinements,
        seconds=time.perf_counter() - started,
        versions=library_versions(),
        design_hash=design_hash(design),
    )


def _points(
    mesh: CommonMesh, currents: Sequence[float], progress: Callable[[int, int], None] | None
) -> tuple[list[CurvePoint], list[State]]:
    """Return point and state of every current, once the mesh serves each of them."""
    while True:
        points: list[CurvePoint] = []
        states: list[State] = []
        fine = _fine_sides(mesh.sides)
        for solution, state in solutions_in_a_row(mesh.sides, currents):
            coenergy = solution.coenergy if fine is None else coenergy_on(fine, solution)
            if relative_half_width(solution, coenergy) > mesh.tolerance:
                mesh.refine_for(solution)
                break
            points.append(_point(solution, state, coenergy))
            states.append(state)
            if progress is not None:
                progress(len(points), len(currents))
        else:
            return points, states


def _fine_sides(sides: Sides) -> Sides | None:
    """Return the sides with quadrature for the final energies of saturating materials."""
    if not sides.laws.saturating:
        return None
    return both_sides(sides.problem, sides.mesh, FINE_ORDER)


def _point(solution: FieldSolution, state: State, coenergy: Bounds) -> CurvePoint:
    idle = solution.idle
    return CurvePoint(
        current=solution.current,
        coenergy=coenergy,
        flux_linkage_of_sides=solution.flux_linkage_of_sides,
        incremental_inductance_of_sides=state.incremental_inductance_of_sides,
        magnet_flux_linkage=0.0 if idle is None else float(np.mean(idle.flux_linkage_of_sides)),
    )


def _initial_inductance(sides: Sides, states: Sequence[State]) -> float:
    """Return the incremental inductance in H at small current; with magnets the largest."""
    if sides.laws.has_magnets:
        return max(state.incremental_inductance for state in states)
    return solution_near(sides, SMALL * states[0].current)[1].incremental_inductance


def _saturation_current(
    sides: Sides, states: Sequence[State], wanted: float, initial: float
) -> float | None:
    """Return the first current in A at which the incremental inductance falls to `wanted` (H)."""
    if states[0].incremental_inductance < wanted <= initial and not sides.laws.has_magnets:
        start = solution_near(sides, SMALL * states[0].current)[1]
        return _root(sides, (start, states[0]), wanted, initial)
    for low, high in pairwise(states):
        if low.incremental_inductance >= wanted > high.incremental_inductance:
            return _root(sides, (low, high), wanted, initial)
    return None


def _root(sides: Sides, ends: tuple[State, State], wanted: float, initial: float) -> float:
    """Return the current in A between two states at which the incremental inductance is `wanted`.

    Regula falsi with the Illinois rule; every solution is predicted from both ends.
    """
    low, high = ends
    excess = [end.incremental_inductance - wanted for end in ends]
    idle = idle_solution(sides)
    current = high.current
    for _ in range(ROOT_STEPS):
        current = (low.current * excess[1] - high.current * excess[0]) / (excess[1] - excess[0])
        _, state = solution_near(sides, current, (low, high), idle)
        found = state.incremental_inductance - wanted
        if abs(found) <= ROOT_ACCURACY * initial:
            break
        if found < 0.0:
            high, excess = state, [0.5 * excess[0], found]
        else:
            low, excess = state, [found, 0.5 * excess[1]]
    return current


def _checked_currents(currents: Sequence[float]) -> list[float]:
    accepted = f"two currents or more of one sign, {CURRENTS[0]:g} A to {CURRENTS[1]:g} A"
    found = [number(current, "currents", accepted) for current in currents]
    values = np.abs(found)
    one_sign = len({current > 0.0 for current in found}) == 1
    inside = np.all((values >= CURRENTS[0]) & (values <= CURRENTS[1]))
    if not (2 <= len(set(found)) == len(found) <= MOST_POINTS and one_sign and inside):
        raise InputError("not usable", key="currents", value=currents, accepted=accepted)
    return found


def _checked_drops(drops: Sequence[float]) -> list[float]:
    accepted = "shares above 0 and below 1, such as 0.2"
    for drop in drops:
        if not 0.0 < number(drop, "drops", accepted) < 1.0:
            raise InputError("not usable", key="drops", value=drop, accepted=accepted)
    return list(drops)
