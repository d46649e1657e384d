"""The change of flux density between the two ends of a ripple, from both sides on one mesh."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from femag.errors import NewtonError
from femag.field.bounds import FieldSolution
from femag.field.discretisation import QUADRATURE_ORDER, discretise
from femag.field.flux_side import flux_side
from femag.field.newton import Minimum, minimum
from femag.field.potential_side import potential_side
from femag.field.side import Side

Array = NDArray[np.float64]

ACCURACY = 1e-8
"""Squared Newton decrement over the energy before the last full step, which squares it again."""


@dataclass(frozen=True, eq=False)
class Swing:
    """Changes of B between the currents of trough and peak, T.

    Parameters
    ----------
    solution : FieldSolution
        Fields at the peak.
    weight : array, (elements, points)
        Volume of the quadrature points, m3.
    change_of_sides : tuple of array, (elements, 2, points)
        B at the peak less B at the trough, from flux side and potential side.
    lower_half : array, (elements, 2, points)
        B half way between the two currents less B at the trough, from the flux side.
    unknowns : array, (size,)
        Change of the flux side's unknowns.
    """

    solution: FieldSolution
    weight: Array
    change_of_sides: tuple[Array, Array]
    lower_half: Array
    unknowns: Array

    @property
    def as_solution(self) -> FieldSolution:
        """A solution whose flux side is the change, for figures."""
        flux = replace(self.solution.flux, x=self.unknowns)
        return replace(self.solution, flux=flux, idle=None)


def swing(solution: FieldSolution, trough: float) -> Swing:
    """Return the swing between a trough current in A and the current of a solution, on its mesh.

    Linear problems need no further solution; saturating ones are solved at the trough and, on the
    flux side, at the mean of both currents.

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
        x, b = (
            x - idle.flux.x,
            [own - at_rest for own, at_rest in zip(b, _flux_densities(idle), strict=True)],
        )
    flux, potential = (share * field for field in b)
    weight = solution.sides.discretisation.weight
    return Swing(solution, weight, (flux, potential), 0.5 * flux, share * x)


def _flux_densities(solution: FieldSolution) -> list[Array]:
    """Return B of both sides in T; in magnets less and plus the remanence."""
    potential = solution.potential
    return [solution.flux.field, potential.secant[:, None] * potential.field]


def _swing_of_solutions(solution: FieldSolution, trough: float) -> Swing:
    sides = solution.sides
    discretisation = discretise(sides.mesh, QUADRATURE_ORDER)
    flux = flux_side(sides.problem, discretisation, sides.laws, sides.flux.numbering)
    potential = potential_side(sides.problem, discretisation, sides.laws, sides.potential.numbering)
    idle, middle = solution.idle, 0.5 * (solution.current + trough)
    x_middle, x_trough = (
        _unknowns(flux, solution.flux, idle.flux if idle else None, current)
        for current in (middle, trough)
    )
    y_trough = _unknowns(potential, solution.potential, idle.potential if idle else None, trough)
    at_peak = _flux_density(potential, solution.potential.x, solution.current)
    return Swing(
        solution,
        discretisation.weight,
        (
            flux.change(solution.flux.x - x_trough),
            at_peak - _flux_density(potential, y_trough, trough),
        ),
        flux.change(x_middle - x_trough),
        solution.flux.x - x_trough,
    )


def _flux_density(potential: Side, x: Array, current: float) -> Array:
    """Return B in T of the potential side, (elements, 2, points)."""
    field = potential.field(x, current)
    return np.asarray(potential.coefficients(field)[0][:, None] * field)


def _unknowns(side: Side, peak: Minimum, idle: Minimum | None, current: float) -> Array:
    """Return the unknowns at a current; without current there is nothing to solve."""
    at_rest = idle.x if idle else np.zeros_like(peak.x)
    if current == 0.0:
        return at_rest
    guess = at_rest + (peak.x - at_rest) * current / peak.current
    try:
        return minimum(side, current, accuracy=ACCURACY, guess=guess).x
    except NewtonError:
        return minimum(side, current, accuracy=ACCURACY).x
