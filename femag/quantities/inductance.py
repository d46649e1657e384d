"""Inductances beyond the bounded one: the incremental inductance from the tangent problem."""

from __future__ import annotations

import numpy as np

from femag.field.bounds import FieldSolution
from femag.field.newton import solved
from femag.field.side import linearised


def incremental_inductance_of_sides(solution: FieldSolution) -> tuple[float, float]:
    """Return d(flux linkage)/dI in H from the flux side and from the potential side.

    Each is the second derivative of its side's energy by the current at the solution, from one
    linear solve with the tangent; no differences. Their distance estimates an error.
    """
    flux, side = solution.flux, solution.sides.flux
    answer = solved(side.hessian(flux.field, flux.secant, flux.tangent), side.load)
    from_flux = float(side.load @ answer)

    potential, side = solution.potential, solution.sides.potential
    state = (potential.field, potential.secant, potential.tangent)
    flow = linearised(*state, side.source)
    stiff = np.sum(side.weight * np.sum(flow * side.source, axis=1))
    coupling = side.tested(flow, np.ones_like(potential.secant))
    from_potential = float(stiff - coupling @ solved(side.hessian(*state), coupling))
    return from_flux, from_potential
