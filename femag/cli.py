"""The command line: ``gapfield``."""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from femag.errors import GapfieldError, InputError

if TYPE_CHECKING:
    from femag.design import Design
    from femag.field.bounds import FieldSolution
    from femag.result import Result

STOPPED = 130
FOLDER_FILES = ("result.json", "section.png", "gap.png")
PATIENCE = 1.0
"""Seconds of silence before progress shows on a terminal."""

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
) -> None:
    """Solve a design file.

    Prints the inductance between bounds, beside the hand calculation.
    """
    from femag.design_file import read_design

    _answer(_with_current(read_design(design), current), json, out)


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
    from femag.export.whole_file import whole_file

    text = files("femag").joinpath("demo.toml").read_text(encoding="utf-8")
    _make_folder(out)
    with whole_file(out / "design.toml") as temporary:
        temporary.write_text(text, encoding="utf-8")
    _answer(design_from_toml(text, "demo.toml"), None, out)
    typer.echo(f"Change {out / 'design.toml'} and run: gapfield solve {out / 'design.toml'}")


def _with_current(design: Design, current: str | None) -> Design:
    if current is None:
        return design
    from femag.units import si_value

    try:
        return replace(design, current=si_value(current, "A"))
    except InputError as error:
        raise InputError(
            error.problem, key="--current", value=current, accepted=error.accepted
        ) from error


def _answer(design: Design, json: str | None, out: Path | None) -> None:
    """Solve, then write files, then print."""
    from femag.result import solve

    if out is not None:
        _make_folder(out)
    with _shown_progress() as progress:
        result = solve(design, progress=progress)
    if out is not None:
        _write_folder(result, out)
    if json is not None and json != "-":
        from femag.export.result_file import write_result

        write_result(result, json)
    _print(result, json)
    if out is not None and json != "-":
        typer.echo(f"\nWritten to {out}: {', '.join(FOLDER_FILES)}")


def _print(result: Result, json: str | None) -> None:
    if json == "-":
        from femag.export.result_file import result_json

        typer.echo(result_json(result), nl=False)
        return
    from rich.console import Console

    from femag.answer import print_answer

    print_answer(result, Console())


def _make_folder(out: Path) -> None:
    try:
        out.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise InputError(
            f"cannot be made a folder ({error.strerror})", key="--out", value=str(out)
        ) from error


def _write_folder(result: Result, out: Path) -> None:
    from femag.export.result_file import write_result
    from femag.plot import flux_map, gap_map, write_figure

    json, section, gap = FOLDER_FILES
    write_result(result, out / json)
    write_figure(lambda ax: flux_map(result, ax), out / section)
    write_figure(lambda ax: gap_map(result, ax), out / gap)


@contextmanager
def _shown_progress() -> Iterator[Callable[[FieldSolution], None] | None]:
    """Give a callback that shows the bracket on a terminal when it takes long; None if piped."""
    if not sys.stderr.isatty():
        yield None
        return
    from rich.console import Console

    from femag.field.adapt import inductance_bounds

    started = time.monotonic()
    with Console(stderr=True).status("") as status:
        status.stop()

        def show(solution: FieldSolution) -> None:
            if time.monotonic() - started > PATIENCE:
                status.update(f"{inductance_bounds(solution)}, {solution.unknowns} unknowns")
                status.start()

        yield show


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command line and return its exit code.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments without the program's name; those of the process when left out.
    """
    try:
        code = _run(argv)
        sys.stdout.flush()
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    return code


def _run(argv: Sequence[str] | None) -> int:
    try:
        answer: Any = app(argv, prog_name="gapfield", standalone_mode=False)
    except GapfieldError as error:
        return _said(str(error), error.exit_code)
    except typer.TyperException as error:
        return _said(error.format_message(), 2)
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
