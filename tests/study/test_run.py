import os
import signal
import sqlite3
import time
from collections.abc import Sequence
from concurrent.futures import Executor, Future, ThreadPoolExecutor
from dataclasses import replace
from pathlib import Path
from typing import Any

import psutil
import pytest

import femag as fm
from femag.study import Progress, Store


class AtOnce(Executor):
    """Solves where it is called."""

    def submit(self, work: Any, /, *arguments: Any, **named: Any) -> Future[Any]:
        future: Future[Any] = Future()
        future.set_result(work(*arguments, **named))
        return future


@pytest.fixture
def coarse(pot_26_16: fm.Design) -> fm.Design:
    return replace(pot_26_16, tolerance=0.1)


def test_a_study_says_what_each_solution_says(coarse: fm.Design) -> None:
    gaps, currents = [0.3e-3, 1e-3], [1.0, 3.0]
    study = fm.Study(coarse, {"gap.length": gaps, "drive.current": currents})
    columns = study.run(executor=AtOnce()).columns
    for case in range(4):
        design = replace(coarse, gaps=(fm.Gap(gaps[case // 2]),), current=currents[case % 2])
        result = fm.solve(design)
        assert columns["gap.length"][case] == gaps[case // 2]
        assert columns["drive.current"][case] == currents[case % 2]
        assert columns["inductance.lower"][case] == result.inductance.lower
        assert columns["flux_linkage"][case] == result.flux_linkage
        for row in result.hand:
            assert columns[f"hand.error.{row.estimate.name}"][case] == row.error
            assert columns[f"hand.in_range.{row.estimate.name}"][case] == row.estimate.in_range


def test_results_do_not_depend_on_workers_order_or_company(coarse: fm.Design) -> None:
    """Threads land in any order and share coarse meshes; a case alone shares nothing."""
    axes = {"gap.length": [0.3e-3, 1e-3], "drive.current": [1.0, 2.0]}
    together = fm.Study(coarse, axes)
    with ThreadPoolExecutor(2) as threads:
        crowd = together.run(executor=threads, in_flight=2)
    turned = fm.Study(coarse, dict(reversed(axes.items()))).run(executor=AtOnce())
    alone = fm.Study(coarse, {"gap.length": [1e-3], "drive.current": [2.0]}).run(executor=AtOnce())
    assert together.run(executor=AtOnce()).columns == crowd.columns
    kept = [name for name in crowd.columns if name not in ("case", "state", "reason")]
    for name in kept:
        values = crowd.columns[name]
        assert [turned.columns[name][n] for n in (0, 2, 1, 3)] == values
        assert alone.columns[name] == [values[3]]


def test_failures_are_rows_with_their_reason(coarse: fm.Design, tmp_path: Path) -> None:
    study = fm.Study(coarse, {"gap.length": [0.5e-3, 12e-3], "solve.tolerance": [0.1, 2.0]})
    table = study.run(tmp_path / "runs.sqlite", executor=AtOnce())
    assert table.columns["state"] == ["done", "failed", "failed", "failed"]
    assert "tolerance out of range" in table.columns["reason"][1]
    assert "the gap is longer than the post" in table.columns["reason"][2]
    assert table.columns["inductance.value"][1:] == [None] * 3


def test_a_defect_in_one_case_is_a_row_too(
    coarse: fm.Design, monkeypatch: pytest.MonkeyPatch
) -> None:
    def defect(design: fm.Design, **_: object) -> None:
        raise ZeroDivisionError(f"at {design.current} A")

    monkeypatch.setattr("femag.result.solve", defect)
    table = fm.Study(coarse, {"drive.current": [1.0]}).run(executor=AtOnce())
    assert table.columns["reason"] == ["ZeroDivisionError: at 1.0 A"]


def test_an_answer_of_other_versions_is_not_kept(
    coarse: fm.Design, monkeypatch: pytest.MonkeyPatch
) -> None:
    from femag.result import library_versions

    study = fm.Study(coarse, {"drive.current": [1.0]})
    here = library_versions()
    monkeypatch.setattr("femag.study.study._versions", lambda: here | {"numpy": "1.0"})
    table = study.run(executor=AtOnce())
    assert table.columns["reason"] == [f"solved with numpy {here['numpy']} instead of 1.0"]


def test_a_second_run_solves_nothing_again(coarse: fm.Design, tmp_path: Path) -> None:
    seen: list[Progress] = []
    study = fm.Study(coarse, {"gap.length": [0.5e-3, 1e-3]})
    first = study.run(tmp_path / "runs.sqlite", executor=AtOnce())
    again = study.run(tmp_path / "runs.sqlite", executor=AtOnce(), progress=seen.append)
    assert again.columns == first.columns
    assert [(state.done, state.here) for state in seen] == [(2, 0)]


def test_the_first_interrupt_finishes_what_is_in_flight(coarse: fm.Design, tmp_path: Path) -> None:
    study = fm.Study(coarse, {"gap.length": [(5 + n) * 1e-4 for n in range(6)]})

    def interrupt(state: Progress) -> None:
        if state.here == 2 and not state.stopping:
            os.kill(os.getpid(), signal.SIGINT)

    before = signal.getsignal(signal.SIGINT)
    with ThreadPoolExecutor(1) as thread:
        table = study.run(
            tmp_path / "runs.sqlite", executor=thread, in_flight=2, progress=interrupt
        )
        assert signal.getsignal(signal.SIGINT) == before
        done = table.columns["state"].count("done")
        assert 2 <= done <= 4
        whole = study.run(tmp_path / "runs.sqlite", executor=thread)
    with Store(tmp_path / "runs.sqlite") as store:
        assert store.counts() == {"open": 0, "taken": 0, "done": 6, "failed": 0}
    assert whole.columns == study.run(executor=AtOnce()).columns


def test_two_runs_on_one_store_share_the_work_and_both_return_all_of_it(
    coarse: fm.Design, tmp_path: Path
) -> None:
    study = fm.Study(coarse, {"gap.length": [(5 + n) * 1e-4 for n in range(6)]})
    path = tmp_path / "runs.sqlite"
    study.opened(path).close()
    with ThreadPoolExecutor(2) as both:
        runs = [both.submit(study.run, path, executor=AtOnce()) for _ in range(2)]
        one, other = (run.result().columns for run in runs)
    assert one == other == study.run(executor=AtOnce()).columns
    with sqlite3.connect(path) as connection:
        attempts = connection.execute("SELECT DISTINCT attempts FROM cases").fetchall()
    connection.close()
    assert attempts == [(1,)]


def test_a_run_takes_over_from_one_that_dies(coarse: fm.Design, tmp_path: Path) -> None:
    study = fm.Study(coarse, {"gap.length": [0.5e-3, 0.6e-3]})
    other = study.opened(tmp_path / "runs.sqlite")
    other.start_run()
    other.take()

    def die(state: Progress) -> None:
        if state.here == 1 and state.seconds > 0.5:
            other.close()

    table = study.run(tmp_path / "runs.sqlite", executor=AtOnce(), progress=die)
    assert table.columns["state"] == ["done", "done"]


@pytest.mark.slow
def test_a_stuck_process_is_ended_alone_and_tried_again_on_request(
    coarse: fm.Design, tmp_path: Path
) -> None:
    """A stopped process hears nothing, like one inside a hung library."""
    study = fm.Study(coarse, {"gap.length": [5e-4, 6e-4, 7e-4]})
    stopped: list[psutil.Process] = []

    def stop_one(state: Progress) -> None:
        if state.here == 1 and not stopped:
            stopped.append(_busiest(psutil.Process().children()))
            stopped[0].suspend()

    path = tmp_path / "runs.sqlite"
    table = study.run(path, workers=1, limit=1.5, progress=stop_one)
    assert table.columns["state"].count("done") == 2
    (reason,) = [reason for reason in table.columns["reason"] if reason]
    assert reason == "not done within 1.5 s"
    stopped[0].wait(5)
    whole = study.run(path, executor=AtOnce(), retry=True)
    assert whole.columns == study.run(executor=AtOnce()).columns


def _busiest(processes: Sequence[psutil.Process]) -> psutil.Process:
    return max(processes, key=lambda process: process.memory_info().rss)


@pytest.mark.slow
def test_a_killed_process_takes_its_own_case_only(coarse: fm.Design) -> None:
    study = fm.Study(coarse, {"gap.length": [(5 + n) * 1e-4 for n in range(12)]})
    killed: list[int] = []

    def kill_one(state: Progress) -> None:
        if state.here == 2 and not killed:
            victim = _busiest(psutil.Process().children())
            killed.append(victim.pid)
            victim.kill()

    table = study.run(workers=2, progress=kill_one)
    reasons = [reason for reason in table.columns["reason"] if reason]
    assert reasons == ["the worker process died (a crash, or killed for its memory)"]
    assert table.columns["state"].count("done") == 11


@pytest.mark.slow
@pytest.mark.parametrize("moment", [0.1, 3.0], ids=["processes start", "they solve"])
def test_the_second_interrupt_stops_and_leaves_no_process(
    pot_26_16: fm.Design, tmp_path: Path, moment: float
) -> None:
    slow = replace(pot_26_16, tolerance=1e-6)
    study = fm.Study(slow, {"gap.length": [1e-3, 2e-3, 3e-3]})
    workers: list[psutil.Process] = []

    def interrupt(state: Progress) -> None:
        if state.seconds > moment:
            workers[:] = [
                p for p in psutil.Process().children() if "spawn_main" in str(p.cmdline())
            ]
            os.kill(os.getpid(), signal.SIGINT)

    started = time.monotonic()
    with pytest.raises(KeyboardInterrupt):
        study.run(tmp_path / "runs.sqlite", workers=2, progress=interrupt)
    assert time.monotonic() - started < moment + 2.0
    assert len(workers) == 2
    assert not psutil.wait_procs(workers, timeout=1.0)[1]
    with Store(tmp_path / "runs.sqlite") as store:
        counts = store.counts()
    assert counts["taken"] == counts["failed"] == 0
    assert counts["open"] == 3 - counts["done"] >= 1  # how far it gets hangs on the machine
    assert [file.name for file in tmp_path.iterdir()] == ["runs.sqlite"]


@pytest.mark.parametrize(
    ("arguments", "problem"),
    [
        ({"limit": 1.0, "executor": AtOnce()}, "limit = 1.0: cannot be kept"),
        ({"limit": 0.0}, "limit = 0.0: cannot be kept"),
        ({"workers": 0}, "workers = 0: no workers"),
    ],
)
def test_what_a_run_cannot_do_is_said(
    coarse: fm.Design, arguments: dict[str, Any], problem: str
) -> None:
    with pytest.raises(fm.InputError, match=problem):
        fm.Study(coarse, {"gap.length": [1e-3]}).run(**arguments)
