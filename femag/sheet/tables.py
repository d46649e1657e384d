"""The tables of the sheet: numbers as text, ready to be set."""

from __future__ import annotations

from dataclasses import dataclass

from femag.answer import described_gap, layers_text
from femag.current_curve import CurvePoint, InductanceCurve
from femag.curve_answer import relative_half_width
from femag.geometry import Block, Conductor, Foil, LitzWire, RoundWire
from femag.quantities import Pull, WoundCopper, copper_clearance
from femag.requirement_answer import (
    interval_text,
    limit_text,
    margin_text,
    reason,
    spread_text,
    value_text,
)
from femag.result import Result
from femag.review import MeshStep, Review
from femag.sheet.texts import shown, shown_together, with_micro
from femag.tolerance_answer import half_range_text
from femag.tolerance_budget import ToleranceBudget

Row = tuple[str, ...]


@dataclass(frozen=True)
class Table:
    """A table as it is set.

    Parameters
    ----------
    caption : str
        What it shows.
    head : tuple of str
        Names of the columns.
    rows : tuple of tuple of str
        Cells.
    words : frozenset of int
        Columns of words, set to the left; numbers are set to the right.
    """

    caption: str
    head: Row
    rows: tuple[Row, ...]
    words: frozenset[int] = frozenset({0})


def requirement_rows(review: Review) -> tuple[Row, ...]:
    """Return value, interval, limit, spread, margin, verdict and basis of every requirement."""
    return tuple(
        (
            check.words,
            with_micro(value_text(check)).replace(" C", " \N{DEGREE SIGN}C"),
            interval_text(check) or "-",
            with_micro(limit_text(check)).replace(" C", " \N{DEGREE SIGN}C"),
            spread_text(check),
            margin_text(check),
            check.verdict,
            reason(check) or check.known.basis,
        )
        for check in review.checks
    )


def part_table(review: Review) -> Table:
    """Return core, gaps, windings, material and drive of the design."""
    design = review.design
    core = ", ".join(text for text in (design.core.name, design.core.description) if text)
    rows = [("core", core)]
    rows += [("gap", described_gap(gap)) for gap in design.gaps] or [("gap", "none")]
    for winding in design.windings:
        carried = "" if winding in design.driven_windings else ", without current"
        laid = "" if winding.conductor is None else f" of {_conductor_text(winding.conductor)}"
        rows.append((f"winding {winding.name}", f"{winding.turns} turns{laid}{carried}"))
        if winding.block is not None:
            rows.append(("  copper", _block_text(winding.block)))
    rows += [("material", design.material.label), ("peak current", f"{design.current:g} A")]
    if design.detail == "turn":
        rows.append(("field", "turn by turn"))
    return Table("The design as it was solved", ("part", ""), tuple(rows), frozenset({0, 1}))


def _conductor_text(conductor: Conductor) -> str:
    match conductor:
        case RoundWire(diameter):
            return f"round wire, {1e3 * diameter:g} mm bare"
        case LitzWire(strands, strand):
            return f"litz, {strands} x {1e3 * strand:g} mm"
        case Foil(thickness):
            return f"foil, {1e3 * thickness:g} mm"


def _block_text(block: Block) -> str:
    r0, r1, z0, z1 = (
        f"{1e3 * edge:.4g}"
        for edge in (block.inner_radius, block.outer_radius, block.bottom, block.top)
    )
    return f"radius {r0} to {r1} mm, height {z0} to {z1} mm"


