"""Result files: JSON out and in. The tables below are the format."""

from __future__ import annotations

from pathlib import Path
from typing import Any, Literal

from pydantic import Field

from femag.design_file import design_document, design_from_document
from femag.errors import InputError
from femag.export.document import Entry, check_against_design, document_of_file
from femag.export.loss_entries import (
    CopperLossEntry,
    CoreLossEntry,
    LossBudgetEntry,
    copper_loss_entry,
    copper_loss_of,
    core_loss_entry,
    core_loss_of,
    loss_budget_entry,
)
from femag.export.tolerance_entry import (
    SampledSpreadEntry,
    ToleranceBudgetEntry,
    budget_entry,
    budget_of_entry,
    spread_entry,
)
from femag.export.whole_file import whole_file
from femag.field.bounds import Bounds
from femag.hand import HandEstimate
from femag.quantities import Force, Pull, SectionMean, VolumeShare, WoundCopper
from femag.requirement_checks import RequirementCheck, checked_requirements
from femag.result import Comparison, Result
from femag.tolerance_budget import SampledSpread

FORMAT: Literal["gapfield result 1"] = "gapfield result 1"


class BoundsEntry(Entry):
    """A quantity between two bounds, SI."""

    lower: float
    value: float
    upper: float


class HandEntry(Entry):
    """A hand formula beside the field: H, error as a share, validity and source."""

    name: str
    inductance: float
    error: float
    in_range: bool
    range: str
    source: str


class SectionMeanEntry(Entry):
    """Mean flux density (T) through one cut (area in m2)."""

    name: str
    area: float
    flux_density: float


class VolumeShareEntry(Entry):
    """Flux density (T) that a share of the core's volume stays below."""

    share: float
    flux_density: float


class CopperEntry(Entry):
    """Conductor of a winding: m, ohm, degrees Celsius."""

    name: str
    turns: int
    layers: int
    fill: float
    mean_turn_length: float
    wire_length: float
    resistance: float
    temperature: float
    turns_in_sections: tuple[int, ...]
    layers_in_sections: tuple[int, ...]


class RequirementEntry(Entry):
    """A requirement of the design beside what is known, SI or degrees Celsius; margin a share."""

    key: str
    unit: str
    sense: Literal["least", "most"]
    limit: float | None
    value: float | None
    lower: float | None
    upper: float | None
    basis: str
    spread: float | None
    margin: float | None
    verdict: Literal["kept", "missed", "not shown"]


class PullEntry(Entry):
    """An attraction along the axis: N, and Pa on an area in m2; of sides: flux, potential."""

    name: str
    force: float
    pressure: float
    area: float
    stress_of_sides: tuple[float, float]
    work_of_sides: tuple[float, float]


class ForceEntry(Entry):
    """Pull of the halves, on what bears it, and of the faces of every gap."""

    halves: PullEntry
    gaps: list[PullEntry]


class ResultDocument(Entry):
    """Everything in a result but the fields, SI."""

    format: Literal["gapfield result 1"]
    design: dict[str, Any]
    design_hash: str
    versions: dict[str, str]
    current: float
    tolerance: float
    inductance: BoundsEntry
    apparent_inductance: float
    incremental_inductance: float
    incremental_inductance_of_sides: tuple[float, float]
    flux_linkage: float
    flux_linkage_of_sides: tuple[float, float]
    magnet_flux_linkage: float | None
    magnet_flux_linkage_of_sides: tuple[float, float] | None
    magnet_coenergy: BoundsEntry | None
    coenergy: BoundsEntry
    fringing_factor: float
    gap_factor: float | None
    plain_inductance: float
    section_means: list[SectionMeanEntry]
    volume_shares: list[VolumeShareEntry] = Field(default_factory=list)
    copper: list[CopperEntry]
    requirements: list[RequirementEntry] = Field(default_factory=list)
    copper_loss: list[CopperLossEntry] = Field(default_factory=list)
    core_loss: CoreLossEntry | None = None
    losses: LossBudgetEntry | None = None
    force: ForceEntry
    tolerance_budget: ToleranceBudgetEntry | None = None
    sampled: SampledSpreadEntry | None = None
    hand: list[HandEntry]
    model_note: str = ""
    unknowns: int
    refinements: int
    seconds: float


def result_json(result: Result, spread: SampledSpread | None = None) -> str:
    """Return a result as JSON text, SI units throughout.

    Parameters
    ----------
    result : Result
        What was solved.
    spread : SampledSpread, optional
        Samples of the design's tolerances; `read_result` leaves them out.
    """
    sampled = {"sampled": spread_entry(spread)} if spread else {}
    return _document(result).model_copy(update=sampled).model_dump_json(indent=2) + "\n"


