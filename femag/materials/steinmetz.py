"""Core loss of a material under a sine: k f^alpha B^beta, and where it was fitted."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from femag.errors import InputError, number

Array = NDArray[np.float64]

EXPONENTS = {"alpha": (0.5, 3.0), "beta": (1.0, 4.0)}
"""Least and largest exponent of frequency and of flux density; materials lie well within."""
FEWEST_READINGS = 3


@dataclass(frozen=True)
class Steinmetz:
    r"""Mean loss density under a sine of frequency f and peak flux density B.

    .. math:: p = k f^\alpha \hat B^\beta

    Parameters
    ----------
    k : float
        W/m3 at 1 Hz and 1 T, that is W/m3 over Hz^alpha T^beta.
    alpha, beta : float
        Exponents of frequency and of flux density.
    frequencies : tuple of float
        Lowest and highest frequency of what was fitted, Hz.
    flux_densities : tuple of float
        Lowest and highest peak flux density of what was fitted, T.
    temperature : float, optional
        Degrees Celsius; None if not stated.
    source : str
        For print.

    Raises
    ------
    InputError
        If a number cannot be used.

    References
    ----------
    C. P. Steinmetz, "On the law of hysteresis", Trans. AIEE 9 (1892) 1 (from memory), without the
    frequency; the power of frequency is a trade habit.
    """

    k: float
    alpha: float
    beta: float
    frequencies: tuple[float, float]
    flux_densities: tuple[float, float]
    temperature: float | None = None
    source: str = ""

    def __post_init__(self) -> None:
        accepted = "a number above 0, W/m3 over Hz^alpha T^beta"
        if not 0.0 < number(self.k, "k", accepted) < math.inf:
            raise InputError("out of range", key="k", value=self.k, accepted=accepted)
        for key, (least, most) in EXPONENTS.items():
            value, accepted = getattr(self, key), f"{least:g} to {most:g}"
            if not least <= number(value, key, accepted) <= most:
                raise InputError("out of range", key=key, value=value, accepted=accepted)
        for key in ("frequencies", "flux_densities"):
            limits, accepted = getattr(self, key), "lowest and highest, both above 0"
            values = [number(value, key, accepted) for value in limits]
            if len(values) != 2 or not 0.0 < values[0] <= values[1] < math.inf:
                raise InputError("no range", key=key, value=limits, accepted=accepted)
            object.__setattr__(self, key, (values[0], values[1]))
        if not isinstance(self.source, str) or not self.source.isprintable():
            raise InputError(
                "not printable", key="source", value=self.source, accepted="one line of text"
            )

    def loss_density(self, frequency: float, peak: ArrayLike) -> Array:
        """Return the loss density in W/m3 under a sine (Hz) of a peak flux density (T)."""
        peaks = np.asarray(peak, dtype=float)
        return np.asarray(self.k * frequency**self.alpha * peaks**self.beta)


def steinmetz_through(
    frequency: ArrayLike,
    flux_density: ArrayLike,
    loss_density: ArrayLike,
    temperature: float | None = None,
    source: str = "",
) -> Steinmetz:
    """Return the parameters whose logarithm fits readings best, by least squares.

    Parameters
    ----------
    frequency, flux_density, loss_density : array_like, (readings,)
        Hz, peak T and W/m3 of sines.
    temperature : float, optional
        Degrees Celsius.
    source : str
        For print; how many readings there are and how far off the worst is, is added.

    Raises
    ------
    InputError
        If the readings do not fix three parameters, or these are none of a material.
    """
    readings = np.array([frequency, flux_density, loss_density], dtype=float)
    if not np.all((readings > 0.0) & np.isfinite(readings)):
        raise InputError("a reading is not above 0", key="readings", accepted="numbers above 0")
    f, b, p = np.log(readings)
    matrix = np.column_stack([np.ones_like(f), f - f.mean(), b - b.mean()])
    found, _, rank, _ = np.linalg.lstsq(matrix, p, rcond=1e-6)
    if rank < FEWEST_READINGS:
        raise InputError(
            "the readings do not fix three parameters", key="readings",
            accepted=f"{FEWEST_READINGS} or more, at two frequencies and two flux densities",
        )  # fmt: skip
    worst = float(np.max(np.abs(np.expm1(matrix @ found - p))))
    said = f"fitted to {len(p)} readings, worst {100.0 * worst:.2g} % off"
    return Steinmetz(
        k=float(np.exp(found[0] - found[1] * f.mean() - found[2] * b.mean())),
        alpha=float(found[1]),
        beta=float(found[2]),
        frequencies=(float(readings[0].min()), float(readings[0].max())),
        flux_densities=(float(readings[1].min()), float(readings[1].max())),
        temperature=temperature,
        source=f"{source}; {said}" if source else said,
    )


def mean_steinmetz(first: Steinmetz, second: Steinmetz, share: float) -> Steinmetz | None:
    """Return the parameters between two: the logarithm of the loss is interpolated everywhere.

    None where the ranges that the two were fitted in do not meet.

    Parameters
    ----------
    first, second : Steinmetz
        Of two temperatures.
    share : float
        Of the second, from 0 to 1.
    """
    ranges = {}
    for key in ("frequencies", "flux_densities"):
        (low, high), (other_low, other_high) = getattr(first, key), getattr(second, key)
        ranges[key] = (max(low, other_low), min(high, other_high))
        if ranges[key][0] > ranges[key][1]:
            return None
    known = first.temperature is not None and second.temperature is not None
    return Steinmetz(
        k=first.k ** (1.0 - share) * second.k**share,
        alpha=_between(first.alpha, second.alpha, share),
        beta=_between(first.beta, second.beta, share),
        frequencies=ranges["frequencies"],
        flux_densities=ranges["flux_densities"],
        temperature=_between(first.temperature or 0.0, second.temperature or 0.0, share)
        if known
        else None,
        source="; ".join(dict.fromkeys((first.source, second.source))),
    )


def _between(first: float, second: float, share: float) -> float:
    return (1.0 - share) * first + share * second
