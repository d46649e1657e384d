"""The command line: ``gapfield``."""

from __future__ import annotations

import os
import sys
from collections.abc import Mapping, Sequence
from contextlib import ExitStack
from dataclasses import replace
from io import TextIOWrapper
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from femag.bench_command import bench_command
from femag.command_output import (
    check_file,
    check_targets,
    make_folder,
    quantity,
    shown_progress,
    terminal,
)
from femag.curve_command import curve_command
from femag.errors import GapfieldError, InputError
from femag.gap_command import gap_command
from femag.keep_out_command import keep_out_command
from femag.machine_command import check_command, report_command
from femag.sheet_command import MISSED, sheet_command
from femag.study_command import study_command
from femag.winding_command import windings_command

if TYPE_CHECKING:
    from femag.design import Design
    from femag.field.bounds import FieldSolution
    from femag.result import Result
    from femag.tolerance_budget import SampledSpread

STOPPED = 130
FOLDER_FILES = ("result.json", "section.png", "gap.png")
COPPER_FILE = "copper.png"
CORE_LOSS_FILE = "core-loss.png"

app = typer.Typer(
    add_completion=False,
    rich_markup_mode=None,
    help="Gapped inductors on round-post cores: inductance between a lower and an upper bound.",
)

CurrentOption = Annotated[
    str | None,
    typer.Option("--current", help="Peak current, such as '2 A', instead of the design's."),
]
JsonOption = Annotated[
    str | None,
    typer.Option("--json", metavar="FILE|-", help="Write the result as JSON; - for the terminal."),
]
OutOption = Annotated[
    Path | None, typer.Option("--out", metavar="DIR", help="Write JSON and figures into a folder.")
]
FieldOption = Annotated[
    Path | None,
    typer.Option("--field", metavar="FILE.vtu", help="Write B and H on the mesh as VTU."),
]
MeshOption = Annotated[
    Path | None,
    typer.Option("--mesh", metavar="FILE.msh", help="Write the mesh with named regions as MSH."),
]
FiguresOption = Annotated[
    Path | None,
    typer.Option("--figures", metavar="DIR", help="Write every figure of the result by itself."),
]
SampleOption = Annotated[
    int | None,
    typer.Option(
        "--sample",
        metavar="N",
        min=2,
        max=100_000,
        help="Solve N samples of the design's tolerances as well.",
    ),
]


@app.callback(invoke_without_command=True)
def _entry(
    context: typer.Context,
    version: Annotated[
        bool, typer.Option("--version", help="Print the version and leave.")
    ] = False,
) -> None:
    if version:
        from importlib.metadata import version as installed_version

        typer.echo(f"gapfield {installed_version('gapfield')}")
    elif context.invoked_subcommand is None:
        typer.echo(context.get_help())


@app.command("solve")
def solve_command(
    design: Annotated[Path, typer.Argument(metavar="DESIGN.toml", help="The design file.")],
    current: CurrentOption = None,
    json: JsonOption = None,
    out: OutOption = None,
    field: FieldOption = None,
    mesh: MeshOption = None,
    figures: FiguresOption = None,
    sample: SampleOption = None,
) -> int:
    """Solve a design file.

    Prints the inductance between bounds, beside the hand calculation. Leaves with 1 when the design
    misses a requirement.
    """
    from femag.design_file import read_design

    if json and Path(json).exists() and Path(json).samefile(design):
        raise InputError(
            "is the design itself", key="--json", value=json, accepted="another file, or -"
        )
    check_file("--field", field, ".vtu")
    check_file("--mesh", mesh, ".msh")
    check_targets(None, figures, "--figures")
    asked = _with_current(read_design(design), current)
    if sample is not None and asked.part_tolerances is None:
        raise InputError(
            "the design has no tolerances", key="--sample", value=sample,
            accepted="a table [tolerance] in the design",
        )  # fmt: skip
    return _answer(asked, json, out, meshed=(field, mesh), figures=figures, sample=sample)


