"""One period of a current from a CSV file: columns of time and current, named with units."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from femag.csv_columns import csv_rows
from femag.errors import InputError
from femag.ripple import Ripple
from femag.text_file import text_of_file

Array = NDArray[np.float64]

HEADER = "a header line such as 't [us],I [A]' or 'time (ms);current (mA)'"
PERIOD = (
    "one period: times that grow, the last row the same point of the next period as the first, "
    "currents at the two within 1 % of the ripple"
)
CLOSING = 0.01
"""Difference of first and last current over the ripple that counts as none."""
NAMES = {"t": "s", "time": "s", "i": "A", "current": "A"}
"""Names of columns, in any case, and the units that they need."""


def read_ripple(path: str | Path, frequency: float | None = None) -> Ripple:
    """Return the ripple that a CSV file of one period holds.

    Lines that begin with # are comments. The header names a column of time (`t`, `time`) and one of
    current (`I`, `current`) with units; others are not used. The separator is the first of
    semicolon, tab and comma that the header holds; with any but the comma the decimal sign may be
    a comma. Between the rows the current goes straight. First and last row are the same point of
    two periods; where their currents differ, by no more than 1 % of the ripple, both take the mean.

    Parameters
    ----------
    path : path
        The file.
    frequency : float, optional
        Hz; one over the time from the first to the last row when left out.

    Raises
    ------
    InputError
        If the file cannot be read or used; it names the file.
    """
    try:
        time, current = _time_and_current(text_of_file(path, "CSV of time and current"))
        return _ripple(time, current, frequency)
    except InputError as error:
        key = "" if error.key == "drive.waveform" else error.key
        raise error.changed(key=key, file=str(path)) from error


def _ripple(time: Array, current: Array, frequency: float | None) -> Ripple:
    if len(time) < 3 or not np.all(np.diff(time) > 0.0):
        raise InputError("no period", key="rows", accepted=f"3 or more rows of {PERIOD}")
    height, apart = float(np.ptp(current)), float(abs(current[-1] - current[0]))
    if apart > CLOSING * height:
        share = f"{100.0 * apart / height:.2g} % of the ripple"
        raise InputError(f"first and last current differ by {share}", key="rows", accepted=PERIOD)
    period = float(time[-1] - time[0])
    shares = (time - time[0]) / period
    currents = current.copy()
    currents[[0, -1]] = 0.5 * (current[0] + current[-1])
    return Ripple.of_samples(np.column_stack([shares, currents]), frequency or 1.0 / period)


def _time_and_current(text: str) -> Array:
    """Return time in s and current in A, (2, rows)."""
    rows = csv_rows(text, HEADER)
    named = [(cell, NAMES.get(cell.name)) for cell in rows.header]
    found = [rows.column(cell, unit, unit) for cell, unit in named if unit is not None]
    return rows.numbers(
        [
            rows.only(what, [column for column in found if column.quantity == unit])
            for unit, what in (("s", "time"), ("A", "current"))
        ]
    )
