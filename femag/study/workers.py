"""Processes that solve cases, one at a time each, and can be ended whatever they are doing.

Each is an executor of its own with a single process, so that a process which dies or is killed
takes its own case with it and no other.
"""

from __future__ import annotations

import gc
import multiprocessing
import os
import signal
import threading
import time
from collections.abc import Callable, Iterator
from concurrent.futures import Executor, Future, ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from multiprocessing.connection import wait
from multiprocessing.context import SpawnContext, SpawnProcess
from typing import Any, Protocol

from femag.errors import NumericalError

ONE_THREAD = {"OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1", "MKL_NUM_THREADS": "1"}


class Worker(Protocol):
    """What takes one case at a time."""

    def submit(self, work: Callable[..., Any], *arguments: Any) -> Future[Any]:
        """Start work and return its future."""

    def seconds_at_work(self) -> float:
        """Return for how long the last work has been going on."""

    def end(self) -> None:
        """End it now, with whatever it is doing, as far as that can be done."""


class _KnownProcesses(SpawnContext):
    """Spawns processes and knows them, so that they can be killed from their first moment on."""

    def __init__(self) -> None:
        super().__init__()
        self.processes: list[SpawnProcess] = []

    def Process(self, *arguments: Any, **named: Any) -> SpawnProcess:  # type: ignore[override]
        """Return a new process, not yet started."""
        process = SpawnProcess(*arguments, **named)
        self.processes.append(process)
        return process


class WorkerProcess:
    """A process of our own: spawned, with one BLAS thread, deaf to Ctrl-C, gone with its parent."""

    def __init__(self) -> None:
        self._executor: ProcessPoolExecutor | None = None
        self._first: Future[int] | None = None
        self._context = _KnownProcesses()
        self._since = 0.0

    def submit(self, work: Callable[..., Any], *arguments: Any) -> Future[Any]:
        """Start work, in a new process if there is none.

        Raises
        ------
        NumericalError
            If the process did not come up.
        """
        if self._executor is None:
            self._start()
        assert self._executor is not None
        try:
            future = self._executor.submit(_tidily, work, *arguments)
        except BrokenProcessPool as problem:  # it died with nothing to do
            why_it_died(self, problem)
            self.end()
            return self.submit(work, *arguments)
        self._since = time.monotonic()
        return future

    @property
    def came_up(self) -> bool:
        """Whether the process has begun to work."""
        return self._first is not None and self._first.done() and not self._first.exception()

    def seconds_at_work(self) -> float:
        """Return for how long the last work has been going on, start of the process left out."""
        return time.monotonic() - self._since if self.came_up else 0.0

    def end(self) -> None:
        """Kill the process if there is one; the next work gets a new one."""
        executor = self._executor
        self._executor = self._first = None
        if executor is None:
            return
        for process in self._context.processes:
            process.kill()
        executor.shutdown(wait=False, cancel_futures=True)

    def close(self) -> None:
        """Let the process leave."""
        if self._executor is not None:
            self._executor.shutdown(wait=True, cancel_futures=True)

    def _start(self) -> None:
        self._context = _KnownProcesses()
        with _one_thread(), _deaf_to_interrupts():
            self._executor = ProcessPoolExecutor(1, self._context, _prepare)
            self._first = self._executor.submit(os.getpid)
        self._first.add_done_callback(self._ready)

    def _ready(self, _: Future[int]) -> None:
        self._since = time.monotonic()


class Slot:
    """A place for one case in an executor of the caller's."""

    def __init__(self, executor: Executor) -> None:
        self._executor = executor

    def submit(self, work: Callable[..., Any], *arguments: Any) -> Future[Any]:
        """Hand work to the executor."""
        return self._executor.submit(work, *arguments)

    def seconds_at_work(self) -> float:
        """Return 0: when the executor begins is not known."""
        return 0.0

    def end(self) -> None:
        """Do nothing: what the executor has begun is its own."""


def usable_processors() -> int:
    """Return the number of processors that this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def why_it_died(worker: Worker, problem: BaseException) -> str:
    """Return why there is no answer.

    Raises
    ------
    NumericalError
        If processes do not even start, which no other case would survive.
    """
    if not isinstance(problem, BrokenProcessPool):
        return f"{type(problem).__name__}: {problem}"
    if isinstance(worker, WorkerProcess) and not worker.came_up:
        raise NumericalError(
            "worker processes do not start; a script that runs a study needs "
            "if __name__ == '__main__': around it"
        ) from problem
    return "the worker process died (a crash, or killed for its memory)"


def _prepare() -> None:
    """Set up a worker process: libraries loaded, an eye on the parent."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_leave_with_the_parent, daemon=True).start()
    import femag.result  # noqa: F401

    gc.freeze()  # what is loaded stays: to look through it after each case would take long


def _tidily(work: Callable[..., Any], *arguments: Any) -> Any:
    """Return what work returns, and leave nothing behind.

    Fields hold each other; waiting for Python to notice, memory grows by a third over 500 cases.
    """
    try:
        return work(*arguments)
    finally:
        gc.collect()


def _leave_with_the_parent() -> None:
    parent = multiprocessing.parent_process()
    if parent is not None:
        wait([parent.sentinel])
        os._exit(1)


@contextmanager
def _one_thread() -> Iterator[None]:
    """Give processes that are started inside one BLAS thread, which numpy reads when it loads."""
    before = {name: os.environ.get(name) for name in ONE_THREAD}
    os.environ.update(ONE_THREAD)
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                del os.environ[name]
            else:
                os.environ[name] = value


@contextmanager
def _deaf_to_interrupts() -> Iterator[None]:
    """Start processes inside that ignore Ctrl-C from their first moment on."""
    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, before)
