"""The command ``gapfield gap``: options in, files and the printed answer out."""

from __future__ import annotations

from contextlib import ExitStack
from pathlib import Path
from typing import Annotated

import typer

from femag.command_output import check_spares, check_targets, quantity

DesignArgument = Annotated[Path, typer.Argument(metavar="DESIGN.toml", help="The design file.")]
InductanceOption = Annotated[str, typer.Option(help="Wanted, such as '250 uH'.")]
AtOption = Annotated[
    str | None, typer.Option("--at", help="At this current, such as '3 A'; else the design's.")
]
JsonOption = Annotated[
    str | None,
    typer.Option("--json", metavar="FILE|-", help="Write the answer as JSON; - for the terminal."),
]
WriteOption = Annotated[
    Path | None,
    typer.Option("--write", metavar="FILE", help="Write the design with that gap."),
]


def gap_command(
    design: DesignArgument,
    inductance: InductanceOption,
    at: AtOption = None,
    json: JsonOption = None,
    write: WriteOption = None,
) -> None:
    """Find the gap that gives an inductance at a current.

    In the field, between bounds, beside what every hand formula asks for.
    """
    from rich.console import Console

    from femag.answer import WIDTH
    from femag.design_file import design_toml, read_design
    from femag.export.gap_file import gap_json
    from femag.export.whole_file import whole_file
    from femag.gap_answer import print_gap
    from femag.target_gap import gap_for

    check_targets(json, None)
    for option, file in (("--json", json), ("--write", write)):
        check_spares(design, "the design", option, file)
    wanted = quantity("--inductance", inductance, "H")
    current = None if at is None else quantity("--at", at, "A")
    found = gap_for(read_design(design), wanted, current)
    with ExitStack() as stack:
        if json is not None and json != "-":
            stack.enter_context(whole_file(json)).write_text(gap_json(found), encoding="utf-8")
        if write is not None:
            target = stack.enter_context(whole_file(write))
            target.write_text(design_toml(found.design), encoding="utf-8")
    if json == "-":
        typer.echo(gap_json(found), nl=False)
        return
    print_gap(found, Console(width=WIDTH))
    if write is not None:
        typer.echo(f"\nWritten to {write}")
