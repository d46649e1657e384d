"""The JSON file of a design's winding matrix. The tables below are the format."""

from __future__ import annotations

from typing import Any, Literal

from femag.coupled_windings import WindingMatrix, WindingPair
from femag.design_file import design_document
from femag.export.document import Entry
from femag.export.result_file import BoundsEntry
from femag.field.bounds import Bounds

Matrix = list[list[BoundsEntry | None]]
"""Row by row, in the order of the windings; null on the diagonal."""


class EquivalentEntry(Entry):
    """The T-equivalent of two windings with their nominal ratio, H."""

    first: str
    second: str
    magnetising_inductance: BoundsEntry
    series_of_first: BoundsEntry
    series_of_second: BoundsEntry
    opposed_inductance: BoundsEntry


class WindingsEntry(Entry):
    """Inductances in H; leakage and turns ratio from the winding of the row to that of the column.

    ``leakage``: inductance of the row's winding with the column's short-circuited.
    ``turns_ratio``: voltage of the column's, open, over that of the row's, driven.
    """

    names: tuple[str, ...]
    turns: tuple[int, ...]
    inductance_matrix: list[list[BoundsEntry]]
    coupling: Matrix
    leakage: Matrix
    turns_ratio: Matrix
    equivalents: list[EquivalentEntry]
    reciprocity: tuple[float, float]


class WindingDocument(Entry):
    """A winding matrix and what it rests on, SI."""

    format: Literal["gapfield windings 1"]
    windings: WindingsEntry
    current: float
    tolerance: float
    unknowns: int
    refinements: int
    seconds: float
    model_note: str
    design: dict[str, Any]
    design_hash: str
    versions: dict[str, str]


def winding_json(found: WindingMatrix) -> str:
    """Return a winding matrix as JSON text, SI units throughout."""
    document = WindingDocument(
        format="gapfield windings 1",
        windings=_windings(found),
        current=found.design.current,
        tolerance=found.design.tolerance,
        unknowns=found.unknowns,
        refinements=found.refinements,
        seconds=found.seconds,
        model_note=found.note,
        design=design_document(found.design),
        design_hash=found.design_hash,
        versions=found.versions,
    )
    return document.model_dump_json(indent=2) + "\n"


def _windings(found: WindingMatrix) -> WindingsEntry:
    names, pairs = found.names, found.pairs
    couplings = {(p.first, p.second): p.coupling for p in pairs}
    leakages = {(p.first, p.second): p.leakage_of_first for p in pairs}
    ratios = {(p.first, p.second): p.forward_ratio for p in pairs}
    return WindingsEntry(
        names=names,
        turns=found.turns,
        inductance_matrix=[[_entry(bounds) for bounds in row] for row in found.inductance],
        coupling=_matrix(names, couplings | {(p.second, p.first): p.coupling for p in pairs}),
        leakage=_matrix(
            names, leakages | {(p.second, p.first): p.leakage_of_second for p in pairs}
        ),
        turns_ratio=_matrix(names, ratios | {(p.second, p.first): p.backward_ratio for p in pairs}),
        equivalents=[_equivalent(pair) for pair in pairs],
        reciprocity=found.reciprocity,
    )


def _matrix(names: tuple[str, ...], entries: dict[tuple[str, str], Bounds]) -> Matrix:
    return [
        [None if row == column else _entry(entries[row, column]) for column in names]
        for row in names
    ]


def _equivalent(pair: WindingPair) -> EquivalentEntry:
    return EquivalentEntry(
        first=pair.first,
        second=pair.second,
        magnetising_inductance=_entry(pair.magnetising_inductance),
        series_of_first=_entry(pair.series_of_first),
        series_of_second=_entry(pair.series_of_second),
        opposed_inductance=_entry(pair.opposed_inductance),
    )


def _entry(bounds: Bounds) -> BoundsEntry:
    return BoundsEntry(lower=bounds.lower, value=bounds.value, upper=bounds.upper)
