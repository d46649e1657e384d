"""The command ``gapfield sheet``: a design in, the sheet of its review out."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from femag.command_output import check_spares, shown_progress, terminal
from femag.curve_command import (
    DesignArgument,
    KindOption,
    MeasuredOption,
    currents_of,
    measured_points,
)
from femag.errors import InputError

if TYPE_CHECKING:
    from femag.review import Review

MISSED = 1
"""Exit code where the design misses a requirement."""

OutOption = Annotated[
    Path, typer.Option("--out", "-o", metavar="FILE.html", help="Where the sheet is written.")
]
CurrentsOption = Annotated[
    str | None,
    typer.Option(
        metavar="LIST",
        help="Of the curve: '0.5 A:8 A:16' (first:last:number) or '1 A, 2 A, 5 A'.",
    ),
]


def sheet_command(
    design: DesignArgument,
    out: OutOption,
    currents: CurrentsOption = None,
    measured: MeasuredOption = None,
    kind: KindOption = None,
) -> int:
    """Write the sheet for a design review: one HTML file.

    Leaves with 1 when the design misses a requirement; the sheet is written all the same.
    """
    from femag.design_file import read_design
    from femag.export.whole_file import whole_file
    from femag.requirement_checks import all_kept
    from femag.review import design_review

    _check_target(out)
    check_spares(design, "the design", "--out", out)
    if measured is not None:
        check_spares(measured, "the measured points", "--out", out)
    asked = [] if currents is None else [c for c in currents_of(currents) if c != 0.0]
    points = measured_points(measured, kind, fit=False)
    with shown_progress(str) as progress:
        reviewed = design_review(read_design(design), asked, points, progress)
        if progress is not None:
            progress("sheet")
        from femag.sheet import review_sheet

        text = review_sheet(reviewed, str(design))
    with whole_file(out) as temporary:
        temporary.write_text(text, encoding="utf-8")
    _print(reviewed)
    typer.echo(f"Written to {out}")
    return 0 if all_kept(reviewed.checks) else MISSED


def _check_target(out: Path) -> None:
    if out.is_dir() or not out.parent.is_dir():
        raise InputError(
            "cannot be written", key="--out", value=str(out),
            accepted="a file in a folder that exists",
        )  # fmt: skip


def _print(reviewed: Review) -> None:

    from femag.requirement_answer import requirement_lines

    console = terminal()
    console.print(f"inductance {reviewed.result.inductance}", highlight=False)
    if reviewed.checks:
        for line in requirement_lines(reviewed.checks):
            console.print(line, highlight=False)