@app.command("demo")
def demo_command(
    out: Annotated[
        Path, typer.Option("--out", metavar="DIR", help="Folder for design, JSON and figures.")
    ] = Path("gapfield-demo"),
) -> None:
    """Solve a built-in, invented design.

    Leaves design, result and figures in a folder to start from.
    """
    from importlib.resources import files

    from femag.design_file import design_from_toml

    text = files("femag").joinpath("demo.toml").read_text(encoding="utf-8")
    file = out / "design.toml"
    if file.exists() and file.read_text(encoding="utf-8", errors="replace") != text:
        raise InputError(
            "holds a design of your own", file=str(file), accepted="another folder with --out"
        )
    _answer(design_from_toml(text, "demo.toml"), None, out, {file: text})
    typer.echo(f"Change {file} and run: gapfield solve {file}")


@app.command("cores")
def cores_command(
    size: Annotated[
        str, typer.Argument(metavar="[SIZE]", help="A size, or a part of one to filter by.")
    ] = "",
    out: Annotated[
        Path | None, typer.Option("--out", metavar="FILE", help="Draw the core into a file.")
    ] = None,
) -> None:
    """List the cores of the catalogue, or show one.

    Every number comes with its source.
    """
    from femag.core_answer import print_core, print_core_list
    from femag.geometry import catalogue, matching_cores

    found = matching_cores(catalogue(), size)
    if out is not None:
        if len(found) != 1:
            raise InputError(
                f"{len(found)} cores are meant", key="SIZE", value=size, accepted="one size"
            )
        from femag.plot import core_drawing, write_figure

        write_figure(lambda ax: core_drawing(found[0].core(), ax), out)
    console = terminal()
    if len(found) == 1:
        print_core(found[0], console)
    else:
        print_core_list(found, console)


app.command("bench")(bench_command)
app.command("curve")(curve_command)
app.command("gap")(gap_command)
app.command("sheet")(sheet_command)
app.command("windings")(windings_command)
app.command("check")(check_command)
app.command("report")(report_command)
app.command("keepout")(keep_out_command)
app.command("study")(study_command)


@app.command("materials")
def materials_command() -> None:
    """List the library of materials.

    Every material comes with its source.
    """
    from femag.material_answer import print_material_list
    from femag.materials import material_library

    print_material_list(material_library(), terminal())


def _with_current(design: Design, current: str | None) -> Design:
    if current is None:
        return design
    return replace(design, current=quantity("--current", current, "A"))


def _answer(
    design: Design,
    json: str | None,
    out: Path | None,
    texts: Mapping[Path, str] | None = None,
    meshed: tuple[Path | None, Path | None] = (None, None),
    figures: Path | None = None,
    sample: int | None = None,
) -> int:
    """Solve, write files, with `texts` among them, print; return the exit code."""
    from femag.requirement_checks import all_kept, checked_requirements
    from femag.result import solve
    from femag.tolerance_budget import sampled_spread

    check_targets(json, out)
    with shown_progress(_bracket) as progress:
        result = solve(design, progress=progress)
        spread = None if sample is None else sampled_spread(design, sample)
    with ExitStack() as stack:
        _write_on_mesh(result, *meshed, stack)
        _write_figures(result, figures, stack)
        _write(result, spread, json, out, texts or {}, stack)
    code = 0 if all_kept(checked_requirements(result)) else MISSED
    if json == "-":
        from femag.export.result_file import result_json

        typer.echo(result_json(result, spread), nl=False)
        return code

    from femag.answer import print_answer

    print_answer(result, terminal(), spread)
    if out is not None:
        typer.echo(f"\nWritten to {out}: {', '.join((*FOLDER_FILES, *_loss_files(result)))}")
    return code


def _write_on_mesh(result: Result, field: Path | None, mesh: Path | None, stack: ExitStack) -> None:
    """Write field and mesh where they were asked for; renamed when the stack is left."""
    if field is None and mesh is None:
        return
    from femag.export.mesh_files import write_field, write_mesh
    from femag.export.whole_file import whole_file

    for file, write in ((field, write_field), (mesh, write_mesh)):
        if file is not None:
            write(result, stack.enter_context(whole_file(file)))


