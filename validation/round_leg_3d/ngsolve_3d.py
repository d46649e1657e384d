r"""Round-leg cores in three dimensions with NGSolve, between two bounds.

Linear core of relative permeability 2000, one turn of 1 A spread uniformly over a ring about the
post, B.n = 0 on a far cylinder. In the ring J = 1/(2 h (r2 - r1)), and

    T = (0, 0, J (r2 - min(max(r, r1), r2))) for \|z\| <= h, 0 beyond

has curl T = J exactly: T_z is continuous in r, and a jump of the normal component at z = +-h makes
no curl. With B = curl A and H = T - grad phi,

    (integral of T . B)^2 / integral of B . B/mu  <=  2 W'  <=  integral of mu H . H.

The left side is the best multiple c of B; T . curl A has the integral of J . A and is orthogonal to
every gradient, so that the curl matrix hardly needs regularisation. A x n = 0 on the far cylinder
and on the planes x = 0 and y = 0 of symmetry; phi = 0 on z = 0. The bounds are those of the curved
mesh (volumes right to 3e-5). Their distance equals the integral of mu (H - c B/mu)^2; a run in
which it does not is refused. Complementary energies: Hammond and Penman, Proc. IEE 123 (1976) 554
(from memory).

``python -m validation.round_leg_3d.ngsolve_3d`` prints reference.csv, in a quarter of an hour; with
names of outlines, only their rows. Lengths in mm inside, inductances in mu0 mm.
"""

from __future__ import annotations

import csv
import itertools
import math
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import ngsolve as ngs
from netgen.occ import Box, Cylinder, Glue, OCCGeometry, Pnt, WorkPlane, Z

SOURCE = "computed for this project (NGSolve 3D, two-sided)"
PERMEABILITY = 2000.0
NANOHENRY = 400.0 * math.pi * 1e-3  # mu0 = 4e-7 pi H/m, times 1 mm, in nH
COLUMNS = "outline kind gap_mm lower_nH upper_nH mean_H2 outer_third_H2 earlier_nH source"
ORDER = 3
QUADRATURE = 2 * ORDER + 4
GRADING_LEVELS, GRADING_FACTOR = 2, 0.2
"""Geometric refinement towards the core's edges at gap and window."""
LARGEST, CORE_SIZE, CORNER_SIZE = 20.0, 1.75, 1.0
NEAR = 1e-4  # mm
Section = tuple[tuple[float, float], ...] | float  # corners, or the radius of a disc (mm)


@dataclass(frozen=True)
class Outline:
    """A core without its gap, and its coil; half sizes (mm).

    The plates are ``plate``, from half window to half height; the legs ``legs`` outside the circle
    of the window. Both are given for x >= 0, and y >= 0 if ``symmetric``.
    """

    post: float
    window: float
    half_window: float
    half_height: float
    plate: Section
    legs: Section
    coil_inner: float
    coil_outer: float
    coil_top: float
    gaps: tuple[float, ...] = (0.25, 0.5, 1.0, 2.0)
    symmetric: bool = True
    hole: float = 0.0
    far: float = 60.0
    rim_size: float = 0.5

    @property
    def part(self) -> Any:
        """The part of the far cylinder that is computed."""
        lowest = 0.0 if self.symmetric else -self.far
        return _disc(self.far, 0.0, self.far) * Box(
            Pnt(0.0, lowest, 0.0), Pnt(self.far, self.far, self.far)
        )


def _rectangle(x: float, bottom: float, top: float) -> Section:
    return ((0.0, bottom), (x, bottom), (x, top), (0.0, top))


_PQ, _ETD, _EP = (
    _rectangle(*sides) for sides in ((13.25, 0.0, 9.5), (17.0, 0.0, 5.4), (6.25, -2.4, 6.4))
)
_RM_LEG = ((4.75, 0.0), (11.375, 0.0), (11.375, 2.275), (4.75, 8.9))
_RM_PLATE = ((0.0, 0.0), *_RM_LEG[1:], (4.75, 5.375), (0.0, 5.375))
OUTLINES = {
    "pot 26/16": Outline(5.75, 10.6, 5.5, 8.05, 12.75, 12.75, 6.4, 10.0, 4.8,
                         gaps=(0.5,), hole=2.75, far=200.0),
    "PQ-like": Outline(6.0, 11.25, 5.75, 10.075, _PQ, _PQ, 6.8, 10.6, 5.0),
    "RM-like": Outline(4.2, 8.65, 5.5, 8.2, _RM_PLATE, _RM_LEG, 4.9, 8.0, 4.8,
                       gaps=(0.25, 0.5, 1.0)),
    "EP-like": Outline(2.175, 5.0, 4.6, 6.45, _EP, _EP, 2.7, 4.6, 3.9,
                       gaps=(0.1, 0.2, 0.4), symmetric=False, rim_size=0.2),
    "ETD-like": Outline(5.5, 12.8, 11.9, 17.3, _ETD, _ETD, 6.4, 12.0, 11.0, far=75.0),
}  # fmt: skip
EARLIER = {
    "PQ-like": (7980.1, 586.71, 324.48, 181.09, 101.97),
    "ETD-like": (3479.7, 473.21, 275.50, 162.00, 97.24),
}
"""AL (nH) without and with a post gap, from another 3D computation of this project."""


