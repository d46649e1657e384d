"""Solutions at many currents in a row, on one mesh that serves them all."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from femag.errors import NewtonError
from femag.field.adapt import (
    MAXIMUM_UNKNOWNS,
    ToleranceError,
    marked_elements,
    transferred_field_strength,
)
from femag.field.bounds import Bounds, FieldSolution, Sides, both_sides, field_solution
from femag.field.newton import minimum
from femag.field.problem import FieldProblem
from femag.field.tangent import Tangent, flux_tangent, potential_tangent
from femag.mesh import coarse_mesh, refined_mesh

Array = NDArray[np.float64]

NEWTON_ACCURACY = 1e-7
"""Squared Newton decrement over the energy before the last full step, which squares it again."""
CORNER_ROUNDS = 1
"""How often elements at singular corners are divided before the first solution: every unknown less
is saved at all currents."""
MOST_ITERATIONS = 12
"""Of Newton's method from a prediction; then it starts afresh."""
RESERVE = 0.9
"""Share of the tolerance that the probed currents must reach; those between them get the rest."""


@dataclass(frozen=True)
class State:
    """A solution's unknowns and how they move with the current.

    Parameters
    ----------
    current : float
        A.
    unknowns : tuple of array
        Of the flux side and of the potential side.
    tangents : tuple of Tangent
        Of the flux side and of the potential side.
    """

    current: float
    unknowns: tuple[Array, Array]
    tangents: tuple[Tangent, Tangent]

    @property
    def incremental_inductance_of_sides(self) -> tuple[float, float]:
        """Incremental inductance in H from either side."""
        return self.tangents[0].inductance, self.tangents[1].inductance

    @property
    def incremental_inductance(self) -> float:
        """Incremental inductance, H: mean of both sides."""
        return 0.5 * sum(self.incremental_inductance_of_sides)


def solutions_in_a_row(
    sides: Sides, currents: Sequence[float]
) -> Iterator[tuple[FieldSolution, State]]:
    """Yield solution and state at each current (A), predicted from the two before it."""
    known: list[State] = []
    idle = idle_solution(sides)
    for current in currents:
        solution, state = solution_near(sides, current, known, idle)
        yield solution, state
        known = [*known[-1:], state]


def solution_near(
    sides: Sides, current: float, known: Sequence[State] = (), idle: FieldSolution | None = None
) -> tuple[FieldSolution, State]:
    """Return solution and state at a current.

    Parameters
    ----------
    sides : Sides
        The discretised problem.
    current : float
        A.
    known : sequence of State
        None, one or two states on the same sides to predict from: by a straight line, or by the
        cubic through both with their tangents.
    idle : FieldSolution, optional
        Solution without current; with magnets only.
    """
    solution = _from_prediction(sides, current, known) if known else None
    if solution is None:
        solution = field_solution(sides, current, accuracy=NEWTON_ACCURACY)
    unknowns = solution.flux.x, solution.potential.x
    tangents = flux_tangent(solution.flux), potential_tangent(solution.potential)
    return replace(solution, idle=idle), State(current, unknowns, tangents)


def _from_prediction(sides: Sides, current: float, known: Sequence[State]) -> FieldSolution | None:
    """Return the solution at a current; None where the prediction is too far off to start from."""
    try:
        flux, potential = (
            minimum(side, current, accuracy=NEWTON_ACCURACY, guess=guess, most=MOST_ITERATIONS)
            for side, guess in zip(
                (sides.flux, sides.potential), _predicted(known, current), strict=True
            )
        )
    except NewtonError:
        return None
    return FieldSolution(sides, current, flux, potential)


def idle_solution(sides: Sides) -> FieldSolution | None:
    """Return the solution without current; None without magnets, as it is zero then."""
    if not sides.laws.has_magnets:
        return None
    return field_solution(sides, 0.0, accuracy=NEWTON_ACCURACY)


def _predicted(known: Sequence[State], current: float) -> list[Array]:
    """Return the unknowns of both sides at a current, by Hermite's cubic or a straight line."""
    last = known[-1]
    if len(known) == 1:
        step = current - last.current
        return [
            x + step * tangent.rate for x, tangent in zip(last.unknowns, last.tangents, strict=True)
        ]
    first, width = known[0], last.current - known[0].current
    t = (current - first.current) / width
    weights = (2 * t**3 - 3 * t**2 + 1, t**3 - 2 * t**2 + t, 3 * t**2 - 2 * t**3, t**3 - t**2)
    return [
        weights[0] * x0 + weights[1] * width * t0.rate + weights[2] * x1
        + weights[3] * width * t1.rate
        for x0, t0, x1, t1 in zip(
            first.unknowns, first.tangents, last.unknowns, last.tangents, strict=True
        )
    ]  # fmt: skip


class CommonMesh:
    """A mesh that is refined until the bracket at every probed current is close.

    Parameters
    ----------
    problem : FieldProblem
        What to solve.
    tolerance : float
        Wanted half width of every bracket over what the current adds to the co-energy.
    """

    def __init__(self, problem: FieldProblem, tolerance: float) -> None:
        self.tolerance = tolerance
        self.refinements = 0
        self.sides = both_sides(problem, coarse_mesh(problem.section, CORNER_ROUNDS))
        self._probes: dict[float, FieldSolution] = {}

    def probe(self, currents: Sequence[float]) -> None:
        """Refine until the brackets at these currents (A), and those before, are close.

        Raises
        ------
        ToleranceError
            If the tolerance is out of reach.
        """
        idle = idle_solution(self.sides)
        for current in currents:
            solution = field_solution(self.sides, current, accuracy=NEWTON_ACCURACY)
            self._probes[current] = replace(solution, idle=idle)
        while wide := [
            solution
            for solution in self._probes.values()
            if relative_half_width(solution) > RESERVE * self.tolerance
        ]:
            self._refine(wide)

    def refine_for(self, solution: FieldSolution) -> None:
        """Refine where the bracket of a solution is wide, and probe its current from now on.

        Raises
        ------
        ToleranceError
            If the tolerance is out of reach.
        """
        self._probes[solution.current] = solution
        self._refine([solution])
        self.probe(())

    def _refine(self, wide: Sequence[FieldSolution]) -> None:
        if wide[0].unknowns > MAXIMUM_UNKNOWNS:
            reason = f"{wide[0].unknowns} unknowns in use"
            raise ToleranceError(wide[0], self.tolerance, reason)
        marked = np.unique(np.concatenate([marked_elements(state.local_gap) for state in wide]))
        mesh, parent = refined_mesh(self.sides.mesh, marked)
        self.sides = both_sides(self.sides.problem, mesh)
        self.refinements += 1
        idle = idle_solution(self.sides)
        for current, state in self._probes.items():
            start = transferred_field_strength(state, self.sides, parent)
            solution = field_solution(self.sides, current, start, NEWTON_ACCURACY)
            self._probes[current] = replace(solution, idle=idle)


def relative_half_width(solution: FieldSolution, coenergy: Bounds | None = None) -> float:
    """Return half the width of the co-energy's bounds over what the current adds to it.

    The bounds are the solution's own, or `coenergy` where they are known better.
    """
    coenergy = coenergy or solution.coenergy
    if solution.idle is None:
        return coenergy.relative_half_width
    linked = np.subtract(solution.flux_linkage_of_sides, solution.idle.flux_linkage_of_sides)
    return coenergy.half_width / (0.5 * abs(solution.current * float(np.mean(linked))))
