"""The fields at places inside elements: where points lie, and what the polynomials are there."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def above_mirror(solution: FieldSolution, points: Array) -> tuple[Array, Array]:
    """Return points (2, n) with those below a mirror plane turned up, and -1 for those, else 1."""
    mirrored = (points[1] < 0.0) & (solution.sides.mesh.section.copies == 2)
    sign = np.where(mirrored, -1.0, 1.0)
    return np.stack([points[0], sign * points[1]]), sign


def located(solution: FieldSolution, points: Array) -> tuple[Index, Array]:
    """Return the element that each point lies in (or nearest to) and its place there, (2, n)."""
    mapping = solution.sides.discretisation.basis.mapping
    elements = solution.sides.mesh.triangles.nelements
    everywhere = np.broadcast_to(points[:, None, :], (2, elements, points.shape[1]))
    local = mapping.invF(everywhere)
    depth = np.minimum(local.min(axis=0), 1.0 - local.sum(axis=0))
    element = depth.argmax(axis=0)
    return element, local[:, element, np.arange(points.shape[1])]


def nodal_u(solution: FieldSolution) -> Array:
    """Return u = A/r in T at every node of the P2 basis."""
    return nodal_values(solution, solution.flux.x)


def nodal_values(solution: FieldSolution, unknowns: Array) -> Array:
    """Return what the flux side's unknowns (size,) are at every node of the P2 basis."""
    side, dofs = solution.sides.flux, solution.sides.discretisation.element_dofs
    nodal = np.zeros(solution.sides.discretisation.basis.N)
    nodal[dofs] = np.append(unknowns, 0.0)[side.numbering.unknown]
    return nodal


def flux_field(
    solution: FieldSolution, nodal: Array, local: Array, element: Index | None = None
) -> tuple[Array, Array]:
    """Return u (elements, n) and its B_r and B_z (2, elements, n) at places in elements.

    B_r = -r du/dz and B_z = 2 u + r du/dr, from A = r u.

    Parameters
    ----------
    solution : FieldSolution
        Its mesh is used.
    nodal : array, (nodes,)
        u at every node of the P2 basis, T, or T/A for B per ampere.
    local : array, (2, n) or (2, elements, n)
        Coordinates in the reference triangle, the same in every element or those in each.
    element : int array, (elements,), optional
        Which elements; all when left out.
    """
    basis = solution.sides.discretisation.basis
    dofs = basis.element_dofs if element is None else basis.element_dofs[:, element]
    r = basis.mapping.F(local, tind=element)[0]
    u, du = np.zeros_like(r), np.zeros((2, *r.shape))
    for i, coefficient in enumerate(nodal[dofs]):
        shape = basis.elem.gbasis(basis.mapping, local, i, tind=element)[0]
        u += coefficient[:, None] * np.asarray(shape)
        du += coefficient[:, None] * shape.grad
    return u, np.stack([-r * du[1], 2.0 * u + r * du[0]])


def from_quadrature(solution: FieldSolution, local: Array) -> Array:
    """Return the weights (n, quadrature points) that give a quadratic at local places (2, n)."""
    at_quadrature = _quadratics(solution.sides.discretisation.basis.quadrature[0])
    return np.asarray(_quadratics(local) @ np.linalg.pinv(at_quadrature))


def _quadratics(local: Array) -> Array:
    """Return 1, x, y, x^2, xy and y^2 at local coordinates (2, n), (n, 6)."""
    x, y = local
    return np.stack([np.ones_like(x), x, y, x * x, x * y, y * y], axis=1)
