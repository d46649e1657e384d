"""Inductances beyond the bounded one: the incremental inductance from the tangent problem."""

from __future__ import annotations

from femag.field.bounds import FieldSolution
from femag.field.tangent import flux_tangent, potential_tangent


def incremental_inductance_of_sides(solution: FieldSolution) -> tuple[float, float]:
    """Return d(flux linkage)/dI in H from the flux side and from the potential side.

    Each is the second derivative of its side's energy by the current at the solution, from one
    linear solve with the tangent; no differences. Their distance estimates an error.
    """
    flux, potential = flux_tangent(solution.flux), potential_tangent(solution.potential)
    return flux.inductance, potential.inductance
