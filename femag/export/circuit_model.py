r"""A saturable inductor for circuit simulators, as a subcircuit in plain SPICE syntax.

A capacitor integrates the voltage of the winding to its flux linkage, and one behavioural source
draws the current that belongs to it. That current is a broken line through the curve, written as

.. math:: f(x) = s_n x + \sum_k \tfrac{1}{2} (s_k - s_{k-1}) (|x - x_k| - |x + x_k|)

which is odd, has the slope s_k between the breaks x_k and x_{k+1}, and goes on with the last slope.

References
----------
L. O. Chua and S. M. Kang, "Section-wise piecewise-linear functions: canonical representation,
properties, and applications", Proc. IEEE 65 (1977) 915, for sums of absolute values (from memory).
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicHermiteSpline

from femag.current_curve import InductanceCurve
from femag.design import Design
from femag.errors import InputError, NumericalError
from femag.export.whole_file import whole_file
from femag.quantities import wound_copper

Array = NDArray[np.float64]

CLOSE = 2e-4
"""Largest distance of the broken line from the smooth curve, over the flux linkage."""
SAMPLES = 64
MOST_SAMPLES = 4000
"""Of the smooth curve between two points and in all, among which the breaks are chosen."""
STEEPEST = 3.0
"""Slope of a cubic over that of its chord up to which it is monotone (Fritsch and Carlson 1980)."""
NAME_LENGTH, TITLE_LENGTH = 40, 70


@dataclass(frozen=True)
class BrokenLine:
    """Current against flux linkage in straight pieces from the origin on, odd.

    Parameters
    ----------
    flux_linkage, current : array, (n,)
        Ends of the pieces, rising, the origin first; Wb and A.
    last_slope : float
        Incremental inductance beyond the last end, H.
    """

    flux_linkage: Array
    current: Array
    last_slope: float


def write_circuit(curve: InductanceCurve, path: str | Path) -> None:
    """Write a curve as a subcircuit: complete or not there.

    Raises
    ------
    InputError
        If there is a magnet in the gap, or the file cannot be written.
    NumericalError
        If the flux linkage does not rise with the current.
    """
    text = circuit_text(curve)
    with whole_file(path) as temporary:
        temporary.write_text(text, encoding="ascii", newline="\n")


def broken_line(curve: InductanceCurve) -> BrokenLine:
    """Return a broken line within `CLOSE` of the cubics through the curve's points.

    The cubics have the incremental inductance as their slope, cut where they would not be monotone.

    Raises
    ------
    InputError
        If there is a magnet in the gap: the curve is not the same for both signs then.
    NumericalError
        If the flux linkage does not rise with the current.
    """
    check_model(curve.design)
    points = sorted(curve.points, key=lambda point: abs(point.current))
    driven = [point for point in points if point.current != 0.0]
    current = np.array([0.0, *(abs(point.current) for point in driven)])
    linkage = np.array([0.0, *(abs(point.flux_linkage) for point in driven)])
    slope = np.array([curve.initial_inductance, *(p.incremental_inductance for p in driven)])
    chord = np.diff(linkage) / np.diff(current)
    if not (np.all(chord > 0.0) and np.all(slope > 0.0)):
        raise NumericalError("the flux linkage does not rise with the current; a lower tolerance")
    least = np.minimum(np.append(chord, np.inf), np.append(np.inf, chord))
    smooth = CubicHermiteSpline(current, linkage, np.minimum(slope, STEEPEST * least))
    samples = max(min(SAMPLES, MOST_SAMPLES // len(driven)), 1)
    parts = np.arange(samples) / samples
    fine = np.append((current[:-1, None] + np.diff(current)[:, None] * parts).ravel(), current[-1])
    breaks = _breaks(fine, smooth(fine))
    return BrokenLine(smooth(fine)[breaks], fine[breaks], float(slope[-1]))


def check_model(design: Design) -> None:
    """Refuse a design that has no circuit model.

    Raises
    ------
    InputError
        If there is a magnet in the gap.
    """
    if any(gap.magnet is not None for gap in design.gaps):
        raise InputError(
            "a magnet makes the two directions of current differ", key="gap.magnet",
            accepted="a gap without a magnet, for a circuit model",
        )  # fmt: skip


def _breaks(current: Array, linkage: Array) -> list[int]:
    """Return the first and last sample, and those between that straight pieces may join.

    Each piece is as long as it can be with all samples near it.
    """
    breaks, last = [0], len(current) - 1
    while breaks[-1] < last:
        start, end = breaks[-1], breaks[-1] + 1
        while end < last and _is_straight(current[start : end + 2], linkage[start : end + 2]):
            end += 1
        breaks.append(end)
    return breaks


def _is_straight(current: Array, linkage: Array) -> bool:
    chord = np.interp(current, current[[0, -1]], linkage[[0, -1]])
    return bool(np.all(np.abs(chord - linkage) <= CLOSE * linkage))


def circuit_text(curve: InductanceCurve) -> str:
    """Return a curve as a subcircuit.

    Raises
    ------
    InputError
        If there is a magnet in the gap.
    NumericalError
        If the flux linkage does not rise with the current.
    """
    line, design = broken_line(curve), curve.design
    name, full = subcircuit_name(design), float(line.flux_linkage[-1])
    resistance, known = _resistance(design)
    inner = "m" if resistance else "a"
    lines = [
        *_comments(curve, line, known),
        f".subckt {name} a b",
        *([f"Rdc a m {resistance!r}"] if resistance else []),
        f"* V(x) is the flux linkage over {full!r} Wb",
        f"Gflux 0 x {inner} b 1",
        f"Cflux x 0 {full!r}",
        f"Bcore {inner} b I =",
        *_source(line, full),
        f".ends {name}",
    ]
    return "\n".join(lines) + "\n"


def subcircuit_name(design: Design) -> str:
    """Return a name of letters, digits and underscores made from the design's title."""
    words = re.sub(r"[^a-z0-9]+", "_", design.title.lower()).strip("_")[:NAME_LENGTH].rstrip("_")
    return f"inductor_{words}" if words else "inductor"