@dataclass(frozen=True)
class Answer:
    """Bounds of AL (nH); mean H^2 at 1 A (A^2/m^2; potential side, flux side) in the coil."""

    lower: float
    upper: float
    coil: tuple[float, float]
    outer_third: tuple[float, float]


def cases(outline: str) -> Iterator[tuple[str, float]]:
    """Yield kind of gap (none, post, spacer) and its length (mm)."""
    yield "none", 0.0
    yield from itertools.product(("post", "spacer"), OUTLINES[outline].gaps)


def _raised(kind: str, gap: float) -> float:
    return 0.5 * gap if kind == "spacer" else 0.0


def _prism(section: Section, bottom: float, top: float) -> Any:
    if isinstance(section, float):
        return _disc(section, bottom, top)
    plane = WorkPlane().MoveTo(*section[0])
    for corner in section[1:]:
        plane = plane.LineTo(*corner)
    return plane.Close().Face().Extrude(top - bottom).Move((0.0, 0.0, bottom))


def _disc(radius: float, bottom: float, top: float) -> Any:
    return Cylinder(Pnt(0.0, 0.0, bottom), Z, r=radius, h=top - bottom)


def solids(outline: Outline, kind: str, gap: float) -> dict[str, Any]:
    """Return the solids of the part that is computed; T_z = 1/(2 h) in ``post`` and ``bore``."""
    o, added = outline, _raised(kind, gap)
    window, top = o.half_window + added, o.half_height + added
    post = _disc(o.post, 0.5 * gap, window)
    legs = _prism(o.legs, added, window) - _disc(o.window, 0.0, top)
    bore = _disc(o.coil_inner, 0.0, o.coil_top)
    core = _prism(o.plate, window, top) + legs + (post - bore)
    post = post * bore
    if o.hole:
        core, post = (solid - _disc(o.hole, 0.0, top) for solid in (core, post))
    two_thirds = _disc((o.coil_inner + 2.0 * o.coil_outer) / 3.0, 0.0, o.coil_top)
    last_third = _disc(o.coil_outer, 0.0, o.coil_top) - two_thirds
    inside = {"core": core, "post": post, "bore": bore - post}
    inside |= {"coil start": two_thirds - bore, "coil end": last_third}
    found = {name: solid * o.part for name, solid in inside.items()}
    found["air"] = o.part
    for solid in inside.values():
        found["air"] = found["air"] - solid
    return found


def graded_mesh(outline: Outline, kind: str, gap: float) -> Any:
    """Return the curved mesh, refined geometrically towards the core's edges at gap and window."""
    parts = solids(outline, kind, gap)
    for name, solid in parts.items():
        solid.mat(name)
        solid.maxh = LARGEST if name == "air" else CORE_SIZE
    shape = Glue(list(parts.values()))
    for face in shape.faces:
        face.name = _boundary(outline, *face.bounding_box)
    heights = {outline.half_window + _raised(kind, gap): CORNER_SIZE}
    if gap:
        heights[0.5 * gap] = outline.rim_size
    for solid in shape.solids:
        if solid.name in ("core", "post"):
            _mark_edges(outline, solid, heights)
    mesh = ngs.Mesh(OCCGeometry(shape).GenerateMesh(maxh=LARGEST, grading=0.4))
    mesh.RefineHP(GRADING_LEVELS, GRADING_FACTOR)
    mesh.Curve(ORDER)
    return mesh


def _on_symmetry(outline: Outline, high: Any) -> bool:
    return high[0] < NEAR or (outline.symmetric and high[1] < NEAR)


def _boundary(outline: Outline, low: Any, high: Any) -> str:
    if high[2] < NEAR:
        return "mirror"
    if _on_symmetry(outline, high):
        return "tangential"
    is_lid = low[2] > outline.far - NEAR
    is_wall = low[2] < NEAR and min(high[0], high[2]) > outline.far - NEAR
    return "far" if is_lid or is_wall else "inside"


def _mark_edges(outline: Outline, solid: Any, heights: dict[float, float]) -> None:
    for edge in solid.edges:
        low, high = edge.bounding_box
        for height, size in heights.items():
            level = max(abs(low[2] - height), abs(high[2] - height)) < NEAR
            if level and not _on_symmetry(outline, high):
                edge.maxh, edge.hpref = size, 1


