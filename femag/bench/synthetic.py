"""Invented captures with hysteresis in closed form, to test and to show the way from one to a loop.

The branches are one saturating curve F, shifted to either side and moved until they meet at the
tips:

    B = F(H - h) + c rising,  B = F(H + h) - c falling,  c = (F(Hm + h) - F(Hm - h)) / 2

with F(H) = J H / sqrt(H^2 + a^2). All that is read off a loop follows in closed form.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, get_args

import numpy as np

from femag.bench.capture import Array, Capture, CoreUnderTest
from femag.units import MU_0

Waveform = Literal["sine", "square", "triangle"]
Driven = Literal["voltage", "current"]
WAVEFORMS: tuple[Waveform, ...] = get_args(Waveform)

RISE = 0.08
"""Share of the period that an edge of a square current takes; a jump takes infinite voltage."""


@dataclass(frozen=True)
class InventedMaterial:
    """A material with loops in closed form.

    Parameters
    ----------
    saturation : float
        J, T.
    knee : float
        a, A/m.
    shift : float
        h of a wide loop, A/m; a loop with peak Hm has h = shift Hm / (Hm + 2 shift).
    """

    saturation: float = 0.47
    knee: float = 60.0
    shift: float = 20.0

    def loop(self, peak: float) -> InventedLoop:
        """Return the loop with a peak field strength in A/m."""
        return InventedLoop(self, peak)


@dataclass(frozen=True)
class InventedLoop:
    """One loop of an invented material; its properties are exact.

    Parameters
    ----------
    material : InventedMaterial
        What it is a loop of.
    peak : float
        Peak field strength, A/m.
    """

    material: InventedMaterial
    peak: float

    def _mean_curve(self, h: Array | float) -> Array:
        return np.asarray(self.material.saturation * h / np.hypot(h, self.material.knee))

    def _slope(self, h: Array | float) -> Array:
        a = self.material.knee
        return np.asarray(self.material.saturation * a**2 / np.hypot(h, a) ** 3)

    def _inverse(self, b: Array | float) -> Array:
        j = self.material.saturation
        return np.asarray(self.material.knee * b / np.sqrt(j**2 - np.square(b)))

    @property
    def _shift(self) -> float:
        return self.material.shift * self.peak / (self.peak + 2.0 * self.material.shift)

    @property
    def _lift(self) -> float:
        high, low = (self._mean_curve(self.peak + s * self._shift) for s in (1, -1))
        return 0.5 * float(high - low)

    @property
    def peak_flux_density(self) -> float:
        """T."""
        high, low = (self._mean_curve(self.peak + s * self._shift) for s in (1, -1))
        return 0.5 * float(high + low)

    @property
    def remanence(self) -> float:
        """T."""
        return float(self._mean_curve(self._shift)) - self._lift

    @property
    def coercive_field(self) -> float:
        """A/m."""
        return self._shift - float(self._inverse(self._lift))

    @property
    def loss_per_cycle(self) -> float:
        """Area of the loop, J/m3."""
        high, low = (np.hypot(self.peak + s * self._shift, self.material.knee) for s in (1, -1))
        return float(2.0 * self.material.saturation * (high - low) - 4.0 * self._lift * self.peak)

    @property
    def remanence_permeability(self) -> float:
        """Slope over mu0 at H = 0."""
        return float(self._slope(self._shift)) / MU_0

    @property
    def tip_permeability(self) -> float:
        """Slope over mu0 just after a tip."""
        return float(self._slope(self.peak + self._shift)) / MU_0

    def from_field(self, h: Array, rate: Array) -> tuple[Array, Array]:
        """Return B and dB/dt for H and dH/dt, arrays of equal shape."""
        way = np.where(rate >= 0.0, 1.0, -1.0)
        moved = h - way * self._shift
        return self._mean_curve(moved) + way * self._lift, self._slope(moved) * rate

    def from_flux_density(self, b: Array, rate: Array) -> Array:
        """Return H for B and dB/dt."""
        way = np.where(rate >= 0.0, 1.0, -1.0)
        return np.asarray(self._inverse(b - way * self._lift) + way * self._shift)


@dataclass(frozen=True)
class Recording:
    """How an invented capture was recorded.

    Parameters
    ----------
    frequency : float
        Hz.
    waveform : {"sine", "square", "triangle"}
        Of what is driven.
    driven : {"voltage", "current"}
        What has that waveform. A square current has edges of 8 % of the period.
    periods : float
        Length of the record.
    samples : float
        Samples in a period.
    phase : float
        Where in the period the record begins, as a share of it.
    noise : float
        Standard deviation of the noise on both channels, over their peaks.
    offset : float
        Offset of both channels, over their peaks.
    drift : float
        By how much the offset changes in a period, over the peaks.
    seed : int
        Of the noise.
    """

    frequency: float = 10e3
    waveform: Waveform = "sine"
    driven: Driven = "voltage"
    periods: float = 10.3
    samples: float = 1000.0
    phase: float = 0.1
    noise: float = 0.0
    offset: float = 0.0
    drift: float = 0.0
    seed: int = 1


def invented_capture(
    loop: InventedLoop, core: CoreUnderTest, recording: Recording | None = None
) -> Capture:
    """Return a capture of an invented loop.

    Parameters
    ----------
    loop : InventedLoop
        The exact loop.
    core : CoreUnderTest
        Turns, section and path.
    recording : Recording, optional
        Drive, time base and what is wrong with the channels.
    """
    set_up = recording or Recording()
    places = set_up.phase + np.arange(int(set_up.periods * set_up.samples)) / set_up.samples
    if set_up.driven == "voltage":
        shape, rate = _integrated_waveform(places % 1.0, set_up.waveform)
        peak = loop.peak_flux_density
        h = loop.from_flux_density(peak * shape, rate)
        b_rate = peak * rate
    else:
        shape, rate = _waveform(places % 1.0, set_up.waveform)
        h = loop.peak * shape
        _, b_rate = loop.from_field(h, loop.peak * rate)
    current = h * core.path_length / core.drive_turns
    voltage = b_rate * set_up.frequency * core.sense_turns * core.area
    random = np.random.default_rng(set_up.seed)
    age = np.arange(places.size) / set_up.samples
    current, voltage = (
        x + np.abs(x).max() * (set_up.offset + set_up.drift * age
        + set_up.noise * random.standard_normal(x.size))
        for x in (current, voltage)
    )  # fmt: skip
    step = 1.0 / (set_up.frequency * set_up.samples)
    return Capture(f"invented {set_up.waveform} {set_up.driven}", step, current, voltage)


def _waveform(place: Array, waveform: Waveform) -> tuple[Array, Array]:
    """Return a waveform of peak 1 and its derivative by the share of the period."""
    if waveform == "sine":
        return np.sin(2.0 * np.pi * place), 2.0 * np.pi * np.cos(2.0 * np.pi * place)
    edge = RISE if waveform == "square" else 0.5
    # a straight edge up around 0, flat, a straight edge down around 1/2, flat
    up = np.clip((0.5 - np.abs((place + 0.25) % 1.0 - 0.5)) * 2.0 / edge - 0.5 / edge, -1.0, 1.0)
    centred = (place + edge / 2.0) % 1.0
    rising, falling = centred < edge, (centred >= 0.5) & (centred < 0.5 + edge)
    return up, 2.0 / edge * (rising.astype(float) - falling.astype(float))


def _integrated_waveform(place: Array, waveform: Waveform) -> tuple[Array, Array]:
    """Return the integral of a waveform, scaled to peak 1, and its derivative, the waveform."""
    if waveform == "sine":
        return -np.cos(2.0 * np.pi * place), 2.0 * np.pi * np.sin(2.0 * np.pi * place)
    if waveform == "square":
        return 4.0 * np.minimum(place, 1.0 - place) - 1.0, np.where(place < 0.5, 4.0, -4.0)
    half = place % 0.5
    way = np.where(place < 0.5, 1.0, -1.0)
    ramp = np.where(half < 0.25, half, 0.5 - half)
    bow = np.where(half < 0.25, 16.0 * half**2 - 1.0, 1.0 - 16.0 * (0.5 - half) ** 2)
    return way * bow, way * 32.0 * ramp


DEMO_CORE = CoreUnderTest(drive_turns=12, sense_turns=12, area=60e-6, path_length=60e-3)
DEMO_SCALE = "10 A/V"
DEMO_PEAKS = (12.0, 25.0, 50.0, 100.0, 200.0)


def demo_files() -> dict[str, str]:
    """Return name and text of invented captures of an invented ring at several drives.

    Sinusoidal voltage at 5 kHz, noise of half a per cent, offset and drift; the current as the
    voltage of a probe with 0.1 V/A.
    """
    files = {}
    for number, peak in enumerate(DEMO_PEAKS, start=1):
        recording = Recording(
            frequency=5e3,
            periods=8.4,
            samples=500,
            noise=0.005,
            offset=0.02,
            drift=1e-3,
            seed=number,
        )
        capture = invented_capture(InventedMaterial().loop(peak), DEMO_CORE, recording)
        files[f"invented-{number}.csv"] = capture_csv(capture, volts_per_ampere=0.1)
    return files


def capture_csv(capture: Capture, volts_per_ampere: float) -> str:
    """Return a capture as a scope might write it: lines of its own, then time and two channels."""
    time = capture.step * np.arange(capture.current.size)
    table = np.column_stack((1e3 * time, volts_per_ampere * capture.current, capture.voltage))
    rows = "\n".join(f"{t:.6f},{i:.6g},{v:.6g}" for t, i, v in table)
    return (
        f"Invented capture,no measurement\nRecord length,{time.size}\n"
        f"Time,Drive current,Sense voltage\n(ms),(V),(V)\n{rows}\n"
    )
