"""AL values that makers of ferrite cores print beside their gaps, and every hand formula."""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator
from functools import cache

from femag.design import Design
from femag.geometry import Gap, Winding, catalogue_core
from femag.materials import LinearCurve
from femag.result import Result, solve
from femag.units import si_value
from validation.rows import Digits, Row, table_of
from validation.table import print_rows

TURNS = 10
TOLERANCE = 1e-3
ALLOWED = 0.10
"""What such a table can show: makers' gaps for one AL value lie 15 to 40 % apart."""


def rows() -> tuple[Row, ...]:
    """Return one row for each printed AL value."""
    return tuple(row_of(line) for line in table_of("handbook_tables"))


def handbook_design(size: str, permeability: float, gap: float, side: str) -> Design:
    """Return a nominal core, its window full of copper, and a gap (m) in both halves or in one."""
    offset = gap / 2 if side == "one" else 0.0
    return Design(
        core=catalogue_core(size).core(),
        windings=(Winding(TURNS),),
        material=LinearCurve(permeability),
        gaps=(Gap(gap, offset=offset),),
        tolerance=TOLERANCE,
    )


@cache
def result_of(size: str, permeability: str, gap: str, side: str) -> Result:
    """Return the solution of one line of reference.csv."""
    return solve(handbook_design(size, float(permeability), si_value(gap, "m"), side))


def row_of(line: dict[str, str]) -> Row:
    """Return the row of one line of reference.csv."""
    result = _result(line)
    bounds = result.inductance.scaled(1.0 / TURNS**2, "H")
    return Row(
        case=f"{line['size']}, {line['gap']}",
        quantity=f"AL, mu {line['permeability']}",
        reference=_printed(line).value,
        lower=bounds.lower,
        upper=bounds.upper,
        value=bounds.value,
        unit="H",
        allowed=ALLOWED if line["judged"] == "yes" else math.inf,
        contained=None,
        source=line["source"],
    )


def formula_table(lines: Iterable[dict[str, str]]) -> Iterator[str]:
    """Yield lines of a Markdown table: error of the field and of each hand formula, per cent."""
    solved = [(line, _result(line)) for line in lines]
    names = [row.estimate.name for row in solved[0][1].hand]
    yield "| core, gap | AL, nH | field | " + " | ".join(names) + " |"
    yield "|" + "---|" * (3 + len(names))
    for line, result in solved:
        printed = _printed(line).value * TURNS**2
        values = [result.inductance.value, *(row.estimate.inductance for row in result.hand)]
        errors = [f"{100 * (value / printed - 1):+.1f}" for value in values]
        yield f"| {line['size']}, {line['gap']} | {line['al']} | " + " | ".join(errors) + " |"


def _result(line: dict[str, str]) -> Result:
    return result_of(line["size"], line["permeability"], line["gap"], line["side"])


def _printed(line: dict[str, str]) -> Digits:
    return Digits(float(line["al"]) * 1e-9, 0.0)


if __name__ == "__main__":
    code = print_rows(rows())
    print("\n" + "\n".join(formula_table(table_of("handbook_tables"))))
    raise SystemExit(code)
