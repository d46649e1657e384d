"""Ripple: the part of the drive that repeats, about its mean, with its exact Fourier series."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import Literal, get_args

import numpy as np
from numpy.typing import ArrayLike, NDArray

from femag.errors import InputError, number

Array = NDArray[np.float64]
ComplexArray = NDArray[np.complex128]

Shape = Literal["triangle", "sine", "samples"]
SHAPES: tuple[Shape, ...] = get_args(Shape)

RIPPLES = (1e-12, 1e9)
"""Smallest and largest ripple, A peak to peak."""
FREQUENCIES = (1e-3, 1e9)
"""Lowest and highest frequency, Hz."""
RISES = (1e-3, 1.0 - 1e-3)
"""Least and largest share of the period in which a triangle rises."""
MOST_SAMPLES = 10_000
MOST_HARMONICS = 4096
SAMPLES = (
    "at least 3 pairs of share of the period and current in A: shares that grow from 0 to 1, first "
    f"and last current equal, at most {MOST_SAMPLES} pairs"
)
_BLOCK = 256
"""Harmonics taken together, to bound the memory."""


@dataclass(frozen=True)
class Ripple:
    """The alternating part of a current that is periodic.

    The current of the drive is the peak, ripple included; the mean follows from it. A negative
    peak turns the whole waveform over.

    Parameters
    ----------
    peak_to_peak : float
        Highest less lowest current, A.
    frequency : float
        Hz.
    shape : {"triangle", "sine", "samples"}
        How the current goes over a period. Triangle and sine start at their lowest.
    rise : float
        Share of the period in which a triangle rises.
    samples : tuple of (float, float)
        With shape "samples": share of the period, and current in A, which may have a mean; straight
        lines between, shares from 0 to 1, first and last current equal.

    Raises
    ------
    InputError
        If a number cannot be used.
    """

    peak_to_peak: float
    frequency: float
    shape: Shape = "triangle"
    rise: float = 0.5
    samples: tuple[tuple[float, float], ...] = ()

    def __post_init__(self) -> None:
        _check_within("ripple", self.peak_to_peak, RIPPLES, "A")
        _check_within("frequency", self.frequency, FREQUENCIES, "Hz")
        _check_within("rise", self.rise, RISES)
        if self.shape not in SHAPES:
            raise InputError(
                "not a shape", key="drive.shape", value=self.shape,
                accepted=" or ".join(map(repr, SHAPES)),
            )  # fmt: skip
        if self.shape != "samples" and self.samples:
            raise InputError(
                f"samples do not go with a {self.shape}", key="drive.waveform",
                accepted="shape 'samples'",
            )  # fmt: skip
        if self.shape == "samples":
            _check_samples(self.samples, self.peak_to_peak)

    @classmethod
    def of_samples(cls, samples: ArrayLike, frequency: float) -> Ripple:
        """Return the ripple through samples of one period.

        Parameters
        ----------
        samples : array_like, shape (n, 2)
            Share of the period, and current in A; straight lines between.
        frequency : float
            Hz.

        Raises
        ------
        InputError
            If they cannot be used.
        """
        table = np.asarray(samples, dtype=float)
        if table.ndim != 2 or table.shape[1] != 2 or len(table) < 3:
            raise InputError("not usable", key="drive.waveform", accepted=SAMPLES)
        pairs = tuple((float(share), float(current)) for share, current in table)
        return cls(float(np.ptp(table[:, 1])), frequency, "samples", samples=pairs)

    @cached_property
    def corners(self) -> tuple[Array, Array]:
        """Shares of the period, from 0 to 1, and currents about the mean in A, of straight pieces.

        Those of a sine are its lowest and highest points; it is not straight between them.
        """
        half = 0.5 * self.peak_to_peak
        if self.shape == "samples":
            shares, currents = np.array(self.samples, dtype=float).T
            mean = np.sum(np.diff(shares) * (currents[1:] + currents[:-1])) / 2.0
            return shares, currents - mean
        top = self.rise if self.shape == "triangle" else 0.5
        return np.array([0.0, top, 1.0]), np.array([-half, half, -half])

    @property
    def crest(self) -> float:
        """Highest current about the mean, A."""
        return float(np.max(self.corners[1]))

    def bias(self, peak: float) -> float:
        """Return the mean current in A when `peak` (A) is the peak current."""
        return peak - math.copysign(self.crest, peak)

    def trough(self, peak: float) -> float:
        """Return the current in A at the other end of the ripple when `peak` (A) is the peak."""
        return peak - math.copysign(self.peak_to_peak, peak)

    @cached_property
    def rms(self) -> float:
        """Effective value of the alternating part, A."""
        if self.shape == "sine":
            return self.peak_to_peak / math.sqrt(8.0)
        shares, currents = self.corners
        a, b = currents[:-1], currents[1:]
        return math.sqrt(float(np.sum(np.diff(shares) * (a * a + a * b + b * b))) / 3.0)

    def current(self, phase: ArrayLike) -> Array:
        """Return the current about its mean, A, at shares of the period of any shape and size."""
        share = np.mod(np.asarray(phase, dtype=float), 1.0)
        if self.shape == "sine":
            return np.asarray(-0.5 * self.peak_to_peak * np.cos(2.0 * np.pi * share))
        return np.asarray(np.interp(share, *self.corners))

    def harmonics(self, number: int) -> tuple[Array, ComplexArray]:
        """Return frequencies (Hz) and complex peak amplitudes (A) of the first harmonics.

        The current is the real part of the sum of c_n exp(2 pi i n t f). With straight pieces of
        slope s between the shares p the Fourier integral is exact, without sampling:
        c_n = 2 / (2 pi n)^2 times the sum of s (exp(-2 pi i n p_end) - exp(-2 pi i n p_start)).

        Parameters
        ----------
        number : int
            How many; `enough_harmonics` says how many do.
        """
        orders = np.arange(1, number + 1)
        amplitudes = np.zeros(number, dtype=complex)
        if self.shape == "sine":
            amplitudes[:1] = -0.5 * self.peak_to_peak
        else:
            for start in range(0, number, _BLOCK):
                block = slice(start, start + _BLOCK)
                amplitudes[block] = self._amplitudes(orders[block])
        return orders.astype(float) * self.frequency, amplitudes

    def enough_harmonics(self, rest: float = 1e-3) -> int:
        """Return how many harmonics hold all but a share `rest` of the mean squared slope.

        Loss by eddy currents goes with the squared slope at low frequency, and rises more slowly
        once the skin depth is small, so that the share of the loss left out is below `rest`. No
        more than `MOST_HARMONICS` are asked for.
        """
        if self.shape == "sine":
            return 1
        shares, currents = self.corners
        whole = float(np.sum(np.diff(currents) ** 2 / np.diff(shares)))
        found, count = np.empty(0), 16
        while count <= MOST_HARMONICS:
            _, amplitudes = self.harmonics(count)
            slopes = 2.0 * np.pi * np.arange(1, count + 1) * np.abs(amplitudes)
            found = np.cumsum(0.5 * slopes**2)
            if found[-1] >= (1.0 - rest) * whole:
                return int(np.searchsorted(found, (1.0 - rest) * whole)) + 1
            count *= 2
        return MOST_HARMONICS

    def _amplitudes(self, orders: NDArray[np.int64]) -> ComplexArray:
        shares, currents = self.corners
        lengths = np.diff(shares)
        turns = -2j * np.pi * orders[:, None]
        changes = np.exp(turns * shares[:-1]) * np.expm1(turns * lengths)
        factor = 2.0 / (2.0 * np.pi * orders) ** 2
        return np.asarray(factor * (changes @ (np.diff(currents) / lengths)))


def _check_within(key: str, value: float, limits: tuple[float, float], unit: str = "") -> None:
    accepted = " ".join(f"{limits[0]:g} {unit} to {limits[1]:g} {unit}".split())
    if not limits[0] <= number(value, f"drive.{key}", accepted) <= limits[1]:
        raise InputError("out of range", key=f"drive.{key}", value=value, accepted=accepted)


def _check_samples(samples: tuple[tuple[float, float], ...], peak_to_peak: float) -> None:
    problem = None
    values = [value for pair in samples for value in pair]
    if not 3 <= len(samples) <= MOST_SAMPLES:
        problem = f"{len(samples)} samples"
    elif not all(map(math.isfinite, values)):
        problem = "a sample is not finite"
    elif samples[0][0] != 0.0 or samples[-1][0] != 1.0:
        problem = "the shares do not go from 0 to 1"
    elif any(after[0] <= before[0] for before, after in pairwise(samples)):
        problem = "the shares do not grow"
    elif samples[0][1] != samples[-1][1]:
        problem = "the period does not close"
    elif not math.isclose(np.ptp([current for _, current in samples]), peak_to_peak, rel_tol=1e-9):
        problem = "peak_to_peak is not that of the samples"
    if problem is not None:
        raise InputError(problem, key="drive.waveform", accepted=SAMPLES)
