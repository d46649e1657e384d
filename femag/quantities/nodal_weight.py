"""Weights of the mesh's nodes: 1 on one body, 0 on another, and how they change in between."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix
from skfem import Basis, ElementTriP1
from skfem.models.poisson import laplace

from femag.field.newton import solved
from femag.geometry.section import Polygon
from femag.mesh import SectionMesh

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def harmonic_weights(mesh: SectionMesh, values: Array, given: Index) -> Array:
    """Return weights that are harmonic away from the given nodes.

    Parameters
    ----------
    mesh : SectionMesh
        The mesh.
    values : array, (n, nodes)
        Weights; those of the given nodes stay.
    given : int array
        Nodes whose weights are given.
    """
    matrix = csc_matrix(laplace.assemble(Basis(mesh.triangles, ElementTriP1())))
    free = np.setdiff1d(np.arange(values.shape[1]), given)
    load = -matrix[free][:, given] @ values[:, given].T
    found = values.copy()
    found[:, free] = solved(csc_matrix(matrix[free][:, free]), load).T
    return found


def shell_weights(weights: Array) -> Array:
    """Return weights that change in a shell half way between the bodies: 0, 1/2 and 1 stay."""
    return np.asarray(weights**3 * (10.0 - 15.0 * weights + 6.0 * weights**2))


def nodes_on(mesh: SectionMesh, line: Polygon) -> Index:
    """Return the nodes on a line of straight pieces, (r, z) in m."""
    points = mesh.triangles.p.T
    slack = 1e-9 * np.ptp(points)
    on = np.zeros(len(points), dtype=bool)
    for start, end in pairwise(np.asarray(line)):
        along = end - start
        share = np.clip((points - start) @ along / (along @ along), 0.0, 1.0)
        on |= np.hypot(*(points - start - share[:, None] * along).T) < slack
    return np.flatnonzero(on)