def source_field(outline: Outline, mesh: Any) -> Any:
    """Return T (A/mm), whose curl is the current density."""
    o = outline
    per_height = 0.5 / o.coil_top
    radius = ngs.sqrt(ngs.x**2 + ngs.y**2)
    in_coil = per_height * (o.coil_outer - radius) / (o.coil_outer - o.coil_inner)
    t_z = {"post": per_height, "bore": per_height, "coil .*": in_coil}
    return ngs.CF((0.0, 0.0, mesh.MaterialCF(t_z, default=0.0)))


def potential_side_field(mesh: Any, mu: Any, source: Any) -> Any:
    """Return H = T - grad phi (A/mm)."""
    space = ngs.H1(mesh, order=ORDER, dirichlet="mirror")
    u, v = space.TnT()
    phi = _solution(space, mu * ngs.grad(u) * ngs.grad(v), mu * source * ngs.grad(v))
    return source - ngs.grad(phi)


def flux_side_field(mesh: Any, mu: Any, source: Any) -> Any:
    """Return B/mu0 = curl A (A/mm)."""
    space = ngs.HCurl(mesh, order=ORDER, nograds=True, dirichlet="far|tangential")
    u, v = space.TnT()
    form = (ngs.curl(u) * ngs.curl(v) + 1e-8 * u * v) / mu
    return ngs.curl(_solution(space, form, source * ngs.curl(v)))


def _solution(space: Any, form: Any, load_form: Any) -> Any:
    matrix = ngs.BilinearForm(form * ngs.dx, symmetric=True, condense=True)
    preconditioner = ngs.Preconditioner(matrix, "bddc")
    load = ngs.LinearForm(load_form * ngs.dx(bonus_intorder=4))
    matrix.Assemble()
    load.Assemble()
    answer = ngs.GridFunction(space)
    load.vec.data += matrix.harmonic_extension_trans * load.vec
    inverse = ngs.krylovspace.CGSolver(matrix.mat, preconditioner.mat, tol=1e-9, maxiter=600)
    answer.vec.data = inverse * load.vec
    answer.vec.data += matrix.harmonic_extension * answer.vec
    answer.vec.data += matrix.inner_solve * load.vec
    return answer


def bounds(name: str, kind: str, gap: float) -> Answer:
    """Return the bounds of AL and the mean squared field.

    Raises
    ------
    ArithmeticError
        If the bounds are not as far apart as the two fields are.
    """
    outline = OUTLINES[name]
    mesh = graded_mesh(outline, kind, gap)
    source = source_field(outline, mesh)
    mu = mesh.MaterialCF({"core": PERMEABILITY, "post": PERMEABILITY}, default=1.0)
    h, b = potential_side_field(mesh, mu, source), flux_side_field(mesh, mu, source)
    work = ngs.Integrate(source * b, mesh, order=QUADRATURE)
    scale = work / ngs.Integrate(b * b / mu, mesh, order=QUADRATURE)
    upper = ngs.Integrate(mu * h * h, mesh, order=QUADRATURE)
    difference = h - scale * b / mu
    distance = ngs.Integrate(mu * difference * difference, mesh, order=QUADRATURE)
    if abs(upper - scale * work - distance) > 1e-6 * upper:
        raise ArithmeticError(f"{upper - scale * work} apart, fields {distance}")
    to_nanohenry = NANOHENRY * (8.0 if outline.symmetric else 4.0)
    return Answer(
        to_nanohenry * scale * work,
        to_nanohenry * upper,
        *(_mean_squares(mesh, place, h, scale * b) for place in ("coil .*", "coil end")),
    )


def _mean_squares(mesh: Any, place: str, h: Any, b: Any) -> tuple[float, float]:
    weight, *squares = (
        ngs.Integrate(f, mesh, order=QUADRATURE, definedon=mesh.Materials(place))
        for f in (1.0, h * h, b * b)
    )
    return 1e6 * squares[0] / weight, 1e6 * squares[1] / weight


def main(names: list[str]) -> None:
    """Print the table; the mean squares are the means of both sides."""
    table = csv.writer(sys.stdout, lineterminator="\n")
    table.writerow(COLUMNS.split())
    for name in names or OUTLINES:
        for (kind, gap), earlier in itertools.zip_longest(cases(name), EARLIER.get(name, ())):
            a = bounds(name, kind, gap)
            squares = [f"{0.5 * sum(pair):.6g}" for pair in (a.coil, a.outer_third)]
            limits = [f"{value:.7g}" for value in (a.lower, a.upper)]
            table.writerow([name, kind, gap, *limits, *squares, earlier, SOURCE])
            sys.stdout.flush()


if __name__ == "__main__":
    main(sys.argv[1:])
