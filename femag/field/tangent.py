"""The tangent problem: how the solution moves with the current."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.newton import Minimum, solved
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


def flux_tangent(flux: Minimum) -> Tangent:
    """Return the tangent of the flux side's minimiser, from one linear solve."""
    side = flux.side
    matrix = side.hessian(flux.field, flux.secant, flux.tangent)
    rate = solved(matrix, side.load, side.numbering.ordering)
    return Tangent(rate, float(side.load @ rate))


def potential_tangent(potential: Minimum) -> Tangent:
    """Return the tangent of the potential side's minimiser, from one linear solve."""
    side = potential.side
    state = (potential.field, potential.secant, potential.tangent)
    flow = linearised(*state, side.source)
    stiff = float(np.sum(side.weight * np.sum(flow * side.source, axis=1)))
    coupling = side.tested(flow, np.ones_like(potential.secant))
    rate = -solved(side.hessian(*state), coupling, side.numbering.ordering)
    return Tangent(rate, stiff + float(coupling @ rate))
