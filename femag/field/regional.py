"""Refinement until the fields of both sides agree in some regions, where the field itself counts.

The bracket of the co-energy says little about regions that hold little energy, such as copper far
from a gap.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator
from dataclasses import dataclass
from typing import Literal

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

FAR_APART = 0.1
"""Distance of the sides from which B is taken to be the one that is off."""
SETTLED = 0.02
"""Change of the potential side's squared field by a refinement, over the accuracy."""


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
    for finer in _ever_finer(solution, regions):
        if finer.apart <= accuracy:
            return finer.solution
    raise _too_fine(finer, accuracy)


def settled_solution(
    solution: FieldSolution, regions: Collection[str], accuracy: float
) -> tuple[FieldSolution, Literal["flux", "potential"]]:
    """Return a solution that is good in regions of air or copper on one side, and which.

    The flux side where both agree. Without a gap B in the copper is a small part of a large one
    and converges slowly, while the potential side has the turns' H from Ampere's law at once: that
    side where they are a tenth apart or more, and a refinement changes its squared field by no more
    than a fiftieth of `accuracy`.

    Parameters
    ----------
    solution, regions, accuracy
        As of `agreeing_solution`.

    Raises
    ------
    NumericalError
        If that takes too many unknowns.
    """
    before = 0.0
    for finer in _ever_finer(solution, regions):
        if finer.apart <= accuracy:
            return finer.solution, "flux"
        change = abs(finer.square_of_potential - before)
        if finer.apart > FAR_APART and change <= SETTLED * accuracy * before:
            return finer.solution, "potential"
        before = finer.square_of_potential
    raise _too_fine(finer, accuracy)


@dataclass(frozen=True)
class _Finer:
    """A solution, how far its sides are apart in the regions, and the integral of |mu0 H|^2."""

    solution: FieldSolution
    apart: float
    square_of_potential: float


def _ever_finer(solution: FieldSolution, regions: Collection[str]) -> Iterator[_Finer]:
    """Yield solutions on meshes that are refined where the sides differ in the regions."""
    while True:
        elements = elements_in(solution, regions)
        apart, from_b, from_h = _squares(solution, elements)
        off = float(np.sqrt(apart.sum() / from_b)) if from_b > 0.0 else 0.0
        yield _Finer(solution, off, from_h)
        if solution.unknowns > MAXIMUM_UNKNOWNS:
            return
        mesh, parent = refined_mesh(solution.sides.mesh, elements[marked_elements(apart)])
        sides = both_sides(solution.sides.problem, mesh)
        start = transferred_field_strength(solution, sides, parent)
        solution = field_solution(sides, solution.current, start, NEWTON_ACCURACY)


def _too_fine(finest: _Finer, accuracy: float) -> NumericalError:
    return NumericalError(
        f"the fields of both sides in the copper are {finest.apart:.1e} apart, more than "
        f"{accuracy:g}, with {finest.solution.unknowns} unknowns in use"
    )


def elements_in(solution: FieldSolution, regions: Collection[str]) -> Index:
    """Return the elements of regions, by name."""
    mesh = solution.sides.mesh
    wanted = [number for number, name in enumerate(mesh.names) if name in regions]
    return np.flatnonzero(np.isin(mesh.region, wanted))


def _squares(solution: FieldSolution, elements: Index) -> tuple[Array, float, float]:
    """Return the integrals of |B - mu0 H|^2 over each element, of |B|^2 and |mu0 H|^2 over all."""
    weight = solution.sides.discretisation.weight[elements]
    b, h = solution.flux.field[elements], MU_0 * solution.potential.field[elements]
    apart, from_b, from_h = (np.sum(weight * np.sum(f**2, axis=1), axis=1) for f in (b - h, b, h))
    return np.asarray(apart), float(from_b.sum()), float(from_h.sum())
