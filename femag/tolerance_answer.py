"""What tolerances do to the inductance, on the terminal."""

from __future__ import annotations

from rich.table import Table
from rich.text import Text

from femag.answer_table import columns
from femag.tolerance_budget import SampledSpread, ToleranceBudget
from femag.units import with_unit

CUSTOMARY_NOTE = (
    "The design gives no tolerances: those of common practice stand in (no source). [tolerance] in "
    "the design file sets your own."
)


def budget_lines(budget: ToleranceBudget) -> list[Table | Text]:
    """Return every contribution, the worst case and the root of the sum of squares, for print."""
    table = columns("tolerance", "+-", "inductance", words=["tolerance"])
    for entry in budget.contributions:
        half = half_range_text(entry.name, entry.half_range)
        table.add_row(entry.name, half, f"{entry.change / budget.inductance:+.2%}")
    table.add_row("worst case", "", f"+-{budget.worst_case / budget.inductance:.2%}")
    table.add_row("root sum square", "", f"+-{budget.root_sum_square / budget.inductance:.2%}")
    return [table, Text(CUSTOMARY_NOTE)] if budget.is_customary else [table]


def spread_line(spread: SampledSpread) -> Text:
    """Return what sampling on full solutions gave, for print."""
    low, high = spread.limits
    return Text(
        f"{len(spread.inductances)} samples, every part uniform within its half range, each "
        f"solved: mean {with_unit(spread.mean, 'H', 5)}, 95 % between "
        f"{with_unit(low, 'H', 5)} and {with_unit(high, 'H', 5)}, standard deviation "
        f"{spread.standard_deviation / spread.mean:.2%} (straight line: "
        f"{spread.linear_standard_deviation / spread.mean:.2%})."
    )


def half_range_text(name: str, value: float) -> str:
    """Return a half range in mm, or of a share in per cent."""
    if name in ("permeability", "saturation"):
        return f"{100 * value:g} %"
    return f"{1e3 * value:g} mm"
