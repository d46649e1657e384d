"""How far copper must stay from the gap, on the terminal: at most 80 columns."""

from __future__ import annotations

from rich.console import Console
from rich.table import Table
from rich.text import Text

from femag.answer import columns, described
from femag.copper_distance import KeepOut, KeepOutCurve

FACTORS = (1.5, 1.1)
"""Levels over the gap-free one whose distances are printed."""
MOST_COLUMNS = 8
"""Numbers of pieces that fit side by side."""
NOTE = (
    "Mean squared field over the copper, over that with the gap spread evenly along the post: the "
    "eddy currents in strands thinner than a skin depth go with it. Winding: its inner edge is "
    "moved there, its outside kept, and the field solved again. Layer: 1 and what the gap adds in "
    "a thin layer there, with the current where the design has it, over the level at the inner "
    "edge of the design's copper. The core counts with its initial permeability."
)


def print_keep_out(found: KeepOut, console: Console) -> None:
    """Print the squared field against distance for every number of pieces."""
    if found.design.title:
        console.print(Text(found.design.title, style="bold"))
    console.print(described(found.design))
    console.print()
    curves = found.curves[:MOST_COLUMNS]
    console.print(_table(found, curves, "winding"), highlight=False)
    console.print()
    console.print(_distances(found, curves), highlight=False)
    console.print()
    console.print(_table(found, curves, "layer"), highlight=False)
    console.print()
    console.print(Text(f"{NOTE} {found.seconds:.2f} s."))


def _table(found: KeepOut, curves: tuple[KeepOutCurve, ...], what: str) -> Table:
    heads = [f"{curve.pieces}" for curve in curves]
    table = columns(f"{what} at", "gaps", *heads, words=[f"{what} at"])
    for place, distance in enumerate(found.distances):
        name = f"{1e3 * distance:.4g} mm" + (" (design)" if distance == found.distance else "")
        values = (getattr(curve, what)[place] for curve in curves)
        table.add_row(name, f"{distance / found.gap:.2f}", *(f"{value:.3g}" for value in values))
    return table


def _distances(found: KeepOut, curves: tuple[KeepOutCurve, ...]) -> Table:
    """Return the distances from which on the winding has at most a factor."""
    heads = [f"{curve.pieces}" for curve in curves]
    table = columns("winding has at most", "", *heads, words=["winding has at most"])
    for factor in FACTORS:
        texts = (_from_on(found, found.distance_for(curve, factor)) for curve in curves)
        table.add_row(f"{factor:g} from, mm", "", *texts)
    table.add_row("pitch, mm", "", *(f"{1e3 * curve.pitch:.3g}" for curve in curves))
    return table


def _from_on(found: KeepOut, distance: float | None) -> str:
    if distance is None:
        return f">{1e3 * found.distances[-1]:.3g}"
    within = "<" if distance == found.distances[0] else ""
    return f"{within}{1e3 * distance:.3g}"
