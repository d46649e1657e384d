"""Inductance and post flux of two ideal round posts, against mode matching."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise

import numpy as np

from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.bounds import FieldSolution
from femag.field.problem import FieldProblem
from femag.geometry import Region, Section, Wall, rectangle
from femag.quantities import flux_through_discs
from femag.units import MU_0
from validation.rows import Digits, Row, bounded_row, plain_row, printed, table_of
from validation.table import print_rows

POST = 5e-3
"""Post radius in m; the factors do not depend on it."""
TOLERANCE = 5e-6
ROOT_FLUX_ALLOWED = 3e-5
"""The flux at one point has no bounds: a few times the half width of the inductance."""
SOURCE = "computed for this project: corner-adapted mode matching"

Coil = tuple[float, float, float]
"""Inner radius, outer radius and half height, m."""


def rows() -> tuple[Row, ...]:
    """Return two rows for each shape with a full window, one for each rectangular coil."""
    return tuple(row for line in table_of("round_post_fringing") for row in rows_of(line))


def two_posts(b: float, gap: float, h: float, coil: Coil) -> FieldProblem:
    """Return the upper half of the air between ideal posts, plates and return wall (m)."""
    a, s = POST, gap / 2.0
    outline = ((0.0, 0.0), (b, 0.0), (b, h), (a, h), (a, s), (0.0, s))
    walls = tuple(Wall("normal", *ends) for ends in pairwise(outline))
    inner, outer, top = coil
    winding = Region("winding", "winding", rectangle(inner, outer, 0.0, top))
    section = Section(outline, (winding,), walls, copies=2)
    return FieldProblem(section, {}, {"winding": 1.0 / (2.0 * (outer - inner) * top)})


def rows_of(line: dict[str, str]) -> Iterator[Row]:
    """Yield the rows of one line of reference.csv."""
    a_b, g_a, h_a = (float(line[key]) for key in ("a_over_b", "g_over_a", "h_over_a"))
    b, gap, h = POST / a_b, g_a * POST, h_a * POST
    name = f"a/b {a_b:g}, g/a {g_a:g}"
    if line["winding"] != "window":
        inner, outer, top = (float(part) * POST for part in line["winding"].split())
        solution, _ = adapted_solution(two_posts(b, gap, h, (inner, outer, top)), 1.0, TOLERANCE)
        ratio = printed(line["factor"])
        reference = Digits(ratio.value * MU_0 * POST, ratio.rounding)
        yield _inductance_row(f"{name} coil", reference, solution)
        return
    solution, _ = adapted_solution(two_posts(b, gap, h, (POST, b, h)), 1.0, TOLERANCE)
    yield _inductance_row(name, window_inductance(printed(line["factor"]), b, gap, h), solution)
    flux = float(flux_through_discs(solution, np.array([[POST], [h]]))[0])
    root, plain = printed(line["root_factor"]), MU_0 * np.pi * POST**2 / gap
    yield plain_row(name, "root flux/plain", root, flux / plain, "", ROOT_FLUX_ALLOWED, SOURCE)


def window_inductance(factor: Digits, b: float, gap: float, h: float) -> Digits:
    """Return L of one turn of uniform J in the whole window, in H.

    The factor is that of a thin sheet on the post; what the thick winding adds is exact, since
    between the two the field is axial and the same at every height.
    """
    w = b - POST
    sheet = MU_0 * np.pi * POST**2 * factor.value / gap
    total = sheet + MU_0 * np.pi / h * (b * w / 3.0 - w**2 / 4.0)
    return Digits(total, factor.rounding * sheet / total)


def _inductance_row(case: str, reference: Digits, solution: FieldSolution) -> Row:
    return bounded_row(case, "L", reference, inductance_bounds(solution), TOLERANCE, SOURCE)


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
