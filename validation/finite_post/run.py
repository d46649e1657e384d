"""Co-energy and flux linkage of a gapped post of real material, against two-sided values."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

from femag.field.adapt import adapted_solution
from femag.field.problem import FieldProblem
from femag.geometry import Region, Section, Wall, rectangle
from femag.materials import FroehlichCurve, LinearCurve, MagnetisationCurve
from validation.rows import Row, bounded_row, plain_row, printed, table_of
from validation.table import print_rows

POST = 5e-3
TOLERANCE = 1e-5
ESTIMATE_ALLOWED = 2e-5
"""Flux linkage has no bounds."""
SOURCE = "computed for this project: two-sided"
MATERIALS: dict[str, MagnetisationCurve] = {
    "linear 2000": LinearCurve(2000.0),
    "saturating": FroehlichCurve(permeability=2000.0, saturation=0.45),
}


def rows() -> tuple[Row, ...]:
    """Return the rows of each material and current."""
    return tuple(row for line in table_of("finite_post") for row in rows_of(line))


def gapped_post(material: MagnetisationCurve) -> FieldProblem:
    """Return the upper half: b = a/.55, h = a, s = .05 a, coil (1.1, 1.7, .85) a, one turn."""
    a = POST
    b, h, s = a / 0.55, a, 0.05 * a
    inner, outer, top = 1.1 * a, 1.7 * a, 0.85 * a
    outline = ((0.0, 0.0), (b, 0.0), (b, h), (0.0, h))
    section = Section(
        outline,
        (
            Region("post", "core", rectangle(0.0, a, s, h)),
            Region("winding", "winding", rectangle(inner, outer, 0.0, top)),
        ),
        tuple(Wall("normal", *ends) for ends in pairwise(outline)),
        copies=2,
    )
    return FieldProblem(
        section, {"post": material}, {"winding": 1.0 / (2.0 * (outer - inner) * top)}
    )


def rows_of(line: dict[str, str]) -> Iterator[Row]:
    """Yield the rows of one line of reference.csv."""
    problem = gapped_post(MATERIALS[line["material"]])
    solution, _ = adapted_solution(problem, float(line["current"]), TOLERANCE)
    case = f"{line['material']}, {line['current']} A"
    reference = printed(line["coenergy"])
    yield bounded_row(case, "co-energy", reference, solution.coenergy, TOLERANCE, SOURCE)
    if line["flux_linkage"]:
        linkage = sum(solution.flux_linkage_of_sides) / 2.0
        yield plain_row(
            case, "flux linkage", printed(line["flux_linkage"]), linkage, "Wb",
            ESTIMATE_ALLOWED, SOURCE,
        )  # fmt: skip


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
