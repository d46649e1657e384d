"""The command ``gapfield curve``: options in, files and the printed answer out."""

from __future__ import annotations

from collections import Counter
from contextlib import ExitStack
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from femag.command_output import (
    check_file,
    check_spares,
    check_targets,
    make_folder,
    shown_progress,
    terminal,
)
from femag.errors import InputError, NumericalError

if TYPE_CHECKING:
    from femag.current_curve import InductanceCurve
    from femag.design import Design
    from femag.export.curve_file import MeasuredBeside
    from femag.measured_inductance import MeasuredPoints

FOLDER_FILES = ("curve.json", "inductance.png", "shearing.png")
ACCEPTED = "'0.5 A:8 A:16' (first:last:number) or a list such as '1 A, 2 A, 5 A'"
INDUCTANCE_PANEL = (7.2, 5.6)
"""Width and height of the figure of inductance, inch."""
NEEDS_MEASURED = "a file of measured points with --measured"
UNGAPPED_POINTS = 25
UNGAPPED_SPAN = 1e-3
"""Smallest current over the largest for the core without gaps, which saturates far earlier."""
UNGAPPED_TOLERANCE = 2e-3
"""Of the core without gaps, which is only drawn, unless the design's own is wider."""

DesignArgument = Annotated[Path, typer.Argument(metavar="DESIGN.toml", help="The design file.")]
CurrentsOption = Annotated[
    str,
    typer.Option(
        metavar="LIST", help="Such as '0.5 A:8 A:16' (first:last:number) or '1 A, 2 A, 5 A'."
    ),
]
ToleranceOption = Annotated[
    float | None,
    typer.Option(help="Half width of every bracket over its value, instead of the design's."),
]
JsonOption = Annotated[
    str | None,
    typer.Option("--json", metavar="FILE|-", help="Write the curve as JSON; - for the terminal."),
]
OutOption = Annotated[
    Path | None, typer.Option("--out", metavar="DIR", help="Write JSON and figures into a folder.")
]
CircuitOption = Annotated[
    Path | None,
    typer.Option("--circuit", metavar="FILE.cir", help="Write a subcircuit in SPICE syntax."),
]
TableOption = Annotated[
    Path | None, typer.Option("--table", metavar="FILE.csv", help="Write the points as CSV.")
]
MeasuredOption = Annotated[
    Path | None,
    typer.Option(metavar="FILE", help="Lay measured points over it: CSV of current, inductance."),
]
KindOption = Annotated[
    str | None, typer.Option(help="What was measured: 'apparent' or 'incremental'.")
]
FitOption = Annotated[
    bool, typer.Option("--fit", help="Fit gap and permeability to the measured points.")
]


def curve_command(
    design: DesignArgument,
    currents: CurrentsOption,
    tolerance: ToleranceOption = None,
    json: JsonOption = None,
    out: OutOption = None,
    measured: MeasuredOption = None,
    kind: KindOption = None,
    fit: FitOption = False,
    circuit: CircuitOption = None,
    table: TableOption = None,
) -> None:
    """Solve a design at many currents: inductance, flux linkage, saturation.

    On one mesh, with the co-energy between bounds at every current.
    """
    from femag.current_curve import inductance_curve
    from femag.design_file import read_design

    check_file("--circuit", circuit, ".cir")
    check_file("--table", table, ".csv")
    for option, target in (("--json", json), ("--table", table)):
        check_spares(design, "the design", option, target)
        if measured is not None:
            check_spares(measured, "the measured points", option, target)
    check_targets(json, out)
    asked = currents_of(currents)
    solved = _with_tolerance(read_design(design), tolerance)
    if circuit is not None:
        _check_model(solved, design)
    points = measured_points(measured, kind, fit)
    with shown_progress(_how_far) as progress:
        curve = inductance_curve(solved, asked, progress=progress)
        beside = None if points is None else _beside(solved, points, fit)
        without_gap, reason = _without_gap(curve) if out is not None else (None, "")
    with ExitStack() as stack:
        _write_tables(curve, circuit, table, stack)
        _write(curve, beside, without_gap, (json, out), stack)
    if json == "-":
        from femag.export.curve_file import curve_json

        typer.echo(curve_json(curve, beside), nl=False)
        return
    _print(curve, beside)
    if out is not None:
        typer.echo(f"\nWritten to {out}: {', '.join(FOLDER_FILES)}{reason}")


def currents_of(text: str) -> list[float]:
    """Return the currents in A of ``first:last:number`` or of a list with commas.

    Raises
    ------
    InputError
        If it does not read, or the currents make no curve.
    """
    from femag.design import CURRENTS

    currents = _evenly_spaced(text) if ":" in text else [_ampere(p, text) for p in text.split(",")]
    driven = [current for current in currents if current != 0.0]
    if len({current > 0.0 for current in driven}) > 1:
        raise _refusal("currents of both signs", text)
    if len(driven) < 2:
        raise _refusal("one current makes no curve", text)
    for current, times in Counter(currents).items():
        if times > 1:
            raise _refusal(f"{current:g} A is asked for twice", text)
        if current != 0.0 and not CURRENTS[0] <= abs(current) <= CURRENTS[1]:
            span = f"{CURRENTS[0]:g} A to {CURRENTS[1]:g} A"
            raise _refusal(f"{current:g} A is out of range, {span}", text)
    return currents


