"""What the two sides share: a convex energy of a field that is affine in the unknowns."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix

from femag.field.discretisation import local_matrices
from femag.field.numbering import Numbering

Array = NDArray[np.float64]
Law = Callable[[Array], tuple[Array, Array]]


@dataclass(frozen=True)
class Side:
    """A functional: integral of density(|field|) - current load . x.

    The field is current source + fixed + S x, less a constant in the functional.
    On the flux side the field is B - Br, its density w and the load that of the turns; on the
    potential side the field is H + Br/mu, its density w', the source T, and there is no load. Br is
    the remanence of permanent magnets, zero elsewhere: secant times field is H there and B here.

    Parameters
    ----------
    name : str
        For messages.
    shape : array, (elements, 6, 2, points)
        Field of each local function.
    numbering : Numbering
        Unknown of each local function; where there is none it is fixed at zero.
    source : array, (elements, 2, points)
        Field per ampere of the source.
    load : array, (size,)
        Load per ampere.
    weight : array, (elements, points)
        Volume weights, m3.
    law : callable
        Magnitudes to secant and tangent.
    density : callable
        Magnitudes to energy densities.
    flattens : bool
        Whether saturation lowers the tangent (B of H) or raises it (H of B).
    fixed : array, (elements, 2, points), optional
        What magnets add to the field; None without magnets.
    constant : float
        What is taken off the functional, J.
    """

    name: str
    shape: Array
    numbering: Numbering
    source: Array
    load: Array
    weight: Array
    law: Law
    density: Callable[[Array], Array]
    flattens: bool
    fixed: Array | None = None
    constant: float = 0.0

    @property
    def size(self) -> int:
        """Number of unknowns."""
        return self.numbering.size

    def field(self, x: Array, current: float) -> Array:
        """Return the field at the quadrature points, (elements, 2, points)."""
        return self.change(x) + self.prescribed(current)

    def change(self, x: Array) -> Array:
        """Return the change of the field with a change of the unknowns, (elements, 2, points)."""
        local = np.append(x, 0.0)[self.numbering.unknown]
        elements, _, _, points = self.shape.shape
        return (local[:, None, :] @ self.shape.reshape(elements, 6, -1)).reshape(-1, 2, points)

    def prescribed(self, current: float) -> Array:
        """Return the field that does not hang on the unknowns, (elements, 2, points)."""
        driven = current * self.source
        return driven if self.fixed is None else driven + self.fixed

    def coefficients(self, field: Array) -> tuple[Array, Array]:
        """Return secant and tangent at a field, (elements, points)."""
        return self.law(np.hypot(field[:, 0], field[:, 1]))

    def functional(self, x: Array, current: float) -> float:
        """Return the functional's value, J."""
        field = self.field(x, current)
        stored = np.sum(self.weight * self.density(np.hypot(field[:, 0], field[:, 1])))
        return float(stored - current * self.load @ x) - self.constant

    def gradient(self, field: Array, secant: Array, current: float) -> Array:
        """Return the functional's gradient at a field with its secant, (size,)."""
        return self.tested(field, secant) - current * self.load

    def tested(self, field: Array, secant: Array) -> Array:
        """Return the integral of secant field . shape, (size,)."""
        elements = len(field)
        weighted = (field * (self.weight * secant)[:, None]).reshape(elements, -1, 1)
        local = self.shape.reshape(elements, 6, -1) @ weighted
        return self.numbering.vector(local[..., 0])

    def hessian(
        self, field: Array, secant: Array, tangent: Array, toward: Array | None = None
    ) -> csc_matrix:
        """Return the functional's second derivative.

        With `toward`, unit vectors or shorter, one of the two field directions in it is replaced
        by them and the matrix symmetrised.
        """
        along = unit_vectors(field)
        local = local_matrices(
            self.shape,
            self.weight * secant,
            self.weight * (tangent - secant),
            (along if toward is None else toward, along),
        )
        return self.numbering.matrix(local)


def linearised(
    field: Array, secant: Array, tangent: Array, change: Array, toward: Array | None = None
) -> Array:
    """Return the change of the conjugate field (B for H, H for B) for a change of the field."""
    along = unit_vectors(field)
    share = (tangent - secant) * np.sum(along * change, axis=1)
    return np.asarray(
        secant[:, None] * change + share[:, None] * (along if toward is None else toward)
    )


def unit_vectors(field: Array) -> Array:
    """Return the directions of a field (elements, 2, points); zero where it is zero."""
    magnitude = np.hypot(field[:, 0], field[:, 1])
    return np.asarray(field / np.maximum(magnitude, 1e-300)[:, None])
