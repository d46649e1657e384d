"""Time budgets of solutions and studies, measured in one run so that the ratios mean something.

Run ``python -m validation.speed``. Every time is the best of several runs. Both sides run with
one BLAS thread; NGSolve may use two threads of its own and the quicker setting counts. What is
called a time to an error ends at the first level from which on the error of the reported value
(midpoint of the bounds; the one value of NGSolve) stays within the target, and includes meshing
and, for the field solver, all refinements before. Exit code 0 if every measured budget is kept.
"""

from __future__ import annotations

import importlib.util
import itertools
import json
import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path

from femag.current_curve import inductance_curve
from femag.design_file import design_toml
from femag.field.adapt import adapted_solution, inductance_bounds, refinements
from femag.field.design_problem import field_problem
from femag.field.problem import FieldProblem
from femag.materials import FroehlichCurve
from femag.target_gap import gap_for
from validation.pot_core_26_16.run import pot_core_design
from validation.rows import table_of
from validation.study_speed import (
    GAIN,
    GROWTH,
    MANY_CASES,
    MEMORY,
    SECONDS_A_CASE,
    study_figures,
)

RUNS = 5
COLD_RUNS = 3
TIGHTEST = 2e-5
"""Half width at which the levels of the time to an error end."""
ONE_THREAD = {"OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1", "MKL_NUM_THREADS": "1"}

Level = tuple[float, float]
"""Seconds up to a level, and the inductance that it gives in H."""


@dataclass(frozen=True)
class Budget:
    """One budget and what was measured.

    Parameters
    ----------
    what : str
        In a few words.
    seconds : float or None
        Measured time, or what `what` says; None when it could not be measured.
    limit : float
        Largest time in s, or largest share of `beside` where that is given.
    beside : float or None
        Time of the reference run in s.
    note : str
        What was used, or why nothing was measured.
    """

    what: str
    seconds: float | None
    limit: float
    beside: float | None = None
    note: str = ""

    @property
    def measured(self) -> float | None:
        """The time in s, or its ratio to the reference run."""
        if self.seconds is None or self.beside is None:
            return self.seconds
        return self.seconds / self.beside

    @property
    def kept(self) -> bool | None:
        """Whether the budget is kept; None when nothing was measured."""
        return None if self.measured is None else self.measured <= self.limit


def best_time(action: Callable[[], object], runs: int = RUNS) -> float:
    """Return the shortest of several wall times in s."""
    times = []
    for _ in range(runs):
        started = time.perf_counter()
        action()
        times.append(time.perf_counter() - started)
    return min(times)


def warm_budgets(problem: FieldProblem) -> Iterator[Budget]:
    """Yield the times to a half width, in this process."""
    for tolerance, limit in ((1e-3, 0.15), (1e-4, 0.3)):
        solution, number = adapted_solution(problem, 1.0, tolerance)
        seconds = best_time(partial(adapted_solution, problem, 1.0, tolerance))
        note = f"{solution.unknowns} unknowns, {number} refinements"
        yield Budget(f"half width {tolerance:.2%}", seconds, limit, note=note)


def curve_budget() -> Budget:
    """Return the time of 25 points of a saturating core, with the saturation currents."""
    material = FroehlichCurve(permeability=2000.0, saturation=0.45)
    design = replace(pot_core_design(), material=material)
    currents = [0.2 + 7.8 * place / 24 for place in range(25)]
    curve = inductance_curve(design, currents, 2e-3)
    seconds = best_time(lambda: inductance_curve(design, currents, 2e-3))
    flux, potential = zip(*(point.iterations for point in curve.points), strict=True)
    note = (
        f"{curve.unknowns} unknowns; Newton a point: flux side {min(flux)} to {max(flux)}, "
        f"potential {min(potential)} to {max(potential)}"
    )
    return Budget("25-point curve, 0.2 %", seconds, 1.0, note=note)


def gap_budget() -> Budget:
    """Return the field solutions that a gap takes for a target, the inductance within 0.1 %."""
    design = replace(pot_core_design(), tolerance=1e-3)
    found = gap_for(design, 250e-6)
    off = max(
        abs(bound / 250e-6 - 1.0) for bound in (found.inductance.lower, found.inductance.upper)
    )
    seconds = best_time(lambda: gap_for(design, 250e-6))
    note = f"both bounds within {off:.3%}, {seconds:.3f} s with the hand formulas' gaps"
    solutions = float(found.solutions) if off <= 1e-3 else None
    return Budget("gap for 250 uH, solutions", solutions, 6.0, note=note)


def field_levels(problem: FieldProblem) -> list[Level]:
    """Return seconds and midpoint at every level, the best time of each."""
    runs = [list(_one_run(problem)) for _ in range(RUNS)]
    return [(min(times)[0], times[0][1]) for times in zip(*runs, strict=True)]


def _one_run(problem: FieldProblem) -> Iterator[Level]:
    started = time.perf_counter()
    for solution in refinements(problem, 1.0):
        bounds = inductance_bounds(solution)
        yield time.perf_counter() - started, bounds.value
        if bounds.relative_half_width < TIGHTEST:
            return


