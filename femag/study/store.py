"""The store of a study: one SQLite file in write-ahead mode, one transaction for each case.

Several runs may work on one store. Each holds the lock of a small file beside it, which the
system gives back when the run dies in whatever way, and marks the cases that it takes with its
name. Cases that are marked by a run whose lock is free are open again.
"""

from __future__ import annotations

import json
import os
import sqlite3
import uuid
from collections.abc import Iterable, Iterator, Mapping, Sequence
from contextlib import closing, contextmanager, suppress
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, Literal

from filelock import FileLock, Timeout

from femag.errors import InputError
from femag.study.solving import Answer

APPLICATION = 0x47415046
"""Marks an SQLite file as a study store."""
SCHEMA = 1
PATIENCE = 60.0
"""Seconds that a writer waits for another one."""
NOT_OURS, FOLDER, MISSING, EMPTY = NO_STORE = (
    "is no study store", "is a folder", "is not there", "holds no study",
)  # fmt: skip
"""What a file is that cannot be used as a store at all."""
TABLES = (
    "CREATE TABLE study (name TEXT PRIMARY KEY, value TEXT NOT NULL)",
    "CREATE TABLE cases (number INTEGER PRIMARY KEY, key TEXT NOT NULL UNIQUE,"
    " settings TEXT NOT NULL, state TEXT NOT NULL DEFAULT 'open', run TEXT,"
    " attempts INTEGER NOT NULL DEFAULT 0, answer TEXT, reason TEXT, design_hash TEXT,"
    " seconds REAL, finished TEXT)",
    "CREATE INDEX cases_by_state ON cases (state, number)",
)

State = Literal["open", "taken", "done", "failed"]


@dataclass(frozen=True)
class Row:
    """One case in a store.

    Parameters
    ----------
    number : int
        Place in the plan.
    settings : dict
        Varied keys with their values as in a design file.
    state : {"open", "taken", "done", "failed"}
        How far it is.
    values : dict or None
        Kept numbers by column, SI; None unless it is done.
    reason : str or None
        Why it failed.
    """

    number: int
    settings: dict[str, Any]
    state: State
    values: dict[str, Any] | None
    reason: str | None


