import sqlite3
from pathlib import Path

import pytest

import femag as fm
from femag import cli
from femag.study import Progress
from femag.study_command import _lines, in_words

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
STUDY = """
title = "three gaps"
base = "base.toml"
keep = ["inductance", "al_value", "fringing_factor", "hand"]
[axes]
"gap.length" = ["0.3 mm", "1 mm", "12 mm"]
"""


@pytest.fixture
def study(tmp_path: Path) -> Path:
    (tmp_path / "base.toml").write_text(DESIGN)
    (tmp_path / "study.toml").write_text(STUDY)
    return tmp_path / "study.toml"


def run(capsys: pytest.CaptureFixture[str], *arguments: object) -> tuple[int, str, str]:
    code = cli.main(["study", *map(str, arguments)])
    captured = capsys.readouterr()
    return code, captured.out, captured.err


def test_a_study_is_solved_kept_tabulated_and_drawn(
    study: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    store, table = tmp_path / "runs.sqlite", tmp_path / "out.csv"
    arguments = (study, "--store", store, "--workers", 1, "--limit", "60 s")
    code, out, err = run(capsys, *arguments, "--table", table)
    assert code == 0
    assert "2 of 3 cases done, 1 failed" in out
    assert "the gap is longer than the post" in out
    assert max(len(line) for line in out.splitlines() if "/" not in line) <= 80
    assert err.splitlines()[-1].startswith("3 of 3, 1 failed, ")
    first = table.read_bytes()
    head, *rows = first.decode().splitlines()
    assert head.startswith("case,state,reason,gap.length [m],shape.gap [m],")
    solved = fm.solve(fm.read_design(study.with_name("base.toml")), current=1.0)
    assert f",{fm.read_table(store).columns['inductance.value'][0]!r}," in rows[0]
    assert solved.inductance.value < fm.read_table(store).columns["inductance.value"][0]

    folder = tmp_path / "charts"
    code, out, err = run(capsys, "--store", store, "--table", table, "--charts", folder)
    assert (code, err) == (0, "")
    assert table.read_bytes() == first
    names = sorted(file.name for file in folder.iterdir())
    assert names == sorted(
        f"{chart}.{ending}"
        for chart in ("al", "fringing", "hand-errors")
        for ending in ("csv", "png", "svg")
    )


@pytest.mark.slow
def test_retry_solves_failed_cases_only(study: Path, capsys: pytest.CaptureFixture[str]) -> None:
    store = study.with_name("runs.sqlite")
    run(capsys, study, "--store", store, "--workers", 1)
    code, _, err = run(capsys, study, "--store", store, "--retry", "--workers", 1)
    assert (code, err.splitlines()[0]) == (0, "2 of 3, 0 failed")
    with sqlite3.connect(store) as connection:
        attempts = connection.execute("SELECT attempts FROM cases ORDER BY number").fetchall()
    connection.close()
    assert attempts == [(1,), (1,), (2,)]


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        (["{study}"], "--store"),
        (["--store", "none.sqlite"], "none.sqlite: is not there"),
        (["--store", "{study}"], "is no study store"),
        (["none.toml", "--store", "{folder}/r.sqlite"], "none.toml: cannot be read"),
        (["{study}", "--store", "{folder}/no/r.sqlite"], "the folder is not there"),
        (
            ["{study}", "--store", "{folder}/r.sqlite", "--table", "t.xls"],
            "t.xls: no format of a table; accepted: an ending of .csv, .parquet, .nc",
        ),
        (
            ["{study}", "--store", "{folder}/r.sqlite", "--table", "{folder}/no/t.csv"],
            "cannot be written",
        ),
        (["{study}", "--store", "{folder}/r.sqlite", "--charts", "{study}"], "is no folder"),
        (
            ["{study}", "--store", "{folder}/r.sqlite", "--limit", "60"],
            "--limit = '60': the unit is missing",
        ),
        (
            ["{study}", "--store", "{folder}/r.sqlite", "--limit", "0 s"],
            "limit = 0.0: cannot be kept",
        ),
        (
            ["{study}", "--store", "{folder}/r.sqlite", "--cluster", "tcp://x:1", "--limit", "1 s"],
            "--cluster",
        ),
        (["--store", "{folder}/r.sqlite", "--workers", "2"], "--workers: needs a study file"),
        (["--store", "{folder}/r.sqlite", "--retry"], "--retry: needs a study file"),
    ],
)
def test_bad_input_is_one_line(
    study: Path, capsys: pytest.CaptureFixture[str], arguments: list[str], text: str
) -> None:
    filled = [part.format(study=study, folder=study.parent) for part in arguments]
    code, out, err = run(capsys, *filled)
    assert (code, out) == (2, "")
    assert text in err
    assert len(err.splitlines()) == 1


def test_a_study_without_a_case_that_could_be_solved_fails(
    study: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    study.write_text(STUDY.replace('"0.3 mm", "1 mm", ', ""))
    code, _, err = run(capsys, study, "--store", study.with_name("r.sqlite"))
    assert code == 2
    assert "none of the 1 cases is a design; the first: " in err
    assert not list(study.parent.glob("r.sqlite*"))


@pytest.mark.parametrize(
    ("suffix", "library"), [(".parquet", "pandas"), (".parquet", "pyarrow"), (".nc", "xarray")]
)
def test_a_missing_library_is_said_before_the_work(
    study: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch,
    suffix: str, library: str,
) -> None:  # fmt: skip
    monkeypatch.setitem(__import__("sys").modules, library, None)
    store = study.with_name("runs.sqlite")
    code, _, err = run(capsys, study, "--store", store, "--table", study.with_name(f"t{suffix}"))
    assert code == 3
    assert err == f"gapfield: {library} is not installed: pip install 'gapfield[tables]'\n"
    assert not store.exists()


def test_a_missing_cluster_library_is_said(
    study: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(__import__("sys").modules, "distributed", None)
    code, _, err = run(
        capsys, study, "--store", study.with_name("r.sqlite"), "--cluster", "tcp://127.0.0.1:1"
    )
    assert code == 3
    assert err == "gapfield: dask.distributed is not installed: pip install 'gapfield[cluster]'\n"


def test_progress_says_done_failed_rate_and_time_left() -> None:
    state = Progress(done=90, failed=10, total=4000, here=50, seconds=10.0)
    assert in_words(state) == "100 of 4000, 10 failed, 5 a second, 13:00 left"
    assert in_words(Progress(0, 0, 10, 0, 0.0)) == "0 of 10, 0 failed"
    stopping = Progress(5, 0, 10, 5, 1.0, stopping=True)
    assert in_words(stopping) == "5 of 10, finishing what is in flight; Ctrl-C again stops now"


def test_lines_say_at_once_that_a_run_is_stopping(capsys: pytest.CaptureFixture[str]) -> None:
    show = _lines()
    for stopping in (False, False, True, True):
        show(Progress(5, 0, 10, 5, 1.0, stopping))
    assert [line.split(",")[1] for line in capsys.readouterr().err.splitlines()] == [
        " 0 failed", " finishing what is in flight; Ctrl-C again stops now"
    ]  # fmt: skip
