"""The bench on the terminal and as JSON: loops, what is read off them, and the curve."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import asdict
from pathlib import Path
from typing import Any

from rich.console import Console
from rich.table import Table
from rich.text import Text

from femag.answer import columns
from femag.bench import Loop, MeasuredCurve, MeasuredLoss
from femag.units import with_unit

FORMAT = "gapfield bench 1"

READINGS = (
    ("peak field strength", "peak_field_strength", "A/m", "half the swing of H"),
    ("peak flux density", "peak_flux_density", "T", "half the swing of B"),
    ("remanence B_r", "remanence", "T", "B at H = 0, mean of both branches"),
    ("coercive field H_c", "coercive_field", "A/m", "H at B = 0, mean of both branches"),
    ("loss per cycle", "loss_per_cycle", "J/m3", "area of the loop"),
    ("amplitude permeability", "amplitude_permeability", "", "peak B over mu0 peak H"),
    ("slope at remanence", "remanence_permeability", "", "dB/dH over mu0 at H = 0"),
    ("slope after the tip", "tip_permeability", "", "dB/dH over mu0 as H turns back"),
)
CAUTION = (
    "Caution: a drive from the mains or above 50 V can kill, and a sense winding of many turns "
    "steps voltages up. Isolate the drive, mind the rating of probes and where their grounds go, "
    "and leave such set-ups to the local codes and licensed practice."
)
ERRORS_NOTE = (
    "Standard errors come from the scatter between periods. They know nothing of gains, of section "
    "and path length, nor of a delay between the channels."
)


def print_bench(
    loops: Sequence[Loop],
    curve: MeasuredCurve | None,
    loss: MeasuredLoss | None,
    console: Console,
) -> None:
    """Print one loop in full or several in a table, then curve and loss if there are any."""
    parts: list[Text | Table | str] = [Text(_core(loops[0])), ""]
    if len(loops) == 1:
        parts += [Text(_recorded(loops[0])), "", _readings(loops[0])]
    else:
        parts += [_table_of(loops)]
    if len(loops) == 1 and loops[0].errors:
        parts += [Text(ERRORS_NOTE)]
    for loop in loops:
        parts += [Text(f"note, {Path(loop.name).name}: {note}") for note in loop.notes]
    if curve is not None:
        parts += [
            "",
            Text(curve.kind),
            _points(curve),
            *(Text(f"note: {note}") for note in curve.notes),
        ]
    if loss is not None:
        parts += ["", Text(_loss(loss)), *(Text(f"note: {note}") for note in loss.notes)]
    for part in (*parts, "", Text(CAUTION)):
        console.print(part, highlight=False)


def _core(loop: Loop) -> str:
    core = loop.core
    return (
        f"{core.drive_turns} drive and {core.sense_turns} sense turns, section "
        f"{1e6 * core.area:.4g} mm2, path {1e3 * core.path_length:.4g} mm"
    )


def _recorded(loop: Loop) -> str:
    measured = loop.measured
    closed = "unknown" if measured.closure is None else f"{measured.closure:.2%} of the flux swing"
    current, voltage = (
        2.0 * noise / float(channel.max() - channel.min())
        for noise, channel in (
            (measured.current_noise, measured.current),
            (measured.voltage_noise, measured.voltage),
        )
    )
    offset = with_unit(measured.voltage_offset, "V", 3)
    drift = with_unit(measured.voltage_drift, "V", 3)
    return (
        f"{Path(loop.name).name}: {with_unit(loop.frequency, 'Hz', 5)}, mean of {measured.count} "
        f"periods of {measured.current.size} samples\n"
        f"closes within {closed}; noise of a sample over peak: current "
        f"{current:.2g}, voltage {voltage:.2g}\n"
        f"taken out: voltage offset {offset}, drift {drift} a period; current offset "
        f"{with_unit(measured.current_offset, 'A', 3)}"
    )


def _readings(loop: Loop) -> Table:
    table = columns("reading", "value", "error", "what it is", words=["reading", "what it is"])
    for label, key, unit, meaning in READINGS:
        value = getattr(loop.readings, key)
        error = None if loop.errors is None else getattr(loop.errors, key)
        table.add_row(label, _shown(value, unit), _share(error, value), meaning)
    power = _shown(loop.loss_density, "W/m3")
    table.add_row("loss density", power, "", f"mean power at {with_unit(loop.frequency, 'Hz')}")
    return table


def _shown(value: float | None, unit: str) -> str:
    if value is None:
        return "none"
    if unit in ("A/m", ""):
        return f"{value:.4g} {unit}".strip()
    return with_unit(value, unit)


def _share(error: float | None, value: float | None) -> str:
    return "" if error is None or not value else f"{100 * abs(error / value):.1g} %"


def _table_of(loops: Sequence[Loop]) -> Table:
    names = ("capture", "frequency", "H, A/m", "B, T", "B_r, T", "H_c", "J/m3", "mu_a")
    table = columns(*names, words=["capture"], gap=1)
    for loop in loops:
        read = loop.readings
        table.add_row(
            Path(loop.name).name,
            with_unit(loop.frequency, "Hz"),
            f"{read.peak_field_strength:.4g}",
            f"{read.peak_flux_density:.4f}",
            "none" if read.remanence is None else f"{read.remanence:.4f}",
            "none" if read.coercive_field is None else f"{read.coercive_field:.4g}",
            f"{read.loss_per_cycle:.4g}",
            f"{read.amplitude_permeability:.4g}",
        )
    return table


def _points(curve: MeasuredCurve) -> Table:
    table = columns("H, A/m", "B, T", words=[])
    for h, b in curve.points:
        table.add_row(f"{h:.4g}", f"{b:.4f}")
    return table


def _loss(loss: MeasuredLoss) -> str:
    fit = loss.fit
    if fit is None:
        return f"Loss density of {len(loss.readings)} captures with a sine, without parameters."
    return (
        f"Loss density under a sine: {fit.k:.4g} f^{fit.alpha:.4g} B^{fit.beta:.4g} W/m3 with f in "
        f"Hz and B in T, {fit.source.removeprefix('bench; ')}."
    )


def bench_json(
    loops: Sequence[Loop], curve: MeasuredCurve | None, loss: MeasuredLoss | None
) -> str:
    """Return loops, curve and loss as JSON, SI units."""
    document: dict[str, Any] = {
        "format": FORMAT,
        "captures": [_document(loop) for loop in loops],
        "curve": None if curve is None else asdict(curve),
        "loss": None if loss is None else asdict(loss),
    }
    return json.dumps(document, indent=2, allow_nan=False) + "\n"


def _document(loop: Loop) -> dict[str, Any]:
    measured = loop.measured
    return {
        "name": loop.name,
        "core": asdict(loop.core),
        "frequency": loop.frequency,
        "periods": measured.count,
        "samples_in_period": int(measured.current.size),
        "readings": asdict(loop.readings),
        "errors": None if loop.errors is None else asdict(loop.errors),
        "loss_density": loop.loss_density,
        "closure": measured.closure,
        "current_noise": measured.current_noise,
        "voltage_noise": measured.voltage_noise,
        "bias": measured.bias,
        "current_offset": measured.current_offset,
        "voltage_offset": measured.voltage_offset,
        "voltage_drift": measured.voltage_drift,
        "notes": list(loop.notes),
        "field_strength": loop.field_strength.tolist(),
        "flux_density": loop.flux_density.tolist(),
    }
