"""Pull of round posts and of two coils by both ways, and the slope of the inductance by the gap."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import NDArray

from femag.field.adapt import adapted_solution
from femag.field.bounds import FieldSolution
from femag.field.problem import FieldProblem
from femag.geometry import Region, open_section, rectangle
from femag.quantities.nodal_weight import harmonic_weights, nodes_on, shell_weights
from femag.quantities.sensitivity import coenergy_slope
from femag.quantities.stress import Stress
from femag.units import MU_0
from validation.air_coils.run import FAR_RADIUS
from validation.round_post_fringing.run import POST, two_posts
from validation.rows import Digits, Row, plain_row, printed, table_of
from validation.table import print_rows

Array = NDArray[np.float64]
Index = NDArray[np.int64]

TOLERANCE = 2e-4
"""Half width of the inductance; the pulls are estimates."""
COIL_TOLERANCE = 1e-4
ALLOWED = 1e-3
STEP = 1e-5
"""Change of the gap over its length for the slope."""
SOURCE = "computed for this project: mode matching, Bessel integral"


def rows() -> tuple[Row, ...]:
    """Return two rows for each pull, one for each slope."""
    return tuple(row for line in table_of("gap_force") for row in rows_of(line))


def rows_of(line: dict[str, str]) -> Iterator[Row]:
    """Yield the rows of one line of reference.csv."""
    reference = printed(line["value"])
    if line["quantity"] == "coils":
        for way, pull in zip(("stress", "work"), pulls_of_coils(), strict=True):
            yield _row("two coils", f"dM/dz, {way}", reference, -pull, "H/m")
        return
    a_b, g_a = float(line["a_over_b"]), float(line["g_over_a"])
    b, gap = POST / a_b, g_a * POST
    name = f"a/b {a_b:g}, g/a {g_a:g}"
    solution, _ = adapted_solution(_posts(b, gap), 1.0, TOLERANCE)
    plain = MU_0 * np.pi * POST**2 / gap**2
    if line["quantity"] == "slope":
        problems = (_posts(b, gap - STEP * gap), _posts(b, gap + STEP * gap))
        slope = 2.0 * np.mean(coenergy_slope(solution, *problems, 2.0 * STEP * gap))
        yield _row(name, "dL/dg over plain", reference, float(slope) / plain, "")
        return
    for way, pull in zip(("stress", "work"), pulls_of_posts(solution, gap), strict=True):
        yield _row(name, f"f_F, {way}", reference, 2.0 * pull / plain, "")


def pulls_of_posts(solution: FieldSolution, gap: float) -> tuple[float, float]:
    """Return the attraction of the faces of two posts in N by stress and by virtual work."""
    mesh = solution.sides.mesh
    face = nodes_on(mesh, ((0.0, gap / 2), (POST, gap / 2)))
    plate = nodes_on(mesh, ((POST, POST), (mesh.triangles.p[0].max(), POST)))
    middle = np.flatnonzero(mesh.triangles.p[1] == 0.0)
    return _pulls(solution, face, np.concatenate([plate, middle]), 0.5)


def pulls_of_coils() -> tuple[float, float]:
    """Return the attraction of two coils of one turn over their currents' product, N/A2."""
    near, other = (10e-3, 20e-3, -5e-3, 5e-3), (10e-3, 15e-3, 15e-3, 25e-3)
    regions = tuple(
        Region(name, "winding", rectangle(*edges))
        for name, edges in (("lower", near), ("upper", other))
    )
    density = {"lower": 1.0 / 100e-6, "upper": 1.0 / 50e-6}
    section = open_section(regions, FAR_RADIUS * np.hypot(15e-3, 25e-3))
    solution, _ = adapted_solution(FieldProblem(section, {}, density), 1.0, COIL_TOLERANCE)
    mesh = solution.sides.mesh
    lower, upper = (
        np.unique(mesh.triangles.t[:, mesh.elements_of(name)]) for name in ("lower", "upper")
    )
    far = mesh.triangles.facets[:, mesh.walls["far"]].ravel()
    return _pulls(solution, upper, np.concatenate([lower, far]), 0.0)


def _posts(b: float, gap: float) -> FieldProblem:
    return two_posts(b, gap, POST, (POST, b, POST))


def _pulls(
    solution: FieldSolution, moved: Index, held: Index, neutral: float
) -> tuple[float, float]:
    """Return the force down on the nodes that are moved in N, by stress and by virtual work.

    What turns between them and those held at a weight that is not 0 feel is left out.
    """
    stress = Stress(solution)
    weight = np.full((1, solution.sides.mesh.triangles.nvertices), neutral)
    weight[0, moved] = 1.0
    (smooth,) = harmonic_weights(solution.sides.mesh, weight, np.union1d(moved, held))
    first, second = (
        float(np.mean(stress.work(own)))
        + (float(np.mean(stress.force_on_turns(own - neutral))) if neutral else 0.0)
        for own in (shell_weights(smooth), smooth)
    )
    return first, second


def _row(case: str, quantity: str, reference: Digits, value: float, unit: str) -> Row:
    return plain_row(case, quantity, reference, value, unit, ALLOWED, SOURCE)


if __name__ == "__main__":
    raise SystemExit(print_rows(rows()))
