"""Smoothing of a periodic signal with corners: wide windows only where it is smooth."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal, get_args

import numpy as np
from scipy.ndimage import correlate1d

from femag.bench.capture import Array

WIDEST = 0.06
"""Half width of the widest window, as a share of the period."""

CONFIDENCE = 2.0
"""Standard deviations that an interval reaches to either side."""

Side = Literal["before", "both", "after"]


def smoothed(signal: Array, noise: float) -> Array:
    """Return a periodic signal with its noise averaged out and its corners kept.

    At every phase, parabolas are fitted to ever wider windows before, around and after it. Each
    window is widened as long as its confidence interval still meets all those of the narrower ones;
    the three results are averaged with the inverse of their variances.

    Parameters
    ----------
    signal : array, shape (phases,)
        One period.
    noise : float
        Standard deviation of a sample; 0 gives the signal back.

    References
    ----------
    A. Goldenshluger and A. Nemirovski, Math. Methods Stat. 6 (1997) 135; V. Katkovnik, IEEE Trans.
    Signal Process. 47 (1999) 2567: intersection of confidence intervals (both from memory).
    """
    if noise <= 0.0:
        return signal.copy()
    total, weights = np.zeros_like(signal), np.zeros_like(signal)
    for side in get_args(Side):
        estimate, deviation = _widest_that_agrees(signal, noise, side)
        total += estimate / deviation**2
        weights += deviation**-2.0
    return total / weights


def _widest_that_agrees(signal: Array, noise: float, side: Side) -> tuple[Array, Array]:
    """Return estimates with the widest admissible windows, and their standard deviations."""
    best, deviation = signal.copy(), np.full_like(signal, noise)
    low, high = best - CONFIDENCE * noise, best + CONFIDENCE * noise
    widening = np.ones(signal.shape, dtype=bool)
    for reach in _reaches(signal.size):
        weights = _parabola_weights(reach, side)
        spread = noise * float(np.sqrt(np.sum(np.square(weights))))
        estimate = correlate1d(signal, weights, mode="wrap")
        low = np.maximum(low, estimate - CONFIDENCE * spread)
        high = np.minimum(high, estimate + CONFIDENCE * spread)
        widening &= low <= high
        best = np.where(widening, estimate, best)
        deviation = np.where(widening, spread, deviation)
    return best, deviation


def _reaches(phases: int) -> Sequence[int]:
    """Return half widths in samples, growing by a factor of about 1.5."""
    reaches, widest = [3], WIDEST * phases
    while 1.5 * reaches[-1] <= widest:
        reaches.append(round(1.5 * reaches[-1]))
    return reaches


def _parabola_weights(reach: int, side: Side) -> Array:
    """Return the weights that give the fitted parabola's value at the window's middle sample."""
    place = np.arange(-reach, reach + 1) / reach
    used = {"before": place <= 0.0, "both": place <= 1.0, "after": place >= 0.0}[side]
    columns = np.vander(place, 3, increasing=True) * used[:, None]
    return np.asarray(np.linalg.pinv(columns)[0])
