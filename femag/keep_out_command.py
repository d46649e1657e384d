"""The command ``gapfield keepout``: options in, files and the printed answer out."""

from __future__ import annotations

from contextlib import ExitStack
from pathlib import Path
from typing import Annotated

import typer

from femag.command_output import (
    check_spares,
    check_targets,
    make_folder,
    options_named,
    quantity,
    terminal,
)
from femag.errors import InputError

FOLDER_FILES = ("keepout.json", "keepout.png")
PANEL = (7.2, 5.6)
"""Width and height of the chart, inch."""

DesignArgument = Annotated[Path, typer.Argument(metavar="DESIGN.toml", help="The design file.")]
DistancesOption = Annotated[
    str | None,
    typer.Option(metavar="LIST", help="Between post and copper, such as '0.5 mm, 1 mm, 2 mm'."),
]
PiecesOption = Annotated[
    str | None, typer.Option(metavar="LIST", help="Numbers of gaps to compare, such as '1, 2, 4'.")
]
JsonOption = Annotated[
    str | None,
    typer.Option("--json", metavar="FILE|-", help="Write the answer as JSON; - for the terminal."),
]
OutOption = Annotated[
    Path | None, typer.Option("--out", metavar="DIR", help="Write JSON and chart into a folder.")
]


def keep_out_command(
    design: DesignArgument,
    distances: DistancesOption = None,
    pieces: PiecesOption = None,
    json: JsonOption = None,
    out: OutOption = None,
) -> None:
    """Find how far copper must stay from the gap.

    Loss by the fringe field against distance, for one gap and for several small ones.
    """
    from femag.copper_distance import PIECES, keep_out
    from femag.design_file import read_design
    from femag.export.keep_out_file import keep_out_json
    from femag.export.whole_file import whole_file
    from femag.keep_out_answer import print_keep_out

    check_targets(json, out)
    check_spares(design, "the design", "--json", json)
    lengths = None
    if distances is not None:
        lengths = [quantity("--distances", text.strip(), "m") for text in distances.split(",")]
    numbers = PIECES if pieces is None else _numbers(pieces)
    base = read_design(design)
    with options_named(distances=distances):
        found = keep_out(base, lengths, numbers)
    text = keep_out_json(found)
    with ExitStack() as stack:
        if json is not None and json != "-":
            stack.enter_context(whole_file(json)).write_text(text, encoding="utf-8")
        if out is not None:
            from femag.plot import keep_out_chart, write_panels

            make_folder(out)
            document, chart = (stack.enter_context(whole_file(out / n)) for n in FOLDER_FILES)
            document.write_text(text, encoding="utf-8")
            write_panels((lambda ax: keep_out_chart(found, ax),), chart, PANEL)
    if json == "-":
        typer.echo(text, nl=False)
        return
    print_keep_out(found, terminal())
    if out is not None:
        typer.echo(f"\nWritten to {out}: {', '.join(FOLDER_FILES)}")


def _numbers(text: str) -> list[int]:
    """Return the numbers of a list."""
    from femag.geometry.gaps import MOST_PIECES

    try:
        numbers = [int(part) for part in text.split(",")]
    except ValueError:
        numbers = []
    if not numbers or not all(1 <= count <= MOST_PIECES for count in numbers):
        raise InputError(
            "not usable", key="--pieces", value=text,
            accepted=f"whole numbers from 1 to {MOST_PIECES} such as '1, 2, 4'",
        )  # fmt: skip
    return numbers
