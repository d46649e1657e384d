"""Cores with straight legs: their core of revolution beside solutions in three dimensions."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import cache

import numpy as np

from femag.design import Design
from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.bounds import FieldSolution
from femag.field.design_problem import field_problem
from femag.geometry import Block, Core, Gap, PotCore, RoundLegCore, Winding
from femag.materials import FroehlichCurve, LinearCurve, MagnetisationCurve
from femag.units import MU_0
from validation.rows import Digits, Row, plain_row, table_of
from validation.table import print_rows

PERMEABILITY = 2000.0
TOLERANCE = 5e-4
ALLOWED = {"none": 1e-2, "post": 1.5e-3, "spacer": 4e-3, "winding": 5e-3, "saturating": 1e-3}
"""The ungapped core's share that leaks through the window is not in its core factor."""
SOURCE = "computed for this project: 3D, two-sided"
SATURATING = FroehlichCurve(permeability=2000.0, saturation=0.40, exponent=4.0)
SECANT = ((20, 324.64), (120, 320.76), (140, 315.83), (160, 287.31), (180, 259.12), (200, 236.10))
"""Ampere turns and flux linkage over current (nH) of the PQ-like core, gap 0.5 mm, in 3D."""


@dataclass(frozen=True)
class Case:
    """A core and its winding."""

    core: Core
    coil: Block


CASES = {
    "PQ-like": Case(
        RoundLegCore("pq", 12e-3, 22.5e-3, 20.15e-3, 11.5e-3, length=26.5e-3, width=19e-3),
        Block(6.8e-3, 10.6e-3, -5e-3, 5e-3),
    ),
    "ETD-like": Case(
        RoundLegCore("etd", 11e-3, 25.6e-3, 34.6e-3, 23.8e-3, length=34e-3, width=10.8e-3),
        Block(6.4e-3, 12e-3, -11e-3, 11e-3),
    ),
    "RM-like": Case(
        RoundLegCore(
            "rm", 8.4e-3, 17.3e-3, 16.4e-3, 11e-3, length=22.75e-3, width=13.65e-3 * np.sqrt(2.0),
            leg_opening=9.5e-3, waist=10.75e-3,
        ),
        Block(4.9e-3, 8e-3, -4.8e-3, 4.8e-3),
    ),
    "EP-like": Case(
        RoundLegCore(
            "ep", 4.35e-3, 10e-3, 12.9e-3, 9.2e-3, length=12.5e-3, width=8.8e-3, front=2.4e-3
        ),
        Block(2.7e-3, 4.6e-3, -3.9e-3, 3.9e-3),
    ),
    "pot 26/16": Case(
        PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11e-3, 5.5e-3),
        Block(6.4e-3, 10e-3, -4.8e-3, 4.8e-3),
    ),
}  # fmt: skip


def rows() -> tuple[Row, ...]:
    """Return the rows of each outline and gap, then those of the saturating core."""
    lines = table_of("round_leg_3d")
    return (*(row for line in lines for row in rows_of(line)), *saturating_rows())


def rows_of(line: dict[str, str]) -> Iterator[Row]:
    """Yield the rows of one line of reference.csv."""
    outline, kind, gap = line["outline"], line["kind"], float(line["gap_mm"])
    solution = solved(outline, kind, gap, LinearCurve(PERMEABILITY), 1.0)
    case = f"{outline}, {kind} {gap:g}" if gap else f"{outline}, no gap"
    bounds = inductance_bounds(solution)
    low, high = 1e-9 * float(line["lower_nH"]), 1e-9 * float(line["upper_nH"])
    reference = Digits((low + high) / 2, (high - low) / (high + low))
    yield plain_row(case, "AL", reference, bounds.value, "H", ALLOWED[kind], SOURCE)
    if kind == "post":
        yield plain_row(
            case, "rms H, winding", Digits(math.sqrt(float(line["mean_H2"])), 0.0),
            root_mean_square(solution), "A/m", ALLOWED["winding"], SOURCE,
        )  # fmt: skip


def saturating_rows() -> Iterator[Row]:
    """Yield flux linkage over current of the PQ-like core into saturation."""
    for current, printed in SECANT:
        solution = solved("PQ-like", "post", 0.5, SATURATING, float(current))
        apparent = sum(solution.flux_linkage_of_sides) / (2.0 * current)
        yield plain_row(
            f"PQ-like, {current} A", "flux linkage/I", Digits(printed * 1e-9, 0.0), apparent, "H",
            ALLOWED["saturating"], SOURCE,
        )  # fmt: skip


def solved(
    outline: str, kind: str, gap: float, curve: MagnetisationCurve, current: float
) -> FieldSolution:
    """Return the field of one turn; `gap` in mm, core factor as the ungapped core has it in 3D."""
    case = CASES[outline]
    core = case.core
    if isinstance(core, RoundLegCore):
        core = replace(core, core_factor=core_factor_in_3d(outline))
    leg = "all" if kind == "spacer" else "post"
    gaps = (Gap(gap * 1e-3, leg),) if gap else ()  # type: ignore[arg-type]
    design = Design(core, (Winding(1, case.coil),), curve, gaps, current, TOLERANCE)
    return adapted_solution(field_problem(design), current, TOLERANCE)[0]


@cache
def core_factor_in_3d(outline: str) -> float:
    """Return mu/AL of the ungapped core in three dimensions, 1/m."""
    (line,) = (
        line
        for line in table_of("round_leg_3d")
        if (line["outline"], line["kind"]) == (outline, "none")
    )
    middle = 0.5e-9 * (float(line["lower_nH"]) + float(line["upper_nH"]))
    return MU_0 * PERMEABILITY / middle


def root_mean_square(solution: FieldSolution) -> float:
    """Return the root of the mean of H^2 over the winding's volume in A/m, from the flux side."""
    sides = solution.sides
    winding = sides.mesh.elements_of("winding main")
    weight = sides.discretisation.weight[winding]
    h = solution.flux.field[winding] / MU_0
    return math.sqrt(np.sum(weight * np.sum(h**2, axis=1)) / np.sum(weight))


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
