"""Columns of numbers from CSV text: headers with units, any usual separator, decimal commas."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.units import si_value

Array = NDArray[np.float64]

SEPARATORS = ";\t,"
_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_HEADER_CELL = re.compile(
    r"\s*(?P<name>[^\[(/]*?)\s*"
    r"(?:/?\s*\[(?P<a>.*)\]|/?\s*\((?P<b>.*)\)|/\s*(?P<c>.+)|\bin\s+(?P<d>.+))?\s*"
)
"""A name and a unit: ``H [A/m]``, ``H (A/m)``, ``H / (A/m)``, ``B/T``, ``B in T``."""


@dataclass(frozen=True)
class HeaderCell:
    """A cell of the header: its place, its text, and the name and the unit written in it."""

    index: int
    text: str
    name: str
    unit: str


@dataclass(frozen=True)
class Column:
    """A column of numbers: its header, what it holds, and the factor to SI."""

    header: HeaderCell
    quantity: str
    factor: float


AnyColumn = TypeVar("AnyColumn", bound=Column)


@dataclass(frozen=True)
class CsvRows:
    """A header and the rows below it, as text.

    Parameters
    ----------
    header : tuple of HeaderCell
        Cells of the first line that is no comment.
    rows : tuple of (int, list of str)
        Number of the line and cells of every further one.
    separator : str
        What stands between the cells.
    comments : tuple of str
        Lines that begin with #, without it.
    accepted : str
        What messages say a header looks like.
    """

    header: tuple[HeaderCell, ...]
    rows: tuple[tuple[int, list[str]], ...]
    separator: str
    comments: tuple[str, ...]
    accepted: str

    @property
    def header_text(self) -> str:
        """The header as messages show it."""
        return " | ".join(cell.text for cell in self.header)

    @property
    def starts_with_numbers(self) -> bool:
        """Whether numbers stand where the header should."""
        texts = [_with_decimal_point(cell.text) for cell in self.header if cell.text]
        return all(map(_NUMBER.fullmatch, texts))

    def column(self, cell: HeaderCell, quantity: str, unit: str) -> Column:
        """Return the column below a header cell that names a quantity.

        Raises
        ------
        InputError
            If its unit is missing or does not measure what `unit` does.
        """
        if not cell.unit:
            raise InputError(
                "the unit is missing", key="header", value=cell.text, accepted=self.accepted
            )
        try:
            return Column(cell, quantity, si_value(f"1 {cell.unit}", unit))
        except InputError as error:
            raise error.changed(key="header", value=cell.text) from error

    def only(
        self, what: str, columns: Sequence[AnyColumn], accepted: str | None = None
    ) -> AnyColumn:
        """Return the one column of a quantity.

        Raises
        ------
        InputError
            If there is none, or more than one.
        """
        if len(columns) == 1:
            return columns[0]
        raise InputError(
            f"{len(columns) or 'no'} column{'s' if len(columns) > 1 else ''} of {what}",
            key="header", value=self.header_text, accepted=accepted or self.accepted,
        )  # fmt: skip

    def not_used(self, columns: Sequence[Column]) -> tuple[str, ...]:
        """Return a note on the cells of the header that none of the columns is below, if any."""
        used = [column.header for column in columns]
        others = [cell.text for cell in self.header if cell.text and cell not in used]
        return (f"columns not used: {', '.join(others)}",) if others else ()

    def numbers(self, columns: Sequence[Column]) -> Array:
        """Return the numbers in columns, (columns, rows), SI.

        Raises
        ------
        InputError
            If a row has more or fewer cells than the header, or a cell is no number.
        """
        table = [[self._number(row, line, column) for column in columns] for line, row in self.rows]
        return np.array(table).reshape(-1, len(columns)).T

    def _number(self, row: Sequence[str], line: int, column: Column) -> float:
        key = f"line {line}"
        if len(row) != len(self.header):
            decimal = " (decimal commas need semicolons or tabs between)"
            raise InputError(
                f"{len(row)} instead of {len(self.header)} cells"
                f"{decimal if self.separator == ',' else ''}",
                key=key, value=self.separator.join(row), accepted="as many cells as the header has",
            )  # fmt: skip
        cell = row[column.header.index].strip()
        text = _with_decimal_point(cell)
        if not _NUMBER.fullmatch(text):
            raise InputError(
                "not a number", key=key, value=cell,
                accepted="numbers such as 0.25, or 0,25 between semicolons; units in the header",
            )  # fmt: skip
        return column.factor * float(text)


def csv_rows(text: str, accepted: str) -> CsvRows:
    """Return header and rows of a CSV text.

    Lines that begin with # are comments. The separator is the first of semicolon, tab and comma
    that the header holds.

    Parameters
    ----------
    text : str
        Of the file.
    accepted : str
        What messages say a header looks like.

    Raises
    ------
    InputError
        If there are no rows, or only one column.
    """
    lines = [(i, line) for i, line in enumerate(text.splitlines(), 1) if line.strip()]
    comments = tuple(line.lstrip()[1:] for _, line in lines if line.lstrip().startswith("#"))
    written = [(i, line) for i, line in lines if not line.lstrip().startswith("#")]
    if not written:
        raise InputError("no rows", key="points", accepted=accepted)
    first = written[0][1]
    separator = next((mark for mark in SEPARATORS if mark in first), None)
    if separator is None:
        raise InputError(
            "one column", key="header", value=first.strip(),
            accepted=f"{accepted}, with comma, semicolon or tab between",
        )  # fmt: skip
    (_, header), *rows = ((i, _cells(line, separator, i)) for i, line in written)
    named = tuple(_header_cell(i, cell) for i, cell in enumerate(header))
    return CsvRows(named, tuple(rows), separator, comments, accepted)


def _with_decimal_point(cell: str) -> str:
    """Return a number's text with the first comma turned into a point where it has none."""
    return cell if "." in cell else cell.replace(",", ".", 1)


def _cells(line: str, separator: str, number: int) -> list[str]:
    try:
        return next(csv.reader([line], delimiter=separator))
    except csv.Error as error:
        raise InputError(
            f"not CSV ({error})", key=f"line {number}", accepted="numbers and separators"
        ) from error


def _header_cell(index: int, text: str) -> HeaderCell:
    """Return a cell taken apart; its name in small letters, with single spaces between words."""
    match = _HEADER_CELL.fullmatch(text)
    name = (match["name"] if match else "").replace("_", " ").casefold()
    unit = next(filter(None, (match[key] for key in "abcd")), "") if match else ""
    return HeaderCell(index, text.strip(), " ".join(name.split()).strip("\"' "), unit.strip())
