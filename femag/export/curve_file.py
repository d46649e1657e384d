"""Files of a whole curve: JSON out and in. The tables below are the format."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any, Literal

from femag.current_curve import CurvePoint, InductanceCurve, Saturation
from femag.design_file import design_document, design_from_document
from femag.errors import InputError
from femag.export.document import Entry, check_against_design, document_of_file
from femag.export.result_file import BoundsEntry
from femag.export.whole_file import whole_file
from femag.field.bounds import Bounds
from femag.measured_inductance import Fit, MeasuredPoints

FORMAT: Literal["gapfield curve 1"] = "gapfield curve 1"
CLOSE = 1e-9
"""Share within which numbers that follow from others in the file must agree."""


@dataclass(frozen=True)
class MeasuredBeside:
    """Measured points beside a curve.

    Parameters
    ----------
    points : MeasuredPoints
        As measured.
    residuals : tuple of float
        Solved over measured inductance less 1, at each point.
    fit : Fit or None
        Gap and permeability fitted to the points, if that was asked for.
    """

    points: MeasuredPoints
    residuals: tuple[float, ...]
    fit: Fit | None = None


class PointEntry(Entry):
    """The field at one current: A, Wb, H, J. Only the co-energy is bounded."""

    current: float
    flux_linkage: float
    apparent_inductance: float
    incremental_inductance: float
    coenergy: BoundsEntry
    flux_linkage_of_sides: tuple[float, float]
    incremental_inductance_of_sides: tuple[float, float]
    magnet_flux_linkage: float
    iterations: tuple[int, int]


class SaturationEntry(Entry):
    """Current in A at which the incremental inductance has dropped by a share; null if beyond."""

    drop: float
    current: float | None


class MeasuredPointEntry(Entry):
    """A measured point: A, H; residual: solved over measured less 1."""

    current: float
    inductance: float
    residual: float


class FitEntry(Entry):
    """What was fitted to the points: gap in m, with standard errors of the fit only."""

    gap: float | None
    gap_error: float | None
    permeability_factor: float
    permeability_error: float | None
    correlation: float | None
    residuals: tuple[float, ...]
    solutions: int
    note: str


class MeasuredEntry(Entry):
    """Measured points beside the curve."""

    kind: Literal["apparent", "incremental"]
    source: str
    notes: tuple[str, ...]
    points: list[MeasuredPointEntry]
    fit: FitEntry | None


class CurveDocument(Entry):
    """Everything in a curve, SI."""

    format: Literal["gapfield curve 1"]
    design: dict[str, Any]
    design_hash: str
    versions: dict[str, str]
    tolerance: float
    points: list[PointEntry]
    saturation: list[SaturationEntry]
    initial_inductance: float
    model_note: str = ""
    unknowns: int
    refinements: int
    seconds: float
    measured: MeasuredEntry | None = None


def curve_json(curve: InductanceCurve, measured: MeasuredBeside | None = None) -> str:
    """Return a curve, and measured points beside it, as JSON text, SI units throughout."""
    return _document(curve, measured).model_dump_json(indent=2) + "\n"


def write_curve(
    curve: InductanceCurve, path: str | Path, measured: MeasuredBeside | None = None
) -> None:
    """Write a curve, and measured points beside it, as JSON: complete or not there.

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    text = curve_json(curve, measured)
    with whole_file(path) as temporary:
        temporary.write_text(text, encoding="utf-8")


def read_curve(path: str | Path) -> InductanceCurve:
    """Return the curve that a JSON file holds, without the measured points beside it.

    Raises
    ------
    InputError
        If the file cannot be read, is no curve of this program, or holds numbers that do not
        belong together.
    """
    document = document_of_file(path, CurveDocument, "curve", "gapfield curve")
    curve = _curve(document, str(path))
    _check_against_design(document, curve, str(path))
    for place, (entry, point) in enumerate(zip(document.points, curve.points, strict=True)):
        _check_point(entry, point, f"points.{place}", str(path))
    return curve


