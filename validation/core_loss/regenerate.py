r"""Core loss of the one-dimensional pot by the published equation, integrated over time.

B is uniform in post and return, from the root of `validation.nonlinear_pot.regenerate`. The
improved generalised Steinmetz equation, with k_i by quadrature of its integral and the minor loops
separated by hand, is summed over small steps of the period, once with B in proportion to the
current between trough and peak (`proportional`) and once with B as it follows the current
(`followed`).

Run ``python -m validation.core_loss.regenerate`` to write reference.csv.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.integrate import quad

from validation.nonlinear_pot.regenerate import HEIGHT, POST, RETURN, WALL, pot_values
from validation.rows import write_table

Array = NDArray[np.float64]

K, ALPHA, BETA = 1.5, 1.45, 2.6
FREQUENCY = 100e3
STEPS = 2000
"""Of each stretch of the period: the sum of a power of B's slope is then off by less than 1e-6."""
VOLUMES = math.pi * POST**2 * HEIGHT, math.pi * (WALL**2 - RETURN**2) * HEIGHT
LOOPS: dict[str, tuple[tuple[tuple[float, float, float], ...], ...]] = {
    "triangle": (((0.0, 1.0, 0.3), (1.0, 0.0, 0.7)),),
    "two minor loops": (
        ((0.6, 0.4, 0.1), (0.4, 0.6, 0.1)),
        ((0.7, 0.8, 0.04), (0.8, 0.7, 0.025)),
        ((0.0, 0.6, 0.3), (0.6, 1.0, 0.2), (1.0, 0.7, 0.06), (0.7, 0.0, 0.175)),
    ),
}
"""Loops of each waveform, separated by hand: stretches from one share of the ripple to another in a
share of the period."""
CASES = (
    ("triangle", 100.0, 90.0),
    ("triangle", 1000.0, 900.0),
    ("two minor loops", 100.0, 90.0),
    ("sine", 10.0, 20.0),
)
"""Waveform, peak and ripple in A."""


def flux_densities(current: float) -> tuple[float, float]:
    """Return B of post and return in T, odd in the current (A)."""
    if current == 0.0:
        return 0.0, 0.0
    values = pot_values(abs(current))
    sign = math.copysign(1.0, current)
    return sign * values["B_post"], sign * values["B_return"]


def constant() -> float:
    """Return k_i by quadrature of the published integral."""
    quarter, _ = quad(lambda t: math.cos(t) ** ALPHA, 0.0, math.pi / 2.0, epsabs=1e-13)
    return float(K / ((2.0 * math.pi) ** (ALPHA - 1.0) * 4.0 * quarter * 2.0 ** (BETA - ALPHA)))


def loss(waveform: str, b: Callable[[Array], Array]) -> float:
    """Return the loss density in W/m3 of B (T) as a function of the share of the ripple."""
    if waveform == "sine":
        phase = np.linspace(0.0, 1.0, 4 * STEPS + 1)
        return _summed(b(0.5 - 0.5 * np.cos(2.0 * np.pi * phase)), np.diff(phase))
    return sum(_loss_of_loop(loop, b) for loop in LOOPS[waveform])


def _loss_of_loop(loop: Sequence[tuple[float, float, float]], b: Callable[[Array], Array]) -> float:
    values = [b(np.linspace(start, end, STEPS + 1)) for start, end, _ in loop]
    swing = max(part.max() for part in values) - min(part.min() for part in values)
    return sum(
        _summed(part, np.full(STEPS, share / STEPS), swing)
        for part, (_, _, share) in zip(values, loop, strict=True)
    )


def _summed(b: Array, shares: Array, swing: float | None = None) -> float:
    """Return the sum of k_i |dB/dt|^alpha swing^(beta - alpha) over shares of the period."""
    swing = float(np.ptp(b)) if swing is None else swing
    slopes = np.abs(np.diff(b)) / shares * FREQUENCY
    return float(constant() * swing ** (BETA - ALPHA) * np.sum(shares * slopes**ALPHA))


def lines() -> list[dict[str, str]]:
    """Return the lines of reference.csv."""
    table = []
    for waveform, peak, ripple in CASES:
        grid = np.linspace(0.0, 1.0, STEPS + 1)
        fields = np.array([flux_densities(peak - ripple * (1.0 - share)) for share in grid]).T
        proportional = followed = 0.0
        for field, volume in zip(fields, VOLUMES, strict=True):
            proportional += volume * loss(waveform, _through(grid[[0, -1]], field[[0, -1]]))
            followed += volume * loss(waveform, _through(grid, field))
        table.append(
            {
                "waveform": waveform, "peak": f"{peak:g}", "ripple": f"{ripple:g}",
                "proportional": f"{proportional:.9e}", "followed": f"{followed:.6e}",
                "mark": "computed",
            }
        )  # fmt: skip
    return table


def _through(grid: Array, field: Array) -> Callable[[Array], Array]:
    return lambda share: np.interp(share, grid, field)


if __name__ == "__main__":
    write_table("core_loss", lines())
