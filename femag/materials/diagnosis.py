"""Points as measured or copied to a curve: what is wrong with them is treated and said, or refused.

The tolerance below is our own choice: data sheets are read off to about a percent.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.materials.curves import HIGHEST_PERMEABILITY
from femag.materials.tabulated import FEWEST_POINTS, ROUNDING, TabulatedCurve
from femag.units import MU_0

Array = NDArray[np.float64]

TOLERANCE = 0.005
"""Largest change of B that is made to a point, over the largest B."""
HIGHEST_POLARISATION = 5.0
"""T; no material reaches half of it."""
MOST_LOOP_TURNS = 4
"""Turning points of H in the order of the rows up to which the rows are taken for a loop."""
NORMAL_CURVE = "the normal curve (tips of loops at several drives), which 'gapfield bench' makes"
_SHARE = f"{100 * TOLERANCE:g} % of the largest B"


@dataclass(frozen=True)
class _Points:
    """Points in the first quadrant with what was done to them; `turns` is that of H in the rows."""

    h: Array
    b: Array
    notes: tuple[str, ...]
    turns: int
    mirrored: bool = False

    @property
    def allowed(self) -> float:
        """Largest change of B, T."""
        return TOLERANCE * float(np.max(np.abs(self.b), initial=0.0))


def curve_through(
    field_strength: Array,
    flux_density: Array,
    *,
    name: str = "",
    source: str = "",
    notes: Sequence[str] = (),
) -> TabulatedCurve:
    """Return the curve through points in any order, as far as they are one.

    Parameters
    ----------
    field_strength, flux_density : array, (points,)
        H in A/m and B in T, both of either sign.
    name, source : str
        For print.
    notes : sequence of str
        What was done before.

    Raises
    ------
    InputError
        If the points are no magnetisation curve; it says what they look like.
    """
    h, b = np.asarray(field_strength, dtype=float), np.asarray(flux_density, dtype=float)
    if not np.all(np.isfinite(h) & np.isfinite(b)):
        raise _refused("a point is not finite", "numbers")
    points = _Points(h, b, tuple(notes), _turns(h))
    points = _without_duplicates(_sorted(_mirrored(_without_origin(points))))
    if len(points.h) < FEWEST_POINTS:
        raise _refused(
            f"too few points: {len(points.h)}", f"{FEWEST_POINTS} or more besides the origin"
        )
    _require_plausible_units(points)
    points = _rising(points)
    pairs = tuple(zip(points.h.tolist(), points.b.tolist(), strict=True))
    return TabulatedCurve(pairs, name, source, points.notes)


def _without_origin(points: _Points) -> _Points:
    at_zero = points.h == 0.0
    remanence = float(np.max(np.abs(points.b[at_zero]), initial=0.0))
    if remanence > points.allowed:
        raise _refused(
            f"B is {remanence:.3g} T at H = 0, so this is a loop with remanence", NORMAL_CURVE
        )
    notes = points.notes
    if remanence > 0.0:
        notes += (f"B of {remanence:.2g} T at H = 0 taken as 0",)
    return _Points(points.h[~at_zero], points.b[~at_zero], notes, points.turns)


def _mirrored(points: _Points) -> _Points:
    """Return the points with those of the third quadrant turned into the first."""
    sign = np.sign(points.h)
    wrong = int(np.sum(sign * points.b < -points.allowed))
    if wrong:
        raise _refused(f"points with H and B of opposite sign, as on a loop: {wrong}", NORMAL_CURVE)
    count = int(np.sum(sign < 0.0))
    notes = points.notes
    if count:
        notes += (f"points of the third quadrant mirrored into the first: {count}",)
    return _Points(sign * points.h, sign * points.b, notes, points.turns, count > 0)


def _sorted(points: _Points) -> _Points:
    order = np.lexsort((points.b, points.h))
    return _Points(points.h[order], points.b[order], points.notes, points.turns, points.mirrored)


def _without_duplicates(points: _Points) -> _Points:
    """Return the points with one for each H, at the mean B."""
    h, b = points.h, points.b
    group = np.cumsum(np.diff(h, prepend=-1.0) > 1e-9 * h) - 1
    sizes = np.bincount(group)
    mean_h, mean_b = (np.bincount(group, values) / sizes for values in (h, b))
    apart = np.abs(b - mean_b[group])
    if np.any(apart > points.allowed):
        worst = int(np.argmax(apart))
        raise _two_valued(points, f"B differs at H = {h[worst]:.4g} A/m")
    notes = points.notes
    if np.any(sizes > 1):
        notes += (f"values of H that occur more than once, B averaged: {int(np.sum(sizes > 1))}",)
    return _Points(mean_h, mean_b, notes, points.turns, points.mirrored)


def _require_plausible_units(points: _Points) -> None:
    polarisation = float(np.max(points.b - MU_0 * points.h))
    permeability = float(np.max(points.b / points.h)) / MU_0
    if polarisation > HIGHEST_POLARISATION:
        raise _refused(
            f"B reaches {np.max(points.b):.3g} T, which no material does",
            "the units that the numbers are in; gauss (G) or mT perhaps",
        )
    if permeability > HIGHEST_PERMEABILITY:
        raise _refused(
            f"the relative permeability reaches {permeability:.2g}, which no material has",
            "the units that the numbers are in; H in oersted (Oe) or kA/m, or B in gauss (G)",
        )
    if permeability < 1.0:
        raise _refused(
            f"B is below mu0 H throughout (relative permeability {permeability:.2g} at most)",
            "the units that the numbers are in; a polarisation in a column headed J",
        )


def _rising(points: _Points) -> _Points:
    """Return the points with the nearest polarisation that does not fall (least squares)."""
    j = points.b - MU_0 * points.h
    if np.all(np.diff(j, prepend=0.0) >= -ROUNDING * np.max(points.b)):
        return points
    from scipy.optimize import isotonic_regression

    level = np.maximum(isotonic_regression(j).x, 0.0)
    moved = np.abs(level - j)
    if np.max(moved) > points.allowed:
        raise _not_rising(points, int(np.argmax(moved)))
    notes = points.notes
    if np.max(moved) > 1e-9 * np.max(points.b):
        count, most = int(np.sum(moved > 0.0)), float(np.max(moved))
        notes += (
            f"points moved so that B - mu0 H does not fall: {count}, by at most {most:.2g} T",
        )
    return _Points(points.h, level + MU_0 * points.h, notes, points.turns, points.mirrored)


def _not_rising(points: _Points, worst: int) -> InputError:
    """Return the refusal of points that fall by more than the tolerance."""
    at = slice(max(worst - 1, 0), worst + 2)
    falls = bool(np.any(np.diff(points.b[at], prepend=0.0 if worst == 0 else -np.inf) < 0.0))
    what = "B falls" if falls else "B rises more slowly than mu0 H"
    return _two_valued(points, f"{what} near H = {points.h[worst]:.4g} A/m")


def _two_valued(points: _Points, problem: str) -> InputError:
    """Return the refusal of points that are no curve, with what they look like."""
    within = f" by more than {_SHARE}"
    if points.mirrored:
        accepted = "first and third quadrant alike: take off the offsets of H and B"
        return _refused(f"{problem}{within}", accepted)
    if 1 <= points.turns <= MOST_LOOP_TURNS:
        return _refused(f"H rises and falls, and {problem}{within}: a whole loop", NORMAL_CURVE)
    return _refused(f"{problem}{within}", "B rising with H, at least as fast as mu0 H")


def _turns(h: Array) -> int:
    """Return how often H turns back in the order of the rows."""
    direction = np.sign(np.diff(h))
    direction = direction[direction != 0.0]
    return int(np.sum(direction[1:] != direction[:-1]))


def _refused(problem: str, accepted: str) -> InputError:
    return InputError(problem, key="points", accepted=accepted)
