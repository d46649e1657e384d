"""Magnetisation curves through given points."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError, number
from femag.materials.curves import HIGHEST_PERMEABILITY
from femag.materials.lookup import Lookup, lookup
from femag.materials.shape_preserving import increasing_spline
from femag.materials.steinmetz import Steinmetz
from femag.units import MU_0

Array = NDArray[np.float64]

FEWEST_POINTS = 3
ACCEPTED = "three or more pairs (H, B) in A/m and T, with H and B - mu0 H rising from the origin"
"""The origin itself does not count."""
FIELD_STRENGTHS = (1e-9, 1e9)
"""Smallest and largest H of a point, A/m."""
ROUNDING = 1e-12
"""Fall of the polarisation over the largest one that is taken for rounding."""


@dataclass(frozen=True)
class TabulatedCurve:
    r"""A curve through points, with a quadratic spline of the polarisation in between.

    .. math:: B = \mu_0 H + J(H)

    The slope of J is continuous, piecewise linear and nowhere negative. Beyond the last point
    H_n J follows the law of approach to saturation, and goes on with the same value and slope:

    .. math:: J = J_s - c/H^2, \quad c = J'(H_n) H_n^3 / 2

    Parameters
    ----------
    points : tuple of (float, float)
        Field strength in A/m and flux density in T. The origin may be left out.
    name : str
        For print.
    source : str
        Where the points come from, for print.
    notes : tuple of str
        What was done to the data on the way, for print.
    loss : Steinmetz, optional
        Parameters of the core loss.

    Raises
    ------
    InputError
        If the points are too few, or H or the polarisation falls.

    References
    ----------
    Law of approach: R. Becker and W. Doering, Ferromagnetismus, Springer 1939 (from memory).
    """

    points: tuple[tuple[float, float], ...]
    name: str = ""
    source: str = ""
    notes: tuple[str, ...] = ()
    loss: Steinmetz | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "points", _checked_points(self.points))
        object.__setattr__(self, "notes", tuple(self.notes))
        for key in ("name", "source", "notes"):
            value = getattr(self, key)
            for text in value if key == "notes" else (value,):
                if not isinstance(text, str) or not text.isprintable():
                    raise InputError(
                        "not printable", key=key, value=text, accepted="printable text in one line"
                    )

    @property
    def is_linear(self) -> bool:
        """Whether B is proportional to H."""
        return False

    @property
    def initial_permeability(self) -> float:
        """Relative permeability at H = 0."""
        return float(self._pieces.slope[0]) / MU_0

    @property
    def saturation(self) -> float:
        """Polarisation at infinite field, T, as extrapolated."""
        return self._tail.saturation

    @property
    def label(self) -> str:
        """One line for tables and figures: name, source, size and what was done to the data."""
        h, b = self.points[-1]
        parts = [
            f"{self.name or 'table of points'}{f' ({self.source})' if self.source else ''}",
            f"initial permeability {self.initial_permeability:.4g}",
            f"{b:g} T at {h:g} A/m, beyond it to a polarisation of {self.saturation:.3g} T",
        ]
        return "; ".join([", ".join(parts), *self.notes])

    def flux_density(self, field_strength: Array) -> Array:
        """B in T for H in A/m."""
        h = np.asarray(field_strength, dtype=float)
        pieces, tail = self._pieces, self._tail
        i = pieces.of_h.index_of(h)
        x = h - pieces.h[i]
        b = np.asarray(pieces.b[i] + x * (pieces.slope[i] + x * pieces.half_bend[i]))
        beyond = h > tail.start
        if np.any(beyond):
            b[beyond] = tail.flux_density(h[beyond])
        return b

    def differential_permeability(self, field_strength: Array) -> Array:
        """dB/dH in H/m at H in A/m."""
        h = np.asarray(field_strength, dtype=float)
        pieces, tail = self._pieces, self._tail
        i = pieces.of_h.index_of(h)
        slope = pieces.slope[i] + 2.0 * (h - pieces.h[i]) * pieces.half_bend[i]
        slope = np.asarray(np.maximum(slope, MU_0))
        beyond = h > tail.start
        if np.any(beyond):
            slope[beyond] = tail.slope(h[beyond])
        return slope

    def field_strength(self, flux_density: Array) -> Array:
        """H in A/m for B in T: a quadratic equation in each piece."""
        b = np.asarray(flux_density, dtype=float)
        pieces, tail = self._pieces, self._tail
        i = pieces.of_b.index_of(b)
        rise, slope = b - pieces.b[i], pieces.slope[i]
        root = np.sqrt(np.maximum(slope**2 + 4.0 * pieces.half_bend[i] * rise, 0.0))
        h = np.asarray(pieces.h[i] + 2.0 * rise / (slope + root))
        beyond = b > tail.start_b
        if np.any(beyond):
            h[beyond] = tail.field_strength(b[beyond])
        return h

    def coenergy_density(self, field_strength: Array) -> Array:
        """Integral of B dH from 0 to H, J/m3."""
        h = np.asarray(field_strength, dtype=float)
        pieces, tail = self._pieces, self._tail
        i = pieces.of_h.index_of(h)
        x = h - pieces.h[i]
        inner = pieces.b[i] + x * (pieces.slope[i] / 2.0 + x * pieces.half_bend[i] / 3.0)
        coenergy = np.asarray(pieces.coenergy[i] + x * inner)
        beyond = h > tail.start
        if np.any(beyond):
            coenergy[beyond] = tail.coenergy_density(h[beyond])
        return coenergy

    def energy_density(self, flux_density: Array) -> Array:
        """Integral of H dB from 0 to B, J/m3."""
        h = self.field_strength(flux_density)
        return flux_density * h - self.coenergy_density(h)

    @cached_property
    def _pieces(self) -> _Pieces:
        return _pieces(self.points)

    @cached_property
    def _tail(self) -> _Tail:
        return _tail(self._pieces)


@dataclass(frozen=True)
class _Pieces:
    """B(H) between knots: b + slope x + half_bend x^2, x = H - h; the last entry ends the table."""

    h: Array
    b: Array
    slope: Array
    half_bend: Array
    coenergy: Array
    of_h: Lookup
    of_b: Lookup


@dataclass(frozen=True)
class _Tail:
    """B = mu0 H + saturation - reach / H^2 from H = start on."""

    start: float
    start_b: float
    start_coenergy: float
    saturation: float
    reach: float

    def flux_density(self, h: Array) -> Array:
        return MU_0 * h + self.saturation - self.reach / h**2

    def slope(self, h: Array) -> Array:
        return MU_0 + 2.0 * self.reach / h**3

    def coenergy_density(self, h: Array) -> Array:
        beyond = h - self.start
        rise = self.saturation + 0.5 * MU_0 * (h + self.start) - self.reach / (h * self.start)
        return self.start_coenergy + beyond * rise

    def field_strength(self, b: Array) -> Array:
        """Return H by Newton's method from below, which rises to the root: B(H) is concave."""
        h = np.maximum((b - self.saturation) / MU_0, self.start)
        for _ in range(60):
            step = (b - self.flux_density(h)) / self.slope(h)
            h = h + np.maximum(step, 0.0)
            if np.all(step <= 4e-16 * h):
                break
        return np.asarray(h)


