"""A gap that meets a target, on the terminal."""

from __future__ import annotations

from rich.console import Console
from rich.text import Text

from femag.answer import cautions, columns, described
from femag.target_gap import TargetGap
from femag.units import with_unit

GRINDING = 0.01e-3
"""Change of the gap in m whose effect is printed."""


def print_gap(found: TargetGap, console: Console) -> None:
    """Print gap, bounds, what grinding does to them, and what every hand formula asks for."""
    design, value = found.design, found.inductance.value
    if design.title:
        console.print(Text(design.title, style="bold"))
    console.print(described(design))
    console.print()
    table = columns("", "", "", words=["", ""])
    table.show_header = False
    share = found.slope * GRINDING / value
    rows = (
        ("gap", f"{1e3 * found.gap:.4g} mm", f"for {with_unit(found.target, 'H', 5)}"),
        ("inductance", with_unit(value, "H", 5), f"between {_between(found)}"),
        ("0.01 mm more", f"{share:+.2%}", "of the inductance, from the energies' derivative"),
    )
    for row in rows:
        table.add_row(*row)
    console.print(table, highlight=False)
    console.print()
    formulas = columns("hand formula", "gap", "off by", words=["hand formula"])
    for entry in found.hand:
        if entry.gap is None:
            formulas.add_row(entry.name, "none", "-")
        else:
            error = entry.gap / found.gap - 1.0
            formulas.add_row(entry.name, f"{1e3 * entry.gap:.4g} mm", f"{error:+.1%}")
    console.print(formulas, highlight=False)
    console.print()
    console.print(
        Text(
            f"{found.solutions} field solutions, {found.seconds:.2f} s. Inductance is 2 W'/I^2. "
            f"{design.core.model_note}"
        )
    )
    console.print()
    stored = 0.5 * value * design.current**2
    console.print(Text(cautions(stored, design.current)))


def _between(found: TargetGap) -> str:
    lower, upper = (with_unit(b, "H", 5) for b in (found.inductance.lower, found.inductance.upper))
    return f"{lower} and {upper}"
