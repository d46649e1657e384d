"""Quadratic splines that keep the shape of increasing data: the numbers behind tabulated curves.

A slope is chosen at every point, and each interval gets one knot more, so that the slope runs
straight from one knot to the next and the data are met. Values, slopes, integrals and the inverse
are then closed forms.

References
----------
L. L. Schumaker, "On shape preserving quadratic spline interpolation", SIAM J. Numer. Anal. 20
(1983) 854 (cited from memory; the place of the knot is our own choice).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

NEAREST_KNOT = 0.1
"""Least distance of an added knot from the ends of its interval, as a share of it."""
LEAST_FIRST_SLOPE = 0.25
"""Least slope at the first point over that of the first chord."""


@dataclass(frozen=True)
class Knots:
    """A quadratic spline with a continuous slope.

    Parameters
    ----------
    x, value, slope : array, (knots,)
        At the knots; the slope is linear in between.
    """

    x: Array
    value: Array
    slope: Array


def increasing_spline(x: Array, y: Array, last_slope: float) -> Knots:
    """Return a spline through increasing points whose slope is nowhere negative.

    It is concave between points where the slopes at both ends allow it, and its error falls with
    the third power of the spacing where the data are smooth and dense.

    Parameters
    ----------
    x, y : array, (points,)
        Rising, and not falling.
    last_slope : float
        Wanted at the last point; used as far as the parabola through the last three points is
        not within a factor of 2 of it.
    """
    width, chord = np.diff(x), np.diff(y) / np.diff(x)
    slope = point_slopes(width, chord, last_slope)
    before, after = slope[:-1], slope[1:]
    share = _knot_shares(np.abs(before - chord), np.abs(after - chord))
    between = 2.0 * chord - share * before - (1.0 - share) * after
    left = share * width
    return Knots(
        _interleaved(x, x[:-1] + left),
        _interleaved(y, y[:-1] + 0.5 * left * (before + between)),
        _interleaved(slope, np.maximum(between, 0.0)),
    )


def _knot_shares(first_turn: Array, second_turn: Array) -> Array:
    """Return where in its interval each knot lies: nearer to the end where the slope turns more.

    With these shares the slope at the knot is that of the chord if it falls or rises throughout,
    and the spline changes steadily with the data.
    """
    turn = first_turn + second_turn
    share = np.where(turn > 0.0, second_turn / np.where(turn > 0.0, turn, 1.0), 0.5)
    return np.clip(share, NEAREST_KNOT, 1.0 - NEAREST_KNOT)


def point_slopes(width: Array, chord: Array, last_slope: float) -> Array:
    """Return the slope at each point, at most twice that of either chord beside it.

    With slopes from 0 to twice the chords no slope in between is negative.

    Parameters
    ----------
    width, chord : array, (intervals,)
        Width and slope of each interval, two or more.
    last_slope : float
        As in `increasing_spline`.
    """
    first = _end_slope(width[0], width[1], chord[0], chord[1])
    last = _end_slope(width[-1], width[-2], chord[-1], chord[-2])
    inner = (width[1:] * chord[:-1] + width[:-1] * chord[1:]) / (width[1:] + width[:-1])
    lowest = 2.0 * np.minimum(chord[1:], chord[:-1])
    return np.concatenate(
        [
            [np.clip(first, LEAST_FIRST_SLOPE * chord[0], 2.0 * chord[0])],
            np.minimum(inner, lowest),
            [min(np.clip(last, 0.5 * last_slope, 2.0 * last_slope), 2.0 * chord[-1])],
        ]
    )


def _end_slope(near: float, far: float, near_chord: float, far_chord: float) -> float:
    """Return the slope at an end of the parabola through the three points next to it."""
    return near_chord + (near_chord - far_chord) * near / (near + far)


def _interleaved(ends: Array, between: Array) -> Array:
    merged = np.empty(len(ends) + len(between))
    merged[::2], merged[1::2] = ends, between
    return merged