def _pieces(points: Sequence[tuple[float, float]]) -> _Pieces:
    h, b = np.array(points).T
    j = np.maximum.accumulate(b - MU_0 * h)
    knots = increasing_spline(h, j, approach_slope(h[-2:], j[-2:]))
    x, width = knots.x, np.diff(knots.x)
    value, slope = knots.value + MU_0 * x, knots.slope + MU_0
    half_bend = 0.5 * np.diff(slope) / width
    steps = width * (value[:-1] + width * (slope[:-1] / 2.0 + width * half_bend / 3.0))
    coenergy = np.concatenate([[0.0], np.cumsum(steps)])
    inner = slice(1, -1)
    return _Pieces(
        x,
        value,
        slope,
        np.append(half_bend, 0.0),
        coenergy,
        of_h=lookup(x[inner]),
        of_b=lookup(value[inner]),
    )


def _tail(pieces: _Pieces) -> _Tail:
    h, b = float(pieces.h[-1]), float(pieces.b[-1])
    slope = float(pieces.slope[-1]) - MU_0
    return _Tail(
        start=h,
        start_b=b,
        start_coenergy=float(pieces.coenergy[-1]),
        saturation=b - MU_0 * h + slope * h / 2.0,
        reach=slope * h**3 / 2.0,
    )


def approach_slope(h: Array, j: Array) -> float:
    """Return dJ/dH at the second of two points of J = J_s - c/H^2, H in A/m and J in T."""
    c = (j[1] - j[0]) / (1.0 / h[0] ** 2 - 1.0 / h[1] ** 2)
    return float(2.0 * c / h[1] ** 3)


def _checked_points(points: object) -> tuple[tuple[float, float], ...]:
    if not isinstance(points, Sequence) or isinstance(points, str):
        raise InputError("not points", key="points", value=points, accepted=ACCEPTED)
    for pair in points:
        if not isinstance(pair, Sequence) or isinstance(pair, str) or len(pair) != 2:
            raise InputError("not a pair", key="points", value=pair, accepted=ACCEPTED)
    pairs = [(number(h, "points", ACCEPTED), number(b, "points", ACCEPTED)) for h, b in points]
    if not pairs or pairs[0] != (0.0, 0.0):
        pairs.insert(0, (0.0, 0.0))
    if len(pairs) <= FEWEST_POINTS:
        raise InputError(f"too few points: {len(pairs) - 1}", key="points", accepted=ACCEPTED)
    h, b = np.array(pairs).T
    _require_increase(h, b)
    return tuple(pairs)


def _require_increase(h: Array, b: Array) -> None:
    if not np.all(np.isfinite(h) & np.isfinite(b)):
        raise InputError("a point is not finite", key="points", accepted=ACCEPTED)
    smallest, largest = FIELD_STRENGTHS
    if h[1] < smallest or h[-1] > largest:
        raise InputError(
            "H out of range", key="points", accepted=f"{smallest:g} A/m to {largest:g} A/m"
        )
    j = b - MU_0 * h
    for step, fall in ((np.diff(h), 0.0), (np.diff(j), -ROUNDING * np.max(np.abs(b)))):
        bad = np.flatnonzero(step <= 0.0 if fall == 0.0 else step < fall)
        if len(bad):
            at = int(bad[0]) + 1
            name = "H does not rise" if fall == 0.0 else "B rises less than mu0 H"
            raise InputError(
                f"{name} up to the point ({h[at]:g} A/m, {b[at]:g} T)", key="points",
                accepted=ACCEPTED,
            )  # fmt: skip
    highest = float(np.max(j[1:] / h[1:])) / MU_0 + 1.0
    if highest > HIGHEST_PERMEABILITY or j[-1] <= 0.0:
        raise InputError(
            f"relative permeability {highest:.3g} out of range", key="points",
            accepted=f"points with B/(mu0 H) above 1 up to {HIGHEST_PERMEABILITY:g}",
        )  # fmt: skip