def _check_against_design(document: CurveDocument, curve: InductanceCurve, file: str) -> None:
    """Refuse a file whose numbers were not all written together."""
    check_against_design(document, curve.design, ("tolerance",), file)
    if len({entry.current for entry in document.points}) != len(document.points) or (
        len(document.points) < 2
    ):
        raise InputError(
            "two points or more are needed, each current once", key="points", file=file
        )


def _check_point(entry: PointEntry, point: CurvePoint, key: str, file: str) -> None:
    """Refuse a point whose numbers do not follow from each other."""
    bounds = entry.coenergy
    if not bounds.lower <= bounds.value <= bounds.upper:
        raise InputError("bounds out of order", key=f"{key}.coenergy", file=file)
    for name in ("flux_linkage", "apparent_inductance", "incremental_inductance"):
        written, follows = getattr(entry, name), getattr(point, name)
        if abs(written - follows) > CLOSE * abs(follows):
            raise InputError(
                "does not follow from the numbers beside it",
                key=f"{key}.{name}",
                value=written,
                accepted=f"{follows!r}",
                file=file,
            )


def _document(curve: InductanceCurve, measured: MeasuredBeside | None) -> CurveDocument:
    return CurveDocument(
        format=FORMAT,
        design=design_document(curve.design),
        design_hash=curve.design_hash,
        versions=curve.versions,
        tolerance=curve.design.tolerance,
        points=[_point_entry(point) for point in curve.points],
        saturation=[SaturationEntry(**vars(entry)) for entry in curve.saturation],
        initial_inductance=curve.initial_inductance,
        model_note=curve.design.core.model_note,
        unknowns=curve.unknowns,
        refinements=curve.refinements,
        seconds=curve.seconds,
        measured=None if measured is None else _measured_entry(measured),
    )


def _measured_entry(measured: MeasuredBeside) -> MeasuredEntry:
    points, fit = measured.points, measured.fit
    rows = zip(points.current, points.inductance, measured.residuals, strict=True)
    return MeasuredEntry(
        kind=points.kind,
        source=points.source,
        notes=points.notes,
        points=[
            MeasuredPointEntry(current=current, inductance=inductance, residual=residual)
            for current, inductance, residual in rows
        ],
        fit=None if fit is None else _fit_entry(fit),
    )


def _fit_entry(fit: Fit) -> FitEntry:
    return FitEntry(
        gap=fit.gap,
        gap_error=fit.gap_error,
        permeability_factor=fit.permeability_factor,
        permeability_error=fit.permeability_error,
        correlation=fit.correlation,
        residuals=fit.residuals_after,
        solutions=fit.solutions,
        note=fit.note,
    )


def _point_entry(point: CurvePoint) -> PointEntry:
    bounds = point.coenergy
    return PointEntry(
        current=point.current,
        flux_linkage=point.flux_linkage,
        apparent_inductance=point.apparent_inductance,
        incremental_inductance=point.incremental_inductance,
        coenergy=BoundsEntry(lower=bounds.lower, value=bounds.value, upper=bounds.upper),
        flux_linkage_of_sides=point.flux_linkage_of_sides,
        incremental_inductance_of_sides=point.incremental_inductance_of_sides,
        magnet_flux_linkage=point.magnet_flux_linkage,
        iterations=point.iterations,
    )


def _curve(document: CurveDocument, file: str) -> InductanceCurve:
    return InductanceCurve(
        design=design_from_document(document.design, file),
        points=tuple(
            CurvePoint(
                current=entry.current,
                coenergy=Bounds(entry.coenergy.lower, entry.coenergy.upper, "J"),
                flux_linkage_of_sides=entry.flux_linkage_of_sides,
                incremental_inductance_of_sides=entry.incremental_inductance_of_sides,
                magnet_flux_linkage=entry.magnet_flux_linkage,
                iterations=entry.iterations,
            )
            for entry in document.points
        ),
        initial_inductance=document.initial_inductance,
        saturation=tuple(Saturation(entry.drop, entry.current) for entry in document.saturation),
        unknowns=document.unknowns,
        refinements=document.refinements,
        seconds=document.seconds,
        versions=document.versions,
        design_hash=document.design_hash,
    )
