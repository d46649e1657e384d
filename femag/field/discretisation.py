"""One mesh made ready for both sides: P2 shape functions, quadrature and weights.

scikit-fem supplies the bases, the quadrature and the numbering of unknowns. The element
matrices are one batched product over all elements: the decorator form evaluates the 36 pairs
of local functions one after another and takes about ten times as long.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix
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
    radius = r[:, None]
    flux = np.stack([-radius * gradient[:, :, 1], 2.0 * value + radius * gradient[:, :, 0]], axis=2)
    weight = 2.0 * np.pi * mesh.section.copies * r * basis.dx
    return Discretisation(mesh, basis, weight, flux, gradient, radius * value)


def assembled_matrix(
    shape: Array,
    secant: Array,
    extra: Array,
    directions: tuple[Array, Array],
    unknown: Index,
    size: int,
) -> csc_matrix:
    """Return the integral of secant (a . b) + extra [(a . d)(b . e) + (a . e)(b . d)] / 2.

    Parameters
    ----------
    shape : array, (elements, 6, 2, points)
        Field of each local function.
    secant, extra : array, (elements, points)
        Weighted coefficients.
    directions : pair of array, (elements, 2, points)
        The vectors d and e.
    unknown : int array, (elements, 6)
        Unknown of each local function; -1 where the value is fixed.
    size : int
        Number of unknowns.
    """
    elements = len(shape)
    flat = shape.reshape(elements, 6, -1)
    weighted = shape * secant[:, None, None, :]
    if np.any(extra):
        for one, other in (directions, directions[::-1]):
            along = np.einsum("eicq,ecq->eiq", shape, one) * (0.5 * extra[:, None, :])
            weighted = weighted + along[:, :, None, :] * other[:, None]
    local = weighted.reshape(elements, 6, -1) @ flat.transpose(0, 2, 1)
    rows = np.broadcast_to(unknown[:, :, None], local.shape)
    columns = np.broadcast_to(unknown[:, None, :], local.shape)
    free = (rows >= 0) & (columns >= 0)
    return csc_matrix((local[free], (rows[free], columns[free])), shape=(size, size))


def assembled_vector(local: Array, unknown: Index, size: int) -> Array:
    """Return the sum of local vectors (elements, 6) over the free unknowns."""
    free = unknown >= 0
    total = np.bincount(unknown[free], weights=local[free], minlength=size)
    return np.asarray(total, dtype=float)
