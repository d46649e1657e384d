"""The answer on the terminal: at most 80 columns, readable without colour."""

from __future__ import annotations

from rich.console import Console
from rich.table import Table
from rich.text import Text

from femag.answer_table import columns as columns
from femag.copper_answer import LOSS_COLUMNS, loss_notes, loss_rows
from femag.design import Design
from femag.geometry import Gap
from femag.loss_answer import described_ripple, loss_lines
from femag.quantities import Pull, WoundCopper
from femag.requirement_answer import requirement_lines
from femag.requirement_checks import checked_requirements
from femag.result import Result
from femag.tolerance_answer import budget_lines, spread_line
from femag.tolerance_budget import SampledSpread
from femag.units import with_common_unit, with_unit

WIDTH = 80
HAND_NOTE = (
    "Errors are against the middle of the bounds. leg: post diameter, ring thickness; "
    "G: window height."
)

OTHER_WINDINGS = "Inductance matrix, coupling and leakage of the windings: gapfield windings."


def print_answer(result: Result, console: Console, spread: SampledSpread | None = None) -> None:
    """Print what the field says about a design, the hand formulas beside it, and cautions.

    Parameters
    ----------
    result : Result
        What the field says.
    console : Console
        Where to print.
    spread : SampledSpread, optional
        Samples of the design's tolerances.
    """
    design = result.design
    lines: list[Text | Table | str] = []
    if design.title:
        lines.append(Text(design.title, style="bold"))
    lines += [described(design), ""]
    if design.requirements:
        lines += [*requirement_lines(checked_requirements(result)), ""]
    lines += [_inductances(result), "", _flux_densities(result)]
    lines += [Text(where_it_saturates(result)), Text(_pulls(result)), ""]
    if len(design.windings) > 1:
        lines += [Text(OTHER_WINDINGS), ""]
    if result.copper:
        lines += [_copper(result), ""]
    if result.copper_loss:
        lines += [_losses(result), *map(Text, loss_notes(result)), ""]
    if result.tolerance_budget is not None:
        sampled = [] if spread is None else [spread_line(spread)]
        lines += [*budget_lines(result.tolerance_budget), *sampled, ""]
    lines += [_hand_formulas(result), Text(HAND_NOTE), *hand_caveat(result), ""]
    lines += loss_lines(result)
    lines += [Text(_provenance(result)), "", Text(cautions(result.stored_energy, result.current))]
    for line in lines:
        console.print(line, highlight=False)


def described(design: Design, currents: str | None = None) -> Text:
    """Return core, gaps, material and drive of a design in words; its current, or `currents`."""
    core = design.core
    parts = [
        *([core.name] if core.name else []),
        core.description,
        *([described_gap(gap) for gap in design.gaps] or ["no gap"]),
    ]
    drive = f"{with_turns(design.turns)}, {currents or f'{design.current:g} A'}"
    if design.ripple is not None and currents is None:
        drive += f"\n{described_ripple(design.ripple, design.current)}"
    return Text(f"{', '.join(parts)}\n{design.material.label}\n{drive}")


def with_turns(turns: float) -> str:
    """Return a number of turns in words."""
    return "1 turn" if turns == 1 else f"{turns} turns"


def described_gap(gap: Gap) -> str:
    """Return a gap in words, lengths to four digits."""
    words = [f"{1e3 * gap.length:.4g} mm gap in the post"]
    if gap.leg == "all":
        words = [f"{1e3 * gap.length:.4g} mm spacer in all legs"]
    if gap.pieces > 1:
        words.append(f"in {gap.pieces} pieces")
    if gap.offset:
        words.append(f"{1e3 * gap.offset:+.4g} mm off the middle")
    return " ".join([*words, *_described_faces(gap), *_described_filling(gap)])


def _described_faces(gap: Gap) -> list[str]:
    words = []
    if gap.rim_length is not None:
        words.append(f"tapered to {1e3 * gap.rim_length:.4g} mm at the rim")
    if gap.step is not None:
        inside = f"{1e3 * gap.step.length:.4g} mm" if gap.step.length else "none"
        words.append(f"with {inside} inside of {1e3 * gap.step.diameter:.4g} mm")
    if gap.chamfer:
        words.append(f"with chamfers of {1e3 * gap.chamfer:.4g} mm")
    if gap.edge_radius:
        words.append(f"with edges of radius {1e3 * gap.edge_radius:.4g} mm")
    return words


