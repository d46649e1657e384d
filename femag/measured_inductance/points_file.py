"""Measured points from a CSV file: columns named with units, the kind by a word of the header."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from femag.csv_columns import Column, CsvRows, HeaderCell, csv_rows
from femag.errors import InputError
from femag.measured_inductance.points import KINDS, Kind, MeasuredPoints
from femag.text_file import text_of_file

HEADER = "a header line such as 'I [A];L [uH]' or 'I (mA),L_inc (mH)'"
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
class _InductanceColumn(Column):
    """A column of inductance, and which one its header says."""

    kind: Kind | None


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
        text = text_of_file(path, "CSV of current and inductance")
        return _points(text, kind, str(path))
    except InputError as error:
        raise error.changed(file=str(path)) from error


def _points(text: str, kind: Kind | None, source: str) -> MeasuredPoints:
    rows = csv_rows(text, HEADER)
    current, inductance = _columns(rows, kind)
    currents, inductances = rows.numbers((current, inductance))
    notes = rows.not_used((current, inductance))
    if inductance.kind is None and kind is None:
        notes += ("the header does not say which inductance was measured: taken as apparent",)
    found = inductance.kind or kind or "apparent"
    return MeasuredPoints(tuple(currents), tuple(inductances), found, source, notes)


def _columns(rows: CsvRows, kind: Kind | None) -> tuple[Column, _InductanceColumn]:
    """Return the columns of current and inductance."""
    units = [(cell, _unit_named(cell)) for cell in rows.header]
    currents = [rows.column(cell, "A", "A") for cell, unit in units if unit == "A"]
    current = rows.only("current", currents)
    measured = [_inductance_column(rows, cell) for cell, unit in units if unit == "H"]
    kinds = {column.kind for column in measured} - {None}
    choice = "one, or kind = 'apparent' or 'incremental' to choose" if len(kinds) > 1 else HEADER
    if len(measured) > 1 and kind is not None:
        measured = [column for column in measured if column.kind == kind]
    inductance = rows.only("inductance", measured, choice)
    if kind is not None and inductance.kind not in (None, kind):
        raise InputError(
            f"the header says {inductance.kind}, not {kind}", key="header",
            value=inductance.header.text,
            accepted=f"a column of {kind} inductance, or kind = {inductance.kind!r}",
        )  # fmt: skip
    return current, inductance


def _unit_named(cell: HeaderCell) -> str | None:
    """Return A or H where a header cell names current or inductance and nothing else."""
    words = cell.name.split()
    unit = next((unit for unit, names in NAMES.items() if set(names) & set(words)), None)
    known = {*NAMES.get(unit or "", ()), *OTHER_WORDS, *(KIND_WORDS if unit == "H" else ())}
    return unit if known.issuperset(words) else None


def _inductance_column(rows: CsvRows, cell: HeaderCell) -> _InductanceColumn:
    column = rows.column(cell, "H", "H")
    kinds = {KIND_WORDS[word] for word in cell.name.split() if word in KIND_WORDS}
    if len(kinds) > 1:
        raise InputError(
            "apparent and incremental at once", key="header", value=cell.text,
            accepted="one of the two",
        )  # fmt: skip
    return _InductanceColumn(cell, "H", column.factor, kinds.pop() if kinds else None)