def peer_levels(kind: str) -> list[Level] | str:
    """Return seconds and value at every level of NGSolve, or why there are none."""
    if importlib.util.find_spec("ngsolve") is None:
        return "skipped: ngsolve is not installed"
    command = ["-m", "validation.pot_core_26_16.ngsolve_reference", kind]
    done = _run([sys.executable, *command])
    if done.returncode != 0:
        return f"ngsolve failed: {_last_line(done.stderr)}"
    lines = (json.loads(line) for line in done.stdout.splitlines())
    return [(seconds, value) for _, seconds, value in lines]


def time_to_error(levels: Sequence[Level], target: float, truth: float) -> float | None:
    """Return the seconds of the first level from which on the error stays within a target.

    Parameters
    ----------
    levels : sequence of Level
        Seconds and values, ever finer.
    target : float
        Relative error.
    truth : float
        True inductance, H.
    """
    inside = list(itertools.takewhile(lambda level: abs(level[1] / truth - 1.0) <= target,
                                      reversed(levels)))  # fmt: skip
    return inside[-1][0] if inside else None


def error_budgets(problem: FieldProblem) -> Iterator[Budget]:
    """Yield the times to a true error beside NGSolve's, uniform and graded."""
    truth = float(table_of("pot_core_26_16")[0]["inductance"])
    own = field_levels(problem)
    for kind, targets in (
        ("uniform", ((1e-3, 1 / 3), (2e-4, 1 / 20))),
        ("graded", ((1e-4, 1 / 2),)),
    ):
        peer = peer_levels(kind)
        for target, limit in targets:
            what = f"error {target:.2%} / NGSolve {kind}"
            if isinstance(peer, str):
                yield Budget(what, None, limit, note=peer)
                continue
            seconds, beside = (time_to_error(run, target, truth) for run in (own, peer))
            note = "" if seconds else "the target was not reached"
            if beside is None:
                beside = peer[-1][0]
                error = abs(peer[-1][1] / truth - 1.0)
                note = f"NGSolve is at {error:.3%} after this time: it would take longer"
            yield Budget(what, seconds, limit, beside, note)


def study_budgets() -> Iterator[Budget]:
    """Yield the budgets of studies; what is no time says so."""
    found = study_figures()
    yield Budget("study: a case at 0.2 %", found.one, SECONDS_A_CASE, note="one process")
    yield Budget("study: two processes / one", found.two, 1 / GAIN, found.one, "s a case")
    note = "" if found.memory else "skipped: psutil is not installed"
    yield Budget("study: MB a process", found.memory, MEMORY, note=note)
    what = f"study: memory over {MANY_CASES} cases"
    yield Budget(what, found.growth, GROWTH, note=note or "end over a fifth of the way")


def cold_budgets() -> Iterator[Budget]:
    """Yield the times of whole processes of the command line."""
    with tempfile.TemporaryDirectory() as folder:
        file = Path(folder) / "design.toml"
        file.write_text(design_toml(pot_core_design()), encoding="utf-8")
        yield _cold("gapfield solve, cold", ["solve", str(file)], 1.5)
    yield _cold("gapfield --help", ["--help"], 0.15)


def _cold(what: str, arguments: list[str], limit: float) -> Budget:
    script = Path(sys.executable).with_name("gapfield")
    command = [str(script)] if script.exists() else [sys.executable, "-m", "femag.cli"]
    done = _run([*command, *arguments])
    if done.returncode != 0:
        return Budget(what, None, limit, note=f"failed: {_last_line(done.stderr)}")
    seconds = best_time(lambda: _run([*command, *arguments]), COLD_RUNS)
    return Budget(what, seconds, limit, note="whole process")


def _run(command: list[str]) -> subprocess.CompletedProcess[str]:
    environment = os.environ | ONE_THREAD
    return subprocess.run(command, capture_output=True, text=True, env=environment, check=False)


def _last_line(text: str) -> str:
    return (text.strip().splitlines() or ["no message"])[-1]


def budget_lines(budget: Budget) -> Iterator[str]:
    """Yield the lines of one budget, at most 80 columns each."""
    times = [f"{value:9.3f}" if value else f"{'-':>9}" for value in (budget.seconds, budget.beside)]
    measured = "-" if budget.measured is None else f"{budget.measured:.3f}"
    kept = {True: "yes", False: "NO", None: "-"}[budget.kept]
    yield f"{budget.what:<31}{times[0]}{times[1]} {measured:>9} {budget.limit:>8.3f}  {kept}"
    if budget.note:
        yield f"    {budget.note}"[:80]


def main() -> int:
    """Measure, print the table and return the exit code."""
    problem = field_problem(pot_core_design())
    print(f"best of {RUNS}, cold: of {COLD_RUNS}; one BLAS thread; {os.cpu_count()} processors")
    print(f"{'budget':<31}{'s':>9}{'beside s':>9} {'measured':>9} {'limit':>8}  kept")
    print("measured: seconds, or the ratio to the run beside it, or the number of solutions")
    kept = []
    for budget in itertools.chain(
        warm_budgets(problem),
        [curve_budget(), gap_budget()],
        error_budgets(problem),
        cold_budgets(),
        study_budgets(),
    ):
        print("\n".join(budget_lines(budget)), flush=True)
        kept.append(budget.kept)
    return 1 if False in kept else 0


if __name__ == "__main__":
    if any(os.environ.get(name) != value for name, value in ONE_THREAD.items()):
        os.execve(
            sys.executable, [sys.executable, "-m", "validation.speed"], os.environ | ONE_THREAD
        )
    raise SystemExit(main())
