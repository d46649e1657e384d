"""What follows from a quadratic form that lies between two others.

If upper - form and form - lower are positive semidefinite, then for all vectors v, w and the width
D = upper - lower: v' form v lies between v' lower v and v' upper v; v' form w within half the root
of (v' D v)(w' D w) of its middle, since the form less the middle lies between -D/2 and D/2; and the
least value along a line between the least values of the two, as each is nowhere larger than the
next.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import Bounds

Array = NDArray[np.float64]


@dataclass(frozen=True)
class BoundedForm:
    """A symmetric form between two others, in the sense of quadratic forms.

    Parameters
    ----------
    lower, upper : array, (n, n)
        The bounds, symmetric; the lower is positive definite.
    unit : str
        SI unit of the values.
    """

    lower: Array
    upper: Array
    unit: str

    def value(self, v: Array) -> Bounds:
        """Return the bounds of v' form v."""
        return Bounds(float(v @ self.lower @ v), float(v @ self.upper @ v), self.unit)

    def product(self, v: Array, w: Array) -> Bounds:
        """Return the bounds of v' form w."""
        middle = float(v @ (self.lower + self.upper) @ w) / 2.0
        width = self.upper - self.lower
        one, other = (max(float(u @ width @ u), 0.0) for u in (v, w))
        half = 0.5 * float(np.sqrt(one * other))
        return Bounds(middle - half, middle + half, self.unit)

    def least(self, v: Array, free: Array) -> Bounds:
        """Return the bounds of the least value of the form on the line v + t free."""
        lower, upper = (self._on_line(form, v, free) for form in (self.lower, self.upper))
        return Bounds(lower, upper, self.unit)

    def lowest(self, v: Array, free: Array) -> Array:
        """Return the vector on the line v + t free where the middle of the forms is least."""
        middle = 0.5 * (self.lower + self.upper)
        share = float(v @ middle @ free) / float(free @ middle @ free)
        return np.asarray(v - share * free)

    @staticmethod
    def _on_line(form: Array, v: Array, free: Array) -> float:
        return float(v @ form @ v - (v @ form @ free) ** 2 / (free @ form @ free))


def over(numerator: Bounds, denominator: Bounds) -> Bounds:
    """Return the interval of a quotient whose denominator is positive."""
    ends = [
        n / d
        for n in (numerator.lower, numerator.upper)
        for d in (denominator.lower, denominator.upper)
    ]
    return Bounds(min(ends), max(ends))
