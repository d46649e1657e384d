"""Points from CSV text: headers with units, any usual separator, decimal commas."""

from __future__ import annotations

import csv
import re
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.units import MU_0, si_value

Array = NDArray[np.float64]

HEADER = "a header line such as 'H [A/m],B [T]' or 'H (Oe);B (G)'"
QUANTITIES = {
    "H": ("h", "field strength", "magnetic field strength", "magnetising field",
          "magnetizing field", "field"),
    "B": ("b", "flux density", "magnetic flux density", "induction"),
    "J": ("j", "polarisation", "polarization", "magnetic polarisation", "magnetic polarization"),
}  # fmt: skip
"""Names of columns, in any case: field strength, flux density, and polarisation B - mu0 H."""
UNITS = {"H": "A/m", "B": "T", "J": "T"}
_NAMES = {name: quantity for quantity, names in QUANTITIES.items() for name in names}
COLUMN_HEADER = re.compile(
    r"\s*(?P<name>[^\[(/]*?)\s*"
    r"(?:/?\s*\[(?P<a>.*)\]|/?\s*\((?P<b>.*)\)|/\s*(?P<c>.+)|\bin\s+(?P<d>.+))?\s*"
)
"""A name and a unit: ``H [A/m]``, ``H (A/m)``, ``H / (A/m)``, ``B/T``, ``B in T``."""
_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")


@dataclass(frozen=True)
class CsvPoints:
    """What a CSV file of points holds: SI columns, notes, and name and source if stated."""

    field_strength: Array
    flux_density: Array
    notes: tuple[str, ...]
    stated: dict[str, str]


@dataclass(frozen=True)
class Column:
    """A column of numbers: its place, what it holds, and the factor to SI."""

    index: int
    quantity: str
    factor: float


def csv_points(text: str) -> CsvPoints:
    """Return the points of a CSV text.

    Lines that begin with # are comments; ``# name: ...`` and ``# source: ...`` among them are
    read. The separator is the first of semicolon, tab and comma in the header line.

    Raises
    ------
    InputError
        If header, units or numbers do not read.
    """
    lines = [(i, line) for i, line in enumerate(text.splitlines(), 1) if line.strip()]
    comments = [line.lstrip()[1:] for _, line in lines if line.lstrip().startswith("#")]
    rows = [(i, line) for i, line in lines if not line.lstrip().startswith("#")]
    if not rows:
        raise InputError("no rows", key="points", accepted=HEADER)
    separator = next((mark for mark in ";\t," if mark in rows[0][1]), None)
    if separator is None:
        raise InputError(
            "one column", key="header", value=rows[0][1].strip(),
            accepted=f"{HEADER}, with comma, semicolon or tab between",
        )  # fmt: skip
    header, *cells = [cells_of(line, separator, i) for i, line in rows]
    columns, notes = _columns(header)
    table = np.array(
        [
            [number_in(row, column, len(header), separator, i) for column in columns]
            for (i, _), row in zip(rows[1:], cells, strict=True)
        ]
    ).reshape(-1, 2)
    h, b = table.T * np.array([[column.factor] for column in columns])
    if columns[1].quantity == "J":
        b = b + MU_0 * h
        notes = (*notes, "polarisation J turned into B = J + mu0 H")
    return CsvPoints(h, b, notes, _stated(comments))


def cells_of(line: str, separator: str, number: int) -> list[str]:
    """Return the cells of a line; `number` is the line's, for messages."""
    try:
        return next(csv.reader([line], delimiter=separator))
    except csv.Error as error:
        raise InputError(
            f"not CSV ({error})", key=f"line {number}", accepted="numbers and separators"
        ) from error


def _stated(comments: Sequence[str]) -> dict[str, str]:
    """Return name and source as far as comments state them."""
    pairs = [comment.partition(":") for comment in comments]
    found = {key.strip().casefold(): value.strip() for key, _, value in pairs}
    return {key: found[key] for key in ("name", "source") if found.get(key)}


def _columns(header: Sequence[str]) -> tuple[tuple[Column, Column], tuple[str, ...]]:
    """Return the columns of H and of B or J, and what is said about others."""
    if all(_NUMBER.fullmatch(cell.strip().replace(",", ".")) for cell in header if cell.strip()):
        raise InputError(
            "numbers without a header, so without units", key="header",
            value=" ".join(header), accepted=HEADER,
        )  # fmt: skip
    found = [_column(i, cell) for i, cell in enumerate(header)]
    known = [column for column in found if column is not None]
    strength = [column for column in known if column.quantity == "H"]
    density = [column for column in known if column.quantity != "H"]
    for these, what in ((strength, "H"), (density, "B")):
        if len(these) != 1:
            problem = f"{len(these) or 'no'} column{'s' if len(these) > 1 else ''} of {what}"
            raise InputError(problem, key="header", value=" | ".join(header), accepted=HEADER)
    others = [cell.strip() for cell, column in zip(header, found, strict=True) if column is None]
    notes = (f"columns not used: {', '.join(filter(None, others))}",) if any(others) else ()
    return (strength[0], density[0]), notes


def _column(index: int, cell: str) -> Column | None:
    """Return what a header cell names, None if it is none of H, B and J."""
    match = COLUMN_HEADER.fullmatch(cell)
    name = " ".join((match["name"] if match else cell).replace("_", " ").split())
    quantity = _NAMES.get(name.casefold().strip("\"' "))
    if match is None or quantity is None:
        return None
    unit = (match["a"] or match["b"] or match["c"] or match["d"] or "").strip()
    if not unit:
        raise InputError("the unit is missing", key="header", value=cell.strip(), accepted=HEADER)
    try:
        return Column(index, quantity, si_value(f"1 {unit}", UNITS[quantity]))
    except InputError as error:
        raise error.changed(key="header", value=cell.strip()) from error


def number_in(row: Sequence[str], column: Column, width: int, separator: str, line: int) -> float:
    """Return the number that a row has in a column, as it stands there; `line` is for messages."""
    key = f"line {line}"
    if len(row) != width:
        comma = " (decimal commas need semicolons or tabs between)" if separator == "," else ""
        raise InputError(
            f"{len(row)} instead of {width} cells{comma}", key=key,
            value=separator.join(row), accepted="as many cells as the header has",
        )  # fmt: skip
    cell = row[column.index].strip()
    text = cell if "." in cell else cell.replace(",", ".", 1)
    if not _NUMBER.fullmatch(text):
        raise InputError(
            "not a number", key=key, value=cell,
            accepted="numbers such as 0.25, or 0,25 between semicolons; units in the header",
        )  # fmt: skip
    return float(text)
