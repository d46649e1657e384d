"""Co-energy and flux linkage of the one-dimensional pot, against a root and quadratures."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution
from femag.field.problem import FieldProblem
from femag.geometry import Region, Section, Wall, rectangle
from femag.materials import FroehlichCurve
from femag.quantities import flux_through_discs
from validation.nonlinear_pot.regenerate import HEIGHT, INNER, OUTER, POST, RETURN, WALL
from validation.rows import Row, bounded_row, plain_row, printed, table_of
from validation.table import print_rows

TOLERANCE = 1e-6
ESTIMATE_ALLOWED = 2e-5
"""Flux linkage and mean flux densities have no bounds."""
SOURCE = "computed for this project: one-dimensional root and quadrature"
MATERIAL = FroehlichCurve(permeability=2000.0, saturation=0.45)


def rows() -> tuple[Row, ...]:
    """Return the rows of each current."""
    return tuple(row for line in table_of("nonlinear_pot") for row in rows_of(line))


def pot() -> FieldProblem:
    """Return the pot between two ideal planes, one turn."""
    outline = ((0.0, 0.0), (WALL, 0.0), (WALL, HEIGHT), (0.0, HEIGHT))
    section = Section(
        outline,
        (
            Region("post", "core", rectangle(0.0, POST, 0.0, HEIGHT)),
            Region("winding", "winding", rectangle(INNER, OUTER, 0.0, HEIGHT)),
            Region("return", "core", rectangle(RETURN, WALL, 0.0, HEIGHT)),
        ),
        (
            Wall("normal", outline[0], outline[1]),
            Wall("tangential", outline[1], outline[2]),
            Wall("normal", outline[2], outline[3]),
        ),
    )
    turns = 1.0 / ((OUTER - INNER) * HEIGHT)
    return FieldProblem(section, {"post": MATERIAL, "return": MATERIAL}, {"winding": turns})


def rows_of(line: dict[str, str]) -> Iterator[Row]:
    """Yield the rows of one line of reference.csv."""
    solution, _ = adapted_solution(pot(), float(line["current"]), TOLERANCE)
    case = f"NI {line['current']} A"
    yield bounded_row(
        case, "co-energy", printed(line["coenergy"]), solution.coenergy, TOLERANCE, SOURCE
    )
    linkage = sum(solution.flux_linkage_of_sides) / 2.0
    post, back = mean_flux_densities(solution)
    for quantity, key, value, unit in (
        ("flux linkage", "flux_linkage", linkage, "Wb"),
        ("B post", "B_post", post, "T"),
        ("B return", "B_return", back, "T"),
    ):
        reference = printed(line[key])
        yield plain_row(case, quantity, reference, value, unit, ESTIMATE_ALLOWED, SOURCE)


def mean_flux_densities(solution: FieldSolution) -> tuple[float, float]:
    """Return mean B_z of post and return in T at mid height, from the flux side."""
    middle = np.full(3, HEIGHT / 2.0)
    flux = flux_through_discs(solution, np.array([[POST, RETURN, WALL], middle]))
    post = flux[0] / (np.pi * POST**2)
    back = (flux[2] - flux[1]) / (np.pi * (WALL**2 - RETURN**2))
    return float(post), float(back)


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
