"""Budgets of studies: cases a second, what a second process gains, memory of a process."""

from __future__ import annotations

import importlib.util
from dataclasses import dataclass, field, replace

from femag.study import Progress, Study
from validation.pot_core_26_16.run import pot_core_design

CASES = 80
MANY_CASES = 1000
WARM = 6
"""Cases after which the clock starts: processes are up then."""
SECONDS_A_CASE = 0.2
GAIN = 1.8
MEMORY = 300.0
"""MB a process."""
GROWTH = 1.02
"""Memory after the last case over that after a fifth of them."""


@dataclass
class Watch:
    """What a run shows of itself while it goes on.

    Parameters
    ----------
    times : list of (int, float)
        Cases that are finished, and s since the start.
    memory : list of (int, float)
        Cases that are finished, and the largest memory of a process in MB.
    """

    times: list[tuple[int, float]] = field(default_factory=list)
    memory: list[tuple[int, float]] = field(default_factory=list)

    def look(self, state: Progress) -> None:
        """Note how far the run is."""
        self.times.append((state.here, state.seconds))
        if state.here % 20 == 0:
            self.memory += [(state.here, size) for size in _memory_of_processes()]

    @property
    def seconds_a_case(self) -> float:
        """Wall time of a case once the processes are up, s."""
        first, last = (next(t for t in self.times if t[0] >= WARM), self.times[-1])
        return (last[1] - first[1]) / (last[0] - first[0])

    def memory_after(self, share: float) -> float:
        """Return the largest memory in MB up to a share of the cases."""
        until = share * self.times[-1][0]
        return max(size for done, size in self.memory if done <= until)


def _memory_of_processes() -> list[float]:
    if importlib.util.find_spec("psutil") is None:
        return []
    import psutil

    return [child.memory_info().rss / 1e6 for child in psutil.Process().children()]


def watched_run(cases: int, workers: int) -> Watch:
    """Run a study of gaps at 0.2 % and return what was seen of it."""
    design = replace(pot_core_design(), tolerance=2e-3)
    watch = Watch()
    study = Study(design, {"gap.length": f"0.2 mm:2 mm:{cases}"})
    study.run(workers=workers, progress=watch.look)
    return watch


@dataclass(frozen=True)
class StudyFigures:
    """What was measured.

    Parameters
    ----------
    one, two : float
        s a case with one process and with two.
    memory : float or None
        Largest memory of a process, MB; None without psutil.
    growth : float or None
        Memory after all cases over that after a fifth of them.
    """

    one: float
    two: float
    memory: float | None
    growth: float | None


def study_figures() -> StudyFigures:
    """Return what is measured, after about two minutes."""
    one, two = (watched_run(CASES, workers) for workers in (1, 2))
    many = watched_run(MANY_CASES, 2)
    memory = many.memory_after(1.0) if many.memory else None
    growth = memory / many.memory_after(0.2) if memory else None
    return StudyFigures(one.seconds_a_case, two.seconds_a_case, memory, growth)