def write_result(result: Result, path: str | Path) -> None:
    """Write a result as JSON: the file is complete or not there.

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    text = result_json(result)
    with whole_file(path) as temporary:
        temporary.write_text(text, encoding="utf-8")


def read_result(path: str | Path) -> Result:
    """Return the result that a JSON file holds, without its fields.

    Raises
    ------
    InputError
        If the file cannot be read or is no result of this program.
    """
    document = document_of_file(path, ResultDocument, "result", "gapfield solve")
    result = _result(document, str(path))
    _check_against_design(document, result, str(path))
    return result


def _check_against_design(document: ResultDocument, result: Result, file: str) -> None:
    """Refuse a file whose numbers were not all written together."""
    for key in ("inductance", "coenergy", "magnet_coenergy"):
        bounds = getattr(document, key)
        if bounds is not None and not bounds.lower <= bounds.value <= bounds.upper:
            raise InputError("bounds out of order", key=key, file=file)
    if document.plain_inductance <= 0.0:
        raise InputError("not positive", key="plain_inductance", file=file)
    check_against_design(document, result.design, ("current", "tolerance"), file)


def _document(result: Result) -> ResultDocument:
    return ResultDocument(
        format=FORMAT,
        design=design_document(result.design),
        design_hash=result.design_hash,
        versions=result.versions,
        current=result.current,
        tolerance=result.design.tolerance,
        inductance=_bounds_entry(result.inductance),
        apparent_inductance=result.apparent_inductance,
        incremental_inductance=result.incremental_inductance,
        incremental_inductance_of_sides=result.incremental_inductance_of_sides,
        flux_linkage=result.flux_linkage,
        flux_linkage_of_sides=result.flux_linkage_of_sides,
        magnet_flux_linkage=result.magnet_flux_linkage,
        magnet_flux_linkage_of_sides=result.magnet_flux_linkage_of_sides,
        magnet_coenergy=_bounds_entry(result.magnet_coenergy) if result.magnet_coenergy else None,
        coenergy=_bounds_entry(result.coenergy),
        fringing_factor=result.fringing_factor,
        gap_factor=result.gap_factor,
        plain_inductance=result.plain_inductance,
        section_means=[SectionMeanEntry(**vars(mean)) for mean in result.section_means],
        volume_shares=[VolumeShareEntry(**vars(share)) for share in result.volume_shares],
        copper=[CopperEntry(**vars(copper)) for copper in result.copper],
        requirements=[_requirement_entry(check) for check in checked_requirements(result)],
        copper_loss=[copper_loss_entry(loss) for loss in result.copper_loss],
        core_loss=core_loss_entry(result.core_loss) if result.core_loss else None,
        losses=loss_budget_entry(result.loss_budget) if result.loss_budget else None,
        force=ForceEntry(
            halves=_pull_entry(result.force.halves),
            gaps=[_pull_entry(pull) for pull in result.force.gaps],
        ),
        tolerance_budget=budget_entry(result.tolerance_budget) if result.tolerance_budget else None,
        hand=[HandEntry(**vars(c.estimate), error=c.error) for c in result.hand],
        model_note=result.design.core.model_note,
        unknowns=result.unknowns,
        refinements=result.refinements,
        seconds=result.seconds,
    )


def _requirement_entry(check: RequirementCheck) -> RequirementEntry:
    return RequirementEntry(
        key=check.key,
        unit=check.unit,
        sense=check.sense,
        limit=check.limit,
        margin=check.margin,
        verdict=check.verdict,
        **vars(check.known),
    )


def _bounds_entry(bounds: Bounds) -> BoundsEntry:
    return BoundsEntry(lower=bounds.lower, value=bounds.value, upper=bounds.upper)


def _pull_entry(pull: Pull) -> PullEntry:
    return PullEntry(**vars(pull), force=pull.force, pressure=pull.pressure)


def _pull(entry: PullEntry) -> Pull:
    return Pull(**entry.model_dump(exclude={"force", "pressure"}))


def _bounds_or_none(entry: BoundsEntry | None) -> Bounds | None:
    return None if entry is None else Bounds(entry.lower, entry.upper, "J")


def _result(document: ResultDocument, file: str) -> Result:
    return Result(
        design=design_from_document(document.design, file),
        inductance=Bounds(document.inductance.lower, document.inductance.upper, "H"),
        coenergy=Bounds(document.coenergy.lower, document.coenergy.upper, "J"),
        flux_linkage_of_sides=document.flux_linkage_of_sides,
        magnet_flux_linkage_of_sides=document.magnet_flux_linkage_of_sides,
        magnet_coenergy=_bounds_or_none(document.magnet_coenergy),
        incremental_inductance_of_sides=document.incremental_inductance_of_sides,
        plain_inductance=document.plain_inductance,
        gap_factor=document.gap_factor,
        hand=tuple(
            Comparison(HandEstimate(**entry.model_dump(exclude={"error"})), entry.error)
            for entry in document.hand
        ),
        section_means=tuple(SectionMean(**mean.model_dump()) for mean in document.section_means),
        volume_shares=tuple(VolumeShare(**s.model_dump()) for s in document.volume_shares),
        copper=tuple(WoundCopper(**copper.model_dump()) for copper in document.copper),
        copper_loss=tuple(copper_loss_of(entry) for entry in document.copper_loss),
        core_loss=core_loss_of(document.core_loss) if document.core_loss else None,
        force=Force(
            _pull(document.force.halves), tuple(_pull(pull) for pull in document.force.gaps)
        ),
        unknowns=document.unknowns,
        refinements=document.refinements,
        seconds=document.seconds,
        versions=document.versions,
        design_hash=document.design_hash,
        tolerance_budget=(
            budget_of_entry(document.tolerance_budget) if document.tolerance_budget else None
        ),
    )
