"""Runs that end badly: killed at random moments, on a cluster that loses a worker."""

import json
import os
import random
import signal
import sqlite3
import subprocess
import sys
import time
from pathlib import Path

import psutil
import pytest

import femag as fm
from femag.study import Store

pytestmark = pytest.mark.slow

DESIGN = """
[core]
size = "P 26/16"
material = { permeability = 2000 }
[[gap]]
length = "0.5 mm"
[[winding]]
turns = 50
[solve]
tolerance = 0.1
"""
CASES = 600
FEWER = 120
KILLS = 20
WORKERS = 2


def study_of(folder: Path, cases: int) -> Path:
    (folder / "base.toml").write_text(DESIGN)
    axes = f'[axes]\n"gap.length" = "0.2 mm:4 mm:{cases}"\n'
    (folder / "study.toml").write_text(f'base = "base.toml"\n{axes}')
    return folder / "study.toml"


def command(study: Path, store: Path, *options: str) -> list[str]:
    return [sys.executable, "-m", "femag.cli", "study", str(study), "--store", str(store),
            "--workers", str(WORKERS), *options]  # fmt: skip


def finished(store: Path) -> dict[int, tuple[str, str]]:
    """Return answer and time of every case that is done."""
    if not store.exists():
        return {}
    connection = sqlite3.connect(store)
    try:
        rows = connection.execute(
            "SELECT number, answer, finished FROM cases WHERE state = 'done'"
        ).fetchall()
    except sqlite3.OperationalError:  # killed before the study was in it
        return {}
    finally:
        connection.close()
    return {number: (answer, when) for number, answer, when in rows}


def test_a_run_that_is_killed_twenty_times_gives_the_table_of_one_that_is_not(
    tmp_path: Path,
) -> None:
    study = study_of(tmp_path, CASES)
    moments = random.Random(1)
    store, undisturbed = tmp_path / "killed.sqlite", tmp_path / "undisturbed.sqlite"
    before: dict[int, tuple[str, str]] = {}
    for kill in range(KILLS):
        run = subprocess.Popen(
            command(study, store), stderr=subprocess.DEVNULL, start_new_session=True
        )
        _wait_for_work(store, len(before), moments.random())
        workers = psutil.Process(run.pid).children(recursive=True)
        if kill % 2:
            os.killpg(run.pid, signal.SIGKILL)
        else:
            run.kill()  # the workers have to notice
        run.wait()
        assert not psutil.wait_procs(workers, timeout=10)[1]
        now = finished(store)
        assert before.items() <= now.items()
        before = now
    assert 0 < len(before) < CASES
    for file in (store, undisturbed):
        table = file.with_suffix(".csv")
        subprocess.run(command(study, file, "--table", str(table)), check=True, capture_output=True)
    assert before.items() <= finished(store).items()
    assert store.with_suffix(".csv").read_bytes() == undisturbed.with_suffix(".csv").read_bytes()
    connection = sqlite3.connect(store)
    ((attempts,),) = connection.execute("SELECT sum(attempts) FROM cases")
    connection.close()
    assert CASES <= attempts <= CASES + KILLS * WORKERS
    assert not list(tmp_path.glob("killed.sqlite-*"))


def _wait_for_work(store: Path, known: int, share: float) -> None:
    """Wait for a random time, in most cases until something more is done."""
    patience = time.monotonic() + 30.0
    if share > 0.2:
        while len(finished(store)) <= known and time.monotonic() < patience:
            time.sleep(0.05)
    time.sleep(1.5 * share)


def test_two_runs_at_once_do_every_case_once(tmp_path: Path) -> None:
    study = study_of(tmp_path, FEWER)
    store = tmp_path / "runs.sqlite"
    runs = [
        subprocess.Popen(
            command(study, store), stderr=subprocess.DEVNULL, stdout=subprocess.DEVNULL
        )
        for _ in range(2)
    ]
    assert [run.wait() for run in runs] == [0, 0]
    connection = sqlite3.connect(store)
    counts = connection.execute("SELECT state, min(attempts), max(attempts), count(*) FROM cases")
    assert counts.fetchall() == [("done", 1, 1, FEWER)]
    connection.close()


CLUSTER = """
import json, os, sys, threading, time
from distributed import LocalCluster

if __name__ == "__main__":
    with LocalCluster("tcp://127.0.0.1:0", n_workers=2, threads_per_worker=1,
                      dashboard_address=None) as cluster:
        print(json.dumps([cluster.scheduler_address]), flush=True)
        sys.stdin.readline()
"""


def test_a_cluster_that_loses_a_worker_gives_the_same_table(tmp_path: Path) -> None:
    pytest.importorskip("distributed")
    study = study_of(tmp_path, FEWER)
    script = tmp_path / "cluster.py"
    script.write_text(CLUSTER)
    store = tmp_path / "cluster.sqlite"
    cluster = subprocess.Popen(
        [sys.executable, str(script)], stdin=subprocess.PIPE, stdout=subprocess.PIPE,
        stderr=subprocess.DEVNULL, text=True,
    )  # fmt: skip
    assert cluster.stdout is not None
    (address,) = json.loads(cluster.stdout.readline())
    run = subprocess.Popen(
        [sys.executable, "-m", "femag.cli", "study", str(study), "--store", str(store),
         "--cluster", address, "--table", str(tmp_path / "cluster.csv")],
        stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True,
    )  # fmt: skip
    try:
        while len(finished(store)) < 20:
            assert run.poll() is None
            time.sleep(0.05)
        workers = [
            process for process in psutil.Process(cluster.pid).children(recursive=True)
            if process.cpu_times().user > 1.0 and process.num_threads() > 3
        ]  # fmt: skip
        max(workers, key=lambda process: process.cpu_times().user).kill()
        output, _ = run.communicate(timeout=1200)
        assert run.returncode == 0, output
    finally:
        run.kill()
        cluster.communicate("\n", timeout=60)
    with Store(store) as opened:
        assert opened.counts() == {"open": 0, "taken": 0, "done": FEWER, "failed": 0}
    fm.read_study(study).run(tmp_path / "own.sqlite", workers=WORKERS)
    own, other = fm.read_table(tmp_path / "own.sqlite"), fm.read_table(store)
    assert own.columns == other.columns
