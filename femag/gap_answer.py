"""A gap that meets a target, on the terminal."""

from __future__ import annotations

from rich.console import Console
from rich.table import Table
from rich.text import Text

from femag.answer import cautions, columns, described
from femag.target_gap import TargetGap
from femag.target_turns import TargetTurns
from femag.tolerance_answer import budget_lines, spread_line
from femag.tolerance_budget import SampledSpread
from femag.units import exact_text, with_unit

GRINDING = 0.01e-3
"""Change of the gap in m whose effect is printed."""


def print_gap(
    found: TargetGap,
    console: Console,
    by_turns: TargetTurns | None = None,
    spread: SampledSpread | None = None,
) -> None:
    """Print gap, bounds, what tolerances do to them, and what every hand formula asks for.

    Parameters
    ----------
    found : TargetGap
        The gap.
    console : Console
        Where to print.
    by_turns : TargetTurns, optional
        How its turns were found.
    spread : SampledSpread, optional
        Samples of its tolerances.
    """
    design, value, search = found.design, found.inductance.value, by_turns or found
    if design.title:
        console.print(Text(design.title, style="bold"))
    console.print(described(design))
    console.print()
    table = columns("", "", "", words=["", ""])
    table.show_header = False
    share = found.slope * GRINDING / value
    rows = (
        ("gap", exact_text(found.gap, "m", "m"), f"for {with_unit(found.target, 'H', 5)}"),
        ("inductance", with_unit(value, "H", 5), f"between {_between(found)}"),
        ("0.01 mm more", f"{share:+.2%}", "of the inductance, from the energies' derivative"),
        ("flux density", f"{found.flux_density:.4f} T", f"greatest mean: {_where(found)}"),
    )
    for row in rows:
        table.add_row(*row)
    console.print(table, highlight=False)
    if by_turns is not None:
        console.print(_why_these_turns(by_turns))
    console.print()
    for line in budget_lines(found.tolerance_budget):
        console.print(line, highlight=False)
    if spread is not None:
        console.print(spread_line(spread), highlight=False)
    console.print()
    console.print(_hand_gaps(found), highlight=False)
    console.print()
    console.print(
        Text(
            f"{search.solutions} field solutions, {search.seconds:.2f} s. Inductance is 2 W'/I^2. "
            f"{design.core.model_note}"
        )
    )
    console.print()
    stored = 0.5 * value * design.current**2
    console.print(Text(cautions(stored, design.current)))


def _hand_gaps(found: TargetGap) -> Table:
    """Return what every hand formula asks for."""
    formulas = columns("hand formula", "gap", "off by", words=["hand formula"])
    for entry in found.hand:
        if entry.gap is None:
            formulas.add_row(entry.name, "none", "-")
        else:
            error = entry.gap / found.gap - 1.0
            formulas.add_row(entry.name, f"{1e3 * entry.gap:.4g} mm", f"{error:+.1%}")
    return formulas


def _where(found: TargetGap) -> str:
    return max(found.section_means, key=lambda mean: mean.flux_density).name


def _why_these_turns(by_turns: TargetTurns) -> Text:
    """Say what other numbers of turns would have given."""
    others = [trial for trial in by_turns.trials if trial.turns < by_turns.turns]
    if not others:
        return Text(f"{by_turns.turns} turn keeps {by_turns.limit:g} T.")
    next_fewer = max(others, key=lambda trial: trial.turns)
    given = (
        "do not reach the inductance"
        if next_fewer.flux_density is None
        else f"would have {next_fewer.flux_density:.4f} T"
    )
    return Text(
        f"{by_turns.turns} turns are the fewest within {by_turns.limit:g} T: {next_fewer.turns} "
        f"{given}."
    )


def _between(found: TargetGap) -> str:
    lower, upper = (with_unit(b, "H", 5) for b in (found.inductance.lower, found.inductance.upper))
    return f"{lower} and {upper}"
