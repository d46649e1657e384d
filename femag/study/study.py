"""The door to studies: a design and what is varied in; a table out."""

from __future__ import annotations

import json
import tempfile
from collections.abc import Callable, Iterable, Mapping, Sequence
from concurrent.futures import Executor
from contextlib import ExitStack
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import Any

from femag.design import Design
from femag.design_file import as_written, design_document, read_document
from femag.errors import InputError
from femag.study.plan import Factor, Plan
from femag.study.quantities import checked_quantities
from femag.study.run import Progress, Task, run_cases
from femag.study.sampling import Sample, steps_of
from femag.study.store import Store, settings_text
from femag.study.table import StudyTable, table_of
from femag.study.workers import Slot, Worker, WorkerProcess, usable_processors

Axes = Mapping[Any, Any]


@dataclass(frozen=True)
class Study:
    """A design and what is varied in it.

    Parameters
    ----------
    design : Design, str or Path
        The base, or its design file. A file need not be a whole design by itself.
    axes : mapping
        From a dotted key of the design file, such as ``"gap.length"``, to its values: numbers in
        SI (temperatures in degrees Celsius), texts with units, names, or
        ``"0.1 mm:2 mm:20"`` (evenly spaced; ``"0.1 mm:2 mm:20:log"``). From a tuple of keys to
        tuples of values for keys that change together. All combinations are solved, the last axis
        changing fastest.
    cases : sequence of mapping
        Listed cases: values of the same keys in each. They are combined with the axes.
    sample : Sample, optional
        Sampled cases, combined with the rest.
    keep : sequence of str
        Quantities to keep; the usual ones when left out.
    title : str
        For print.
    """

    design: Design | str | Path
    axes: Axes = field(default_factory=dict)
    cases: Sequence[Mapping[str, Any]] = ()
    sample: Sample | None = None
    keep: Sequence[str] = ()
    title: str = ""

    def __post_init__(self) -> None:
        object.__setattr__(self, "keep", checked_quantities(self.keep))
        if isinstance(self.design, Design):
            base, file = design_document(self.design), None
        else:
            base, file = read_document(self.design), str(self.design)
        factors = [*_axis_factors(self.axes), *_case_factors(self.cases)]
        if self.sample is not None:
            factors.append(self.sample.factor())
        object.__setattr__(self, "plan", Plan(base, tuple(factors), file))

    plan: Plan = field(init=False, repr=False)

    def __len__(self) -> int:
        return len(self.plan)

    def run(
        self,
        store: str | Path | None = None,
        *,
        workers: int | None = None,
        executor: Executor | None = None,
        in_flight: int | None = None,
        limit: float | None = None,
        retry: bool = False,
        progress: Callable[[Progress], None] | None = None,
    ) -> StudyTable:
        """Solve what is open of the study and return its table.

        A script that calls this needs ``if __name__ == "__main__":`` around it, since workers are
        spawned. The first Ctrl-C finishes the cases in flight and returns; the second stops.

        Parameters
        ----------
        store : path, optional
            File that keeps every case and goes on where it was left; none when left out.
        workers : int, optional
            Processes; one for each usable processor when left out.
        executor : concurrent.futures.Executor, optional
            Solve there instead of in processes of our own.
        in_flight : int, optional
            Cases that are given to `executor` at a time; twice the number of processors when left
            out.
        limit : float, optional
            Most seconds for a case; it is ended then. Not with an executor.
        retry : bool
            Whether cases that failed are solved again.
        progress : callable, optional
            Called with a `Progress` at the start, after each case and while waiting.

        Raises
        ------
        InputError
            If a value is not of its key's kind, no case makes a design, or the store cannot be
            used or holds another study.
        NumericalError
            If worker processes do not start.
        """
        if limit is not None and (executor is not None or not limit > 0.0):
            raise InputError(
                "cannot be kept", key="limit", value=limit,
                accepted="seconds above 0, with workers of our own, which can be ended",
            )  # fmt: skip
        with ExitStack() as stack:
            if store is None:
                folder = stack.enter_context(tempfile.TemporaryDirectory(prefix="gapfield-"))
                store = Path(folder) / "study.sqlite"
            opened = stack.enter_context(self.opened(store))
            opened.start_run(retry)
            task = Task(self.plan, tuple(self.keep), _versions(), limit, executor is not None)
            places = _places(stack, workers, executor, in_flight, opened.counts()["open"])
            run_cases(opened, task, places, progress)
            return table_of(opened)

    def opened(self, path: str | Path) -> Store:
        """Return the study's store in a file, which is begun if it is new.

        Raises
        ------
        InputError
            If the plan or the file cannot be used, or it holds another study.
        """
        if not Path(path).exists():
            self.plan.check()
        store = Store(path, writing=True)
        try:
            if store.is_new:
                versions = _versions()
                store.begin(self._about(versions), (
                    (self.plan.key(case, versions), settings_text(case.settings))
                    for case in self.plan.cases()
                ))  # fmt: skip
            self._check_same(store)
        except BaseException:
            store.close()
            raise
        return store

    @cached_property
    def _identity(self) -> str:
        return json.dumps([self.plan.identity, list(self.keep)])

    def _about(self, versions: Mapping[str, str]) -> dict[str, str]:
        axes = [(factor.name, factor.keys, len(factor.rows)) for factor in self.plan.factors]
        return {
            "title": self.title,
            "identity": self._identity,
            "versions": json.dumps(versions),
            "axes": json.dumps(axes),
            "keep": json.dumps(self.keep),
            "base": json.dumps(self.plan.base, default=str),
            "base_file": self.plan.file or "",
            "files": json.dumps(self.plan.digests),
        }

    def _check_same(self, store: Store) -> None:
        """Refuse the store of another study or of other versions."""
        about, file = store.about(), str(store.path)
        versions, here = json.loads(about["versions"]), _versions()
        for name in here:
            if versions.get(name) != here[name]:
                raise InputError(
                    f"was solved with {name} {versions.get(name)}, here it is {here[name]}",
                    file=file, accepted="the same versions, or a new store",
                )  # fmt: skip
        if about["identity"] == self._identity:
            return
        raise InputError(
            f"holds another study ({self._difference(about)})", file=file,
            accepted="a new store for each study",
        )  # fmt: skip

    def _difference(self, about: Mapping[str, str]) -> str:
        """Say what differs from the study of a store."""
        mine = self._about({})
        names = {"axes": "other axes", "keep": "other quantities", "base": "another base design",
                 "files": "a file that it names has changed"}  # fmt: skip
        differing = (text for name, text in names.items() if mine[name] != about.get(name))
        return next(differing, "other values")


