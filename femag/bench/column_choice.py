"""Which column is which: named by the user, or found where only one can be meant."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from femag.bench.capture import Array, Capture
from femag.bench.channel_units import (
    CURRENT_SCALE,
    current_scale,
    shunt_resistance,
    unit_factor,
    voltage_scale,
)
from femag.bench.scope_file import Column, scope_columns
from femag.errors import InputError

_LIKELY = {
    "time": re.compile(r"t|time|time base|seconds?|zeit|x-?axis", re.IGNORECASE),
    "current": re.compile(r"i|i[ _-]\w{1,8}|current.*|.*[ _-]current|shunt.*|strom", re.IGNORECASE),
    "voltage": re.compile(
        r"[uv]|[uv][ _-]\w{1,8}|voltage.*|.*[ _-]voltage|sense.*|vsense|spannung", re.IGNORECASE
    ),
}
_BASE = {"time": "s", "current": "A", "voltage": "V"}

UNEVEN = 0.01
"""Departure of a time step from the median step that is more than rounding."""

LONGEST_STEP = 3.0
"""Times the median step: beyond, a part of the record is missing."""


@dataclass(frozen=True)
class CaptureColumns:
    """How to read a capture's columns.

    Parameters
    ----------
    time, current, voltage : str, optional
        Name, or number from 1; found if left out and only one column can be meant.
    sample_rate : float, optional
        Samples a second, instead of a column of time.
    current_scale : str, optional
        Such as ``"10 A/V"`` for a probe, or a plain factor for a column in A.
    shunt : str, optional
        Such as ``"0.1 ohm"``, when the voltage of a shunt was recorded.
    voltage_scale : str, optional
        Factor on the sense voltage, such as ``"10"`` for a probe that divides by ten.
    """

    time: str | None = None
    current: str | None = None
    voltage: str | None = None
    sample_rate: float | None = None
    current_scale: str | None = None
    shunt: str | None = None
    voltage_scale: str | None = None


def read_capture(path: str | Path, columns: CaptureColumns | None = None) -> Capture:
    """Read a scope's file.

    Parameters
    ----------
    path : path
        CSV.
    columns : CaptureColumns, optional
        Which column is which, and scales.

    Raises
    ------
    InputError
        If the file or what is said about its columns cannot be used.
    """
    chosen = columns or CaptureColumns()
    table = scope_columns(path)
    try:
        return _capture(table, chosen, str(path))
    except InputError as error:
        raise error.changed(file=str(path)) from error


def _capture(table: Sequence[Column], chosen: CaptureColumns, name: str) -> Capture:
    places = _places(table, chosen)
    notes: list[str] = []
    current = _current(table[places["current"]], chosen, notes)
    column = table[places["voltage"]]
    factor = _factor(column, "voltage", "V", notes)
    voltage = column.values * factor * voltage_scale(chosen.voltage_scale or "1")
    for label, channel in (("current", current), ("voltage", voltage)):
        _refuse_no_numbers(channel, label)
    if chosen.sample_rate is not None:
        return Capture(name, 1.0 / chosen.sample_rate, current, voltage, tuple(notes))
    column = table[places["time"]]
    time = column.values * _factor(column, "time", "s", notes)
    step, channels = _evenly_spaced(time, (current, voltage), notes)
    return Capture(name, step, *channels, tuple(notes))


def _places(table: Sequence[Column], chosen: CaptureColumns) -> dict[str, int]:
    """Return the place of each column that is needed."""
    wanted = {"time": chosen.time, "current": chosen.current, "voltage": chosen.voltage}
    if chosen.sample_rate is not None:
        if chosen.time is not None:
            raise InputError(
                "says the same as --sample-rate", key="--time-column", value=chosen.time,
                accepted="one of the two",
            )  # fmt: skip
        del wanted["time"]
    places = {
        role: _named_place(table, role, name) for role, name in wanted.items() if name is not None
    }
    for role in wanted:
        place = None if role in places else _likely_place(table, role, set(places.values()))
        if place is not None:
            places[role] = place
    missing = [role for role in wanted if role not in places]
    free = [place for place in range(len(table)) if place not in places.values()]
    if len(missing) == 1 and len(free) == 1:
        places[missing[0]] = free[0]
    elif missing:
        other = " or --sample-rate" if missing[0] == "time" else ""
        raise InputError(
            f"it is not clear which column is the {missing[0]}", key=f"--{missing[0]}-column",
            accepted=f"one of {_listed(table)}, by name or number from 1{other}",
        )  # fmt: skip
    if len(set(places.values())) < len(places):
        raise InputError(
            "one column is named twice", key="columns", value=_listed(table),
            accepted="a column of its own for each",
        )  # fmt: skip
    return places


def _named_place(table: Sequence[Column], role: str, name: str) -> int:
    full = [f"{column.name} ({column.unit})" for column in table]
    for names in ([column.name for column in table], full):
        found = [place for place, known in enumerate(names) if _plain(known) == _plain(name)]
        if len(found) == 1:
            return found[0]
    if name.strip().isdigit() and 1 <= int(name) <= len(table):
        return int(name) - 1
    raise InputError("no such column", key=f"--{role}-column", value=name, accepted=_listed(table))


def _likely_place(table: Sequence[Column], role: str, taken: set[int]) -> int | None:
    """Return the one column that can be meant, by its name, then by its unit; None if unclear."""
    free = [place for place in range(len(table)) if place not in taken]
    by_name = [place for place in free if _LIKELY[role].fullmatch(table[place].name)]
    by_unit = [place for place in free if _base(table[place]) == _BASE[role]]
    for found in (by_name, by_unit):
        if len(found) == 1:
            return found[0]
    is_time = role == "time" and not by_name and not by_unit and 0 in free
    return 0 if is_time and _is_even(table[0].values) else None


def _listed(table: Sequence[Column]) -> str:
    return ", ".join(
        f"{place + 1} {column.name!r}" if column.name else f"{place + 1} (no name)"
        for place, column in enumerate(table)
    )


def _plain(name: str) -> str:
    return "".join(name.split()).casefold()


def _base(column: Column) -> str | None:
    known = unit_factor(column.unit)
    return known[1] if known else None


def _is_even(values: Array) -> bool:
    steps = np.diff(values)
    return bool(steps.size and np.all(steps > 0.0) and np.ptp(steps) < 0.1 * np.median(steps))


def _factor(column: Column, role: str, base: str, notes: list[str]) -> float:
    """Return what turns a column into SI; without a unit it is taken as SI, and said."""
    if not column.unit:
        notes.append(f"the {role} column states no unit and is taken as {base}")
        return 1.0
    known = unit_factor(column.unit)
    if known is None or known[1] != base:
        raise InputError(
            f"the {role} column {column.name!r} is in {column.unit}", key=f"--{role}-column",
            accepted=f"a column in {base}",
        )  # fmt: skip
    return known[0]


def _current(column: Column, chosen: CaptureColumns, notes: list[str]) -> Array:
    """Return the current in A from a column in A, or in V with the scale of a probe or shunt."""
    if chosen.shunt is not None and chosen.current_scale is not None:
        raise InputError(
            "says the same as --current-scale", key="--shunt", value=chosen.shunt,
            accepted="one of the two",
        )  # fmt: skip
    scale, base = current_scale(chosen.current_scale or "1")
    if chosen.shunt is not None:
        scale, base = 1.0 / shunt_resistance(chosen.shunt), "V"
    if base == "A" and _base(column) != "A":
        stated = f"is in {column.unit}" if column.unit else "states no unit"
        if chosen.current_scale is None or column.unit:
            raise InputError(
                f"the current column {column.name!r} {stated}", key="--current-scale",
                accepted=f"{CURRENT_SCALE}; or --shunt '0.1 ohm'",
            )  # fmt: skip
    return column.values * _factor(column, "current", base, notes) * scale


def _refuse_no_numbers(channel: Array, label: str) -> None:
    bad = np.flatnonzero(~np.isfinite(channel))
    if bad.size:
        raise InputError(
            f"{bad.size} of {channel.size} values of the {label} are no numbers, the first in row "
            f"{bad[0] + 1} of the data", accepted="a record without gaps, within the scope's range",
        )  # fmt: skip


def _evenly_spaced(
    time: Array, channels: tuple[Array, Array], notes: list[str]
) -> tuple[float, tuple[Array, Array]]:
    """Return the step in s, and both channels at equal steps.

    Raises
    ------
    InputError
        If time stands still, runs back, or a part is missing.
    """
    _refuse_no_numbers(time, "time")
    steps = np.diff(time)
    stuck = np.flatnonzero(steps <= 0.0)
    if stuck.size or not steps.size:
        row = int(stuck[0]) + 2 if stuck.size else 1
        raise InputError(
            f"time does not increase at row {row} of the data", key="--time-column",
            accepted="increasing times; --sample-rate where the file has too few digits",
        )  # fmt: skip
    step, median = float(time[-1] - time[0]) / steps.size, float(np.median(steps))
    longest = int(np.argmax(steps))
    if steps[longest] > LONGEST_STEP * median:
        raise InputError(
            f"the record has a gap of {steps[longest] / median:.3g} steps at row {longest + 2} of "
            "the data", accepted="a record without gaps",
        )  # fmt: skip
    even = time[0] + step * np.arange(time.size)
    if np.abs(time - even).max() <= 0.5 * step and np.abs(steps - median).max() <= _rounding(time):
        return step, channels
    from scipy.interpolate import CubicSpline

    notes.append("the time steps are not equal; both channels were put on equal steps")
    first, second = (np.asarray(CubicSpline(time, channel)(even)) for channel in channels)
    return step, (first, second)


def _rounding(time: Array) -> float:
    """Return the departure of a step that rounding of printed times explains, s."""
    step = float(np.median(np.diff(time)))
    return max(UNEVEN * step, 1e-5 * float(np.abs(time).max()))