def _evenly_spaced(text: str) -> list[float]:
    from femag.current_curve import MOST_POINTS

    parts = text.split(":")
    if len(parts) != 3:
        raise _refusal(f"{len(parts)} parts between colons instead of 3", text)
    first, last = (_ampere(part, text) for part in parts[:2])
    number = parts[2].strip()
    if not (number.isascii() and number.isdigit()):
        raise _refusal(f"{number!r} is no number of currents", text)
    if not 2 <= int(number[:9]) <= MOST_POINTS:
        raise _refusal(f"{number[:9]} currents instead of 2 to {MOST_POINTS}", text)
    if first == last:
        raise _refusal("first and last current are the same", text)
    steps = int(number) - 1
    return [first + (last - first) * k / steps for k in range(steps)] + [last]


def _ampere(part: str, text: str) -> float:
    from femag.units import si_value

    if not part.strip():
        raise _refusal("a current is missing", text)
    try:
        return si_value(part.strip(), "A")
    except InputError as error:
        raise _refusal(f"{part.strip()!r}: {error.problem}", text) from error


def _refusal(problem: str, text: str) -> InputError:
    return InputError(problem, key="--currents", value=text, accepted=ACCEPTED)


def _with_tolerance(design: Design, tolerance: float | None) -> Design:
    if tolerance is None:
        return design
    try:
        return replace(design, tolerance=tolerance)
    except InputError as error:
        raise error.changed(key="--tolerance") from error


def measured_points(file: Path | None, kind: str | None, fit: bool) -> MeasuredPoints | None:
    """Return the measured points that were asked for, None if none were."""
    if file is None:
        for option, given in (("--fit", fit), ("--kind", kind is not None)):
            if given:
                raise InputError("there is nothing measured", key=option, accepted=NEEDS_MEASURED)
        return None
    from femag.measured_inductance import read_measured
    from femag.measured_inductance.points import KINDS

    found = [known for known in KINDS if known == kind]
    if kind is not None and not found:
        raise InputError(
            "unknown kind of inductance", key="--kind", value=kind,
            accepted=" or ".join(map(repr, KINDS)),
        )  # fmt: skip
    return read_measured(file, found[0] if found else None)


def _beside(design: Design, points: MeasuredPoints, fit: bool) -> MeasuredBeside:
    """Return how far the solved inductance is from the measured one, with a fit if wanted."""
    from femag.export.curve_file import MeasuredBeside
    from femag.measured_inductance import fitted_design, measured_curve, residuals

    if fit:
        fitted = fitted_design(design, points)
        return MeasuredBeside(points, fitted.residuals_before, fitted)
    found = residuals(points, measured_curve(design, points))
    return MeasuredBeside(points, tuple(found.tolist()))


def _how_far(done: int, of: int) -> str:
    return f"{done} of {of} currents"


def _without_gap(curve: InductanceCurve) -> tuple[InductanceCurve | None, str]:
    """Return the curve of the same design without gaps, or None and why there is none."""
    from femag.current_curve import inductance_curve

    design = curve.design
    if not design.gaps:
        return None, ""
    largest = max((point.current for point in curve.points), key=abs)
    ratio = UNGAPPED_SPAN ** (1.0 / (UNGAPPED_POINTS - 1))
    currents = [largest * ratio**k for k in range(UNGAPPED_POINTS)]
    tolerance = max(UNGAPPED_TOLERANCE, design.tolerance)
    try:
        return inductance_curve(replace(design, gaps=()), currents, tolerance), ""
    except (InputError, NumericalError) as error:
        return None, f"\nWithout gaps there is nothing to compare with: {error}"


def _check_model(design: Design, file: Path) -> None:
    from femag.export.circuit_model import check_model

    try:
        check_model(design)
    except InputError as error:
        raise error.changed(file=str(file)) from error


def _write_tables(
    curve: InductanceCurve, circuit: Path | None, table: Path | None, stack: ExitStack
) -> None:
    """Write circuit and table where they were asked for; renamed when the stack is left."""
    from femag.export.circuit_model import write_circuit
    from femag.export.curve_table import write_curve_table
    from femag.export.whole_file import whole_file

    if circuit is not None:
        write_circuit(curve, stack.enter_context(whole_file(circuit)))
    if table is not None:
        write_curve_table(curve, stack.enter_context(whole_file(table)))


def _write(
    curve: InductanceCurve,
    beside: MeasuredBeside | None,
    without_gap: InductanceCurve | None,
    targets: tuple[str | None, Path | None],
    stack: ExitStack,
) -> None:
    """Write the JSON file and the folder; each file is renamed when the stack is left."""
    from femag.export.curve_file import curve_json
    from femag.export.whole_file import whole_file

    json, out = targets
    if json is not None and json != "-":
        target = stack.enter_context(whole_file(json))
        target.write_text(curve_json(curve, beside), encoding="utf-8")
    if out is None:
        return
    from femag.plot import inductance_figure, shearing_panels, write_panels

    make_folder(out)
    document, inductance, shearing = (
        stack.enter_context(whole_file(out / name)) for name in FOLDER_FILES
    )
    document.write_text(curve_json(curve, beside), encoding="utf-8")
    overlaid = (None, None) if beside is None else (beside.points, beside.residuals)
    write_panels(
        (lambda ax: inductance_figure(curve, ax, *overlaid),), inductance, INDUCTANCE_PANEL
    )
    write_panels(shearing_panels(curve, without_gap), shearing)


def _print(curve: InductanceCurve, beside: MeasuredBeside | None) -> None:

    from femag.curve_answer import print_curve

    print_curve(curve, terminal(), beside)
