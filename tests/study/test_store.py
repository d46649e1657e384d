import json
import resource
import sqlite3
import threading
import time
from collections import Counter
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

import femag as fm
from femag.result import library_versions
from femag.study import Store
from femag.study.solving import Answer, failed


def about(**changed: str) -> dict[str, str]:
    axes = [["gap.length", ["gap.length"], 100]]
    return {"title": "", "identity": "a", "versions": json.dumps(library_versions()),
            "axes": json.dumps(axes)} | changed  # fmt: skip


def begun(path: Path, number: int = 100) -> Store:
    store = Store(path, writing=True)
    cases = ((f"k{case}", json.dumps({"gap.length": f"{case + 1} mm"})) for case in range(number))
    store.begin(about(), cases)
    return store


def answer_of(number: int) -> Answer:
    return Answer({"inductance.value": 1.0 / (number + 3)}, "", 0.1, "h")


def solve_all(store: Store) -> None:
    while (number := store.take()) is not None:
        store.finish(number, answer_of(number))


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "runs.sqlite"


def test_cases_are_taken_in_order_and_kept_exactly(path: Path) -> None:
    with begun(path, 5) as store:
        store.start_run()
        for number in range(4):
            assert store.take() == number
            store.finish(number, answer_of(number) if number != 2 else failed("too\nlong"))
    with Store(path) as store:
        rows = store.rows()
    assert [row.state for row in rows] == ["done", "done", "failed", "done", "open"]
    assert [row.values and row.values["inductance.value"] for row in rows] == [
        1 / 3, 1 / 4, None, 1 / 6, None
    ]  # fmt: skip
    assert rows[2].reason == "too long"
    assert rows[4].settings == {"gap.length": "5 mm"}


def test_retry_opens_failed_cases_only(path: Path) -> None:
    with begun(path, 3) as store:
        store.start_run()
        for number in range(3):
            store.take()
            store.finish(number, failed("no") if number == 1 else answer_of(number))
    with Store(path, writing=True) as store:
        store.start_run()
        assert store.take() is None
    with Store(path, writing=True) as store:
        store.start_run(retry=True)
        assert store.take() == 1
        assert store.take() is None


def test_a_store_is_read_while_it_is_written(path: Path) -> None:
    with begun(path) as store, Store(path) as reader:
        store.start_run()
        for number in range(3):
            store.take()
            store.finish(number, answer_of(number))
            assert reader.counts()["done"] == number + 1
        assert len(fm.read_table(path)) == 100


