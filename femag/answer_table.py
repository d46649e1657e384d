"""Tables on the terminal."""

from __future__ import annotations

from collections.abc import Sequence

from rich.table import Table


def columns(*names: str, words: Sequence[str], gap: int = 2) -> Table:
    """Return an empty table without lines: columns of `words` to the left, numbers to the right."""
    table = Table(box=None, padding=(0, gap, 0, 0), pad_edge=False, header_style="underline")
    for name in names:
        table.add_column(name, justify="left" if name in words else "right", overflow="fold")
    return table
