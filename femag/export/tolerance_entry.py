"""A tolerance budget in JSON, SI units."""

from __future__ import annotations

from femag.export.document import Entry
from femag.tolerance_budget import Contribution, SampledSpread, ToleranceBudget


class ContributionEntry(Entry):
    """A parameter, its half range (m, or a share) and the change of the inductance with it, H."""

    name: str
    half_range: float
    change: float


class ToleranceBudgetEntry(Entry):
    """Changes of the inductance in H: each, all at their worst, root of the sum of squares."""

    inductance: float
    contributions: list[ContributionEntry]
    worst_case: float
    root_sum_square: float
    customary: bool


class SampledSpreadEntry(Entry):
    """Inductances in H of samples from full solutions."""

    samples: int
    seed: int
    mean: float
    standard_deviation: float
    linear_standard_deviation: float
    limits: tuple[float, float]
    lowest: float
    highest: float


def budget_entry(budget: ToleranceBudget) -> ToleranceBudgetEntry:
    """Return the entry of a budget."""
    return ToleranceBudgetEntry(
        inductance=budget.inductance,
        contributions=[ContributionEntry(**vars(entry)) for entry in budget.contributions],
        worst_case=budget.worst_case,
        root_sum_square=budget.root_sum_square,
        customary=budget.is_customary,
    )


def budget_of_entry(entry: ToleranceBudgetEntry) -> ToleranceBudget:
    """Return the budget of an entry."""
    contributions = tuple(Contribution(**one.model_dump()) for one in entry.contributions)
    return ToleranceBudget(entry.inductance, contributions, entry.customary)


def spread_entry(spread: SampledSpread) -> SampledSpreadEntry:
    """Return the entry of a sampled spread."""
    return SampledSpreadEntry(
        samples=len(spread.inductances),
        seed=spread.seed,
        mean=spread.mean,
        standard_deviation=spread.standard_deviation,
        linear_standard_deviation=spread.linear_standard_deviation,
        limits=spread.limits,
        lowest=float(spread.inductances.min()),
        highest=float(spread.inductances.max()),
    )
