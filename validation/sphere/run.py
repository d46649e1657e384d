"""Co-energy and flux linkage of a polygonal sphere, and where they tend with its sides."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from femag.field.adapt import adapted_solution
from femag.field.bounds import Bounds
from femag.field.problem import FieldProblem
from femag.geometry import Region, Section, Wall, polygon_area
from femag.materials import FroehlichCurve, LinearCurve, MagnetisationCurve
from validation.rows import Row, plain_row, printed, table_of
from validation.sphere.regenerate import SHELL, SPHERE
from validation.table import print_rows

TOLERANCE = 1e-5
FAR_RADIUS = 60.0 * SHELL
SIDES = (32, 64)
"""Sides of the half circle in the table; the extrapolation rests on both."""
POLYGON_COST = 2.6
"""What vertices on the circle cost, measured: at most this over the squared number of sides."""
EXTRAPOLATED_ALLOWED = 3e-5
"""Three half widths: the extrapolation weighs the two brackets 4/3 and 1/3."""
SOURCE = "closed form"
MATERIALS: dict[str, MagnetisationCurve] = {
    "linear 1": LinearCurve(1.0),
    "linear 2000": LinearCurve(2000.0),
    "saturating": FroehlichCurve(permeability=2000.0, saturation=0.45),
}


def rows() -> tuple[Row, ...]:
    """Return the rows of each material and current."""
    return tuple(row for line in table_of("sphere") for row in rows_of(line))


def sphere_in_shell(sides: int, material: MagnetisationCurve) -> FieldProblem:
    """Return the upper half with vertices on the circles, one turn, far wall and mirror plane.

    The shell is cut into one block for each side. A block's turns are exactly those of its
    sector, spread evenly over its area.
    """
    angles = np.linspace(0.0, np.pi / 2.0, sides // 2 + 1)
    inner, outer = _circle(SPHERE, angles), _circle(SHELL, angles)
    regions = [Region("sphere", "core", ((0.0, 0.0), *reversed(inner)))]
    turns = {}
    shares = np.cos(angles[:-1]) - np.cos(angles[1:])
    for index, share in enumerate(shares):
        block = (inner[index + 1], outer[index + 1], outer[index], inner[index])
        name = f"block {index}"
        regions.append(Region(name, "winding", block))
        turns[name] = 0.5 * float(share) / polygon_area(block)
    far = FAR_RADIUS
    outline = ((0.0, 0.0), (far, 0.0), (far, far), (0.0, far))
    walls = (
        Wall("normal", outline[0], outline[1]),
        Wall("far", outline[1], outline[2]),
        Wall("far", outline[2], outline[3]),
    )
    return FieldProblem(
        Section(outline, tuple(regions), walls, copies=2), {"sphere": material}, turns
    )


def polygon_values(sides: int, material: str, ampere_turns: float) -> tuple[Bounds, float]:
    """Return the bounds of the polygon's co-energy (J), and its flux linkage (Wb)."""
    problem = sphere_in_shell(sides, MATERIALS[material])
    solution, _ = adapted_solution(problem, ampere_turns, TOLERANCE)
    return solution.coenergy, sum(solution.flux_linkage_of_sides) / 2.0


def extrapolated(coarse: float, fine: float) -> float:
    """Return the limit of values with an error of second order, from n and 2 n sides."""
    return (4.0 * fine - coarse) / 3.0


def _circle(
    radius: float, angles: np.ndarray[tuple[int], np.dtype[np.float64]]
) -> list[tuple[float, float]]:
    points = radius * np.array([np.sin(angles), np.cos(angles)]).T
    points[0, 0] = points[-1, 1] = 0.0
    return [(float(r), float(z)) for r, z in points]


def rows_of(line: dict[str, str]) -> Iterator[Row]:
    """Yield the rows of one line of reference.csv."""
    ampere_turns = float(line["ampere_turns"])
    case = f"{line['material']}, {ampere_turns:g} A"
    coenergy, linkage = printed(line["coenergy"]), printed(line["flux_linkage"])
    values = [polygon_values(sides, line["material"], ampere_turns) for sides in SIDES]
    bounds = values[-1][0]
    yield Row(
        case, f"W', {SIDES[-1]} sides", coenergy.value, bounds.lower, bounds.upper, bounds.value,
        "J", POLYGON_COST / SIDES[-1] ** 2, None, SOURCE,
    )  # fmt: skip
    limits = (
        ("W', limit", coenergy, extrapolated(values[0][0].value, bounds.value), "J"),
        ("linkage, limit", linkage, extrapolated(values[0][1], values[1][1]), "Wb"),
    )
    for quantity, reference, value, unit in limits:
        yield plain_row(case, quantity, reference, value, unit, EXTRAPOLATED_ALLOWED, SOURCE)


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
