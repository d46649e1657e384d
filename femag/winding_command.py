"""The command ``gapfield windings``: options in, file and printed answer out."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from femag.command_output import check_spares, check_targets, quantity, shown_progress, terminal
from femag.errors import InputError

if TYPE_CHECKING:
    from femag.field.response import Response

DesignArgument = Annotated[Path, typer.Argument(metavar="DESIGN.toml", help="The design file.")]
CurrentOption = Annotated[
    str | None,
    typer.Option(help="Bias of saturating cores, such as '2 A', instead of the design's."),
]
ToleranceOption = Annotated[
    float | None,
    typer.Option(help="Half width of inductances and leakages, instead of the design's."),
]
JsonOption = Annotated[
    str | None,
    typer.Option("--json", metavar="FILE|-", help="Write the answer as JSON; - for the terminal."),
]


def windings_command(
    design: DesignArgument,
    current: CurrentOption = None,
    tolerance: ToleranceOption = None,
    json: JsonOption = None,
) -> None:
    """Inductance matrix, coupling and leakage of several windings.

    At small signal, between bounds; leakage from fields of its own.
    """
    from femag.coupled_windings import winding_matrix
    from femag.design_file import read_design
    from femag.export.winding_file import winding_json

    check_targets(json, None)
    check_spares(design, "the design", "--json", json)
    asked = read_design(design)
    if current is not None:
        asked = replace(asked, current=quantity("--current", current, "A"))
    try:
        with shown_progress(_how_far) as progress:
            found = winding_matrix(asked, tolerance, progress)
    except InputError as error:
        option = "--tolerance" if error.key == "solve.tolerance" else None
        raise error.changed(key=option, file=None if option else str(design)) from error
    if json == "-":
        typer.echo(winding_json(found), nl=False)
        return
    if json is not None:
        from femag.export.whole_file import whole_file

        with whole_file(json) as target:
            target.write_text(winding_json(found), encoding="utf-8")

    from femag.winding_answer import print_windings

    print_windings(found, terminal())


def _how_far(found: Response) -> str:
    return f"{found.sides.unknowns} unknowns"
