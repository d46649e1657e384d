"""One mesh made ready for both sides: P2 shape functions, quadrature and weights.

scikit-fem supplies the bases, the quadrature and the numbering of unknowns. The element
matrices are one batched product over all elements: the decorator form evaluates the 36 pairs
of local functions one after another and takes about ten times as long.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from skfem import Basis, ElementTriP2

from femag.mesh import SectionMesh

Array = NDArray[np.float64]
Index = NDArray[np.int64]

QUADRATURE_ORDER = 5
"""Exact for linear materials on both sides: r (B_r, B_z polynomials of degree 2)^2."""


@dataclass(frozen=True)
class Discretisation:
    """Shape functions at the quadrature points of a mesh.

    Parameters
    ----------
    mesh : SectionMesh
        The mesh.
    basis : skfem.Basis
        Continuous P2.
    order : int
        Polynomial degree that the quadrature integrates exactly.
    weight : array, (elements, points)
        2 pi r dr dz times the section's copies, m3.
    flux_shape : array, (elements, 6, 2, points)
        (B_r, B_z) of each local function of u, where A = r u.
    gradient_shape : array, (elements, 6, 2, points)
        Gradient of each local function.
    radius_shape : array, (elements, 6, points)
        r times each local function, that is A of each.
    """

    mesh: SectionMesh
    basis: Basis
    order: int
    weight: Array
    flux_shape: Array
    gradient_shape: Array
    radius_shape: Array

    @property
    def element_dofs(self) -> Index:
        """Global number of each local function, (elements, 6)."""
        return np.asarray(self.basis.element_dofs.T)


def discretise(mesh: SectionMesh, order: int = QUADRATURE_ORDER) -> Discretisation:
    """Return the P2 discretisation of a mesh with quadrature exact to degree `order`."""
    basis = Basis(mesh.triangles, ElementTriP2(), intorder=order)
    r = np.asarray(basis.global_coordinates())[0]
    functions = [local[0] for local in basis.basis]
    value = np.stack([np.broadcast_to(np.asarray(f), r.shape) for f in functions], axis=1)
    gradient = np.stack([f.grad.transpose(1, 0, 2) for f in functions], axis=1)
    gradient = np.ascontiguousarray(gradient)  # products are three times as quick
    radius = r[:, None]
    flux = np.stack([-radius * gradient[:, :, 1], 2.0 * value + radius * gradient[:, :, 0]], axis=2)
    weight = 2.0 * np.pi * mesh.section.copies * r * basis.dx
    return Discretisation(mesh, basis, order, weight, flux, gradient, radius * value)


def local_matrices(
    shape: Array, secant: Array, extra: Array, directions: tuple[Array, Array]
) -> Array:
    """Return the integral of secant (a . b) + extra [(a . d)(b . e) + (a . e)(b . d)] / 2.

    Parameters
    ----------
    shape : array, (elements, 6, 2, points)
        Field of each local function.
    secant, extra : array, (elements, points)
        Weighted coefficients.
    directions : pair of array, (elements, 2, points)
        The vectors d and e.

    Returns
    -------
    array, (elements, 6, 6)
        One matrix for each element.
    """
    elements = len(shape)
    flat = shape.reshape(elements, 6, -1)
    weighted = (shape * secant[:, None, None, :]).reshape(elements, 6, -1)
    local = weighted @ flat.transpose(0, 2, 1)
    bent = np.flatnonzero(np.any(extra, axis=1))
    if len(bent):
        one, other = (np.einsum("eicq,ecq->eiq", shape[bent], d[bent]) for d in directions)
        product = (one * (0.5 * extra[bent, None, :])) @ other.transpose(0, 2, 1)
        local[bent] += product + product.transpose(0, 2, 1)
    return np.asarray(local)
