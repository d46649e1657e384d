"""Refinement until the fields of both sides agree in some regions, where the field itself counts.

The bracket of the co-energy says little about regions that hold little energy, such as copper far
from a gap.
"""

from __future__ import annotations

from collections.abc import Collection

import numpy as np
from numpy.typing import NDArray

from femag.errors import NumericalError
from femag.field.adapt import (
    MAXIMUM_UNKNOWNS,
    marked_elements,
    transferred_field_strength,
)
from femag.field.bounds import FieldSolution, both_sides, field_solution
from femag.field.continuation import NEWTON_ACCURACY
from femag.mesh import refined_mesh
from femag.units import MU_0

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def agreeing_solution(
    solution: FieldSolution, regions: Collection[str], accuracy: float
) -> FieldSolution:
    """Return a solution, refined until B and mu0 H agree in regions of air or copper.

    Parameters
    ----------
    solution : FieldSolution
        To start from; the same current is solved.
    regions : collection of str
        Names; those that the mesh does not hold are left out.
    accuracy : float
        Root mean square of B - mu0 H, from either side, over that of B.

    Raises
    ------
    NumericalError
        If that takes too many unknowns.
    """
    while True:
        elements = elements_in(solution, regions)
        apart, whole = _squares(solution, elements)
        off = float(np.sqrt(apart.sum() / whole)) if whole > 0.0 else 0.0
        if off <= accuracy:
            return solution
        if solution.unknowns > MAXIMUM_UNKNOWNS:
            raise NumericalError(
                f"the fields of both sides in the copper are {off:.1e} apart, more than "
                f"{accuracy:g}, with {solution.unknowns} unknowns in use"
            )
        mesh, parent = refined_mesh(solution.sides.mesh, elements[marked_elements(apart)])
        sides = both_sides(solution.sides.problem, mesh)
        start = transferred_field_strength(solution, sides, parent)
        solution = field_solution(sides, solution.current, start, NEWTON_ACCURACY)


def elements_in(solution: FieldSolution, regions: Collection[str]) -> Index:
    """Return the elements of regions, by name."""
    mesh = solution.sides.mesh
    wanted = [number for number, name in enumerate(mesh.names) if name in regions]
    return np.flatnonzero(np.isin(mesh.region, wanted))


def _squares(solution: FieldSolution, elements: Index) -> tuple[Array, float]:
    """Return the integrals of |B - mu0 H|^2 over each element, and of |B|^2 over all, T2 m3."""
    weight = solution.sides.discretisation.weight[elements]
    b, h = solution.flux.field[elements], solution.potential.field[elements]
    apart = np.sum(weight * np.sum((b - MU_0 * h) ** 2, axis=1), axis=1)
    return np.asarray(apart), float(np.sum(weight * np.sum(b**2, axis=1)))
