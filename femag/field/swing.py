"""The change of flux density between the two ends of a ripple, from both sides on one mesh."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from femag.errors import NewtonError
from femag.field.bounds import FieldSolution
from femag.field.discretisation import QUADRATURE_ORDER, discretise
from femag.field.flux_side import flux_side
from femag.field.newton import minimum
from femag.field.potential_side import potential_side
from femag.field.side import Side

Array = NDArray[np.float64]

ACCURACY = 1e-8
"""Squared Newton decrement over the energy before the last full step, which squares it again."""
LEVEL_ACCURACY = 1e-4
"""The same between the two ends, where the fields give the shape only."""


@dataclass(frozen=True, eq=False)
class Swing:
    """Changes of B between the currents of trough and peak, T.

    Parameters
    ----------
    solution : FieldSolution
        Fields at the peak.
    trough : float
        Current at the trough, A.
    side : Side
        Flux side with the quadrature points of the changes.
    change_of_sides : tuple of array, (elements, 2, points)
        B at the peak less B at the trough, from flux side and potential side.
    unknowns : array, (size,)
        Change of the flux side's unknowns.
    """

    solution: FieldSolution
    trough: float
    side: Side
    change_of_sides: tuple[Array, Array]
    unknowns: Array

    @property
    def weight(self) -> Array:
        """Volume of the quadrature points, m3, (elements, points)."""
        return self.side.weight

    @property
    def is_straight(self) -> bool:
        """Whether B changes in proportion to the current."""
        return not self.solution.sides.laws.saturating

    @property
    def as_solution(self) -> FieldSolution:
        """A solution whose flux side is the change, for figures."""
        flux = replace(self.solution.flux, x=self.unknowns)
        return replace(self.solution, flux=flux, idle=None)


def swing(solution: FieldSolution, trough: float) -> Swing:
    """Return the swing between a trough current in A and the current of a solution, on its mesh.

    Linear problems need no further solution, saturating ones are solved at the trough.

    Raises
    ------
    NumericalError
        If a solution fails.
    """
    if solution.sides.laws.saturating:
        return _swing_of_solutions(solution, trough)
    share = (solution.current - trough) / solution.current
    idle = solution.idle
    x, b = solution.flux.x, _flux_densities(solution)
    if idle is not None:
        x = x - idle.flux.x
        b = [own - at_rest for own, at_rest in zip(b, _flux_densities(idle), strict=True)]
    flux, potential = (share * field for field in b)
    return Swing(solution, trough, solution.sides.flux, (flux, potential), share * x)


def halved_levels(between: Swing, levels: list[Array]) -> list[Array]:
    """Return unknowns of the flux side at equal steps of current, with one more in each step.

    Parameters
    ----------
    between : Swing
        Of a saturating problem.
    levels : list of array, (size,)
        Unknowns at equal steps of current from trough to peak; `end_levels` to begin with.

    Raises
    ------
    NumericalError
        If a solution fails.
    """
    steps = len(levels) - 1
    height = between.solution.current - between.trough
    finer = levels[:1]
    for i, (low, high) in enumerate(pairwise(levels)):
        current = between.trough + height * (i + 0.5) / steps
        at_zero = abs(current) < 1e-9 * abs(height) and between.side.fixed is None
        middle = 0.5 * (low + high)
        found = (
            np.zeros_like(low)
            if at_zero
            else _minimiser(between.side, current, middle, LEVEL_ACCURACY)
        )
        finer += [found, high]
    return finer


def end_levels(between: Swing) -> list[Array]:
    """Return unknowns of the flux side at trough and peak."""
    peak = between.solution.flux.x
    return [peak - between.unknowns, peak]


def _flux_densities(solution: FieldSolution) -> list[Array]:
    """Return B of both sides in T; in magnets less and plus the remanence."""
    potential = solution.potential
    return [solution.flux.field, potential.secant[:, None] * potential.field]


def _swing_of_solutions(solution: FieldSolution, trough: float) -> Swing:
    sides, idle = solution.sides, solution.idle
    discretisation = discretise(sides.mesh, QUADRATURE_ORDER)
    flux = flux_side(sides.problem, discretisation, sides.laws, sides.flux.numbering)
    potential = potential_side(sides.problem, discretisation, sides.laws, sides.potential.numbering)
    x, y = solution.flux.x, solution.potential.x
    x_idle = idle.flux.x if idle else np.zeros_like(x)
    y_idle = idle.potential.x if idle else np.zeros_like(y)
    share = trough / solution.current
    x_trough, y_trough = (
        at_rest if trough == 0.0 else _minimiser(side, trough, at_rest + share * (peak - at_rest))
        for side, peak, at_rest in ((flux, x, x_idle), (potential, y, y_idle))
    )
    of_potential = _flux_density(potential, y, solution.current) - _flux_density(
        potential, y_trough, trough
    )
    change = x - x_trough
    return Swing(solution, trough, flux, (flux.change(change), of_potential), change)


def _flux_density(potential: Side, x: Array, current: float) -> Array:
    """Return B in T of the potential side, (elements, 2, points)."""
    field = potential.field(x, current)
    return np.asarray(potential.coefficients(field)[0][:, None] * field)


def _minimiser(side: Side, current: float, guess: Array, accuracy: float = ACCURACY) -> Array:
    """Return the unknowns at a current (A)."""
    try:
        return minimum(side, current, accuracy=accuracy, guess=guess).x
    except NewtonError:
        return minimum(side, current, accuracy=accuracy).x
