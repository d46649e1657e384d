"""The JSON file of a gap that meets a target. The table below is the format."""

from __future__ import annotations

from typing import Any, Literal

from femag.design_file import design_document
from femag.export.document import Entry
from femag.export.result_file import BoundsEntry
from femag.export.tolerance_entry import (
    SampledSpreadEntry,
    ToleranceBudgetEntry,
    budget_entry,
    spread_entry,
)
from femag.target_gap import TargetGap
from femag.target_turns import TargetTurns
from femag.tolerance_budget import SampledSpread


class HandGapEntry(Entry):
    """What a hand formula asks for, m; null where it asks for none."""

    name: str
    gap: float | None


class TurnsTrialEntry(Entry):
    """Turns that were tried, the greatest section mean in T (null where no gap will do)."""

    turns: int
    flux_density: float | None
    solutions: int


class GapDocument(Entry):
    """A gap and what it rests on, SI."""

    format: Literal["gapfield gap 1"]
    target: float
    current: float
    gap: float
    turns: int
    flux_density: float
    flux_density_limit: float | None
    trials: list[TurnsTrialEntry]
    solutions: int
    inductance: BoundsEntry
    slope: float
    hand: list[HandGapEntry]
    tolerance_budget: ToleranceBudgetEntry
    sampled: SampledSpreadEntry | None
    design: dict[str, Any]
    design_hash: str
    versions: dict[str, str]
    seconds: float


def gap_json(
    found: TargetGap, by_turns: TargetTurns | None = None, spread: SampledSpread | None = None
) -> str:
    """Return a gap that meets a target as JSON text, SI units throughout.

    Parameters
    ----------
    found : TargetGap
        The gap.
    by_turns : TargetTurns, optional
        How its turns were found.
    spread : SampledSpread, optional
        Samples of its tolerances.
    """
    bounds = found.inductance
    document = GapDocument(
        format="gapfield gap 1",
        target=found.target,
        current=found.design.current,
        gap=found.gap,
        turns=found.design.turns,
        flux_density=found.flux_density,
        flux_density_limit=by_turns.limit if by_turns else None,
        trials=[TurnsTrialEntry(**vars(trial)) for trial in by_turns.trials] if by_turns else [],
        solutions=(by_turns or found).solutions,
        inductance=BoundsEntry(lower=bounds.lower, value=bounds.value, upper=bounds.upper),
        slope=found.slope,
        hand=[HandGapEntry(name=entry.name, gap=entry.gap) for entry in found.hand],
        tolerance_budget=budget_entry(found.tolerance_budget),
        sampled=spread_entry(spread) if spread else None,
        design=design_document(found.design),
        design_hash=found.design_hash,
        versions=found.versions,
        seconds=(by_turns or found).seconds,
    )
    return document.model_dump_json(indent=2) + "\n"
