"""A winding matrix on the terminal."""

from __future__ import annotations

import math
from collections.abc import Iterator

from rich.console import Console
from rich.table import Table
from rich.text import Text

from femag.answer import columns, described, with_turns
from femag.coupled_windings import WindingMatrix, WindingPair
from femag.field.bounds import Bounds
from femag.units import with_unit

COLUMNS = 4
"""Columns of the matrix that fit side by side."""


def print_windings(found: WindingMatrix, console: Console) -> None:
    """Print the inductance matrix, what every two windings do together, and what it rests on."""
    design = found.design
    if design.title:
        console.print(Text(design.title, style="bold"))
    console.print(described(design))
    for first in range(0, len(found.names), COLUMNS):
        console.print()
        console.print(_matrix(found, range(len(found.names))[first : first + COLUMNS]))
    for pair in found.pairs:
        console.print()
        console.print(_pair(pair), highlight=False)
    console.print()
    console.print(Text(_provenance(found)))


def _matrix(found: WindingMatrix, places: range) -> Table:
    """Return some columns of the matrix, middles of the bounds."""
    head = "inductance"
    table = columns(head, *(found.names[place] for place in places), words=[head])
    for name, turns, row in zip(found.names, found.turns, found.inductance, strict=True):
        shown = [_digits(row[place]) for place in places]
        values = [
            with_unit(row[place].value, "H", digits)
            for place, digits in zip(places, shown, strict=True)
        ]
        table.add_row(Text(f"{name}, {with_turns(turns)}"), *values)
    return table


def _pair(pair: WindingPair) -> Table:
    head = f"{pair.first} and {pair.second}"
    table = columns(head, "", "", words=[head])
    for words, bounds in _rows(pair):
        digits = _digits(bounds)
        middle, lower, upper = (
            with_unit(value, "H", digits) if bounds.unit else f"{value:.{digits}g}"
            for value in (bounds.value, bounds.lower, bounds.upper)
        )
        table.add_row(Text(words), middle, f"between {lower} and {upper}")
    return table


def _rows(pair: WindingPair) -> Iterator[tuple[str, Bounds]]:
    one, other = pair.first, pair.second
    yield "coupling", pair.coupling
    yield f"leakage at {one}, {other} shorted", pair.leakage_of_first
    yield f"leakage at {other}, {one} shorted", pair.leakage_of_second
    yield f"opposed ampere turns, at {one}", pair.opposed_inductance
    yield f"voltage {other}/{one}, {one} driven", pair.forward_ratio
    yield f"voltage {one}/{other}, {other} driven", pair.backward_ratio
    yield f"T, ratio {pair.nominal_ratio:.4g}: across {one}", pair.magnetising_inductance
    yield f"T: in series with {one}", pair.series_of_first
    yield f"T: in series with {other}", pair.series_of_second


def _digits(bounds: Bounds) -> int:
    """Return how many digits a value deserves: up to the second of its half width."""
    known = min(max(bounds.relative_half_width, 1e-8), 0.1)
    return 1 - math.floor(math.log10(known))


def _provenance(found: WindingMatrix) -> str:
    design = found.design
    if design.material.is_linear:
        rest = "The bounds are rigorous for this straight-sided model."
    else:
        driven = ", ".join(winding.name for winding in design.driven_windings)
        rest = (
            f"Small signal at {design.current:g} A in {driven}: the bounds hold for the problem "
            "that is linearised at the computed field; how far that field is off is not in them."
        )
    return (
        f"{found.unknowns} unknowns, {found.refinements} refinements, {found.seconds:.2f} s. "
        f"{rest} M12 and M21 differ by {max(found.reciprocity):.0e}. {found.note}".rstrip()
    )
