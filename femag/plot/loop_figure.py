"""What the bench measured: B-H loops with the normal curve, and both channels against time."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np

from femag.bench import Loop, MeasuredCurve
from femag.bench.capture import Array
from femag.units import with_unit

if TYPE_CHECKING:
    from matplotlib.axes import Axes

TIME_UNITS = ((1.0, "s"), (1e-3, "ms"), (1e-6, "us"), (1e-9, "ns"))


def loop_figure(loops: Sequence[Loop], ax: Axes, curve: MeasuredCurve | None = None) -> Axes:
    """Draw B-H loops, and the points of a curve over them.

    Parameters
    ----------
    loops : sequence of Loop
        At least one.
    ax : Axes
        Where to draw.
    curve : MeasuredCurve, optional
        Such as the normal curve.
    """
    for loop in loops:
        ax.plot(_closed(loop.field_strength), _closed(loop.flux_density), color="0.45",
                linewidth=1.1)  # fmt: skip
    ax.plot([], [], color="0.45", linewidth=1.1, label="loops" if len(loops) > 1 else "loop")
    if curve is not None:
        h, b = np.array([(0.0, 0.0), *curve.points]).T
        ax.plot(h, b, color="black", marker="o", markersize=4, linewidth=1.6,
                label=curve.kind.split(":")[0])  # fmt: skip
    if len(loops) == 1:
        _mark_readings(loops[0], ax)
    ax.axhline(0.0, color="0.7", linewidth=0.6, zorder=0)
    ax.axvline(0.0, color="0.7", linewidth=0.6, zorder=0)
    ax.set(xlabel="field strength H, A/m", ylabel="flux density B, T", title=_title(loops))
    ax.legend(loc="upper left", frameon=False)
    return ax


def _mark_readings(loop: Loop, ax: Axes) -> None:
    """Mark remanence and coercive field where they are read."""
    read = loop.readings
    if read.remanence is None or read.coercive_field is None:
        return
    ax.plot(0.0, read.remanence, "ks", markersize=5, label=f"$B_r$ = {read.remanence:.4g} T")
    label = f"$H_c$ = {read.coercive_field:.4g} A/m"
    ax.plot(read.coercive_field, 0.0, "k^", markersize=6, label=label)


def _title(loops: Sequence[Loop]) -> str:
    frequencies = [loop.frequency for loop in loops]
    low, high = (with_unit(frequency, "Hz") for frequency in (min(frequencies), max(frequencies)))
    return low if low == high else f"{low} to {high}"


def waveform_figure(loop: Loop, ax: Axes) -> Axes:
    """Draw current and flux density over one period.

    Parameters
    ----------
    loop : Loop
        What to draw.
    ax : Axes
        For the current; a twin of it takes the flux density.
    """
    measured = loop.measured
    size = measured.current.size
    scale, unit = next((one for one in TIME_UNITS if measured.period >= one[0]), TIME_UNITS[-1])
    time = measured.period / scale * np.arange(size + 1) / size
    current = loop.field_strength * loop.core.path_length / loop.core.drive_turns
    ax.plot(time, _closed(current), color="black", linewidth=1.4, label="current")
    twin = ax.twinx()
    twin.plot(time, _closed(loop.flux_density), color="black", linewidth=1.4,
              linestyle=(0, (5, 2)), label="flux density")  # fmt: skip
    for axes, values in ((ax, current), (twin, loop.flux_density)):
        reach = 1.3 * float(np.abs(values).max())
        axes.set_ylim(-reach, reach)
    ax.axhline(0.0, color="0.7", linewidth=0.6, zorder=0)
    ax.set(xlabel=f"time, {unit}", ylabel="current, A", xlim=(0.0, time[-1]))
    ax.set_title(f"mean of {measured.count} periods, {with_unit(loop.frequency, 'Hz')}")
    twin.set_ylabel("flux density, T (dashed)")
    lines = [ax.get_lines()[0], *twin.get_lines()]
    ax.legend(lines, [str(line.get_label()) for line in lines], loc="upper center",
              ncols=2, frameon=False)  # fmt: skip
    return ax


def _closed(values: Array) -> Array:
    return np.append(values, values[0])
