"""How far a study is, on the terminal: at most 80 columns, readable without colour."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from rich.console import Console
from rich.text import Text

from femag.study.store import State

MOST_REASONS = 5


def print_state(
    title: str,
    counts: Mapping[State, int],
    reasons: Sequence[tuple[str, int]],
    console: Console,
) -> None:
    """Print how many cases are done, open and failed, and why.

    Parameters
    ----------
    title : str
        Of the study; may be empty.
    counts : mapping of state to int
        Cases in each state.
    reasons : sequence of (str, int)
        Why cases failed, and how many.
    console : Console
        Where to print.
    """
    for line in _lines(title, counts, reasons):
        console.print(line, highlight=False)


def _lines(
    title: str, counts: Mapping[State, int], reasons: Sequence[tuple[str, int]]
) -> Iterator[Text]:
    if title:
        yield Text(title, style="bold")
    total = sum(counts.values())
    yield Text(f"{counts['done']} of {total} cases done, {counts['failed']} failed")
    for reason, number in reasons[:MOST_REASONS]:
        yield Text(f"  {number} x {reason}")
    if len(reasons) > MOST_REASONS:
        yield Text(f"  and {len(reasons) - MOST_REASONS} other reasons; the table has them all")
    if counts["failed"]:
        yield Text("--retry solves failed cases again.")
    if counts["taken"]:
        verb = "is" if counts["taken"] == 1 else "are"
        yield Text(f"{counts['taken']} {verb} being solved by another run.")
    if counts["open"]:
        verb = "is" if counts["open"] == 1 else "are"
        yield Text(f"{counts['open']} {verb} open; the same command goes on.")