def inductance_table(result: Result) -> Table:
    """Return the inductances and factors of the peak current."""
    bounds = result.inductance
    value, lower, upper = shown_together((bounds.value, bounds.lower, bounds.upper), "H", 5)
    rows: list[Row] = [
        ("inductance", value, f"between {lower.split()[0]} and {upper}"),
        ("half width of the bounds", f"{100 * bounds.relative_half_width:.2g} %", "of the value"),
        (
            "apparent inductance",
            shown(result.apparent_inductance, "H"),
            "flux linkage over current",
        ),
        ("incremental inductance", shown(result.incremental_inductance, "H"), "for small changes"),
        ("AL value", shown(result.al_value, "H"), "inductance over turns squared"),
        (
            "fringing factor",
            f"{result.fringing_factor:.4f}",
            f"over {shown(result.plain_inductance, 'H')} without fringing",
        ),
    ]
    if result.gap_factor is not None:
        factor = f"{result.gap_factor:.4f}"
        rows.append(("gap factor", factor, "plain gap reluctance over the field's"))
    rows.append(("stored energy", shown(result.stored_energy, "J", 3), "by the current"))
    caption = f"At the peak current, {result.current:g} A"
    return Table(caption, ("quantity", "value", ""), tuple(rows), frozenset({0, 2}))


def section_table(result: Result) -> Table:
    """Return the mean flux density through every cut of the core."""
    rows = tuple(
        (mean.name, f"{mean.flux_density:.4f}", f"{1e6 * mean.area:.1f}")
        for mean in result.section_means
    )
    caption = f"Mean flux density through sections of the core at {result.current:g} A"
    return Table(caption, ("section", "B, T", "area, mm\N{SUPERSCRIPT TWO}"), rows)


def point_table(curve: InductanceCurve) -> Table:
    """Return the points of the curve."""
    names = ("current", "flux linkage", "apparent", "incremental", "co-energy", "half width")
    rows = tuple(_point_row(point) for point in curve.points)
    return Table("Inductance against current", names, rows, frozenset())


def _point_row(point: CurvePoint) -> Row:
    return (
        f"{point.current:.4g} A",
        shown(point.flux_linkage, "Wb"),
        shown(point.apparent_inductance, "H"),
        shown(point.incremental_inductance, "H"),
        shown(point.coenergy.value, "J"),
        f"{100 * relative_half_width(point):.2g} %" if point.current else "-",
    )


def saturation_table(curve: InductanceCurve) -> Table:
    """Return the currents at which the incremental inductance has dropped."""
    farthest = max((point.current for point in curve.points), key=abs)
    rows = tuple(
        (
            f"{100 * entry.drop:g} % less",
            shown((1.0 - entry.drop) * curve.initial_inductance, "H"),
            f"beyond {farthest:.4g} A" if entry.current is None else shown(entry.current, "A"),
        )
        for entry in curve.saturation
    )
    caption = f"Saturation: against {shown(curve.initial_inductance, 'H')} at small current"
    return Table(caption, ("incremental inductance", "", "current"), rows)


def measured_table(review: Review) -> Table | None:
    """Return solved beside measured inductance; None where nothing is measured."""
    points = review.measured
    if points is None:
        return None
    rows = tuple(
        (
            f"{current:g} A",
            shown(value, "H"),
            shown((1.0 + off) * value, "H"),
            f"{100 * off:+.2f} %",
        )
        for current, value, off in zip(
            points.current, points.inductance, review.residuals, strict=True
        )
    )
    names = ("current", "measured", "solved", "solved over measured")
    caption = f"Measured {points.kind} inductance, {points.source or 'points given'}"
    return Table(caption, names, rows, frozenset())


def hand_rows(result: Result) -> tuple[tuple[str, str, float, str, str, str], ...]:
    """Return name, inductance, error, in range or not, range and source of every formula."""
    return tuple(
        (
            row.estimate.name,
            shown(row.estimate.inductance, "H"),
            row.error,
            "yes" if row.estimate.in_range else "no",
            row.estimate.range,
            row.estimate.source,
        )
        for row in result.hand
    )


def clearance_text(result: Result) -> str:
    """Return how near copper comes to a gap, in words."""
    found = copper_clearance(result.design)
    if found is None:
        return "There is no gap that copper could be near to."
    if found.distance <= 0.0:
        return (
            f"Winding {found.name} reaches the edge of a gap of {1e3 * found.gap:.3g} mm. To keep "
            "two to three gap lengths away is common practice, no source."
        )
    return (
        f"Winding {found.name} comes as near as {1e3 * found.distance:.3g} mm to the edge of a "
        f"gap of {1e3 * found.gap:.3g} mm: {found.distance / found.gap:.2g} gap lengths. To keep "
        "two to three away is common practice, no source."
    )


