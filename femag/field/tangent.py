"""The tangent problem: how the solution moves with the current."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution
from femag.field.newton import solved
from femag.field.side import linearised

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Tangent:
    """Derivatives of one side's minimiser by the current.

    Parameters
    ----------
    rate : array, (size,)
        Of the unknowns, 1/A.
    inductance : float
        Second derivative of the side's co-energy: the incremental inductance, H.
    """

    rate: Array
    inductance: float


def tangents_of_sides(solution: FieldSolution) -> tuple[Tangent, Tangent]:
    """Return the tangents of the flux side and of the potential side, one linear solve each."""
    flux, side = solution.flux, solution.sides.flux
    rate = solved(side.hessian(flux.field, flux.secant, flux.tangent), side.load)
    of_flux = Tangent(rate, float(side.load @ rate))

    potential, side = solution.potential, solution.sides.potential
    state = (potential.field, potential.secant, potential.tangent)
    flow = linearised(*state, side.source)
    stiff = float(np.sum(side.weight * np.sum(flow * side.source, axis=1)))
    coupling = side.tested(flow, np.ones_like(potential.secant))
    rate = -solved(side.hessian(*state), coupling)
    return of_flux, Tangent(rate, stiff + float(coupling @ rate))
