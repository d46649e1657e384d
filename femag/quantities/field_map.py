"""The field at points that a figure can draw."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution
from femag.mesh import SectionMesh
from femag.quantities.inside_elements import flux_field, nodal_u

Array = NDArray[np.float64]
Index = NDArray[np.int64]


@dataclass(frozen=True)
class FieldMap:
    """Flux and flux density on small triangles that do not share nodes between elements.

    Parameters
    ----------
    r, z : array, (n,)
        Points, m.
    triangles : int array, (m, 3)
        Triangles over the points.
    flux : array, (n,)
        Flux through the disc inside each point, Wb; its level lines are the flux lines.
    flux_density : array, (n,)
        Magnitude of B from the flux side, T; it jumps between materials.
    role : array of str, (m,)
        "core", "air" or "winding" of each triangle.
    outlines : dict of str to array, (k, 2, 2)
        Ends (r, z) in m of the mesh edges around everything of one role.
    """

    r: Array
    z: Array
    triangles: Index
    flux: Array
    flux_density: Array
    role: NDArray[np.str_]
    outlines: dict[str, Array]


def field_map(solution: FieldSolution, parts: int = 4) -> FieldMap:
    """Return the flux side's field on every element, each divided into parts^2 triangles.

    The half below a mirror plane is added.
    """
    local, pieces = _divided_triangle(parts)
    r, z = solution.sides.discretisation.basis.mapping.F(local)
    u, b = flux_field(solution, nodal_u(solution), local)
    first = local.shape[1] * np.arange(len(r))[:, None, None]
    role = _roles(solution.sides.mesh)
    half = FieldMap(
        r=r.ravel(),
        z=z.ravel(),
        triangles=(first + pieces).reshape(-1, 3),
        flux=(2.0 * np.pi * r**2 * u).ravel(),
        flux_density=np.hypot(*b).ravel(),
        role=np.repeat(role, len(pieces)),
        outlines={name: _outline(solution.sides.mesh, role == name) for name in np.unique(role)},
    )
    return _with_mirror_image(half) if solution.sides.mesh.section.copies == 2 else half


def _divided_triangle(parts: int) -> tuple[Array, Index]:
    """Return points (2, n) and triangles of the reference triangle cut into parts^2."""
    number: dict[tuple[int, int], int] = {}
    for j in range(parts + 1):
        for i in range(parts + 1 - j):
            number[i, j] = len(number)
    points = np.array(list(number)).T / parts
    upright = [[(i, j), (i + 1, j), (i, j + 1)] for i, j in number if i + j < parts]
    inverted = [[(i + 1, j), (i + 1, j + 1), (i, j + 1)] for i, j in number if i + j < parts - 1]
    return points, np.array([[number[corner] for corner in t] for t in upright + inverted])


def _roles(mesh: SectionMesh) -> NDArray[np.str_]:
    roles = {region.name: region.role for region in mesh.section.regions}
    return np.array([roles.get(name, "air") for name in mesh.names])[mesh.region]


def _outline(mesh: SectionMesh, inside: NDArray[np.bool_]) -> Array:
    """Return the edges (k, 2, 2) between chosen elements and others, leaving out mirror planes."""
    neighbours = mesh.triangles.f2t
    across = np.where(neighbours[1] >= 0, inside[neighbours[1]], False)
    edge = inside[neighbours[0]] != across
    edge[mesh.walls["normal"]] = False
    return np.asarray(mesh.triangles.p[:, mesh.triangles.facets[:, edge]].transpose(2, 1, 0))


def _with_mirror_image(half: FieldMap) -> FieldMap:
    mirror = np.array([1.0, -1.0])
    return FieldMap(
        r=np.tile(half.r, 2),
        z=np.concatenate([half.z, -half.z]),
        triangles=np.vstack([half.triangles, half.triangles + len(half.r)]),
        flux=np.tile(half.flux, 2),
        flux_density=np.tile(half.flux_density, 2),
        role=np.tile(half.role, 2),
        outlines={name: np.vstack([e, e * mirror]) for name, e in half.outlines.items()},
    )


def typical_peak(fields: FieldMap, share: float = 0.98) -> float:
    """Return the flux density in T that `share` of the core's volume stays below.

    At a sharp corner the maximum grows without limit as the mesh is refined; this does not.
    """
    triangles = fields.triangles[fields.role == "core"]
    corner_r, corner_z = fields.r[triangles], fields.z[triangles]
    (r1, r2), (z1, z2) = ((c[:, 1:] - c[:, :1]).T for c in (corner_r, corner_z))
    volume = np.abs(r1 * z2 - r2 * z1) * corner_r.mean(axis=1)
    b = fields.flux_density[triangles].mean(axis=1)
    order = np.argsort(b)
    filled = np.cumsum(volume[order])
    return float(b[order][np.searchsorted(filled, share * filled[-1])])
