r"""Core loss of a waveform over that of a sine of the same swing and frequency.

The improved generalised Steinmetz equation is

.. math:: p = \frac1T \int_0^T k_i \left|\frac{dB}{dt}\right|^\alpha (\Delta B)^{\beta-\alpha} dt,
          \quad k_i = \frac{k}{(2\pi)^{\alpha-1} \int_0^{2\pi} |\cos\theta|^\alpha
          2^{\beta-\alpha} d\theta},

with a waveform of several loops taken apart, each with its own swing. Where B follows the current
in proportion, it is k f^alpha (DeltaB/2)^beta times a number that depends on the shape alone.

References
----------
K. Venkatachalam, C. R. Sullivan, T. Abdallah and H. Tacca, "Accurate prediction of ferrite core
loss with nonsinusoidal waveforms using only Steinmetz parameters", IEEE Workshop on Computers in
Power Electronics 2002 (from memory), for the equation and for taking minor loops apart.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from femag.ripple import Ripple

Array = NDArray[np.float64]

SINE_PIECES = 4096
"""Straight pieces of a sine where its weights in steps of current are wanted."""


@dataclass(frozen=True, eq=False)
class LoopShare:
    """One loop of a waveform.

    Parameters
    ----------
    low, high : float
        Its ends as shares of the whole range of the current; 0 and 1 of the major loop.
    weights : array, (steps,)
        Integral of |dx/dp|^alpha over its part of the period, x the current over the whole range, p
        the share of the period; by equal steps of current, the lowest first.
    """

    low: float
    high: float
    weights: Array

    @property
    def height(self) -> float:
        """Its range over that of the whole waveform."""
        return self.high - self.low

    @property
    def weight(self) -> float:
        """Sum of the weights."""
        return float(self.weights.sum())


def waveform_factor(ripple: Ripple, alpha: float, beta: float) -> float:
    """Return the core loss over that of a sine of equal swing and frequency; 1 for a sine.

    Parameters
    ----------
    ripple : Ripple
        The waveform.
    alpha, beta : float
        Exponents of frequency and of flux density.
    """
    if ripple.shape == "sine":
        return 1.0
    loops = loop_shares(ripple, alpha)
    summed = sum(loop.weight * math.pow(loop.height, beta - alpha) for loop in loops)
    return summed / (math.pow(math.pi, alpha) * mean_power_of_sine(alpha))


def mean_power_of_sine(alpha: float) -> float:
    """Return the mean of |sin|^alpha over a period: Gamma((a+1)/2) / (sqrt(pi) Gamma(a/2 + 1)).

    B(1/2, (a+1)/2)/pi in NIST's Digital Library of Mathematical Functions, 5.12.2.
    """
    logarithm = math.lgamma((alpha + 1.0) / 2.0) - math.lgamma(alpha / 2.0 + 1.0)
    return math.exp(logarithm) / math.sqrt(math.pi)


def loop_shares(ripple: Ripple, alpha: float, steps: int = 1) -> tuple[LoopShare, ...]:
    """Return the loops that straight pieces close, the minor ones first, the major one last.

    A branch that turns back opens a loop, which is closed when the current comes back to where it
    turned; from there the branch before goes on as if nothing had been. The period starts at its
    lowest point. Level pieces count nothing. A sine is taken as many straight pieces.

    Parameters
    ----------
    ripple : Ripple
        The waveform.
    alpha : float
        Exponent of frequency.
    steps : int
        Equal steps of current that the weights are divided into.
    """
    lengths, levels = _from_the_lowest(ripple)
    edges = np.linspace(0.0, 1.0, steps + 1)
    closed: list[LoopShare] = []
    branches = [_Branch(levels[0], np.zeros(steps))]
    rises = True
    for (start, end), length in zip(pairwise(levels), lengths, strict=True):
        if end == start:
            continue
        if (end > start) != rises:
            branches.append(_Branch(start, np.zeros(steps)))
            rises = not rises
        density = float(abs(end - start) / length) ** (alpha - 1.0)
        place = start
        while len(branches) >= 3 and _reaches(end, branches[-2].start, rises):
            turned = branches[-2].start
            branches[-1].weights += density * steps_between(turned, place, edges)
            closed.append(_closed(branches.pop(), branches.pop()))
            place = turned
        branches[-1].weights += density * steps_between(end, place, edges)
    return (*closed, _closed(branches[1], branches[0]))


def steps_between(one: float, other: float, edges: Array) -> Array:
    """Return how much of each step between rising edges lies between two levels, (steps,)."""
    within = np.clip(edges, min(one, other), max(one, other))
    return np.diff(within)


@dataclass
class _Branch:
    """An open branch: where it began, and its weights so far."""

    start: float
    weights: Array


def _reaches(end: float, turned: float, rises: bool) -> bool:
    return end >= turned if rises else end <= turned


def _closed(last: _Branch, before: _Branch) -> LoopShare:
    low, high = sorted((last.start, before.start))
    return LoopShare(low, high, last.weights + before.weights)


def _from_the_lowest(ripple: Ripple) -> tuple[list[float], list[float]]:
    """Return lengths of the straight pieces and levels from 0 to 1, from the lowest on."""
    shares, currents = ripple.corners
    if ripple.shape == "sine":
        shares = np.linspace(0.0, 1.0, SINE_PIECES + 1)
        currents = ripple.current(shares)
    levels = (currents - currents.min()) / np.ptp(currents)
    lowest = int(np.argmin(levels[:-1]))
    lengths = np.roll(np.diff(shares), -lowest)
    turned = np.roll(levels[:-1], -lowest)
    return lengths.tolist(), [*turned.tolist(), float(turned[0])]
