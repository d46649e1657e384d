"""Refinement where the bracket is wide, until it is as narrow as asked."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from femag.errors import NumericalError
from femag.field.bounds import (
    Bounds,
    FieldSolution,
    Sides,
    both_sides,
    exact_solution,
    field_solution,
)
from femag.field.current_share import current_share, gaps_to_close
from femag.field.newton import EXACT
from femag.field.problem import FieldProblem
from femag.mesh import SectionMesh, coarse_mesh, refined_mesh

Array = NDArray[np.float64]
Index = NDArray[np.int64]

BULK_SHARE = 0.7
"""Share of the width that the marked elements hold (bulk marking)."""
NEWTON_SHARE = 1e-3
"""Accuracy of Newton's method on the way, as a share of the tolerance; the end is exact."""
MAXIMUM_UNKNOWNS = 400_000


class ToleranceError(NumericalError):
    """The bounds did not come as close as asked.

    Parameters
    ----------
    solution : FieldSolution
        The best that was reached.
    tolerance : float
        What was asked.
    reason : str
        Why it stopped.
    """

    def __init__(self, solution: FieldSolution, tolerance: float, reason: str) -> None:
        self.solution, self.tolerance = solution, tolerance
        inductance = inductance_bounds(solution)
        super().__init__(
            f"tolerance {tolerance:g} not reached: {reason}; the inductance is {inductance}, "
            f"half width {inductance.relative_half_width:.1e}"
        )


def inductance_bounds(solution: FieldSolution) -> Bounds:
    """Return the bounds of the energy inductance in H: 2/I^2 times what the current adds to W'."""
    return current_share(solution).scaled(2.0 / solution.current**2, "H")


def refinements(
    problem: FieldProblem,
    current: float,
    accuracy: float = EXACT,
    mesh: SectionMesh | None = None,
) -> Iterator[FieldSolution]:
    """Yield solutions on ever finer meshes, each refined where the last bracket was wide.

    Parameters
    ----------
    problem : FieldProblem
        What to solve.
    current : float
        A.
    accuracy : float
        Accuracy of Newton's method.
    mesh : SectionMesh, optional
        Mesh to start from; a coarse one when left out.
    """
    sides = both_sides(problem, mesh or coarse_mesh(problem.section))
    solution = _first_solution(sides, current, accuracy)
    while True:
        yield solution
        marked = [marked_elements(gap) for gap in gaps_to_close(solution)]
        mesh, parent = refined_mesh(sides.mesh, np.unique(np.concatenate(marked)))
        sides = both_sides(problem, mesh)
        solution = solution_on_finer_mesh(solution, sides, parent, accuracy)


def _first_solution(sides: Sides, current: float, accuracy: float) -> FieldSolution:
    """Return the fields at a current, with magnets also those without current."""
    solution = field_solution(sides, current, accuracy=accuracy)
    if not sides.laws.has_magnets:
        return solution
    return replace(solution, idle=field_solution(sides, 0.0, accuracy=accuracy))


def solution_on_finer_mesh(
    coarse: FieldSolution, fine: Sides, parent: Index, accuracy: float
) -> FieldSolution:
    """Return the fields of a solution on a finer mesh, started from it."""
    start = transferred_field_strength(coarse, fine, parent)
    solution = field_solution(fine, coarse.current, start, accuracy)
    if coarse.idle is None:
        return solution
    return replace(solution, idle=solution_on_finer_mesh(coarse.idle, fine, parent, accuracy))


def transferred_field_strength(coarse: FieldSolution, fine: Sides, parent: Index) -> Array | None:
    """Return H of a solution at the quadrature points of a mesh nested in its own.

    H is linear in each coarse element, so that a fit to the coarse quadrature points
    reproduces it. Linear problems need no start and get none.
    """
    if not fine.laws.saturating:
        return None
    basis = coarse.sides.discretisation.basis
    points = np.asarray(fine.discretisation.basis.global_coordinates())
    inside = _linears(basis.mapping.invF(points, tind=parent))
    fit = np.linalg.pinv(_linears(basis.quadrature[0]))
    return np.asarray(
        np.einsum("ecp,mp,eqm->ecq", coarse.potential.field[parent], fit, inside, optimize=True)
    )


def _linears(local: Array) -> Array:
    """Return 1, x and y at local coordinates (2, ...), last axis 3."""
    x, y = local
    return np.stack([np.ones_like(x), x, y], axis=-1)


def adapted_solution(
    problem: FieldProblem,
    current: float,
    tolerance: float,
    progress: Callable[[FieldSolution], None] | None = None,
    mesh: SectionMesh | None = None,
) -> tuple[FieldSolution, int]:
    """Return the first solution whose relative half width is within `tolerance`, and its number.

    Parameters
    ----------
    problem : FieldProblem
        What to solve.
    current : float
        A.
    tolerance : float
        Wanted half width of what the current adds to the co-energy, over its value.
    progress : callable, optional
        Called with every solution.
    mesh : SectionMesh, optional
        Mesh to start from; a coarse one when left out.

    Raises
    ------
    ToleranceError
        If the tolerance is out of reach; it holds the best solution.
    """
    accuracy = max(EXACT, NEWTON_SHARE * tolerance)
    for number, solution in enumerate(refinements(problem, current, accuracy, mesh)):
        if progress is not None:
            progress(solution)
        if current_share(solution).relative_half_width <= tolerance:
            exact = exact_solution(solution)
            if current_share(exact).relative_half_width <= tolerance:
                return exact, number
        if solution.unknowns > MAXIMUM_UNKNOWNS:
            raise ToleranceError(solution, tolerance, f"{solution.unknowns} unknowns in use")
    raise AssertionError("refinements never end")


def marked_elements(local_gap: Array, share: float = BULK_SHARE) -> Index:
    """Return the fewest elements that hold `share` of the width."""
    order = np.argsort(-local_gap)
    total = np.cumsum(local_gap[order])
    count = int(np.searchsorted(total, share * total[-1])) + 1
    return np.sort(order[:count])
