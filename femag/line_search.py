"""Step lengths for minimising a convex function along Newton's directions."""

from __future__ import annotations

from collections.abc import Callable

STEEPNESS = 0.5
"""Share of the first slope that may be left."""
LONGEST_STEP = 2.0**40
MAXIMUM_TRIALS = 100


def step_length(slope_at: Callable[[float], float], decrement: float) -> float:
    """Return a step length where at most half of the slope along the step is left.

    The slope of a convex function rises along the step. Where it is still steep after a full
    step the step is doubled, which the flat stretches of a saturated core need; then the zero is
    bracketed.

    Parameters
    ----------
    slope_at : callable
        Derivative of the function along the step, at a step length.
    decrement : float
        Minus the slope at length 0, that is Newton's decrement squared.
    """
    allowed = STEEPNESS * decrement
    if decrement <= 0.0:
        return 1.0
    low, high, slope_low, slope_high = 0.0, 1.0, -decrement, slope_at(1.0)
    while slope_high < -allowed and high < LONGEST_STEP:
        low, slope_low, high = high, slope_high, 2.0 * high
        slope_high = slope_at(high)
    length, slope = high, slope_high
    for _ in range(MAXIMUM_TRIALS):
        if abs(slope) <= allowed:
            break
        if slope < 0.0:
            low, slope_low = length, slope
        else:
            high, slope_high = length, slope
        share = slope_low / (slope_low - slope_high)
        length = low + min(max(share, 0.1), 0.9) * (high - low)
        slope = slope_at(length)
    return length