def _versions() -> dict[str, str]:
    from femag.result import library_versions

    return library_versions()


def _places(
    stack: ExitStack,
    workers: int | None,
    executor: Executor | None,
    in_flight: int | None,
    open_cases: int,
) -> list[Worker]:
    """Return what takes cases: processes that leave with the stack, or slots of an executor."""
    number = usable_processors() if workers is None else workers
    if number < 1:
        raise InputError("no workers", key="workers", value=workers, accepted="1 or more")
    if executor is not None:
        return [Slot(executor) for _ in range(in_flight or 2 * usable_processors())]
    processes = [WorkerProcess() for _ in range(min(number, max(open_cases, 1)))]
    for process in processes:
        stack.callback(process.close)
    return list(processes)


def _axis_factors(axes: Axes) -> list[Factor]:
    factors = []
    for keys, values in axes.items():
        together = (keys,) if isinstance(keys, str) else tuple(keys)
        if isinstance(values, str):
            values = steps_of(together[0], values)
        if not isinstance(values, Iterable):
            raise InputError(
                "no list", key=", ".join(together), value=values, accepted="a sequence of values"
            )
        rows = [(value,) if isinstance(keys, str) else tuple(value) for value in values]
        for row in rows:
            if len(row) != len(together):
                raise InputError(
                    "not one value for each key", key=", ".join(together), value=row,
                    accepted=f"{len(together)} values",
                )  # fmt: skip
        factors.append(Factor(together[0], together, _written_rows(together, rows)))
    return factors


def _case_factors(cases: Sequence[Mapping[str, Any]]) -> list[Factor]:
    if not cases:
        return []
    keys = tuple(cases[0])
    for place, case in enumerate(cases):
        for key in {*keys} ^ {*case}:
            raise InputError(
                "stands in some cases only", key=f"case.{place}.{key}",
                accepted="the same keys in each case",
            )  # fmt: skip
    rows = [tuple(case[key] for key in keys) for case in cases]
    return [Factor("case", keys, _written_rows(keys, rows))]


def _written_rows(
    keys: Sequence[str], rows: Sequence[Sequence[Any]]
) -> tuple[tuple[Any, ...], ...]:
    """Return rows as in a design file: numbers in SI become texts with units."""
    return tuple(
        tuple(as_written(key, value) for key, value in zip(keys, row, strict=True)) for row in rows
    )
