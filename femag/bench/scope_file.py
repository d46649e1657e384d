"""A scope's text file as named columns of numbers."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from femag.bench.capture import Array
from femag.bench.channel_units import unit_factor
from femag.errors import InputError

LARGEST_FILE = 500_000_000
"""Bytes."""

FORMS = ((";", ","), (";", "."), ("\t", ","), ("\t", "."), (",", "."), (" ", "."), (" ", ","))
"""Separator and decimal sign, in the order in which they are tried."""

_TRIED_LINES = 20
_ROWS_IN_SERIES = 4
_MOST_HEADER_LINES = 1000
_BRACKETS = re.compile(r"(.*?)\s*[(\[]\s*([^()\[\]]*?)\s*[)\]]\s*")
_SLASH = re.compile(r"(.*\S)\s*/\s*(\S+)\s*")
_NO_NUMBERS = {"nan", "-nan", "inf", "-inf", "+inf", "infinity", "-infinity"}


@dataclass(frozen=True, eq=False)
class Column:
    """A column of a scope's file.

    Parameters
    ----------
    name : str
        As in the header, without its unit; empty without a header.
    unit : str
        As in the header; empty where none is stated.
    values : array, shape (n,)
        As written.
    """

    name: str
    unit: str
    values: Array


@dataclass(frozen=True)
class _Form:
    """How the fields of a line are written."""

    separator: str
    decimal: str

    def fields(self, line: str) -> list[str]:
        parts = line.split() if self.separator == " " else line.split(self.separator)
        return [part.strip().strip('"').strip() for part in parts]

    def value(self, field: str) -> float | None:
        """Return the number in a field, None if it is none."""
        if self.decimal == ",":
            if "." in field and field.lower() not in _NO_NUMBERS:
                return None
            field = field.replace(",", ".")
        try:
            return float(field)
        except ValueError:
            return None


def scope_columns(path: str | Path) -> tuple[Column, ...]:
    """Return the columns of a text file.

    Parameters
    ----------
    path : path
        CSV of any scope. Lines before the data are skipped but for the names and units of the
        columns; the separator is a comma, semicolon, tab or blank; with any but the comma the
        decimal sign may be a comma.

    Raises
    ------
    InputError
        If it cannot be read, or holds no table of at least two columns of numbers.
    """
    lines = _lines(Path(path))
    form, used = _form(lines, str(path))
    rows = [form.fields(line) for line in lines]
    first = _first_row(rows, used, form)
    table = np.array([_numbers(rows[row], used, form) for row in range(first, len(rows))])
    names, units = _header(rows[:first], used[-1] + 1)
    return tuple(
        Column(names[place], units[place], table[:, column]) for column, place in enumerate(used)
    )


def _lines(path: Path) -> list[str]:
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise InputError("too large a file", file=str(path), accepted="up to 500 MB")
        data = path.read_bytes()
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})", file=str(path)) from error
    for encoding in ("utf-8-sig", "utf-16", "latin-1"):
        if encoding == "utf-16" and data[:2] not in (b"\xff\xfe", b"\xfe\xff"):
            continue
        try:
            text = data.decode(encoding)
            break
        except UnicodeDecodeError:
            continue
    if "\0" in text:
        raise InputError("no text file", file=str(path), accepted="CSV as the scope writes it")
    lines = [line.rstrip("\r") for line in text.split("\n")]
    return [line for line in lines if line.strip() and not line.lstrip().startswith("#")]


def _form(lines: Sequence[str], file: str) -> tuple[_Form, list[int]]:
    """Return separator and decimal sign, and which fields of a line hold numbers."""
    tried = lines[-_TRIED_LINES:]
    for separator, decimal in FORMS:
        form = _Form(separator, decimal)
        rows = [form.fields(line) for line in tried]
        if not rows or any(len(row) != len(rows[0]) for row in rows):
            continue
        used = [
            place for place in range(len(rows[0]))
            if all(form.value(row[place]) is not None for row in rows)
        ]  # fmt: skip
        filled = [place for place, field in enumerate(rows[-1]) if field]
        if len(used) >= 2 and used == filled:
            return form, used
    raise InputError(
        "no table of numbers is found at its end", file=file,
        accepted="lines of two or more numbers, with the same separator to the last line",
    )  # fmt: skip


def _first_row(rows: Sequence[Sequence[str]], used: Sequence[int], form: _Form) -> int:
    """Return the first row that holds numbers in all fields in use, like the next few."""
    holds = [_holds_numbers(row, used, form) for row in rows[:_MOST_HEADER_LINES]]
    for row in range(len(holds)):
        if all(holds[row : row + _ROWS_IN_SERIES]):
            return row
    return len(rows) - 1


def _holds_numbers(row: Sequence[str], used: Sequence[int], form: _Form) -> bool:
    return used[-1] < len(row) and all(form.value(row[place]) is not None for place in used)


def _numbers(row: Sequence[str], used: Sequence[int], form: _Form) -> list[float]:
    values = (form.value(row[place]) if place < len(row) else None for place in used)
    return [np.nan if value is None else value for value in values]


def _header(rows: Sequence[Sequence[str]], size: int) -> tuple[list[str], list[str]]:
    """Return names and units of all fields, from the last lines before the data."""
    names, units = [""] * size, [""] * size
    fitting = [row[:size] for row in rows[-3:] if len(row) >= size and any(row)]
    if not fitting:
        return names, units
    if all(unit_factor(_bare(field)) or not field for field in fitting[-1]):
        units = [_bare(field) for field in fitting.pop()]
    if fitting:
        pairs = [_name_and_unit(field) for field in fitting[-1]]
        names = [name for name, _ in pairs]
        units = [known or unit for known, (_, unit) in zip(units, pairs, strict=True)]
    return names, units


def _bare(field: str) -> str:
    return field.strip("()[] ")


def _name_and_unit(field: str) -> tuple[str, str]:
    match = _BRACKETS.fullmatch(field) or _SLASH.fullmatch(field)
    if match is not None and unit_factor(match.group(2)):
        return match.group(1), match.group(2)
    return field, ""
