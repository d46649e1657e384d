"""What the current adds to the co-energy of a core with magnets: W'(I) - W'(0) - I lambda(0).

Without magnets that is W'(I) itself. With magnets and linear materials the field of the current
alone is the difference of two solutions, admissible on either side, so that its energies are
bounds. With a saturating core W'(I) and W'(0) have bounds each, and lambda(0) two estimates.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import Bounds, FieldSolution

Array = NDArray[np.float64]


def current_share(solution: FieldSolution) -> Bounds:
    """Return the interval of the co-energy in J that the current adds.

    Rigorous without magnets or with linear materials. Else the distance of the co-energies'
    bounds, widened by the distance of the two estimates of the flux linkage without current.
    """
    idle = solution.idle
    if idle is None:
        return solution.coenergy
    if not solution.sides.laws.saturating:
        return _share_of_linear(solution, idle)
    linked = [solution.current * linkage for linkage in idle.flux_linkage_of_sides]
    total, rest = solution.coenergy, idle.coenergy
    return Bounds(
        total.lower - rest.upper - max(linked), total.upper - rest.lower - min(linked), "J"
    )


def changed_fields(solution: FieldSolution) -> tuple[Array, Array]:
    """Return what the current changes in B and in H, (elements, 2, points) each."""
    if solution.idle is None:
        return solution.flux.field, solution.potential.field
    idle = solution.idle
    return solution.flux.field - idle.flux.field, solution.potential.field - idle.potential.field


def gaps_to_close(solution: FieldSolution) -> tuple[Array, ...]:
    """Return the local gaps in J, (elements,) each, of the brackets that the share rests on."""
    if solution.idle is None:
        return (solution.local_gap,)
    if solution.sides.laws.saturating:
        return solution.local_gap, solution.idle.local_gap
    b, h = changed_fields(solution)
    laws, weight = solution.sides.laws, solution.sides.discretisation.weight
    density = laws.energy_density(_size(b)) + laws.coenergy_density(_size(h)) - np.sum(b * h, 1)
    return np.asarray(np.sum(weight * density, axis=1)), solution.idle.local_gap


def _share_of_linear(solution: FieldSolution, idle: FieldSolution) -> Bounds:
    """Return the bounds of the current's own co-energy, from its own fields on either side."""
    b, h = changed_fields(solution)
    laws, weight = solution.sides.laws, solution.sides.discretisation.weight
    work = solution.current * solution.sides.flux.load @ (solution.flux.x - idle.flux.x)
    stored = np.sum(weight * laws.energy_density(_size(b)))
    return Bounds(
        float(work - stored), float(np.sum(weight * laws.coenergy_density(_size(h)))), "J"
    )


def _size(field: Array) -> Array:
    return np.asarray(np.hypot(field[:, 0], field[:, 1]))
