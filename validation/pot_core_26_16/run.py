"""Inductance of the pot core 26/16 at three tolerances, against an independent bracket."""

from __future__ import annotations

from femag.design import Design
from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.design_problem import field_problem
from femag.geometry import Block, Gap, PotCore, Winding
from femag.materials import LinearCurve
from validation.rows import Digits, Row, bounded_row, table_of
from validation.table import print_rows

TOLERANCES = (1e-3, 1e-4, 1e-5)
SOURCES = {
    "order 7": "computed for this project: NGSolve, order 7, graded to 0.2 um",
    "bracket": "computed for this project: two-sided",
}


def rows() -> tuple[Row, ...]:
    """Return one row for each tolerance, and one for the other bracket; the current is 1 A."""
    references = {line["name"]: line for line in table_of("pot_core_26_16")}
    problem = field_problem(pot_core_design())
    solutions = (adapted_solution(problem, 1.0, tolerance)[0] for tolerance in TOLERANCES)
    table = []
    for tolerance, solution in zip(TOLERANCES, solutions, strict=True):
        bounds, case = inductance_bounds(solution), f"tolerance {tolerance:g}"
        for name in SOURCES if tolerance == TOLERANCES[-1] else ("order 7",):
            reference = _with_uncertainty(references[name])
            row = bounded_row(case, f"L, {name}", reference, bounds, tolerance, SOURCES[name])
            table.append(row)
    return tuple(table)


def _with_uncertainty(line: dict[str, str]) -> Digits:
    """Return a value whose rounding is its stated uncertainty: two brackets must overlap."""
    value, uncertainty = float(line["inductance"]), float(line["uncertainty"])
    return Digits(value, uncertainty / value)


def pot_core_design() -> Design:
    """Return the design: 0.5 mm gap, 50 turns, relative permeability 2000."""
    core = PotCore(
        outer_diameter=25.5e-3,
        window_diameter=21.2e-3,
        post_diameter=11.5e-3,
        hole_diameter=5.5e-3,
        height=16.1e-3,
        window_height=11.0e-3,
    )
    winding = Winding(turns=50, block=Block(6.4e-3, 10.0e-3, -4.8e-3, 4.8e-3))
    return Design(core=core, gaps=(Gap(0.5e-3),), windings=(winding,), material=LinearCurve(2000.0))


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
