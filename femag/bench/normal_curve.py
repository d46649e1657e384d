"""The normal curve, and a material file, from loops at several drives."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import PurePath

import numpy as np

from femag.bench.branches import branches
from femag.bench.loop import Loop
from femag.bench.measured_loss import MeasuredLoss, loss_toml
from femag.errors import InputError
from femag.units import MU_0, with_unit

LEAST_TIPS = 3
"""Loops that make a normal curve."""

EQUAL_FREQUENCY = 0.05
"""Share within which two frequencies are one."""

EQUAL_DRIVE = 0.01
"""Share of H within which two tips are averaged."""

DIGITS = 5
MIDDLE_POINTS = 24


@dataclass(frozen=True)
class MeasuredCurve:
    """A magnetisation curve from the bench.

    Parameters
    ----------
    points : tuple of (float, float)
        H in A/m and B in T, rising.
    kind : str
        How the points were had.
    captures : tuple of str
        Names of the records, without folders.
    frequencies : tuple of float
        Least and largest frequency, Hz.
    notes : tuple of str
        What was treated.
    """

    points: tuple[tuple[float, float], ...]
    kind: str
    captures: tuple[str, ...]
    frequencies: tuple[float, float]
    notes: tuple[str, ...] = ()


def normal_curve(loops: Sequence[Loop]) -> MeasuredCurve:
    """Return the curve through the tips of loops at several drives.

    Tips within 1 % of each other in H are averaged. Where one frequency has three loops or more,
    the lowest such frequency makes the curve alone: loss widens loops as the frequency rises.

    Parameters
    ----------
    loops : sequence of Loop
        At least three different drives, none with a bias.

    Raises
    ------
    InputError
        If they are too few, or B does not rise from each to the next at least as in vacuum.
    """
    _refuse_biased(loops)
    loops, notes = _of_lowest_frequency(loops)
    tips = sorted(
        (loop.readings.peak_field_strength, loop.readings.peak_flux_density, loop.name)
        for loop in loops
    )
    groups: list[list[tuple[float, float, str]]] = []
    for tip in tips:
        if groups and tip[0] <= (1.0 + EQUAL_DRIVE) * groups[-1][0][0]:
            groups[-1].append(tip)
        else:
            groups.append([tip])
    if len(groups) < LEAST_TIPS:
        raise InputError(
            f"{len(groups)} different drives make no normal curve", key="captures",
            accepted=f"captures at {LEAST_TIPS} drives or more",
        )  # fmt: skip
    points = [(_mean(group, 0), _mean(group, 1)) for group in groups]
    for below, above, group in zip(points, points[1:], groups[1:], strict=False):
        if above[1] - below[1] < MU_0 * (above[0] - below[0]):
            raise InputError(
                f"the normal curve falls: {above[1]:.4g} T at {above[0]:.4g} A/m after "
                f"{below[1]:.4g} T at {below[0]:.4g} A/m", file=group[0][2],
                accepted="captures of one core, with the same turns and scales",
            )  # fmt: skip
    merged = len(tips) - len(groups)
    if merged:
        notes = (*notes, f"{merged + 1} captures at nearly equal drive were averaged")
    return _curve(points, "normal curve: tips of loops at several drives", loops, notes)


def _of_lowest_frequency(loops: Sequence[Loop]) -> tuple[list[Loop], tuple[str, ...]]:
    """Return the loops at the lowest frequency that has enough, all if none has; and a note."""
    ordered = sorted(loops, key=lambda loop: loop.frequency)
    for lowest in ordered:
        limits = lowest.frequency, (1.0 + EQUAL_FREQUENCY) * lowest.frequency
        chosen = [loop for loop in ordered if limits[0] <= loop.frequency <= limits[1]]
        if len(chosen) >= LEAST_TIPS:
            said = f"from the {len(chosen)} captures at {with_unit(lowest.frequency, 'Hz')} alone"
            return chosen, (said,) if len(chosen) < len(ordered) else ()
    return ordered, ()


def middle_curve(loop: Loop) -> MeasuredCurve:
    """Return the curve in the middle of a single loop: mean H of both branches at equal B.

    It stands in for the normal curve when there is one drive only. At small fields it is steeper:
    the normal curve starts with the initial permeability, this one near the slope of the branches.

    Raises
    ------
    InputError
        If the loop has a bias, or its middle does not rise.
    """
    _refuse_biased([loop])
    rising, falling = branches(loop.field_strength, loop.flux_density)
    levels = loop.readings.peak_flux_density * np.linspace(-1.0, 1.0, 2 * MIDDLE_POINTS + 1)
    up = np.interp(levels, np.maximum.accumulate(rising.flux_density), rising.field_strength)
    back = np.maximum.accumulate(falling.flux_density[::-1])
    mean = 0.5 * (up + np.interp(levels, back, falling.field_strength[::-1]))
    odd = 0.5 * (mean - mean[::-1])[MIDDLE_POINTS + 1 :]
    points = list(zip(odd.tolist(), levels[MIDDLE_POINTS + 1 :].tolist(), strict=True))
    steps = np.diff(odd, prepend=0.0)
    if np.any(steps <= 0.0):
        raise InputError(
            "the middle of the loop does not rise, noise is too large for it", file=loop.name,
            accepted=f"more periods, or captures at {LEAST_TIPS} drives for a normal curve",
        )  # fmt: skip
    kind = "middle of one loop: mean H of both branches at equal B, no normal curve"
    return _curve(points, kind, [loop], ())


def material_toml(
    curve: MeasuredCurve, name: str, temperature: float = 25.0, loss: MeasuredLoss | None = None
) -> str:
    """Return a material file.

    Parameters
    ----------
    curve : MeasuredCurve
        The points.
    name : str
        Of the material.
    temperature : float
        Of the core while it was measured, degrees Celsius.
    loss : MeasuredLoss, optional
        Its readings go into the file where they fix the loss.
    """
    low, high = (with_unit(frequency, "Hz") for frequency in curve.frequencies)
    span = low if low == high else f"{low} to {high}"
    source = f"bench, {curve.kind}; {span}; {', '.join(curve.captures)}"
    points = ",\n".join(f"  [{h:.{DIGITS}g}, {b:.{DIGITS}g}]" for h, b in curve.points)
    losses = "" if loss is None or loss.fit is None else f"\n{loss_toml(loss, 'curve.loss')}"
    return (
        f"name = {_toml_text(name)}\nsource = {_toml_text(source)}\n\n"
        '[units]\nfield_strength = "A/m"\nflux_density = "T"\n\n'
        f'[[curve]]\ntemperature = "{temperature:g} C"\npoints = [\n{points},\n]\n{losses}'
    )


def _toml_text(text: str) -> str:
    """Return a basic string of TOML, which takes the escapes of JSON."""
    return json.dumps(text.replace("\x7f", " "), ensure_ascii=False)


def _refuse_biased(loops: Sequence[Loop]) -> None:
    for loop in loops:
        if loop.measured.bias:
            raise InputError(
                "a loop with a bias is no point of a magnetisation curve", file=loop.name,
                accepted="captures of an alternating drive",
            )  # fmt: skip


def _mean(group: Sequence[tuple[float, float, str]], place: int) -> float:
    return float(np.mean([tip[place] for tip in group]))


def _curve(
    points: Sequence[tuple[float, float]], kind: str, loops: Sequence[Loop], notes: tuple[str, ...]
) -> MeasuredCurve:
    frequencies = [loop.frequency for loop in loops]
    return MeasuredCurve(
        points=tuple(points),
        kind=kind,
        captures=tuple(PurePath(loop.name).name for loop in loops),
        frequencies=(min(frequencies), max(frequencies)),
        notes=notes,
    )
