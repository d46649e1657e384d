"""B-H points from CSV text."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.csv_columns import Column, CsvRows, csv_rows
from femag.errors import InputError
from femag.units import MU_0

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


@dataclass(frozen=True)
class CsvPoints:
    """What a CSV file of points holds: SI columns, notes, and name and source if stated."""

    field_strength: Array
    flux_density: Array
    notes: tuple[str, ...]
    stated: dict[str, str]


def csv_points(text: str) -> CsvPoints:
    """Return the points of a CSV text.

    Lines that begin with # are comments; ``# name: ...`` and ``# source: ...`` among them are
    read. The separator is the first of semicolon, tab and comma in the header line.

    Raises
    ------
    InputError
        If header, units or numbers do not read.
    """
    rows = csv_rows(text, HEADER)
    columns = _columns(rows)
    h, b = rows.numbers(columns)
    notes = rows.not_used(columns)
    if columns[1].quantity == "J":
        b = b + MU_0 * h
        notes = (*notes, "polarisation J turned into B = J + mu0 H")
    return CsvPoints(h, b, notes, _stated(rows.comments))


def _stated(comments: Sequence[str]) -> dict[str, str]:
    """Return name and source as far as comments state them."""
    pairs = [comment.partition(":") for comment in comments]
    found = {key.strip().casefold(): value.strip() for key, _, value in pairs}
    return {key: found[key] for key in ("name", "source") if found.get(key)}


def _columns(rows: CsvRows) -> tuple[Column, Column]:
    """Return the columns of H and of B or J."""
    if rows.starts_with_numbers:
        raise InputError(
            "numbers without a header, so without units", key="header",
            value=" ".join(cell.text for cell in rows.header), accepted=HEADER,
        )  # fmt: skip
    named = [(cell, _NAMES.get(cell.name)) for cell in rows.header]
    known = [rows.column(cell, q, UNITS[q]) for cell, q in named if q is not None]
    strength = rows.only("H", [column for column in known if column.quantity == "H"])
    return strength, rows.only("B", [column for column in known if column.quantity != "H"])
