"""The command ``gapfield study``: options in, a store filled, tables and charts out."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from femag.command_output import make_folder, quantity, terminal
from femag.errors import InputError, MissingLibraryError, NumericalError

if TYPE_CHECKING:
    from femag.study import Progress, StudyTable

STOPPED = 130
LINE_EVERY = 10.0
"""Seconds between lines of progress where there is no terminal."""
CHART_FILES = ("fringing", "hand-errors", "al")
ENDINGS = (".svg", ".png")

StudyArgument = Annotated[
    Path | None, typer.Argument(metavar="[STUDY.toml]", help="The study file, to solve it.")
]
StoreOption = Annotated[
    Path, typer.Option("--store", metavar="FILE.sqlite", help="Where every case is kept.")
]
TableOption = Annotated[
    Path | None,
    typer.Option("--table", metavar="OUT", help="Write a table: .csv, .parquet or .nc."),
]
ChartsOption = Annotated[
    Path | None,
    typer.Option("--charts", metavar="DIR", help="Write charts and the tables behind them."),
]
WorkersOption = Annotated[
    int | None, typer.Option(min=1, help="Processes; one for each processor when left out.")
]
LimitOption = Annotated[
    str | None, typer.Option(help="Most time for a case, such as '60 s'; it is ended then.")
]
RetryOption = Annotated[bool, typer.Option("--retry", help="Solve failed cases again.")]
ClusterOption = Annotated[
    str | None,
    typer.Option(metavar="tcp://HOST:PORT", help="Solve on a dask.distributed cluster."),
]


def study_command(
    store: StoreOption,
    study: StudyArgument = None,
    table: TableOption = None,
    charts: ChartsOption = None,
    workers: WorkersOption = None,
    limit: LimitOption = None,
    retry: RetryOption = False,
    cluster: ClusterOption = None,
) -> int:
    """Solve many cases of a design; stop it, start it again: it goes on.

    Without a study file: how far a store is, its table, its charts.
    """
    from femag.study import read_study, read_table

    _check_options(study, table, charts, {
        "--workers": workers, "--limit": limit, "--retry": retry or None, "--cluster": cluster,
    })  # fmt: skip
    if cluster is not None and (workers is not None or limit is not None):
        raise InputError(
            "does not go with --workers or --limit", key="--cluster", value=cluster,
            accepted="a cluster alone; its workers are its own",
        )  # fmt: skip
    finished = True
    if study is None:
        found = read_table(store)
    else:
        seconds = None if limit is None else quantity("--limit", limit, "s")
        with _executor(cluster) as (executor, in_flight), _shown() as progress:
            found = read_study(study).run(
                store, workers=workers, limit=seconds, retry=retry, progress=progress,
                executor=executor, in_flight=in_flight,
            )  # fmt: skip
        finished = "open" not in found.columns["state"]
    _write(found, table, charts)
    _print_state(store)
    if "done" not in found.columns["state"] and finished:
        reason = next((reason for reason in found.columns["reason"] if reason), "none was solved")
        raise NumericalError(f"no case was solved; the first: {reason}")
    return 0 if finished else STOPPED


def _check_options(
    study: Path | None, table: Path | None, charts: Path | None, of_runs: dict[str, Any]
) -> None:
    """Refuse before the work what cannot be written after it, and options without a use."""
    if table is not None:
        from femag.export.study_table_file import check_table_target

        check_table_target(table)
    if charts is not None and charts.exists() and not charts.is_dir():
        raise InputError("is no folder", key="--charts", value=str(charts), accepted="a folder")
    for option, value in of_runs.items():
        if study is None and value is not None:
            raise InputError("needs a study file", key=option, accepted="STUDY.toml before it")


def _write(found: StudyTable, table: Path | None, charts: Path | None) -> None:
    if table is not None:
        from femag.export.study_table_file import write_table

        write_table(found, table)
        typer.echo(f"Written: {table}")
    if charts is not None:
        typer.echo(f"Written to {charts}: {', '.join(_write_charts(found, charts))}")


def _write_charts(found: StudyTable, folder: Path) -> list[str]:
    """Write every chart that the study has the numbers for, and return the files' names."""
    from femag.export.study_table_file import write_chart_table
    from femag.plot import al_chart, fringing_chart, hand_error_chart, write_panels
    from femag.study.charts import al_table, formulas, fringing_table, hand_error_table

    panels: dict[str, tuple[Any, list[Any], tuple[float, float], int]] = {
        "fringing": (fringing_table, [lambda ax: fringing_chart(found, ax)], (6.4, 4.8), 1),
        "hand-errors": (
            hand_error_table,
            [lambda ax, name=name: hand_error_chart(found, name, ax) for name in formulas(found)],
            (5.6, 3.2),
            -(-len(formulas(found)) // 2),
        ),
        "al": (al_table, [lambda ax: al_chart(found, ax)], (6.4, 4.8), 1),
    }
    files: list[str] = []
    refusals: list[InputError] = []
    for name in CHART_FILES:
        tabulate, draws, panel, rows = panels[name]
        try:
            behind = tabulate(found)
        except InputError as refusal:
            refusals.append(refusal)
            continue
        make_folder(folder, "--charts")
        write_chart_table(behind, folder / f"{name}.csv")
        for ending in ENDINGS:
            write_panels(draws, folder / f"{name}{ending}", panel, rows)
        files += [f"{name}{ending}" for ending in (*ENDINGS, ".csv")]
    if not files:
        raise refusals[0]
    return files


def _print_state(path: Path) -> None:

    from femag.study import Store
    from femag.study_answer import print_state

    with Store(path) as store:
        title = store.about()["title"]
        print_state(title, store.states(), store.reasons(), terminal())


@contextmanager
def _executor(cluster: str | None) -> Iterator[tuple[Any, int | None]]:
    """Give the executor of a cluster and the number of cases to have in flight there."""
    if cluster is None:
        yield None, None
        return
    try:
        from distributed import Client
    except ImportError as error:
        raise MissingLibraryError(
            "dask.distributed is not installed: pip install 'gapfield[cluster]'"
        ) from error
    try:
        client: Any = Client(cluster, timeout=10)  # type: ignore[no-untyped-call]
    except (OSError, ValueError) as error:
        problem = str(error).split("\n")[0]
        raise InputError(
            f"no cluster answers ({problem})", key="--cluster", value=cluster,
            accepted="the address of a dask scheduler, such as 'tcp://10.0.0.5:8786'",
        ) from error  # fmt: skip
    with client:
        threads = sum(client.nthreads().values())
        if threads == 0:
            raise InputError("the cluster has no workers", key="--cluster", value=cluster)
        yield client.get_executor(pure=False), 2 * threads


@contextmanager
def _shown() -> Iterator[Callable[[Progress], None]]:
    """Give a callback that shows progress: a bar on a terminal, else lines now and then."""
    if sys.stderr is not None and sys.stderr.isatty():
        with _bar() as show:
            yield show
    else:
        yield _lines()


@contextmanager
def _bar() -> Iterator[Callable[[Progress], None]]:
    from rich.progress import BarColumn, TextColumn
    from rich.progress import Progress as Bar

    columns = (BarColumn(20), TextColumn("{task.description}"))
    with Bar(*columns, console=terminal(stderr=True), transient=True) as bar:
        task = bar.add_task("", total=None)

        def show(state: Progress) -> None:
            finished = state.done + state.failed
            bar.update(task, completed=finished, total=state.total, description=in_words(state))

        yield show


def _lines() -> Callable[[Progress], None]:
    last, stopping = time.monotonic() - LINE_EVERY, False

    def show(state: Progress) -> None:
        nonlocal last, stopping
        now = time.monotonic()
        if now - last >= LINE_EVERY or state.left == 0 or state.stopping != stopping:
            last, stopping = now, state.stopping
            typer.echo(in_words(state), err=True)

    return show


def in_words(state: Progress) -> str:
    """Return how far a run is in one line."""
    finished = f"{state.done + state.failed} of {state.total}"
    if state.stopping:
        return f"{finished}, finishing what is in flight; Ctrl-C again stops now"
    words = [finished, f"{state.failed} failed"]
    if state.here:
        words.append(f"{state.rate:.3g} a second")
    if state.seconds_left is not None and state.left:
        words.append(f"{_duration(state.seconds_left)} left")
    return ", ".join(words)


def _duration(seconds: float) -> str:
    minutes, rest = divmod(round(seconds), 60)
    hours, minutes = divmod(minutes, 60)
    return f"{hours}:{minutes:02}:{rest:02}" if hours else f"{minutes}:{rest:02}"