def _write_figures(result: Result, folder: Path | None, stack: ExitStack) -> None:
    """Write every figure into a folder, if one is given; renamed when the stack is left."""
    if folder is None:
        return
    from femag.export.whole_file import whole_file
    from femag.plot import result_files
    from femag.review import mesh_row

    meshes, _ = mesh_row(result.design)
    made = result_files(result, meshes)
    make_folder(folder, "--figures")
    for name, content in made.items():
        stack.enter_context(whole_file(folder / name)).write_bytes(content)


def _write(
    result: Result,
    spread: SampledSpread | None,
    json: str | None,
    out: Path | None,
    texts: Mapping[Path, str],
    stack: ExitStack,
) -> None:
    """Write the other files that were asked for; each is renamed when the stack is left."""
    from femag.export.result_file import result_json
    from femag.export.whole_file import whole_file

    if json is not None and json != "-":
        target = stack.enter_context(whole_file(json))
        target.write_text(result_json(result, spread), encoding="utf-8")
    if out is None:
        return
    from femag.plot import flux_map, gap_map, write_figure

    make_folder(out)
    document, section, gap = (stack.enter_context(whole_file(out / name)) for name in FOLDER_FILES)
    document.write_text(result_json(result, spread), encoding="utf-8")
    for file, text in texts.items():
        stack.enter_context(whole_file(file)).write_text(text, encoding="utf-8")
    write_figure(lambda ax: flux_map(result, ax), section)
    write_figure(lambda ax: gap_map(result, ax), gap)
    _write_losses(result, out, stack)


def _write_losses(result: Result, out: Path, stack: ExitStack) -> None:
    """Draw the losses that are known; renamed when the stack is left."""
    from femag.export.whole_file import whole_file
    from femag.plot import copper_map, core_loss_map, layer_bars, write_figure, write_panels

    for name in _loss_files(result):
        file = stack.enter_context(whole_file(out / name))
        if name == COPPER_FILE:
            panels = (lambda ax: copper_map(result, ax), lambda ax: layer_bars(result, ax))
            write_panels(panels, file)
        else:
            write_figure(lambda ax: core_loss_map(result, ax), file)


def _loss_files(result: Result) -> list[str]:
    """Return the names of the figures of losses in a folder."""
    copper = any(loss.crossing_of_turns for loss in result.copper_loss)
    names = {COPPER_FILE: copper, CORE_LOSS_FILE: result.core_loss is not None}
    return [name for name, is_known in names.items() if is_known]


def _bracket(solution: FieldSolution) -> str:
    """Return the bounds of a solution in words, for progress."""
    from femag.field.adapt import inductance_bounds

    return f"{inductance_bounds(solution)}, {solution.unknowns} unknowns"


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command line and return its exit code.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments without the program's name; those of the process when left out.
    """
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, TextIOWrapper):
            stream.reconfigure(errors="replace")
    try:
        code = _run(argv)
        if sys.stdout is not None:
            sys.stdout.flush()
    except OSError as error:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        if isinstance(error, BrokenPipeError):
            return 0
        return _said(f"nothing can be printed ({error.strerror})", 2)
    return code


def _run(argv: Sequence[str] | None) -> int:
    try:
        answer: Any = app(argv, prog_name="gapfield", standalone_mode=False)
    except GapfieldError as error:
        return _said(str(error), error.exit_code)
    except typer.TyperException as error:
        return _said(error.format_message(), 2)
    except SystemExit:  # so say click and rich that the reader of a pipe has gone
        return 0
    except (KeyboardInterrupt, typer.Abort):
        answer = STOPPED
    if answer == STOPPED:  # also typer's own answer to Ctrl-C
        return _said("stopped", STOPPED)
    return answer if isinstance(answer, int) else 0


def _said(problem: str, code: int) -> int:
    typer.echo(f"gapfield: {' '.join(problem.split())}", err=True)
    return code


if __name__ == "__main__":
    sys.exit(main())
