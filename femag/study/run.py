"""A run: the open cases of a store go to workers until none is left or it is stopped."""

from __future__ import annotations

import signal
import threading
import time
from collections.abc import Callable, Iterator, Mapping, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, wait
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import Any

from femag.design_file import design_document, design_from_document
from femag.errors import GapfieldError, InputError
from femag.study.plan import Plan
from femag.study.solving import Answer, failed, solved_case
from femag.study.store import Store
from femag.study.workers import Worker, why_it_died

ATTENTION = 0.2
"""Seconds after which a run looks up from waiting: for the time limit, for Ctrl-C."""


@dataclass(frozen=True)
class Progress:
    """How far a run is.

    Parameters
    ----------
    done, failed, total : int
        Cases in the store.
    here : int
        Cases that this run has finished.
    seconds : float
        Since this run began.
    stopping : bool
        Whether it only finishes what is in flight.
    """

    done: int
    failed: int
    total: int
    here: int
    seconds: float
    stopping: bool = False

    @property
    def rate(self) -> float:
        """Cases per second of this run."""
        return self.here / self.seconds if self.seconds > 0.0 else 0.0

    @property
    def left(self) -> int:
        """Cases that are left."""
        return self.total - self.done - self.failed

    @property
    def seconds_left(self) -> float | None:
        """Expected time to the end; None before anything is known."""
        return self.left / self.rate if self.here else None


@dataclass(frozen=True)
class Task:
    """What is asked of each worker.

    Parameters
    ----------
    plan : Plan
        The plan.
    keep : tuple of str
        Quantities to keep.
    versions : mapping
        Versions that the answers must come from.
    limit : float or None
        Most seconds for a case.
    elsewhere : bool
        Whether workers may see other files than this process, so that designs are sent whole.
    """

    plan: Plan
    keep: tuple[str, ...]
    versions: Mapping[str, str]
    limit: float | None = None
    elsewhere: bool = False


@dataclass
class _Flight:
    """A case that is being solved."""

    number: int
    worker: Worker
    overdue: bool = False


@dataclass
class _Stop:
    """Whether Ctrl-C was pressed."""

    asked: bool = False


@dataclass
class _Run:
    """The state of a run, for the functions below."""

    store: Store
    task: Task
    idle: list[Worker]
    progress: Callable[[Progress], None] | None
    flights: dict[Future[Answer], _Flight] = field(default_factory=dict)
    here: int = 0
    started: float = field(default_factory=time.monotonic)


def run_cases(
    store: Store,
    task: Task,
    workers: Sequence[Worker],
    progress: Callable[[Progress], None] | None = None,
) -> bool:
    """Solve the open cases of a store; return False when Ctrl-C ended it before the last.

    The first Ctrl-C lets the cases in flight finish, the second raises KeyboardInterrupt.

    Parameters
    ----------
    store : Store
        With its run started.
    task : Task
        What to do.
    workers : sequence of Worker
        As many cases are in flight.
    progress : callable, optional
        Called at the start, after each case and while waiting.

    Raises
    ------
    InputError
        If the store cannot be written.
    NumericalError, MissingLibraryError
        If no worker can solve anything.
    """
    run = _Run(store, task, list(workers), progress)
    with _interrupts() as stop:
        _tell(run, stop)
        try:
            while _is_at_work(run, stop):
                landed, _ = wait(run.flights, ATTENTION, FIRST_COMPLETED)
                for future in landed:
                    _land(run, future)
                _end_the_overdue(run)
                _tell(run, stop)
        finally:
            for flight in run.flights.values():
                flight.worker.end()
    return not stop.asked


def _is_at_work(run: _Run, stop: _Stop) -> bool:
    """Give open cases to idle workers; return whether there is something to wait for.

    That may be another run on the same store, whose cases are taken over if it dies.
    """
    _take_off(run, stop)
    if run.flights or stop.asked:
        return bool(run.flights)
    run.store.release_the_dead()
    counts = run.store.counts()
    if counts["open"]:
        return _is_at_work(run, stop)
    if counts["taken"]:
        time.sleep(ATTENTION)
    return counts["taken"] > 0


def _take_off(run: _Run, stop: _Stop) -> None:
    """Give open cases to idle workers."""
    while run.idle and not stop.asked:
        number = run.store.take()
        if number is None:
            break
        worker = run.idle.pop()
        task = run.task
        case = task.plan.case(number)
        try:
            document, file = _sent(case.document, task)
        except InputError as error:
            _write(run, number, failed(str(error)))
            run.idle.append(worker)
            continue
        future = worker.submit(solved_case, document, file, task.keep)
        run.flights[future] = _Flight(number, worker)


def _sent(document: dict[str, Any], task: Task) -> tuple[dict[str, Any], str | None]:
    """Return document and file as a worker gets them: elsewhere without reference to files."""
    if not task.elsewhere:
        return document, task.plan.file
    return design_document(design_from_document(document, task.plan.file)), None


def _land(run: _Run, future: Future[Answer]) -> None:
    """Write what became of a case, and put its worker back."""
    flight = run.flights.pop(future)
    run.idle.append(flight.worker)
    problem = future.exception()
    if isinstance(problem, GapfieldError):
        raise problem
    if flight.overdue:
        answer = failed(f"not done within {run.task.limit:g} s", run.task.limit or 0.0)
    elif problem is not None:
        answer = failed(why_it_died(flight.worker, problem))
        flight.worker.end()
    else:
        answer = _of_the_same_versions(future.result(), run.task.versions)
    _write(run, flight.number, answer)


def _write(run: _Run, number: int, answer: Answer) -> None:
    run.store.finish(number, answer)
    run.here += 1


def _of_the_same_versions(answer: Answer, versions: Mapping[str, str]) -> Answer:
    for name, version in (answer.versions or {}).items():
        if versions.get(name) != version:
            return failed(f"solved with {name} {version} instead of {versions.get(name)}")
    return answer


def _end_the_overdue(run: _Run) -> None:
    """Kill workers that are over the time limit; their cases land with that reason."""
    if run.task.limit is None:
        return
    for future, flight in run.flights.items():
        late = flight.worker.seconds_at_work() > run.task.limit
        if late and not flight.overdue and not future.done():
            flight.overdue = True
            flight.worker.end()


def _tell(run: _Run, stop: _Stop) -> None:
    if run.progress is None:
        return
    counts = run.store.counts()
    seconds = time.monotonic() - run.started
    done, failures = counts["done"], counts["failed"]
    run.progress(Progress(done, failures, sum(counts.values()), run.here, seconds, stop.asked))


@contextmanager
def _interrupts() -> Iterator[_Stop]:
    """Note the first Ctrl-C instead of raising; the second raises. Only in the main thread."""
    stop = _Stop()
    if threading.current_thread() is not threading.main_thread():
        yield stop
        return

    def note(*_: object) -> None:
        if stop.asked:
            raise KeyboardInterrupt
        stop.asked = True

    before = signal.signal(signal.SIGINT, note)
    try:
        yield stop
    finally:
        signal.signal(signal.SIGINT, before)
