"""One period of a current from a CSV file: columns of time and current, named with units."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.materials.csv_points import COLUMN_HEADER, Column, cells_of, number_in
from femag.ripple import Ripple
from femag.units import si_value

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
SEPARATORS = ";\t,"


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
        time, current = _columns_of_text(_text(Path(path)))
        return _ripple(time, current, frequency)
    except InputError as error:
        key = "" if error.key == "drive.waveform" else error.key
        raise error.changed(key=key, file=str(path)) from error


def _text(file: Path) -> str:
    try:
        return file.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError("not UTF-8 text", accepted="CSV of time and current") from error
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})") from error


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


def _columns_of_text(text: str) -> tuple[Array, Array]:
    """Return time in s and current in A."""
    lines = [(i, line) for i, line in enumerate(text.splitlines(), 1) if line.strip()]
    rows = [(i, line) for i, line in lines if not line.lstrip().startswith("#")]
    if not rows:
        raise InputError("no rows", key="rows", accepted=HEADER)
    number, first = rows[0]
    separator = next((mark for mark in SEPARATORS if mark in first), None)
    if separator is None:
        raise InputError("one column", key="header", value=first.strip(), accepted=HEADER)
    header = cells_of(first, separator, number)
    columns = _columns(header)
    cells = [(cells_of(line, separator, i), i) for i, line in rows[1:]]
    time, current = (
        np.array([number_in(row, column, len(header), separator, i) for row, i in cells])
        * column.factor
        for column in columns
    )
    return time, current


def _columns(header: Sequence[str]) -> tuple[Column, Column]:
    found = [column for i, cell in enumerate(header) if (column := _column(i, cell)) is not None]
    picked = []
    for unit, what in (("s", "time"), ("A", "current")):
        these = [column for column in found if column.quantity == unit]
        if len(these) != 1:
            raise InputError(
                f"{len(these) or 'no'} column{'s' if len(these) > 1 else ''} of {what}",
                key="header", value=" | ".join(cell.strip() for cell in header), accepted=HEADER,
            )  # fmt: skip
        picked += these
    return picked[0], picked[1]


def _column(index: int, cell: str) -> Column | None:
    """Return what a header cell names, None if it is neither time nor current."""
    match = COLUMN_HEADER.fullmatch(cell)
    name = (match["name"] if match else cell).casefold().strip("\"' ")
    if match is None or name not in NAMES:
        return None
    written = (match["a"] or match["b"] or match["c"] or match["d"] or "").strip()
    if not written:
        raise InputError("the unit is missing", key="header", value=cell.strip(), accepted=HEADER)
    try:
        return Column(index, NAMES[name], si_value(f"1 {written}", NAMES[name]))
    except InputError as error:
        raise error.changed(key="header", value=cell.strip()) from error
