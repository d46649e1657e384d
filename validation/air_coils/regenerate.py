r"""Inductances of thick coils in open space, from the Bessel integral.

Two coaxial filaments have :math:`M = \mu_0 \pi r r' \int_0^\infty J_1(kr) J_1(kr')
e^{-k|z-z'|} dk`. Averaged over two rectangles this is

.. math:: M = \mu_0 \pi \int_0^\infty p(k)\, p'(k)\, q(k)\, dk

with p the mean of r J_1(kr) over a coil's radii (Struve functions) and q the mean of the
exponential over both heights. The integrand of a self-inductance falls like k^-4: the rule is
a composite Gauss rule up to 2e4 over the outer radius, and the mean of the rest is added.

Run ``python -m validation.air_coils.regenerate`` to write reference.csv.

References
----------
NIST Digital Library of Mathematical Functions, 10.22 and 11.2, for the Bessel integrals.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import j0, j1, struve

from validation.rows import write_table

Array = NDArray[np.float64]

MU_0 = 4e-7 * math.pi
LARGEST = 2e4
"""Largest k times the outer radius."""
INTERVALS = 6_000


@dataclass(frozen=True)
class Coil:
    """A rectangle of uniform current density: radii, height and middle in m."""

    inner: float
    outer: float
    height: float
    middle: float = 0.0

    @property
    def label(self) -> str:
        """The lengths in mm."""
        lengths = (self.inner, self.outer, self.height, self.middle)
        return " ".join(f"{1e3 * length:g}" for length in lengths)


COILS = (
    Coil(10e-3, 20e-3, 10e-3),
    Coil(10e-3, 20e-3, 20e-3),
    Coil(10e-3, 12e-3, 40e-3),
    Coil(5e-3, 15e-3, 5e-3),
)
PAIR = (Coil(10e-3, 20e-3, 10e-3), Coil(10e-3, 15e-3, 10e-3, 20e-3))


def mutual_inductance(one: Coil, other: Coil) -> float:
    """Return the inductance between two coils of one turn in H; the self-inductance if equal."""
    k, weight = wave_numbers(max(one.outer, other.outer))
    kernel = radial_mean(k, one) * radial_mean(k, other) * axial_mean(k, one, other)
    tail = _mean_tail(one) if one == other else 0.0
    return float(MU_0 * math.pi * (np.sum(weight * kernel) + tail))


def wave_numbers(radius: float) -> tuple[Array, Array]:
    """Return nodes and weights of the composite Gauss rule."""
    points, weights = np.polynomial.legendre.leggauss(12)
    step = LARGEST / radius / INTERVALS
    nodes = step * (np.arange(INTERVALS)[:, None] + (points + 1.0) / 2.0)
    return nodes.ravel(), np.tile(weights * step / 2.0, INTERVALS)


def radial_mean(k: Array, coil: Coil) -> Array:
    """Return the mean of r J_1(kr) over a coil's radii, m."""

    def integral(r: float) -> Array:
        x = k * r
        crossed = j1(x) * struve(0, x) - j0(x) * struve(1, x)
        return np.asarray(0.5 * np.pi * x * crossed / k**2)

    return (integral(coil.outer) - integral(coil.inner)) / (coil.outer - coil.inner)


def _mean_tail(coil: Coil) -> float:
    """Return the integral beyond the last node, without its oscillation.

    There p^2 tends to (r1 + r2)/(pi k^3 w^2) on average and q to 2/(k height).
    """
    largest, width = LARGEST / coil.outer, coil.outer - coil.inner
    factor = 2.0 * (coil.inner + coil.outer) / (math.pi * width**2 * coil.height)
    return factor / (3.0 * largest**3)


def axial_mean(k: Array, one: Coil, other: Coil) -> Array:
    """Return the mean of exp(-k |z - z'|) over both heights."""
    distance = abs(one.middle - other.middle)
    if distance == 0.0 and one.height == other.height:
        x = k * one.height
        small = 1.0 - x / 3.0 + x**2 / 12.0 - x**3 / 60.0 + x**4 / 360.0 - x**5 / 2520.0
        exact = 2.0 * (x + np.expm1(-x)) / np.maximum(x, 1e-30) ** 2
        return np.asarray(np.where(x < 1e-2, small, exact))
    if distance < 0.5 * (one.height + other.height):
        raise ValueError("coils that share some of their height only are not covered")
    clearance = distance - 0.5 * (one.height + other.height)
    rise = np.expm1(-k * one.height) * np.expm1(-k * other.height)
    return np.asarray(np.exp(-k * clearance) * rise / (k**2 * one.height * other.height))


def lines() -> list[dict[str, str]]:
    """Return the lines of reference.csv: lengths are inner, outer, height and middle in mm."""
    table = [_line("L", coil, coil) for coil in COILS]
    return [*table, _line("M", *PAIR)]


def _line(quantity: str, one: Coil, other: Coil) -> dict[str, str]:
    value = mutual_inductance(one, other)
    return {
        "quantity": quantity,
        "coil_mm": one.label,
        "other_coil_mm": other.label if quantity == "M" else "",
        "inductance": f"{value:.11e}",
        "mark": "computed",
    }


if __name__ == "__main__":
    write_table("air_coils", lines())
