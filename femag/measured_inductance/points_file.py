"""Measured points from a CSV file: columns named with units, the kind by a word of the header."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from femag.errors import InputError
from femag.materials.csv_points import COLUMN_HEADER, Column, cells_of, number_in
from femag.measured_inductance.points import KINDS, Kind, MeasuredPoints
from femag.units import si_value

HEADER = "a header line such as 'I [A];L [uH]' or 'I (mA),L_inc (mH)'"
SEPARATORS = ";\t,"
NAMES = {"A": ("i", "current"), "H": ("l", "inductance")}
"""Words that name a column of current and one of inductance, by unit; in any case."""
KIND_WORDS: dict[str, Kind] = {
    "apparent": "apparent",
    "app": "apparent",
    "secant": "apparent",
    "incremental": "incremental",
    "inc": "incremental",
    "incr": "incremental",
    "differential": "incremental",
    "diff": "incremental",
}
"""Words that say which inductance was measured."""
OTHER_WORDS = ("dc", "bias", "peak", "measured", "meas")
"""Words that may stand beside a name; any other makes the column another quantity."""


@dataclass(frozen=True)
class _MeasuredColumn(Column):
    """A column; its quantity is the SI unit, A or H."""

    kind: Kind | None
    text: str


def read_measured(path: str | Path, kind: Kind | None = None) -> MeasuredPoints:
    """Return the measured points of a CSV file.

    Lines that begin with # are comments. The header names a column of current (`I`, `current`)
    and one of inductance (`L`, `inductance`) with units, such as ``I [A]; L_inc [uH]``. The words
    `apparent`, `app`, `secant` or `incremental`, `inc`, `incr`, `differential`, `diff` in the name
    of the inductance say which it is. The separator is the first of semicolon, tab and comma that
    the header holds; with any but the comma the decimal sign may be a comma.

    Parameters
    ----------
    path : path
        The file.
    kind : {"apparent", "incremental"}, optional
        Which inductance was measured, where the header does not say; or which column to take of
        two. Without either the points are taken as apparent, and a note says so.

    Raises
    ------
    InputError
        If the file cannot be read or used; it names the file.
    """
    if kind is not None and kind not in KINDS:
        raise InputError(
            "unknown kind of inductance", key="kind", value=kind,
            accepted=" or ".join(map(repr, KINDS)),
        )  # fmt: skip
    try:
        return _points(_text(Path(path)), kind, str(path))
    except InputError as error:
        raise error.changed(file=str(path)) from error


def _text(file: Path) -> str:
    try:
        return file.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError("not UTF-8 text", accepted="CSV of current and inductance") from error
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})") from error


def _points(text: str, kind: Kind | None, source: str) -> MeasuredPoints:
    rows = [
        (i, line)
        for i, line in enumerate(text.splitlines(), 1)
        if line.strip() and not line.lstrip().startswith("#")
    ]
    if not rows:
        raise InputError("no rows", key="points", accepted=HEADER)
    first = rows[0][1]
    separator = next((mark for mark in SEPARATORS if mark in first), None)
    if separator is None:
        raise InputError(
            "one column", key="header", value=first.strip(),
            accepted=f"{HEADER}, with comma, semicolon or tab between",
        )  # fmt: skip
    header = cells_of(first, separator, rows[0][0])
    current, inductance, notes = _columns(header, kind)
    cells = [(cells_of(line, separator, i), i) for i, line in rows[1:]]
    table = np.array(
        [
            [
                column.factor * number_in(row, column, len(header), separator, i)
                for column in (current, inductance)
            ]
            for row, i in cells
        ]
    ).reshape(-1, 2)
    if inductance.kind is None and kind is None:
        notes += ("the header does not say which inductance was measured: taken as apparent",)
    found = inductance.kind or kind or "apparent"
    return MeasuredPoints(tuple(table[:, 0]), tuple(table[:, 1]), found, source, notes)


def _columns(
    header: Sequence[str], kind: Kind | None
) -> tuple[_MeasuredColumn, _MeasuredColumn, tuple[str, ...]]:
    """Return the columns of current and inductance, and what is said about others."""
    found = [column for i, cell in enumerate(header) if (column := _column(i, cell)) is not None]
    current = _only("current", [column for column in found if column.quantity == "A"], header)
    measured = [column for column in found if column.quantity == "H"]
    if len(measured) > 1 and kind is not None:
        measured = [column for column in measured if column.kind == kind]
    inductance = _only("inductance", measured, header)
    if kind is not None and inductance.kind not in (None, kind):
        raise InputError(
            f"the header says {inductance.kind}, not {kind}", key="header", value=inductance.text,
            accepted=f"a column of {kind} inductance, or kind = {inductance.kind!r}",
        )  # fmt: skip
    used = (current.index, inductance.index)
    others = [cell.strip() for i, cell in enumerate(header) if i not in used and cell.strip()]
    return current, inductance, (f"columns not used: {', '.join(others)}",) if others else ()


def _only(what: str, columns: Sequence[_MeasuredColumn], header: Sequence[str]) -> _MeasuredColumn:
    if len(columns) == 1:
        return columns[0]
    accepted = HEADER
    if what == "inductance" and len({column.kind for column in columns} - {None}) > 1:
        accepted = "one, or kind = 'apparent' or 'incremental' to choose"
    raise InputError(
        f"{len(columns) or 'no'} column{'s' if len(columns) > 1 else ''} of {what}", key="header",
        value=" | ".join(cell.strip() for cell in header), accepted=accepted,
    )  # fmt: skip


def _column(index: int, cell: str) -> _MeasuredColumn | None:
    """Return what a header cell names, None if it is neither current nor inductance."""
    match = COLUMN_HEADER.fullmatch(cell)
    words = (match["name"] if match else cell).casefold().replace("_", " ").split()
    unit = next((unit for unit, names in NAMES.items() if set(names) & set(words)), None)
    known = {*NAMES.get(unit or "", ()), *OTHER_WORDS, *(KIND_WORDS if unit == "H" else ())}
    if match is None or unit is None or not known.issuperset(words):
        return None
    text = cell.strip()
    written = (match["a"] or match["b"] or match["c"] or match["d"] or "").strip()
    if not written:
        raise InputError("the unit is missing", key="header", value=text, accepted=HEADER)
    kinds = {KIND_WORDS[word] for word in words if word in KIND_WORDS}
    if len(kinds) > 1:
        raise InputError(
            "apparent and incremental at once", key="header", value=text, accepted="one of the two"
        )
    try:
        factor = si_value(f"1 {written}", unit)
    except InputError as error:
        raise error.changed(key="header", value=text) from error
    return _MeasuredColumn(index, unit, factor, kinds.pop() if kinds else None, text)
