"""Requirements held against a result: value, bounds, margin, and whether they are kept."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

from femag.quantities import copper_clearance
from femag.requirements import Limit, Sense
from femag.result import Result

Verdict = Literal["kept", "missed", "not shown"]


@dataclass(frozen=True)
class Known:
    """What is known of a quantity.

    Parameters
    ----------
    value : float or None
        Best value, SI; None where there is none.
    lower, upper : float or None
        Where the model has it, SI: bounds, or two estimates, as `basis` says.
    basis : str
        What the two rest on, for print; why there is no value.
    spread : float or None
        What the design's part tolerances may add to either end or take off it, SI; None where that
        is not known.
    """

    value: float | None
    lower: float | None
    upper: float | None
    basis: str
    spread: float | None = None


@dataclass(frozen=True)
class RequirementCheck:
    """One requirement beside what is known.

    Parameters
    ----------
    key : str
        Key in the design file's table [require].
    words : str
        What is required, for print.
    unit : str
        SI unit; "C" for degrees Celsius, empty for a yes or no.
    sense : {"least", "most"}
        Which side of the limit is accepted.
    limit : float or None
        SI; None for a yes or no.
    known : Known
        What is held against it.
    """

    key: str
    words: str
    unit: str
    sense: Sense
    limit: float | None
    known: Known

    @property
    def margin(self) -> float | None:
        """Room between the worse end and the limit over the limit; below 0 where it is missed.

        Parts are at the worse ends of their tolerances. Of temperatures the difference in kelvin.
        """
        room = self._room(worse=True)
        if room is None or self.limit is None:
            return None
        room -= self.known.spread or 0.0
        return room if self.unit == "C" else room / self.limit

    @property
    def verdict(self) -> Verdict:
        """Kept, missed, or not shown: the limit lies between both ends, or nothing is known."""
        if self.known.value is None:
            return "not shown"
        if self.margin is None or self.margin >= 0.0:
            return "kept"
        return "not shown" if self._is_between else "missed"

    @property
    def is_missed_by_tolerance(self) -> bool:
        """Whether it is missed with parts at their worse ends only."""
        room = self._room(worse=True)
        return self.verdict == "missed" and room is not None and room >= 0.0

    @property
    def _is_between(self) -> bool:
        worse, better = self._room(worse=True), self._room(worse=False)
        return worse is not None and better is not None and worse < 0.0 <= better

    def _room(self, *, worse: bool) -> float | None:
        """Return what is left of nominal parts at one end to the limit; below 0 beyond it."""
        at_lower = (self.sense == "least") == worse
        end = self.known.lower if at_lower else self.known.upper
        if end is None or self.limit is None:
            return None
        return end - self.limit if self.sense == "least" else self.limit - end


def checked_requirements(result: Result) -> tuple[RequirementCheck, ...]:
    """Return every requirement of a result's design beside what the result knows of it."""
    required = result.design.requirements
    checks = [_check(limit, KNOWN[limit.key](result)) for limit in required.limits()]
    if required.fit:
        checks.append(RequirementCheck("fit", "turns fit", "", "least", None, _fit(result)))
    return tuple(checks)


def all_kept(checks: tuple[RequirementCheck, ...]) -> bool:
    """Return whether every requirement is kept; what is not shown is not kept."""
    return all(check.verdict == "kept" for check in checks)


def _check(limit: Limit, known: Known) -> RequirementCheck:
    return RequirementCheck(limit.key, limit.words, limit.unit, limit.sense, limit.value, known)


def _inductance(result: Result) -> Known:
    bounds, budget = result.inductance, result.tolerance_budget
    spread = None if budget is None else budget.worst_case
    return Known(bounds.value, bounds.lower, bounds.upper, "bounds", spread)


def _incremental(result: Result) -> Known:
    sides = result.incremental_inductance_of_sides
    return Known(result.incremental_inductance, min(sides), max(sides), "two estimates")


def _post_flux_density(result: Result) -> Known:
    return _largest_mean(result, "post")


def _flux_density(result: Result) -> Known:
    return _largest_mean(result, "")


def _largest_mean(result: Result, part: str) -> Known:
    fullest = max(
        (mean for mean in result.section_means if mean.name.startswith(part)),
        key=lambda mean: mean.flux_density,
    )
    value = fullest.flux_density
    return Known(value, value, value, f"estimate, {fullest.name}")


def _clearance(result: Result) -> Known:
    found = copper_clearance(result.design)
    if found is None:
        return Known(None, None, None, "there is no gap")
    return Known(found.distance, found.distance, found.distance, f"geometry, winding {found.name}")


def _temperature(result: Result) -> Known:
    if not result.copper:
        return Known(None, None, None, "no winding has a conductor")
    coldest = min(result.copper, key=lambda copper: copper.temperature)
    value = coldest.temperature
    return Known(value, value, value, f"assumed for winding {coldest.name}")


def _loss(result: Result) -> Known:
    budget = result.loss_budget
    if budget is None:
        return Known(None, None, None, "a winding that carries current has no conductor")
    if budget.missing:
        return Known(None, None, None, f"not known: {', '.join(budget.missing)}")
    return Known(budget.total, budget.total, budget.total, "estimate, core and copper")


def _force(result: Result) -> Known:
    pull = result.force.halves
    ways = (*pull.stress_of_sides, *pull.work_of_sides)
    return Known(pull.force, min(ways), max(ways), f"four estimates, on the {pull.name}")


def _fit(result: Result) -> Known:
    """Return 1 for turns that fit; what does not fit was refused with the design."""
    bare = [winding.name for winding in result.design.windings if winding.conductor is None]
    if bare:
        return Known(None, None, None, f"winding {bare[0]} has no conductor")
    fullest = max(result.copper, key=lambda copper: copper.fill)
    return Known(1.0, 1.0, 1.0, f"largest fill {fullest.fill:.2f}, winding {fullest.name}")


KNOWN: dict[str, Callable[[Result], Known]] = {
    "inductance_least": _inductance,
    "inductance_most": _inductance,
    "incremental_inductance": _incremental,
    "flux_density": _post_flux_density,
    "core_flux_density": _flux_density,
    "loss": _loss,
    "force": _force,
    "copper_clearance": _clearance,
    "temperature": _temperature,
}
"""What is held against each limit."""
