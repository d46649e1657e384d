"""Both bounds of fields that the elements represent, against closed forms."""

from __future__ import annotations

from femag.field.adapt import inductance_bounds
from femag.field.bounds import Bounds, both_sides, field_solution
from femag.field.problem import FieldProblem
from femag.geometry import Region, Section, Wall, rectangle
from femag.geometry.section import WallKind
from femag.materials import LinearCurve
from femag.mesh import coarse_mesh, uniformly_refined_mesh
from validation.rows import Row, plain_row, printed, table_of
from validation.table import print_rows
from validation.uniform_field.regenerate import HEIGHT, RADIUS

ALLOWED = 1e-11
SOURCE = "closed form"
WALLS: dict[str, WallKind] = {"normal": "normal", "tangential": "tangential"}


def rows() -> tuple[Row, ...]:
    """Return two rows for each case, one for each bound."""
    return tuple(row for line in table_of("uniform_field") for row in _rows_of(line))


def _rows_of(line: dict[str, str]) -> tuple[Row, Row]:
    lower, upper = line["lower_permeability"], line["upper_permeability"]
    bounds = inductance_of_both_sides(WALLS[line["outer_wall"]], float(lower), float(upper))
    permeability = lower if lower == upper else f"{lower}/{upper}"
    case = f"{line['outer_wall']}, mu {permeability}"
    reference = printed(line["inductance"])
    return (
        plain_row(case, "L, flux side", reference, bounds.lower, "H", ALLOWED, SOURCE),
        plain_row(case, "L, potential", reference, bounds.upper, "H", ALLOWED, SOURCE),
    )


def inductance_of_both_sides(wall: WallKind, lower: float, upper: float) -> Bounds:
    """Return the bounds of the inductance on an irregular mesh, H; the two should be equal.

    The turns are shared between the layers like length over permeability.
    """
    joint = 2.0 * HEIGHT / 3.0
    reluctance = 2.0 / lower + 1.0 / upper
    outline = ((0.0, 0.0), (RADIUS, 0.0), (RADIUS, HEIGHT), (0.0, HEIGHT))
    kinds: tuple[WallKind, ...] = ("normal", wall, "normal")
    section = Section(
        outline,
        (
            Region("lower", "core", rectangle(0.0, RADIUS, 0.0, joint)),
            Region("upper", "core", rectangle(0.0, RADIUS, joint, HEIGHT)),
        ),
        tuple(
            Wall(kind, start, end)
            for kind, start, end in zip(kinds, outline, outline[1:], strict=False)
        ),
    )
    layer = RADIUS * HEIGHT / 3.0
    problem = FieldProblem(
        section,
        {"lower": LinearCurve(lower), "upper": LinearCurve(upper)},
        {
            "lower": 1.0 / (lower * reluctance * layer),
            "upper": 1.0 / (upper * reluctance * layer),
        },
    )
    mesh = uniformly_refined_mesh(coarse_mesh(section))
    return inductance_bounds(field_solution(both_sides(problem, mesh), 1.0))


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