def _comments(curve: InductanceCurve, line: BrokenLine, resistance: str) -> list[str]:
    design = curve.design
    title = design.title.encode("ascii", "replace").decode()[:TITLE_LENGTH] or "untitled"
    return [
        f"* Saturable inductor: {title}",
        f"* gapfield {curve.versions['gapfield']}, design hash {curve.design_hash}",
        f"* {design.turns} turns; {len(line.current) - 1} straight pieces up to "
        f"{line.current[-1]:g} A",
        f"* within {100 * CLOSE:g} % of a smooth curve through the solved points.",
        f"* Beyond {line.current[-1]:g} A the incremental inductance there, "
        f"{line.last_slope:.6g} H, goes on:",
        "* a guess; solve to a higher current instead.",
        "* The same for both signs of current. No hysteresis, no core loss, no capacitance.",
        f"* {resistance}",
        "* The incremental inductance changes in steps from piece to piece.",
    ]


def _resistance(design: Design) -> tuple[float, str]:
    """Return the DC resistance in ohm of the driven windings, 0 if unknown, and a remark."""
    driven = [winding.name for winding in design.driven_windings]
    wound = [copper for copper in wound_copper(design) if copper.name in driven]
    if len(wound) < len(driven):
        return 0.0, "No resistance: the design does not say what the winding is wound with."
    resistance = sum(copper.resistance for copper in wound)
    temperatures = ", ".join(sorted({f"{copper.temperature:g} C" for copper in wound}))
    return resistance, f"DC resistance {resistance:.6g} ohm at {temperatures}; nothing for AC."


def _source(line: BrokenLine, full: float) -> list[str]:
    """Return the lines of the source's expression, in A for V(x) = flux linkage / `full`."""
    x = line.flux_linkage / full
    slope = np.append(np.diff(line.current) / np.diff(x), full / line.last_slope)
    terms = [f"+ {slope[-1]:.12e}*V(x)"]
    for place, change in zip(x[1:], 0.5 * np.diff(slope), strict=True):
        terms.append(f"+ {change:+.12e}*(abs(V(x)-{place:.12e})-abs(V(x)+{place:.12e}))")
    return terms
