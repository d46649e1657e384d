"""The field at any points, and along the lines that a review looks at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution
from femag.quantities.inside_elements import above_mirror, flux_field, located, nodal_u

Array = NDArray[np.float64]
Index = NDArray[np.int64]

AT_ONCE = 4_000_000
"""Pairs of an element and a point that are looked at together."""


@dataclass(frozen=True)
class PointFields:
    """The flux side's field at points.

    Parameters
    ----------
    points : array, (2, n)
        r and z, m.
    flux_density : array, (2, n)
        B_r and B_z, T.
    field_strength : array, (2, n)
        H_r and H_z in A/m that the material at the point has at this B.
    flux : array, (n,)
        Flux through the disc inside each point, Wb.
    region : tuple of str, (n,)
        Name of the region that each point lies in.
    """

    points: Array
    flux_density: Array
    field_strength: Array
    flux: Array
    region: tuple[str, ...]


def point_fields(solution: FieldSolution, points: Array) -> PointFields:
    """Return the field at points of the whole section, also below a mirror plane.

    On a boundary between elements that of one of both is taken.

    Parameters
    ----------
    solution : FieldSolution
        Both fields.
    points : array, (2, n)
        r and z, m.
    """
    points = np.asarray(points, dtype=float)
    mesh = solution.sides.mesh
    inside, sign = above_mirror(solution, points)
    pairs = points.shape[1] * mesh.triangles.nelements
    pieces = np.array_split(inside, 1 + pairs // AT_ONCE, axis=1)
    found = [_fields_inside(solution, piece) for piece in pieces]
    u, b, element = (np.concatenate(parts, axis=-1) for parts in zip(*found, strict=True))
    h = _field_strength(solution, b, element)
    return PointFields(
        points=points,
        flux_density=b * [sign, np.ones_like(sign)],
        field_strength=h * [sign, np.ones_like(sign)],
        flux=2.0 * np.pi * points[0] ** 2 * u,
        region=tuple(mesh.names[index] for index in mesh.region[element]),
    )


def _fields_inside(solution: FieldSolution, points: Array) -> tuple[Array, Array, Index]:
    """Return u, B (2, n) and the element of points of the mesh."""
    element, local = located(solution, points)
    u, b = flux_field(solution, nodal_u(solution), local[:, :, None], element)
    return u[:, 0], b[:, :, 0], element


def _field_strength(solution: FieldSolution, b: Array, element: Index) -> Array:
    """Return H (2, n) of B (2, n) in elements, by their materials."""
    problem, mesh = solution.sides.problem, solution.sides.mesh
    h = np.zeros_like(b)
    for index in np.unique(mesh.region[element]):
        name = mesh.names[index]
        here = mesh.region[element] == index
        own = b[:, here] - np.array([[0.0], [problem.remanences.get(name, 0.0)]])
        size = np.hypot(*own)
        ratio = problem.curve_of(name).field_strength(size) / np.where(size > 0.0, size, 1.0)
        h[:, here] = own * ratio
    return h
