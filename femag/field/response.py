"""Small-signal fields of several excitations, on one mesh and with one factorisation a side.

The problem is linear: that of linear materials, or the tangent problem of saturating ones at a
bias. Its co-energy is half a quadratic form of the excitations' currents, and both sides bound that
form for every mix of currents at once: upper - form and form - lower are positive semidefinite.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.adapt import marked_elements, solution_on_finer_mesh
from femag.field.bounds import FieldSolution, Sides, both_sides, finely_integrated
from femag.field.flux_side import turn_density, turns_load
from femag.field.newton import EXACT, solved
from femag.field.side import linearised
from femag.field.source_field import source_fields
from femag.mesh import refined_mesh

Array = NDArray[np.float64]
Excitation = Mapping[str, float]
"""Turns per area of regions, 1/m2; of either sign."""


@dataclass(frozen=True)
class Tensor:
    """Symmetric tensor from H to B, (elements, points): one slope along the bias, one across.

    Parameters
    ----------
    bias : array, (elements, 2, points)
        H that it is taken at, A/m; its direction counts where the slopes differ.
    across, along : array, (elements, points)
        B/H and dB/dH at the bias, H/m.
    """

    bias: Array
    across: Array
    along: Array

    def flux_density(self, h: Array) -> Array:
        """Return B of H, (elements, 2, points)."""
        return linearised(self.bias, self.across, self.along, h)

    def field_strength(self, b: Array) -> Array:
        """Return H of B, (elements, 2, points)."""
        return linearised(self.bias, 1.0 / self.across, 1.0 / self.along, b)


@dataclass(frozen=True)
class Response:
    """Fields of n excitations with 1 A each, and the form that they bound.

    Parameters
    ----------
    sides : Sides
        The discretised problem.
    excitations : tuple of mapping
        What carries the currents.
    bias : FieldSolution or None
        Where a saturating problem is linearised; None for linear materials.
    tensor : Tensor
        Linear law at the quadrature points.
    flux_density : array, (n, elements, 2, points)
        Admissible B of the flux side, T/A.
    field_strength : array, (n, elements, 2, points)
        Admissible H of the potential side, 1/m.
    lower, upper : array, (n, n)
        Forms in H whose halves bound the co-energy of every mix of currents; symmetric.
    linkages_of_sides : pair of array, (n, n)
        Flux in Wb/A that the current of one excitation (row) links with another (column).
    """

    sides: Sides
    excitations: tuple[Excitation, ...]
    bias: FieldSolution | None
    tensor: Tensor
    flux_density: Array
    field_strength: Array
    lower: Array
    upper: Array
    linkages_of_sides: tuple[Array, Array]

    def local_gap(self, currents: Array) -> Array:
        """Return the share of each element in the width for a mix of currents (n,), (elements,).

        The shares sum to the mix's upper less its lower form.
        """
        b = np.tensordot(currents, self.flux_density, axes=1)
        h = np.tensordot(currents, self.field_strength, axes=1)
        excess = b - self.tensor.flux_density(h)
        density = np.sum(excess * self.tensor.field_strength(excess), axis=1)
        return np.asarray(np.sum(self.sides.discretisation.weight * density, axis=1))


def response(
    sides: Sides, excitations: Sequence[Excitation], bias: FieldSolution | None = None
) -> Response:
    """Return the fields of several excitations.

    Parameters
    ----------
    sides : Sides
        The discretised problem; its own turns play no part.
    excitations : sequence of mapping
        Turns per area in 1/m2 of the regions that carry each current.
    bias : FieldSolution, optional
        On the same mesh; where saturating materials are linearised.

    Raises
    ------
    NumericalError
        If a side cannot be solved.
    """
    turns = [turn_density(one, sides.discretisation) for one in excitations]
    tensor = _tensor(sides, bias)
    b, below, linked = _flux_fields(sides, tensor, turns)
    h, above, also_linked = _potential_fields(sides, tensor, turns)
    return Response(
        sides, tuple(excitations), bias, tensor, b, h, below, above, (linked, also_linked)
    )


def refined_response(coarse: Response, mixes: Sequence[Array]) -> Response:
    """Return the fields on a mesh that is refined where the widths of mixes of currents lie.

    Parameters
    ----------
    coarse : Response
        What is not close enough.
    mixes : sequence of array, (n,)
        Currents whose widths are to be closed. With a bias its own width is closed too.
    """
    gaps = [coarse.local_gap(mix) for mix in mixes]
    if coarse.bias is not None:
        gaps.append(coarse.bias.local_gap)
    marked = np.unique(np.concatenate([marked_elements(gap) for gap in gaps]))
    mesh, parent = refined_mesh(coarse.sides.mesh, marked)
    sides = both_sides(coarse.sides.problem, mesh)
    if coarse.bias is None:
        return response(sides, coarse.excitations)
    bias = finely_integrated(solution_on_finer_mesh(coarse.bias, sides, parent, EXACT))
    return response(bias.sides, coarse.excitations, bias)


def _tensor(sides: Sides, bias: FieldSolution | None) -> Tensor:
    """Return the law linearised at the mean of both sides' H, or at none."""
    if bias is None:
        h = np.zeros_like(sides.potential.source)
    else:
        h = 0.5 * (bias.potential.field + bias.flux.secant[:, None] * bias.flux.field)
    across, along = sides.laws.of_field_strength(np.hypot(h[:, 0], h[:, 1]))
    return Tensor(h, across, along)


def _flux_fields(
    sides: Sides, tensor: Tensor, turns: Sequence[Array]
) -> tuple[Array, Array, Array]:
    """Return B of each excitation, the lower form, and the linkages.

    The form is -2 F for any admissible fields, so that it bounds whatever the solver's rounding.
    """
    side = sides.flux
    loads = np.stack([turns_load(sides.discretisation, side.numbering, t) for t in turns], axis=1)
    matrix = side.hessian(tensor.bias, 1.0 / tensor.across, 1.0 / tensor.along)
    x = solved(matrix, loads, side.numbering.ordering)
    b = np.stack([side.change(column) for column in x.T])
    linked = x.T @ loads
    stored = _products(b, np.stack([tensor.field_strength(one) for one in b]), side.weight)
    return b, linked + linked.T - stored, linked


def _potential_fields(
    sides: Sides, tensor: Tensor, turns: Sequence[Array]
) -> tuple[Array, Array, Array]:
    """Return H of each excitation, the upper form, and the linkages with the source fields."""
    side = sides.potential
    sources = source_fields(
        sides.discretisation, np.concatenate(turns, axis=1), sides.laws.permeability
    )
    ones = np.ones_like(tensor.across)
    loads = np.stack([-side.tested(tensor.flux_density(s), ones) for s in sources], axis=1)
    matrix = side.hessian(tensor.bias, tensor.across, tensor.along)
    x = solved(matrix, loads, side.numbering.ordering)
    h = sources + np.stack([side.change(column) for column in x.T])
    b = np.stack([tensor.flux_density(one) for one in h])
    return h, _products(h, b, side.weight), _products(b, sources, side.weight)


def _products(one: Array, other: Array, weight: Array) -> Array:
    """Return the integrals of a . b for all pairs of fields (n, elements, 2, points), (n, n)."""
    weighted = (weight[:, None] * one).reshape(len(one), -1)
    return np.asarray(weighted @ other.reshape(len(other), -1).T)
