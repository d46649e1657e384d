"""Rows of the validation table: one reference value beside what Gapfield makes of it."""

from __future__ import annotations

import csv
import math
from dataclasses import dataclass
from pathlib import Path

from femag.field.bounds import Bounds

ROUNDING = 1e-12
"""Relative slack of every containment, for the rounding of the solver's own sums."""


@dataclass(frozen=True)
class Row:
    """One reference value and its counterpart.

    Parameters
    ----------
    case, quantity : str
        What was computed, in a few words.
    reference : float
        The reference value, in `unit`.
    lower, upper : float or None
        The bounds; None where the quantity has none.
    value : float
        What Gapfield reports: the midpoint of the bounds where there are some.
    unit : str
        SI unit, for print.
    allowed : float
        Largest relative distance between `value` and `reference`; infinite where the row is shown
        and not judged, for a reason that the folder's README gives.
    contained : bool or None
        Whether the bounds hold the reference; None where that cannot be expected, since the
        quantity has no bounds or the meshed body is not exactly the reference's.
    source : str
        Where the reference comes from.
    """

    case: str
    quantity: str
    reference: float
    lower: float | None
    upper: float | None
    value: float
    unit: str
    allowed: float
    contained: bool | None
    source: str

    @property
    def error(self) -> float:
        """The value over the reference, less 1."""
        return self.value / self.reference - 1.0

    @property
    def relative_half_width(self) -> float | None:
        """Half the distance of the bounds over the reference; None without bounds."""
        if self.lower is None or self.upper is None:
            return None
        return (self.upper - self.lower) / (2.0 * abs(self.reference))

    @property
    def is_judged(self) -> bool:
        """Whether the row can fail."""
        return math.isfinite(self.allowed)

    @property
    def passed(self) -> bool:
        """Whether the value is near enough, and the bounds hold the reference where they must."""
        return self.contained is not False and abs(self.error) <= self.allowed


@dataclass(frozen=True)
class Digits:
    """A number as it is printed in a table.

    Parameters
    ----------
    value : float
        The number.
    rounding : float
        Half a unit of its last printed digit, relative to it.
    """

    value: float
    rounding: float


def printed(text: str) -> Digits:
    """Return a number from its printed form, with the relative rounding of its digits."""
    value = float(text)
    mantissa, _, exponent = text.lower().partition("e")
    decimals = len(mantissa.partition(".")[2])
    half_unit = 0.5 * 10.0 ** (int(exponent or "0") - decimals)
    return Digits(value, half_unit / abs(value))


def table_of(folder: str) -> list[dict[str, str]]:
    """Return the lines of a folder's reference.csv, each by its column names."""
    path = Path(__file__).parent / folder / "reference.csv"
    with path.open(newline="", encoding="utf-8") as file:
        return list(csv.DictReader(file))


def write_table(folder: str, lines: list[dict[str, str]]) -> None:
    """Write a folder's reference.csv, columns in the order of the first line."""
    path = Path(__file__).parent / folder / "reference.csv"
    with path.open("w", newline="", encoding="utf-8") as file:
        writer = csv.DictWriter(file, list(lines[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(lines)


def bounded_row(
    case: str, quantity: str, reference: Digits, bounds: Bounds, allowed: float, source: str
) -> Row:
    """Return the row of a quantity whose bounds must hold the reference.

    The bounds may miss it by the rounding of its printed digits and of the solver's sums only.

    Parameters
    ----------
    case, quantity, source : str
        As in `Row`.
    reference : Digits
        The reference value.
    bounds : Bounds
        What Gapfield found.
    allowed : float
        Largest relative distance of the midpoint.
    """
    slack = (reference.rounding + ROUNDING) * abs(reference.value)
    contained = bounds.lower - slack <= reference.value <= bounds.upper + slack
    return Row(
        case, quantity, reference.value, bounds.lower, bounds.upper, bounds.value, bounds.unit,
        allowed, contained, source,
    )  # fmt: skip


def plain_row(
    case: str, quantity: str, reference: Digits, value: float, unit: str, allowed: float,
    source: str,
) -> Row:  # fmt: skip
    """Return the row of a quantity without bounds."""
    return Row(
        case, quantity, reference.value, None, None, value, unit, allowed, None, source
    )  # fmt: skip