class Store:
    """An open store; close it, or use it in a with statement.

    Parameters
    ----------
    path : path
        The file.
    writing : bool
        Whether cases will be solved: makes the file if it is not there.

    Raises
    ------
    InputError
        If the file cannot be used; this holds for every method.
    """

    def __init__(self, path: str | Path, writing: bool = False) -> None:
        self.path = Path(path)
        self.run = uuid.uuid4().hex[:12]
        self._lock: FileLock | None = None
        with self._said():
            self._connection = self._opened(writing)
        try:
            with self._said():
                self._check_kind(writing)
        except BaseException:
            self._connection.close()
            raise

    def __enter__(self) -> Store:
        return self

    def __exit__(self, *problem: object) -> None:
        self.close()

    def close(self) -> None:
        """Close the file, and give back what this run has taken and not finished."""
        if self._lock is not None:
            with suppress(InputError), self._transaction() as connection:
                _release(connection, self.run)
            self._lock.release()
            Path(self._lock.lock_file).unlink(missing_ok=True)
            self._lock = None
        self._connection.close()

    # --- the study ---

    @property
    def is_new(self) -> bool:
        """Whether no study has been put into it."""
        with self._said():
            found = self._connection.execute("SELECT name FROM sqlite_master").fetchall()
        return not found

    def begin(self, about: Mapping[str, str], cases: Iterable[tuple[str, str]]) -> None:
        """Put a study into a new store, all or nothing; a store that has one keeps it.

        Parameters
        ----------
        about : mapping
            Texts by name: what the study is and what solves it.
        cases : iterable of (str, str)
            Key and settings (JSON) of each case in order.
        """
        with self._transaction() as connection:
            if connection.execute("SELECT name FROM sqlite_master").fetchone():
                return
            for statement in TABLES:
                connection.execute(statement)
            connection.executemany("INSERT INTO study VALUES (?, ?)", about.items())
            connection.executemany(
                "INSERT INTO cases (number, key, settings) VALUES (?, ?, ?)",
                ((number, *case) for number, case in enumerate(cases)),
            )
            connection.execute(f"PRAGMA application_id = {APPLICATION}")
            connection.execute(f"PRAGMA user_version = {SCHEMA}")

    def about(self) -> dict[str, str]:
        """Return the texts that say what the study is."""
        with self._said():
            return dict(self._connection.execute("SELECT name, value FROM study"))

    def counts(self) -> dict[State, int]:
        """Return the number of cases in each state."""
        counts: dict[State, int] = {"open": 0, "taken": 0, "done": 0, "failed": 0}
        with self._said():
            counts |= dict(
                self._connection.execute("SELECT state, count(*) FROM cases GROUP BY state")
            )
        return counts

    def states(self) -> dict[State, int]:
        """Return the number of cases in each state, those that dead runs had taken being open."""
        counts = self.counts()
        with self._said():
            taken = self._connection.execute(
                "SELECT run, count(*) FROM cases WHERE state = 'taken' GROUP BY run"
            ).fetchall()
        dead = sum(number for run, number in taken if not self._is_alive(run))
        return counts | {"open": counts["open"] + dead, "taken": counts["taken"] - dead}

    def rows(self) -> list[Row]:
        """Return all cases in order, as they are now."""
        query = "SELECT number, settings, state, answer, reason FROM cases ORDER BY number"
        with self._said():
            found = self._connection.execute(query).fetchall()
        numbers, settings, states, answers, reasons = zip(*found, strict=True)
        columns = (numbers, _decoded(settings), states, _decoded(answers), reasons)
        return [Row(*row) for row in zip(*columns, strict=True)]

    def reasons(self) -> list[tuple[str, int]]:
        """Return why cases failed, the most frequent first, with their number."""
        query = (
            "SELECT reason, count(*) AS n FROM cases WHERE state = 'failed' "
            "GROUP BY reason ORDER BY n DESC, reason"
        )
        with self._said():
            return self._connection.execute(query).fetchall()

    # --- a run ---

    def start_run(self, retry: bool = False) -> None:
        """Say that this run will take cases, and open those of runs that have died.

        Parameters
        ----------
        retry : bool
            Whether failed cases are opened as well.
        """
        lock = FileLock(self._lock_file(self.run))
        try:
            lock.acquire(timeout=0)
        except OSError as error:
            raise self._refusal(error.strerror or str(error)) from error
        self._lock = lock
        self.release_the_dead()
        if retry:
            with self._transaction() as connection:
                connection.execute(
                    "UPDATE cases SET state = 'open', run = NULL, reason = NULL "
                    "WHERE state = 'failed'"
                )

    def release_the_dead(self) -> None:
        """Open the cases that were taken by runs which are no more."""
        query = "SELECT DISTINCT run FROM cases WHERE state = 'taken' AND run != ?"
        with self._said():
            others = [run for (run,) in self._connection.execute(query, (self.run,))]
        for run in others:
            lock = FileLock(self._lock_file(run))
            try:
                lock.acquire(timeout=0)
            except Timeout:
                continue
            with self._transaction() as connection:
                _release(connection, run)
            lock.release()
            Path(lock.lock_file).unlink(missing_ok=True)

    def take(self) -> int | None:
        """Return the number of the next open case, now taken by this run; None if there is none."""
        with self._transaction() as connection:
            found: tuple[int] | None = connection.execute(
                "SELECT number FROM cases WHERE state = 'open' ORDER BY number LIMIT 1"
            ).fetchone()
            if found is not None:
                connection.execute(
                    "UPDATE cases SET state = 'taken', run = ?, attempts = attempts + 1 "
                    "WHERE number = ?",
                    (self.run, *found),
                )
        return None if found is None else found[0]

    def finish(self, number: int, answer: Answer) -> None:
        """Write the answer of a case that this run has taken.

        Parameters
        ----------
        number : int
            Of the case.
        answer : Answer
            What became of it.
        """
        state = "failed" if answer.values is None else "done"
        text = None if answer.values is None else json.dumps(answer.values)
        with self._transaction() as connection:
            connection.execute(
                "UPDATE cases SET state = ?, run = NULL, answer = ?, reason = ?, design_hash = ?, "
                "seconds = ?, finished = ? WHERE number = ? AND state = 'taken' AND run = ?",
                (state, text, answer.reason or None, answer.design_hash or None, answer.seconds,
                 datetime.now(UTC).isoformat(timespec="seconds"), number, self.run),
            )  # fmt: skip

    # --- the file ---

    def _is_alive(self, run: str) -> bool:
        """Return whether a run holds its lock; the file of one that does not is left as it is."""
        file = self._lock_file(run)
        if run == self.run or not Path(file).exists():
            return run == self.run
        lock = FileLock(file)
        try:
            lock.acquire(timeout=0)
        except Timeout:
            return True
        except OSError:  # a folder that cannot be written: no run goes on in it
            return False
        lock.release()
        return False

    def _lock_file(self, run: str) -> str:
        return f"{self.path}-run-{run}"

    def _opened(self, writing: bool) -> sqlite3.Connection:
        if self.path.is_dir():
            raise self._refusal(FOLDER)
        if writing:
            if not self.path.parent.is_dir():
                raise self._refusal("the folder is not there")
            return _connection(self.path, "rwc")
        if not self.path.exists():
            raise self._refusal(MISSING)
        try:
            connection = _connection(self.path, "rw")  # not "ro", which leaves files behind
            with closing(connection.execute("PRAGMA user_version")):
                return connection
        except sqlite3.OperationalError:
            if Path(f"{self.path}-wal").exists() or os.access(self.path.parent, os.W_OK):
                raise
            return _connection(self.path, "ro&immutable=1")  # a folder that cannot be written

    def _check_kind(self, writing: bool) -> None:
        connection = self._connection
        ((application,),) = connection.execute("PRAGMA application_id")
        ((schema,),) = connection.execute("PRAGMA user_version")
        tables = connection.execute("SELECT count(*) FROM sqlite_master").fetchone()[0]
        if tables and application != APPLICATION:
            raise self._refusal(NOT_OURS)
        if schema > SCHEMA:
            raise self._refusal(f"was written by a later version (format {schema}, not {SCHEMA})")
        if not tables and not writing:
            raise self._refusal(EMPTY)
        if writing:
            connection.execute("PRAGMA journal_mode = WAL").fetchall()
            connection.execute("PRAGMA synchronous = NORMAL")

    @contextmanager
    def _transaction(self) -> Iterator[sqlite3.Connection]:
        """Give the connection inside a transaction that is undone when something fails."""
        with self._said():
            self._connection.execute("BEGIN IMMEDIATE")
            try:
                yield self._connection
                self._connection.execute("COMMIT")
            except BaseException:
                if self._connection.in_transaction:
                    self._connection.execute("ROLLBACK")
                raise

    @contextmanager
    def _said(self) -> Iterator[None]:
        """Turn what SQLite raises into one line about the file."""
        try:
            yield
        except sqlite3.Error as error:
            raise self._refusal(_in_words(error)) from error

    def _refusal(self, problem: str) -> InputError:
        accepted = "a store of 'gapfield study'" if problem in NO_STORE else None
        return InputError(problem, file=str(self.path), accepted=accepted)


