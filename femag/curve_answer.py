"""A whole curve on the terminal: at most 80 columns, readable without colour."""

from __future__ import annotations

from itertools import pairwise

from rich.console import Console
from rich.table import Table
from rich.text import Text

from femag.answer import cautions, columns, described
from femag.current_curve import CurvePoint, InductanceCurve
from femag.export.curve_file import MeasuredBeside
from femag.measured_inductance import CAUTION, Fit
from femag.units import with_unit


def print_curve(
    curve: InductanceCurve, console: Console, measured: MeasuredBeside | None = None
) -> None:
    """Print points, saturation currents, what was measured, provenance and cautions."""
    design = curve.design
    lines: list[Text | Table | str] = []
    if design.title:
        lines.append(Text(design.title, style="bold"))
    lines += [described(design, _range(curve)), "", _points(curve), Text(_what_is_bounded(curve))]
    lines += ["", _saturation(curve), ""]
    if measured is not None:
        lines += [*_beside_measured(measured), ""]
    largest = max(curve.points, key=lambda point: abs(point.current))
    lines += [Text(_provenance(curve)), "", Text(cautions(_stored(curve), largest.current))]
    for line in lines:
        console.print(line, highlight=False)


def _range(curve: InductanceCurve) -> str:
    return f"{curve.points[0].current:g} A to {curve.points[-1].current:g} A"


def _points(curve: InductanceCurve) -> Table:
    names = ("current", "flux linkage", "apparent", "incremental", "co-energy", "half width")
    table = columns(*names, words=[])
    for point in curve.points:
        table.add_row(
            f"{point.current:g} A",
            with_unit(point.flux_linkage, "Wb"),
            with_unit(point.apparent_inductance, "H"),
            with_unit(point.incremental_inductance, "H"),
            with_unit(point.coenergy.value, "J"),
            f"{100 * relative_half_width(point):.2g} %" if point.current else "-",
        )
    return table


def relative_half_width(point: CurvePoint) -> float:
    """Return half the distance of the co-energy's bounds over what the current adds to it."""
    if point.magnet_flux_linkage == 0.0:
        return point.coenergy.relative_half_width
    return point.coenergy.half_width / (0.5 * point.apparent_inductance * point.current**2)


def _what_is_bounded(curve: InductanceCurve) -> str:
    driven = [point for point in curve.points if point.current]
    linkages, increments = (
        max(abs(second - first) / abs(value) for (first, second), value in pairs)
        for pairs in (
            [(p.flux_linkage_of_sides, p.apparent_inductance * p.current) for p in driven],
            [(p.incremental_inductance_of_sides, p.incremental_inductance) for p in driven],
        )
    )
    over = "of what the current adds to it " if curve.points[0].magnet_flux_linkage else ""
    return (
        f"Bounded: the co-energy, to the half width {over}on either side. Estimates without "
        "bounds: flux linkage, apparent (flux linkage over current) and incremental inductance "
        "(for small changes), each the mean of two solutions, which are at most "
        f"{100 * linkages:.1g} % (flux linkage) and {100 * increments:.1g} % (incremental) apart."
    )


def _saturation(curve: InductanceCurve) -> Table:
    table = columns("incremental inductance", "", "current", words=["incremental inductance"])
    has_magnet = curve.points[0].magnet_flux_linkage != 0.0
    start = "largest on the curve" if has_magnet else "initial, at small current"
    table.add_row(start, with_unit(curve.initial_inductance, "H"), "")
    farthest = max((point.current for point in curve.points), key=abs)
    for entry in curve.saturation:
        table.add_row(
            f"{100 * entry.drop:g} % less",
            with_unit((1.0 - entry.drop) * curve.initial_inductance, "H"),
            f"beyond {farthest:g} A" if entry.current is None else with_unit(entry.current, "A"),
        )
    return table


def _beside_measured(measured: MeasuredBeside) -> list[Text | Table | str]:
    """Return measured beside solved inductance, what was assumed, and the fit if there is one."""
    points, fit = measured.points, measured.fit
    names = ("current", f"measured, {points.kind}", "solved", "off by")
    table = columns(*names, *(["after the fit"] if fit else []), words=[])
    for place, residual in enumerate(measured.residuals):
        inductance = points.inductance[place]
        table.add_row(
            f"{points.current[place]:g} A",
            with_unit(inductance, "H"),
            with_unit((1.0 + residual) * inductance, "H"),
            f"{residual:+.2%}",
            *([f"{fit.residuals_after[place]:+.2%}"] if fit else []),
        )
    notes: list[Text | Table | str] = [Text(f"note: {note}") for note in points.notes]
    return [table, *notes, *(_fitted(fit) if fit else [])]


def _fitted(fit: Fit) -> list[Text | Table | str]:
    table = columns("fitted", "value", "standard error", words=["fitted"])
    if fit.gap is not None:
        table.add_row("gap", f"{1e3 * fit.gap:.4g} mm", _error(fit.gap_error, 1e3, " mm"))
    factor = f"{fit.permeability_factor:.4g}"
    table.add_row("permeability, over the design's", factor, _error(fit.permeability_error))
    notes = [f"note: {fit.note}"] if fit.note else []
    if fit.correlation is not None:
        notes.append(f"Both errors are correlated, {fit.correlation:+.3f}.")
    caution = f"{CAUTION[0].upper()}{CAUTION[1:]}. {fit.solutions} curves solved."
    return ["", table, *map(Text, notes), Text(caution)]


def _error(error: float | None, scale: float = 1.0, unit: str = "") -> str:
    return "none" if error is None else f"{scale * error:.2g}{unit}"


def _stored(curve: InductanceCurve) -> float:
    """Return the energy in J that the largest current has put into the field.

    That is lambda I - W'; with magnets, whose idle co-energy is not in the curve, the sum of
    I d lambda from point to point.
    """
    points = sorted(curve.points, key=lambda point: abs(point.current))
    last = points[-1]
    if last.magnet_flux_linkage == 0.0:
        return last.flux_linkage * last.current - last.coenergy.value
    steps = [(0.0, last.magnet_flux_linkage), *((p.current, p.flux_linkage) for p in points)]
    return sum(
        (i0 + i1) / 2 * (linked1 - linked0) for (i0, linked0), (i1, linked1) in pairwise(steps)
    )


def _provenance(curve: InductanceCurve) -> str:
    rest = "The bounds of the co-energy hold up to the quadrature of the energy densities."
    if curve.design.material.is_linear:
        rest = "The bounds of the co-energy are rigorous for this straight-sided model."
    return (
        f"{len(curve.points)} currents on one mesh, {curve.unknowns} unknowns, {curve.refinements} "
        f"refinements, {curve.seconds:.2f} s. {rest} {curve.design.core.model_note}"
    )
