"""Both fields at six nodes of every element, from which they can be had again exactly.

With u in P2, the B_r = -r du/dz and B_z = 2 u + r du/dr of the flux side are polynomials of degree
2 in each element, and H of the potential side of degree 1. Neither is continuous: nodes are not
shared between elements.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution
from femag.quantities.inside_elements import flux_field, from_quadrature, nodal_u

Array = NDArray[np.float64]

NODES = np.array([[0.0, 1.0, 0.0, 0.5, 0.5, 0.0], [0.0, 0.0, 1.0, 0.0, 0.5, 0.5]])
"""Corners of the reference triangle, then the middles of the edges 0-1, 1-2 and 2-0."""


@dataclass(frozen=True)
class NodalField:
    """Fields at the corners and middles of edges of every element.

    Parameters
    ----------
    points : array, (elements, 6, 2)
        r and z, m.
    flux : array, (elements, 6)
        Flux through the disc inside each node, Wb.
    flux_density : array, (elements, 6, 2)
        B of the flux side, T: free of divergence, with its components along r and z.
    field_strength : array, (elements, 6, 2)
        H of the potential side, A/m: its curl is the current density exactly.
    """

    points: Array
    flux: Array
    flux_density: Array
    field_strength: Array


def nodal_field(solution: FieldSolution) -> NodalField:
    """Return the fields of a solution at the nodes of every element."""
    h, fixed = solution.potential.field, solution.sides.potential.fixed
    points = solution.sides.discretisation.basis.mapping.F(NODES).transpose(1, 2, 0)
    u, b = flux_field(solution, nodal_u(solution), NODES)
    to_nodes = from_quadrature(solution, NODES)
    return NodalField(
        points=points,
        flux=2.0 * np.pi * points[..., 0] ** 2 * u,
        flux_density=b.transpose(1, 2, 0),
        field_strength=np.einsum("nq,ecq->enc", to_nodes, h if fixed is None else h - fixed),
    )
