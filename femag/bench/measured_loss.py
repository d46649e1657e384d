"""Loss parameters of a material from loops at several frequencies and flux densities."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import PurePath

import numpy as np

from femag.bench.loop import Loop
from femag.errors import InputError
from femag.materials import Steinmetz, steinmetz_through

DISTORTION = 0.03
"""Harmonics of B over its fundamental (root of the sum of squares) that still pass for a sine; a
triangle has 0.12."""

SPREAD = 0.1
"""Least standard deviation of ln f and ln B together, in whatever direction: two frequencies that
are a quarter apart have 0.11."""

SPREAD_ASKED = (
    "frequencies and flux densities that each differ by a quarter or more, not only together"
)


@dataclass(frozen=True)
class MeasuredLoss:
    """Loss densities under sines, and the parameters through them.

    Parameters
    ----------
    readings : tuple of (float, float, float)
        Frequency in Hz, peak flux density in T, loss density in W/m3 of each capture.
    captures : tuple of str
        Their names, without folders.
    fit : Steinmetz or None
        The parameters; None where a note says why they cannot be had.
    notes : tuple of str
        What was left out, and why.
    """

    readings: tuple[tuple[float, float, float], ...]
    captures: tuple[str, ...]
    fit: Steinmetz | None
    notes: tuple[str, ...]


def measured_loss(loops: Sequence[Loop], temperature: float | None = None) -> MeasuredLoss:
    """Return the loss of loops whose flux is a sine, and Steinmetz's parameters through it.

    Loops with a bias, with a flux that is no sine, or without a loss above 0 are left out, and that
    is noted.

    Parameters
    ----------
    loops : sequence of Loop
        Of one material.
    temperature : float, optional
        Of the core while it was measured, degrees Celsius.
    """
    why_not = [(loop, _why_not(loop)) for loop in loops]
    usable = [loop for loop, reason in why_not if reason is None]
    notes = [f"not in the loss: {_name(loop)}, {reason}" for loop, reason in why_not if reason]
    readings = tuple(
        (loop.frequency, loop.readings.peak_flux_density, loop.loss_density) for loop in usable
    )
    fit = None
    try:
        fit = _fit(readings, temperature)
    except InputError as error:
        asked = f" (needed: {error.accepted})" if error.accepted else ""
        notes.append(f"no loss parameters: {error.problem}{asked}")
    return MeasuredLoss(readings, tuple(map(_name, usable)), fit, tuple(notes))


def _fit(readings: Sequence[tuple[float, float, float]], temperature: float | None) -> Steinmetz:
    if len(readings) < 3:
        raise InputError(f"{len(readings)} captures with a sine", accepted="3 or more")
    frequency, flux_density, loss_density = np.array(readings).T
    logarithms = np.log(np.column_stack([frequency, flux_density]))
    least = np.linalg.svd(logarithms - logarithms.mean(axis=0), compute_uv=False)[-1]
    if least < SPREAD * np.sqrt(len(readings)):
        raise InputError("the captures are too much alike", accepted=SPREAD_ASKED)
    try:
        return steinmetz_through(frequency, flux_density, loss_density, temperature, "bench")
    except InputError as error:
        raise InputError(
            f"fitted {error.key} = {error.value:.3g}", accepted=error.accepted
        ) from error


def _why_not(loop: Loop) -> str | None:
    """Return why a loop says nothing of the loss under a sine, None if it does."""
    if loop.measured.bias:
        return "it has a bias"
    if loop.loss_density <= 0.0:
        return "its loss is not above 0"
    lines = np.abs(np.fft.rfft(loop.flux_density))
    distortion = float(np.linalg.norm(lines[2:]) / lines[1])
    if distortion > DISTORTION:
        return f"its flux is no sine ({distortion:.1%} of harmonics)"
    return None


def loss_toml(loss: MeasuredLoss, heading: str) -> str:
    """Return the readings as a table of a material file, each with its capture beside it.

    Parameters
    ----------
    loss : MeasuredLoss
        The readings.
    heading : str
        Dotted key of the table, such as "curve.loss".
    """
    rows = "".join(
        f'  ["{f:.6g} Hz", "{b:.5g} T", "{p:.5g} W/m3"],  # {_printable(name)}\n'
        for (f, b, p), name in zip(loss.readings, loss.captures, strict=True)
    )
    return f'[{heading}]\nsource = "bench"\nreadings = [\n{rows}]\n'


def _name(loop: Loop) -> str:
    return PurePath(loop.name).name


def _printable(text: str) -> str:
    return "".join(letter if letter.isprintable() else " " for letter in text)