def _connection(path: Path, mode: str) -> sqlite3.Connection:
    uri = f"{path.resolve().as_uri()}?mode={mode}"
    return sqlite3.connect(uri, uri=True, timeout=PATIENCE, isolation_level=None)


def _release(connection: sqlite3.Connection, run: str) -> None:
    connection.execute(
        "UPDATE cases SET state = 'open', run = NULL WHERE state = 'taken' AND run = ?", (run,)
    )


def _in_words(error: sqlite3.Error) -> str:
    problem = str(error)
    if "not a database" in problem:
        return NOT_OURS
    if "full" in problem or "disk I/O" in problem:
        return f"cannot be written ({problem}); what was finished is kept"
    if "unable to open" in problem or "readonly" in problem:
        return f"cannot be opened for writing ({problem})"
    if "locked" in problem:
        return f"is in use ({problem})"
    return f"cannot be used ({problem})"


def _decoded(texts: Sequence[str | None]) -> list[Any]:
    """Return what JSON texts hold, None for None; many at once are read in half the time."""
    decoded: list[Any] = json.loads(f"[{','.join(text or 'null' for text in texts)}]")
    return decoded


def settings_text(settings: Mapping[str, Any] | Sequence[Any]) -> str:
    """Return settings as they stand in a store."""
    return json.dumps(settings)