def _described_filling(gap: Gap) -> list[str]:
    if gap.magnet is not None:
        magnet = gap.magnet
        return [f"with a magnet, {magnet.remanence:g} T, recoil {magnet.recoil_permeability:g}"]
    return [f"of permeability {gap.permeability:g}"] if gap.permeability != 1.0 else []


def _inductances(result: Result) -> Table:
    bounds = result.inductance
    middle, interval = str(bounds).split(" (")
    table = Table.grid(padding=(0, 2))
    table.add_column(no_wrap=True)
    table.add_column(justify="right", no_wrap=True)
    table.add_column()
    between = f"between {interval.rstrip(')').replace(' .. ', ' and ')}"
    table.add_row(Text("inductance", style="bold"), Text(middle, style="bold"), between)
    table.add_row(
        "  half width",
        f"{100 * bounds.relative_half_width:.2g} %",
        "half the distance of the bounds",
    )
    apparent, incremental, plain = with_common_unit(
        (result.apparent_inductance, result.incremental_inductance, result.plain_inductance), "H"
    )
    linkages, increments = _linkages_of_current(result), result.incremental_inductance_of_sides
    table.add_row("  apparent", apparent, f"flux linkage over current; {_apart(linkages)}")
    table.add_row("  incremental", incremental, f"for small changes; {_apart(increments)}")
    table.add_row("AL value", with_unit(result.al_value, "H"), "inductance over turns squared")
    table.add_row(
        "fringing factor", f"{result.fringing_factor:.4f}", f"over {plain} without fringing"
    )
    if result.gap_factor is not None:
        table.add_row(
            "gap factor", f"{result.gap_factor:.4f}", "plain gap reluctance over the field's"
        )
    if result.magnet_flux_linkage is not None:
        linkage = with_unit(result.magnet_flux_linkage, "Wb")
        table.add_row("magnet", linkage, "flux linkage without current")
    return table


def _linkages_of_current(result: Result) -> tuple[float, float]:
    """Return what the current adds to the flux linkage of either side, Wb."""
    magnet = result.magnet_flux_linkage_of_sides or (0.0, 0.0)
    first, second = (
        total - own for total, own in zip(result.flux_linkage_of_sides, magnet, strict=True)
    )
    return first, second


def _apart(of_sides: tuple[float, float]) -> str:
    """Say how far two estimates are apart: no bound, but what there is to judge them by."""
    share = abs(of_sides[1] - of_sides[0]) / abs(sum(of_sides) / 2)
    return f"estimates {100 * share:.1g} % apart"


def _flux_densities(result: Result) -> Table:
    values = [mean.flux_density for mean in result.section_means]
    unit, factor = _flux_density_unit(max(values))
    table = columns("mean flux density", unit, "section, mm2", words=["mean flux density"])
    for mean in result.section_means:
        table.add_row(mean.name, f"{mean.flux_density / factor:.4f}", f"{1e6 * mean.area:.1f}")
    return table


def _flux_density_unit(largest: float) -> tuple[str, float]:
    """Return a unit, and how many T it is, in which four decimals show a flux density in T."""
    units = (("T", 1.0), ("mT", 1e-3), ("uT", 1e-6), ("nT", 1e-9), ("pT", 1e-12))
    return next((unit for unit in units if largest >= 0.01 * unit[1]), units[-1])


def where_it_saturates(result: Result) -> str:
    """Return the fullest section, and what flux density shares of the core stay below."""
    fullest = max(result.section_means, key=lambda mean: mean.flux_density)
    unit, factor = _flux_density_unit(max(share.flux_density for share in result.volume_shares))
    levels = ", ".join(f"{share.flux_density / factor:.3f}" for share in result.volume_shares)
    return (
        f"Saturates first: {fullest.name}. Half, 90 % and 99 % of the core's volume lie below "
        f"{levels} {unit}."
    )


