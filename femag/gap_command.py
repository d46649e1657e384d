"""The command ``gapfield gap``: options in, files and the printed answer out."""

from __future__ import annotations

from contextlib import ExitStack
from pathlib import Path
from typing import Annotated

import typer

from femag.command_output import (
    check_file,
    check_spares,
    check_targets,
    options_named,
    quantity,
    terminal,
)
from femag.errors import InputError

DesignArgument = Annotated[Path, typer.Argument(metavar="DESIGN.toml", help="The design file.")]
InductanceOption = Annotated[str, typer.Option(help="Wanted, such as '250 uH'.")]
AtOption = Annotated[
    str | None, typer.Option("--at", help="At this current, such as '3 A'; else the design's.")
]
FluxDensityOption = Annotated[
    str | None,
    typer.Option(help="Find the fewest turns at which no section mean exceeds this, as '0.3 T'."),
]
TurnsOption = Annotated[int | None, typer.Option(help="Turns instead of the design's.")]
SampleOption = Annotated[
    int | None,
    typer.Option(
        "--sample",
        metavar="N",
        min=2,
        max=100_000,
        help="Solve N samples of the tolerances as well.",
    ),
]
JsonOption = Annotated[
    str | None,
    typer.Option("--json", metavar="FILE|-", help="Write the answer as JSON; - for the terminal."),
]
WriteOption = Annotated[
    Path | None,
    typer.Option(
        "--write", metavar="FILE.toml", help="Write the design with that gap, all else as it is."
    ),
]


def gap_command(
    design: DesignArgument,
    inductance: InductanceOption,
    at: AtOption = None,
    flux_density: FluxDensityOption = None,
    turns: TurnsOption = None,
    sample: SampleOption = None,
    json: JsonOption = None,
    write: WriteOption = None,
) -> None:
    """Find the gap that gives an inductance at a current, and the turns for a flux density.

    In the field, between bounds, beside what every hand formula asks for.
    """
    from femag.design_file import changed_design_file, read_design
    from femag.export.gap_file import gap_json
    from femag.export.whole_file import whole_file
    from femag.gap_answer import print_gap
    from femag.target_gap import gap_for
    from femag.target_turns import turns_for, with_turns
    from femag.tolerance_budget import sampled_spread

    if turns is not None and flux_density is not None:
        raise InputError(
            "stands beside --turns", key="--flux-density", value=flux_density,
            accepted="one of the two",
        )  # fmt: skip
    check_targets(json, None)
    check_file("--write", write, ".toml")
    for option, file in (("--json", json), ("--write", write)):
        check_spares(design, "the design", option, file)
    wanted = quantity("--inductance", inductance, "H")
    current = None if at is None else quantity("--at", at, "A")
    own = read_design(design)
    base = own if turns is None else with_turns(own, turns)
    limit = None if flux_density is None else quantity("--flux-density", flux_density, "T")
    with options_named(inductance=inductance, flux_density=flux_density):
        by_turns = None if limit is None else turns_for(base, wanted, limit, current)
        found = by_turns.found if by_turns else gap_for(base, wanted, current)
    spread = None if sample is None else sampled_spread(found.design, sample)
    text = gap_json(found, by_turns, spread)
    with ExitStack() as stack:
        if write is not None:
            changed = changed_design_file(design, own, found.design, write)
            stack.enter_context(whole_file(write)).write_bytes(changed.encode())
        if json is not None and json != "-":
            stack.enter_context(whole_file(json)).write_text(text, encoding="utf-8")
    if json == "-":
        typer.echo(text, nl=False)
        return
    print_gap(found, terminal(), by_turns, spread)
    if write is not None:
        typer.echo(f"\nWritten to {write}")