def copper_table(copper: tuple[WoundCopper, ...]) -> Table | None:
    """Return the conductors of the windings; None where no winding has one."""
    if not copper:
        return None
    rows = tuple(
        (
            one.name,
            f"{one.turns}",
            layers_text(one),
            f"{one.fill:.2f}",
            f"{1e3 * one.mean_turn_length:.1f} mm",
            f"{one.wire_length:.3g} m",
            f"{shown(one.resistance, 'ohm', 3)} at {one.temperature:g} \N{DEGREE SIGN}C",
        )
        for one in copper
    )
    names = ("winding", "turns", "layers", "fill", "mean turn", "wire", "resistance")
    return Table("Conductors", names, rows)


def mesh_table(meshes: tuple[MeshStep, ...]) -> Table:
    """Return the bounds on every mesh of the row."""
    every = [(s.inductance.lower, s.inductance.value, s.inductance.upper) for s in meshes]
    final = meshes[-1].inductance.value
    texts = shown_together((final, *(value for row in every for value in row)), "H", 6)
    numbers = [text.split()[0] for text in texts[1:]]
    rows = tuple(
        (
            f"{step.unknowns}",
            *numbers[3 * place : 3 * place + 3],
            f"{100 * step.inductance.relative_half_width:.2g} %",
        )
        for place, step in enumerate(meshes)
    )
    names = ("unknowns", "lower bound", "middle", "upper bound", "half width")
    caption = f"The bounds on a row of ever finer meshes, {texts[0].split()[1]}"
    return Table(caption, names, rows, frozenset())


def tolerance_table(budget: ToleranceBudget) -> Table:
    """Return what every part tolerance does to the inductance, and all of them together."""
    whole = budget.inductance
    rows = [
        (entry.name, half_range_text(entry.name, entry.half_range), f"{entry.change / whole:+.2%}")
        for entry in budget.contributions
    ]
    rows.append(("worst case", "", f"\N{PLUS-MINUS SIGN}{budget.worst_case / whole:.2%}"))
    rows.append(("root sum square", "", f"\N{PLUS-MINUS SIGN}{budget.root_sum_square / whole:.2%}"))
    names = ("tolerance", "half range", "inductance")
    return Table("What part tolerances do to the inductance, to first order", names, tuple(rows))


def force_table(result: Result) -> Table:
    """Return the pull of the halves and of the faces of every gap."""
    force = result.force
    rows = [_pull_row(f"halves, on the {force.halves.name}", force.halves)]
    rows += [_pull_row(f"faces, {pull.name}", pull) for pull in force.gaps]
    names = ("pull along the axis", "force", "by stress", "by virtual work", "pressure")
    return Table(f"Forces at {result.current:g} A", names, tuple(rows))


def _pull_row(name: str, pull: Pull) -> Row:
    texts = shown_together((pull.force, pull.force, pull.by_stress, pull.by_work), "N")
    return (name, *texts[1:], shown(pull.pressure, "Pa", 3))


def provenance_table(review: Review) -> Table:
    """Return what the numbers rest on: versions, mesh, hash."""
    result = review.result
    versions = ", ".join(f"{name} {version}" for name, version in result.versions.items())
    rows = (
        ("versions", versions),
        ("result", f"{result.unknowns} unknowns of both sides, {result.refinements} refinements"),
        (
            "curve and field viewer",
            f"{len(review.curve.points)} currents on one mesh, {review.curve.unknowns} unknowns, "
            f"half width at most {100 * review.curve.design.tolerance:g} %",
        ),
        ("drawn fields", f"finest mesh, {review.finest.unknowns} unknowns"),
        ("tolerance asked for", f"{100 * review.design.tolerance:g} % half width"),
        ("hash of the design", result.design_hash),
    )
    return Table("Provenance", ("", ""), rows, frozenset({0, 1}))
