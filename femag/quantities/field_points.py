"""The field at any points, and along the lines that a review looks at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution
from femag.quantities.section_means import located, nodal_u

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
    mirrored = (points[1] < 0.0) & (mesh.section.copies == 2)
    inside = np.where(mirrored, -points[1], points[1])
    elements = mesh.triangles.nelements
    pieces = np.array_split(
        np.stack([points[0], inside]), 1 + points.shape[1] * elements // AT_ONCE, axis=1
    )
    found = [_fields_inside(solution, piece) for piece in pieces]
    u, b, element = (np.concatenate(parts, axis=-1) for parts in zip(*found, strict=True))
    h = _field_strength(solution, b, element)
    flip = np.where(mirrored, -1.0, 1.0)
    return PointFields(
        points=points,
        flux_density=b * [flip, np.ones_like(flip)],
        field_strength=h * [flip, np.ones_like(flip)],
        flux=2.0 * np.pi * points[0] ** 2 * u,
        region=tuple(mesh.names[index] for index in mesh.region[element]),
    )


def _fields_inside(solution: FieldSolution, points: Array) -> tuple[Array, Array, Index]:
    """Return u, B (2, n) and the element of points of the mesh."""
    basis = solution.sides.discretisation.basis
    element, local = located(solution, points)
    of_element = nodal_u(solution)[basis.element_dofs[:, element]]
    u, du = np.zeros(points.shape[1]), np.zeros_like(points)
    for i, coefficient in enumerate(of_element):
        shape = basis.elem.gbasis(basis.mapping, local[:, :, None], i, tind=element)[0]
        u += coefficient * np.asarray(shape)[:, 0]
        du += coefficient * shape.grad[:, :, 0]
    r = points[0]
    return u, np.stack([-r * du[1], 2.0 * u + r * du[0]]), element


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
