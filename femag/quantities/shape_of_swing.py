"""What it costs that B of a saturating core does not follow the current in proportion."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from femag.field.swing import Swing, end_levels, halved_levels
from femag.quantities.waveform_factor import loop_shares, steps_between
from femag.ripple import Ripple

Array = NDArray[np.float64]

FEWEST_STEPS, MOST_STEPS = 4, 32
CLOSE = 5e-3
"""Change of the core's loss, as a share, by the last halving of the steps; the rest is a third."""
_BLOCK = 64
"""Loops taken together, to bound the memory."""


def shape_ratio(
    between: Swing,
    inside: NDArray[np.bool_],
    loss: Array,
    ripple: Ripple,
    exponents: tuple[float, float],
) -> Array:
    """Return the loss with B followed through the ripple over that with B in proportion.

    Where a step of one n-th of the current takes the share s of the swing, |dB/dt| is n s times as
    large, and a minor loop swings by the sum of the shares that it covers. The steps are halved
    until the loss of the whole core hardly changes.

    Parameters
    ----------
    between : Swing
        The fields.
    inside : array of bool, (elements,)
        Elements of the core.
    loss : array, (core elements, points)
        Loss with B in proportion, W.
    ripple : Ripple
        The waveform.
    exponents : tuple of float
        alpha and beta, of frequency and of flux density.

    Returns
    -------
    array, (core elements, points)

    Raises
    ------
    NumericalError
        If a field between the ends of the ripple cannot be solved.
    """
    ratio = np.ones_like(loss)
    if between.is_straight:
        return ratio
    whole = np.maximum(_magnitude(between.change_of_sides[0][inside]), 1e-300)
    levels = end_levels(between)
    while len(levels) <= MOST_STEPS:
        levels, before = halved_levels(between, levels), ratio
        steps = len(levels) - 1
        changes = [between.side.change(high - low)[inside] for low, high in pairwise(levels)]
        slopes = np.stack([steps * _magnitude(change) / whole for change in changes], axis=-1)
        ratio = _ratio_of_slopes(slopes, ripple, exponents)
        moved = abs(np.sum(loss * (ratio - before)))
        if steps >= FEWEST_STEPS and moved < CLOSE * np.sum(loss * ratio):
            break
    return ratio


def _ratio_of_slopes(slopes: Array, ripple: Ripple, exponents: tuple[float, float]) -> Array:
    """Return the ratio for relative slopes of B in equal steps of current, (..., steps)."""
    alpha, beta = exponents
    loops = loop_shares(ripple, alpha, slopes.shape[-1])
    edges = np.linspace(0.0, 1.0, slopes.shape[-1] + 1)
    covered = np.array([steps_between(loop.low, loop.high, edges) for loop in loops])
    weights = np.array([loop.weights for loop in loops])
    in_proportion = np.sum(covered.sum(axis=1) ** (beta - alpha) * weights.sum(axis=1))
    powers, ratio = slopes**alpha, np.zeros(slopes.shape[:-1])
    for start in range(0, len(loops), _BLOCK):
        block = slice(start, start + _BLOCK)
        swings = np.maximum(slopes @ covered[block].T, 1e-300)
        ratio += np.sum(swings ** (beta - alpha) * (powers @ weights[block].T), axis=-1)
    return np.asarray(ratio / in_proportion)


def _magnitude(b: Array) -> Array:
    return np.asarray(np.hypot(b[:, 0], b[:, 1]))
