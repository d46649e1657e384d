"""The JSON file of a gap that meets a target. The table below is the format."""

from __future__ import annotations

from typing import Any, Literal

from femag.design_file import design_document
from femag.export.document import Entry
from femag.export.result_file import BoundsEntry
from femag.target_gap import TargetGap


class HandGapEntry(Entry):
    """What a hand formula asks for, m; null where it asks for none."""

    name: str
    gap: float | None


class GapDocument(Entry):
    """A gap and what it rests on, SI."""

    format: Literal["gapfield gap 1"]
    target: float
    current: float
    gap: float
    solutions: int
    inductance: BoundsEntry
    slope: float
    hand: list[HandGapEntry]
    design: dict[str, Any]
    design_hash: str
    versions: dict[str, str]
    seconds: float


def gap_json(found: TargetGap) -> str:
    """Return a gap that meets a target as JSON text, SI units throughout."""
    bounds = found.inductance
    document = GapDocument(
        format="gapfield gap 1",
        target=found.target,
        current=found.design.current,
        gap=found.gap,
        solutions=found.solutions,
        inductance=BoundsEntry(lower=bounds.lower, value=bounds.value, upper=bounds.upper),
        slope=found.slope,
        hand=[HandGapEntry(name=entry.name, gap=entry.gap) for entry in found.hand],
        design=design_document(found.design),
        design_hash=found.design_hash,
        versions=found.versions,
        seconds=found.seconds,
    )
    return document.model_dump_json(indent=2) + "\n"