def _pulls(result: Result) -> str:
    """Say what the halves and the faces of the gaps are pulled together with."""
    force = result.force
    apart = max(_apart_ways(pull) for pull in (force.halves, *force.gaps))
    strongest: dict[str, Pull] = {}
    for pull in force.gaps:
        leg = f"{pull.name.partition(' gap')[0]} gap"
        strongest[leg] = max(strongest.get(leg, pull), pull, key=lambda one: one.force)
    faces = "".join(
        f" Faces of the {leg}: {with_unit(pull.force, 'N', 3)}, "
        f"{with_unit(pull.pressure, 'Pa', 3)}."
        for leg, pull in strongest.items()
    )
    return (
        f"Pull of the halves at {result.current:g} A: {with_unit(force.halves.force, 'N', 3)} on "
        f"the {force.halves.name}.{faces} Estimates, {100 * apart:.1g} % apart."
    )


def _apart_ways(pull: Pull) -> float:
    """Return how far the estimates of a pull are apart, over their mean."""
    estimates = (*pull.stress_of_sides, *pull.work_of_sides)
    return (max(estimates) - min(estimates)) / abs(pull.force) if pull.force else 0.0


def _copper(result: Result) -> Table:
    names = ("winding", "turns", "layers", "fill", "mean turn", "wire", "resistance")
    table = columns(*names, words=["winding", "resistance"])
    for copper in result.copper:
        table.add_row(
            copper.name,
            f"{copper.turns}",
            layers_text(copper),
            f"{copper.fill:.2f}",
            f"{1e3 * copper.mean_turn_length:.1f} mm",
            f"{copper.wire_length:.3g} m",
            f"{with_unit(copper.resistance, 'ohm', 3)} at {copper.temperature:g} C",
        )
    return table


def _losses(result: Result) -> Table:
    table = columns(*LOSS_COLUMNS, words=["loss of"])
    for row in loss_rows(result):
        table.add_row(*row)
    return table


def layers_text(copper: WoundCopper) -> str:
    """Return how many layers there are, of each section from the lowest where they differ."""
    counts = copper.layers_in_sections
    if len(counts) == 1:
        return f"{copper.layers}"
    if len(set(counts)) == 1:
        return f"{len(counts)} x {copper.layers}"
    return "+".join(map(str, counts))


def _hand_formulas(result: Result) -> Table:
    names = ("hand formula", "inductance", "error", "inside", "range")
    table = columns(*names, words=["hand formula", "inside", "range"])
    inductances = with_common_unit(
        (result.inductance.value, *(row.estimate.inductance for row in result.hand)), "H"
    )
    for row, inductance in zip(result.hand, inductances[1:], strict=True):
        estimate = row.estimate
        inside = "yes" if estimate.in_range else "no"
        table.add_row(estimate.name, inductance, f"{row.error:+.1%}", inside, estimate.range)
    return table


def hand_caveat(result: Result) -> list[Text]:
    """Return where errors are not the fringing formulas' own, and why none is inside its range."""
    lines = []
    if any(gap.is_shaped for gap in result.design.gaps):
        lines.append(Text("No formula knows shaped faces: all count as outside of their ranges."))
    factor = result.gap_factor
    saturated = result.incremental_inductance < 0.5 * result.inductance.value
    if not saturated and (factor is None or factor > 1.0):
        return lines
    return [
        *lines,
        Text(
            "Here the core saturates or hardly guides the flux, so that much of it passes beside "
            "the core. The network leaves that out, whatever the formula; the ranges are about "
            "the shape of the gap only."
        ),
    ]


def _provenance(result: Result) -> str:
    return (
        f"{result.unknowns} unknowns, {result.refinements} refinements, {result.seconds:.2f} s. "
        f"{what_is_bounded(result)} {result.design.core.model_note}"
    )


def what_is_bounded(result: Result) -> str:
    """Return what the bounds of a result's inductance are good for."""
    if result.design.material.is_linear:
        return "The bounds are rigorous for this straight-sided model."
    if result.magnet_coenergy is None:
        return "The bounds hold up to the quadrature of the energy densities."
    return (
        "The co-energies with and without current are bounded up to the quadrature of the "
        "energy densities; the inductance also rests on the magnet's flux linkage, which "
        "counts with the distance of two estimates and has no bound."
    )


def cautions(stored_energy: float, current: float) -> str:
    """Return what to beware of: an energy in J that is stored at a current in A."""
    return (
        f"Caution: about {with_unit(stored_energy, 'J', 2)} is stored at {current:g} A and becomes "
        "a voltage when the current is cut. Check insulation from the mains, creepage and hot "
        "parts by the codes that apply to you, with licensed practice."
    )
