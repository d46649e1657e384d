"""The two branches of a loop, and what is read off them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.polynomial import Polynomial

from femag.bench.capture import Array

REMANENCE_WINDOW = 1.5
"""Coercive fields to either side of H = 0 over which the slope there is fitted."""

TIP_WINDOW = 0.3
"""Share of the peak field strength over which the slope after a tip is fitted."""

LEAST_FITTED = 9
"""Samples in a fit of a cubic."""


@dataclass(frozen=True, eq=False)
class Branch:
    """One side of a loop in the order of time, from one extreme of B to the other.

    Parameters
    ----------
    field_strength, flux_density : array, shape (n,)
        A/m, T.
    """

    field_strength: Array
    flux_density: Array


def branches(field_strength: Array, flux_density: Array) -> tuple[Branch, Branch]:
    """Return the rising and the falling branch of a closed loop, arrays of shape (n,)."""
    size, low = flux_density.size, int(np.argmin(flux_density))
    top = (int(np.argmax(flux_density)) - low) % size
    order = (low + np.arange(size + 1)) % size
    rising, falling = (
        Branch(field_strength[part], flux_density[part]) for part in (order[: top + 1], order[top:])
    )
    return rising, falling


def coercive_field(rising: Branch, falling: Branch) -> float:
    """Return half the width of the loop at B = 0, A/m."""
    right = _value_at_zero(rising.flux_density, rising.field_strength)
    left = _value_at_zero(falling.flux_density, falling.field_strength)
    return 0.5 * (right - left)


def remanence(rising: Branch, falling: Branch) -> float:
    """Return half the height of the loop at H = 0, T."""
    upper = _value_at_zero(falling.field_strength, falling.flux_density)
    lower = _value_at_zero(rising.field_strength, rising.flux_density)
    return 0.5 * (upper - lower)


def _value_at_zero(argument: Array, values: Array) -> float:
    """Return the value where the argument passes zero; the mean where noise makes it do so often.

    For an argument that never does, the value where it comes nearest.
    """
    left = np.flatnonzero(np.signbit(argument[:-1]) != np.signbit(argument[1:]))
    if left.size == 0:
        return float(values[np.argmin(np.abs(argument))])
    share = argument[left] / (argument[left] - argument[left + 1])
    return float(np.mean(values[left] + share * (values[left + 1] - values[left])))


def slope_at_remanence(rising: Branch, falling: Branch) -> float:
    """Return dB/dH where H is 0, mean of both branches, H/m.

    Cubics in time through H and through B, over 1.5 coercive fields to either side but no more than
    half the peak field strength.
    """
    window = REMANENCE_WINDOW * abs(coercive_field(rising, falling))
    return 0.5 * sum(_slope_at_zero_field(branch, window) for branch in (rising, falling))


def _slope_at_zero_field(branch: Branch, window: float) -> float:
    distance = np.abs(branch.field_strength)
    middle = int(np.argmin(distance))
    far = np.flatnonzero(distance > min(window, 0.5 * float(distance.max())))
    reach = max(LEAST_FITTED // 2, int(np.min(np.abs(far - middle), initial=distance.size)) - 1)
    part = slice(max(middle - reach, 0), middle + reach + 1)
    time = np.arange(distance.size, dtype=np.float64)[part] - middle
    zero = _value_at_zero(branch.field_strength[part], time)
    b_rate, h_rate = (
        Polynomial.fit(time, values[part], 3).deriv()(zero)
        for values in (branch.flux_density, branch.field_strength)
    )
    return float(b_rate / h_rate)


def slope_after_tip(rising: Branch, falling: Branch) -> float:
    """Return dB/dH just after H has turned round at a tip, mean of both tips, H/m.

    A cubic H(B) over the first 0.3 of the way of H from the tip to zero.
    """
    return 0.5 * (_slope_at_start(rising) + _slope_at_start(falling))


def _slope_at_start(branch: Branch) -> float:
    distance = np.abs(branch.field_strength - branch.field_strength[0])
    peak = 0.5 * float(np.ptp(branch.field_strength))
    beyond = np.flatnonzero(distance > TIP_WINDOW * peak)
    last = max(LEAST_FITTED, int(beyond[0]) if beyond.size else distance.size)
    b, h = branch.flux_density[:last], branch.field_strength[:last]
    return float(1.0 / Polynomial.fit(b, h, 3).deriv()(b[0]))
