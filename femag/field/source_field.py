"""The source field T: an edge-element field with curl T = J, from a spanning tree.

T is zero on the tree; each remaining edge follows from Stokes' law element by element. The
tree runs first along the walls where the tangential field vanishes, then through permeable
regions, so that T lives mostly in air and H = T - grad Omega loses no digits in iron.

References
----------
R. Albanese and G. Rubinacci, "Integral formulation for 3D eddy-current computation using edge
elements", IEE Proc. A 135 (1988) 457.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_matrix, csc_matrix
from scipy.sparse.csgraph import minimum_spanning_tree
from scipy.sparse.linalg import splu
from skfem import Basis, ElementTriN1

from femag.errors import NumericalError
from femag.field.discretisation import Discretisation

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def source_fields(discretisation: Discretisation, turns: Array, permeability: Array) -> Array:
    """Return T per ampere of n excitations in 1/m, (n, elements, 2, points).

    Parameters
    ----------
    discretisation : Discretisation
        The mesh with its quadrature.
    turns : array, (elements, n)
        Turns per area of each excitation, 1/m2.
    permeability : array, (elements, 1)
        Initial permeability, H/m.

    Raises
    ------
    NumericalError
        If the domain is not simply connected, or a closed wall holds back a net current.
    """
    triangles = discretisation.mesh.triangles
    edges = Basis(
        triangles,
        ElementTriN1(),
        quadrature=discretisation.basis.quadrature,
    )
    walls = _zero_edges(discretisation)
    cotree = ~_tree_edges(triangles.facets, _edge_weights(triangles, walls, permeability))
    if np.count_nonzero(cotree) != triangles.nelements:
        raise NumericalError("the meshed domain is not simply connected")
    circulation = np.zeros((triangles.nfacets, turns.shape[1]))
    circulation[cotree] = _circulations(edges, cotree, turns)
    closed = np.abs(circulation[walls]).max(axis=0, initial=0.0)
    if np.any(closed > 1e-9 * np.abs(circulation).max(axis=0)):
        raise NumericalError("a closed wall without tangential field encloses a net current")
    local = circulation[edges.element_dofs]
    shapes = np.stack([np.asarray(function[0]) for function in edges.basis])
    return np.asarray(np.einsum("ien,iceq->necq", local, shapes))


def _zero_edges(discretisation: Discretisation) -> Index:
    walls = discretisation.mesh.walls
    return np.concatenate([walls["far"], walls["normal"]])


def _edge_weights(triangles: object, walls: Index, permeability: Array) -> Array:
    """Return 1 on walls without tangential field, then 2 to 3 with falling permeability."""
    inside = triangles.f2t  # type: ignore[attr-defined]
    mu = permeability[:, 0]
    highest = np.where(inside[1] >= 0, np.maximum(mu[inside[0]], mu[inside[1]]), mu[inside[0]])
    weight = 2.0 + mu.min() / highest
    weight[walls] = 1.0
    return np.asarray(weight)


def _tree_edges(facets: Index, weight: Array) -> NDArray[np.bool_]:
    """Return which edges a minimum spanning tree of the mesh's vertices uses."""
    start, end = facets
    size = int(facets.max()) + 1
    graph = coo_matrix((weight, (start, end)), shape=(size, size)).tocsr()
    tree = minimum_spanning_tree(graph).tocoo()
    keys = np.sort(
        np.minimum(tree.row, tree.col).astype(np.int64) * size + np.maximum(tree.row, tree.col)
    )
    return np.isin(np.minimum(start, end).astype(np.int64) * size + np.maximum(start, end), keys)


def _circulations(edges: Basis, cotree: NDArray[np.bool_], turns: Array) -> Array:
    """Solve Stokes' law on every element for the edges off the tree.

    In the (r, z) plane the curl of T points along -phi.
    """
    number = np.where(cotree, np.cumsum(cotree) - 1, -1)[edges.element_dofs]
    area = edges.dx.sum(axis=1)
    curl = np.stack([function[0].curl[:, 0] for function in edges.basis]) * area
    free = number >= 0
    elements = np.broadcast_to(np.arange(len(area)), number.shape)
    stokes = csc_matrix((curl[free], (elements[free], number[free])))
    return np.asarray(splu(stokes).solve(-turns * area[:, None]))
