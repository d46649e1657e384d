"""The JSON file of a gap that meets a target. The table below is the format."""

from __future__ import annotations

from typing import Any, Literal

from pydantic import BaseModel, ConfigDict

from femag.design_file import design_document
from femag.target_gap import TargetGap


class _Entry(BaseModel):
    model_config = ConfigDict(frozen=True, allow_inf_nan=False, extra="forbid")


class InductanceEntry(_Entry):
    """Energy inductance between bounds, H."""

    lower: float
    value: float
    upper: float


class HandGapEntry(_Entry):
    """What a hand formula asks for, m; null where it asks for none."""

    name: str
    gap: float | None


class GapDocument(_Entry):
    """A gap and what it rests on, SI."""

    format: Literal["gapfield gap 1"]
    target: float
    current: float
    gap: float
    solutions: int
    inductance: InductanceEntry
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
        inductance=InductanceEntry(lower=bounds.lower, value=bounds.value, upper=bounds.upper),
        slope=found.slope,
        hand=[HandGapEntry(name=entry.name, gap=entry.gap) for entry in found.hand],
        design=design_document(found.design),
        design_hash=found.design_hash,
        versions=found.versions,
        seconds=found.seconds,
    )
    return document.model_dump_json(indent=2) + "\n"