def test_several_writers_share_the_cases(path: Path) -> None:
    begun(path, 400).close()
    taken: list[int] = []

    def work() -> None:
        with Store(path, writing=True) as store:
            store.start_run()
            while (number := store.take()) is not None:
                taken.append(number)
                store.finish(number, answer_of(number))

    threads = [threading.Thread(target=work) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert Counter(taken) == Counter(range(400))
    with Store(path) as store:
        assert [row.values for row in store.rows()] == [answer_of(n).values for n in range(400)]
    assert [file.name for file in path.parent.iterdir()] == ["runs.sqlite"]


def test_what_a_dead_run_had_taken_is_open_again_and_what_a_live_one_has_is_not(
    path: Path,
) -> None:
    live = begun(path, 3)
    live.start_run()
    assert live.take() == 0
    with sqlite3.connect(path) as connection:  # as a run leaves it that is killed
        connection.execute("UPDATE cases SET state = 'taken', run = 'gone' WHERE number = 1")
    connection.close()
    with Store(path, writing=True) as store:
        store.start_run()
        assert [store.take(), store.take(), store.take()] == [1, 2, None]
        live.close()
        store.release_the_dead()
        assert store.take() == 0


def test_an_answer_counts_only_from_the_run_that_has_the_case(path: Path) -> None:
    with begun(path, 1) as first, Store(path, writing=True) as second:
        first.start_run()
        first.take()
        second.start_run()
        second.finish(0, failed("not mine"))
        first.finish(0, answer_of(0))
        first.finish(0, failed("too late"))
        assert first.rows()[0].values == answer_of(0).values


def test_cases_of_a_dead_run_count_as_open_without_being_touched(path: Path) -> None:
    with begun(path, 3) as alive, Store(path) as other:
        alive.start_run()
        assert alive.take() == 0
        with sqlite3.connect(path) as connection:
            connection.execute("UPDATE cases SET state = 'taken', run = 'gone' WHERE number = 1")
        connection.close()
        Path(f"{path}-run-gone").touch()  # as a killed run leaves it
        assert other.states() == {"open": 2, "taken": 1, "done": 0, "failed": 0}
        assert other.counts() == {"open": 1, "taken": 2, "done": 0, "failed": 0}


def test_a_full_disk_is_one_line_and_nothing_is_lost(path: Path) -> None:
    with begun(path) as store:
        store.start_run()
        soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
        most = path.with_name("runs.sqlite-wal").stat().st_size + 40_000
        resource.setrlimit(resource.RLIMIT_FSIZE, (most, hard))
        try:
            with pytest.raises(fm.InputError, match=r"runs.sqlite: cannot be written") as refused:
                solve_all(store)
        finally:
            resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
        assert "\n" not in str(refused.value)
        assert "accepted" not in str(refused.value)
    with Store(path, writing=True) as store:
        store.start_run()
        written = store.counts()["done"]
        assert written > 0
        assert store.counts() == {"open": 100 - written, "taken": 0, "done": written, "failed": 0}
        assert store.take() == written


@pytest.mark.parametrize(
    ("make", "problem"),
    [
        (lambda path: None, "is not there"),
        (lambda path: path.mkdir(), "is a folder"),
        (
            lambda path: path.write_text("no database at all, but long enough" * 9),
            "is no study store",
        ),
        (lambda path: path.write_text(""), "holds no study"),
        (lambda path: _other_database(path), "is no study store"),
        (lambda path: _later(path), "was written by a later version"),
    ],
)
def test_what_is_no_store_is_said_in_one_line(
    path: Path, make: Callable[[Path], object], problem: str
) -> None:
    make(path)
    before = path.read_bytes() if path.is_file() else b""
    with pytest.raises(fm.InputError, match=problem) as refused:
        Store(path)
    assert str(path) in str(refused.value)
    if problem not in ("is not there", "holds no study"):
        with pytest.raises(fm.InputError, match=problem):
            Store(path, writing=True)
    assert not before or path.read_bytes() == before


def _other_database(path: Path) -> None:
    with sqlite3.connect(path) as connection:
        connection.execute("CREATE TABLE something (a)")
    connection.close()


def _later(path: Path) -> None:
    begun(path).close()
    with sqlite3.connect(path) as connection:
        connection.execute("PRAGMA user_version = 7")
    connection.close()


@pytest.mark.parametrize("path", [Path("/proc/runs.sqlite"), Path("/nowhere/runs.sqlite")])
def test_a_folder_that_cannot_be_written_is_said_in_one_line(path: Path) -> None:
    with pytest.raises(fm.InputError, match=str(path)) as refused:
        Store(path, writing=True)
    assert "\n" not in str(refused.value)


def test_a_store_of_another_study_or_version_is_refused(
    tmp_path: Path, pot_26_16: fm.Design
) -> None:
    path = tmp_path / "runs.sqlite"
    fm.Study(pot_26_16, {"gap.length": [1e-3, 2e-3]}).opened(path).close()
    fm.Study(pot_26_16, {"gap.length": [1e-3, 2e-3]}).opened(path).close()
    base = tmp_path / "b.toml"
    base.write_text(fm.design_toml(replace(pot_26_16, material=fm.LinearCurve(2100.0))))
    for other, difference in (
        (fm.Study(pot_26_16, {"gap.length": [1e-3, 3e-3]}), "other values"),
        (fm.Study(pot_26_16, {"winding.turns": [1, 2]}), "other axes"),
        (fm.Study(pot_26_16, {"gap.length": [1e-3, 2e-3]}, keep=["hand"]), "other quantities"),
        (fm.Study(base, {"gap.length": [1e-3, 2e-3]}), "another base design"),
    ):
        with pytest.raises(fm.InputError, match=f"holds another study \\({difference}\\)"):
            other.opened(path)
    with sqlite3.connect(path) as connection:
        text = json.dumps(library_versions() | {"numpy": "1.0"})
        connection.execute("UPDATE study SET value = ? WHERE name = 'versions'", (text,))
    connection.close()
    with pytest.raises(fm.InputError, match=r"was solved with numpy 1.0, here it is"):
        fm.Study(pot_26_16, {"gap.length": [1e-3, 2e-3]}).opened(path)
    assert len(fm.read_table(path)) == 2


def test_ten_thousand_rows_open_resume_and_tabulate_in_two_seconds(
    tmp_path: Path, pot_26_16: fm.Design
) -> None:
    ranges = {"gap.length": (0.1e-3, 2e-3), "drive.current": (1.0, 3.0)}
    study = fm.Study(pot_26_16, sample=fm.Sample(ranges, 10_000, "latin hypercube"))
    path = tmp_path / "runs.sqlite"
    values = {f"hand.error.formula {number}": number / 7 for number in range(40)}
    with study.opened(path) as store:
        store.start_run()
    with sqlite3.connect(path) as connection:
        connection.execute(
            "UPDATE cases SET state = 'done', answer = ? WHERE number > 0", (json.dumps(values),)
        )
    connection.close()
    started = time.process_time()
    with study.opened(path) as store:
        store.start_run()
        assert store.take() == 0
        store.finish(0, Answer(values))
    table = fm.read_table(path)
    assert time.process_time() - started < 2.0
    assert table.columns["state"] == ["done"] * 10_000
    assert len(table.columns) == 3 + 2 + 40
