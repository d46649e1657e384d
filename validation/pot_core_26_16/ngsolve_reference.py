r"""The pot core 26/16 in NGSolve: uniform refinement, or a mesh graded by hand.

The azimuthal vector potential as u = A/r, one side only (so a lower value, and no upper bound):
minimise the integral of nu |B|^2/2 - J r u over 2 pi r dr dz, B = (-r u_z, 2 u + r u_r). Upper
half, natural condition on the mirror plane, u = 0 on a quarter circle around the core.

``python -m validation.pot_core_26_16.ngsolve_reference uniform|graded`` prints one JSON line
``[unknowns, seconds, inductance]`` for each level. The seconds are those of a run that goes
straight to that level: meshing, refinement, assembly and solution, best of `RUNS`. With
``fine`` it prints the value of reference.csv.
"""

from __future__ import annotations

import itertools
import json
import math
import sys
import time
from collections.abc import Iterator
from contextlib import AbstractContextManager, nullcontext
from typing import Any, TypedDict

import ngsolve as ngs
from netgen.geom2d import SplineGeometry

THREADS = (1, 2)
"""Both are tried at every level and the quicker counts."""
RUNS = 3
MU_0 = 4e-7 * math.pi
HOLE, POST, WINDOW, OUTER = 2.75e-3, 5.75e-3, 10.6e-3, 12.75e-3
GAP, HALF_WINDOW, HALF_HEIGHT = 0.25e-3, 5.5e-3, 8.05e-3
COIL_INNER, COIL_OUTER, COIL_TOP = 6.4e-3, 10.0e-3, 4.8e-3
TURNS, PERMEABILITY = 50, 2000.0
CORE = ((HOLE, GAP), (POST, GAP), (POST, HALF_WINDOW), (WINDOW, HALF_WINDOW), (WINDOW, 0.0),
        (OUTER, 0.0), (OUTER, HALF_HEIGHT), (HOLE, HALF_HEIGHT))  # fmt: skip
COIL = ((COIL_INNER, 0.0), (COIL_OUTER, 0.0), (COIL_OUTER, COIL_TOP), (COIL_INNER, COIL_TOP))
GAP_CORNERS, ON_MIRROR = CORE[:2], (CORE[4], CORE[5])


class Grading(TypedDict):
    """Sizes at the gap's and the other corners of the core, largest size, far radius (m); order."""

    gap_size: float
    corner_size: float
    largest: float
    far: float
    order: int


UNIFORM = Grading(gap_size=1.0, corner_size=1.0, largest=0.04, far=0.15, order=3)
"""Netgen's own mesh of the section, without grading, to be divided uniformly."""
GRADED = Grading(gap_size=0.02e-3, corner_size=0.02e-3, largest=0.04, far=0.15, order=4)
"""Equal grading into every corner; 0.05 mm, the next larger size tried, misses 0.01 %."""
FINE = Grading(gap_size=0.2e-6, corner_size=10e-6, largest=0.1, far=0.765, order=7)
"""Far radius as the field solver's: 60 outer radii."""


def geometry(gap_size: float, corner_size: float, far: float) -> Any:
    """Return the section with an element size at each corner of the core (m)."""
    shape = SplineGeometry()
    sizes = [gap_size if corner in GAP_CORNERS else corner_size for corner in CORE]
    sizes = [
        3e-3 if corner in ON_MIRROR else size for corner, size in zip(CORE, sizes, strict=True)
    ]
    core = [shape.AppendPoint(*corner, maxh=size) for corner, size in zip(CORE, sizes, strict=True)]
    coil = [shape.AppendPoint(*corner, maxh=3e-3) for corner in COIL]
    origin = shape.AppendPoint(0.0, 0.0, maxh=1.5e-3)
    side, corner, top = (shape.AppendPoint(*p) for p in ((far, 0.0), (far, far), (0.0, far)))
    air, iron, copper = 1, 2, 3
    for index in (0, 1, 2, 3, 5, 6, 7):  # every edge of the core but the one on the mirror plane
        _line(shape, core[index], core[(index + 1) % 8], iron, air)
    for index in (1, 2, 3):
        _line(shape, coil[index], coil[(index + 1) % 4], copper, air)
    for start, end, inside in (
        (origin, coil[0], air),
        (coil[0], coil[1], copper),
        (coil[1], core[4], air),
        (core[4], core[5], iron),
        (core[5], side, air),
        (top, origin, air),
    ):
        _line(shape, start, end, inside, 0)
    shape.Append(["spline3", side, corner, top], leftdomain=air, rightdomain=0, bc="far")
    for number, name in ((air, "air"), (iron, "iron"), (copper, "copper")):
        shape.SetMaterial(number, name)
    return shape


def _line(shape: Any, start: int, end: int, left: int, right: int) -> None:
    shape.Append(["line", start, end], leftdomain=left, rightdomain=right, bc="natural")


def inductance(
    refinements: int, gap_size: float, corner_size: float, largest: float, far: float, order: int
) -> tuple[int, float]:
    """Return unknowns and inductance (H) after uniform refinements of a graded mesh."""
    mesh = ngs.Mesh(geometry(gap_size, corner_size, far).GenerateMesh(maxh=largest, grading=0.4))
    for _ in range(refinements):
        mesh.Refine()
    space = ngs.H1(mesh, order=order, dirichlet="far")
    u, v = space.TnT()
    r = ngs.x
    nu = mesh.MaterialCF({"iron": 1.0 / (MU_0 * PERMEABILITY)}, default=1.0 / MU_0)
    area = 2.0 * (COIL_OUTER - COIL_INNER) * COIL_TOP
    density = mesh.MaterialCF({"copper": TURNS / area}, default=0.0)

    def flux(w: Any) -> Any:
        return ngs.CF((-r * ngs.grad(w)[1], 2.0 * w + r * ngs.grad(w)[0]))

    matrix = ngs.BilinearForm(
        2.0 * math.pi * nu * r * flux(u) * flux(v) * ngs.dx(bonus_intorder=1),
        symmetric=True,
        condense=True,
    )
    load = ngs.LinearForm(2.0 * math.pi * density * r * r * v * ngs.dx(bonus_intorder=2))
    matrix.Assemble()
    load.Assemble()
    answer = ngs.GridFunction(space)
    inverse = matrix.mat.Inverse(space.FreeDofs(coupling=True), inverse="sparsecholesky")
    extended = ngs.IdentityMatrix() + matrix.harmonic_extension
    extended_t = ngs.IdentityMatrix() + matrix.harmonic_extension_trans
    answer.vec.data = (extended @ inverse @ extended_t + matrix.inner_solve) * load.vec
    return space.ndof, 2.0 * float(ngs.InnerProduct(load.vec, answer.vec))


def levels(kind: str) -> Iterator[tuple[int, float, float]]:
    """Yield unknowns, seconds and inductance (H) of every level of a study."""
    setting = UNIFORM if kind == "uniform" else GRADED
    for refinements in itertools.count():
        runs = []
        for threads in THREADS:
            with parallel(threads):
                inductance(refinements, **setting)
                runs += [_timed(refinements, setting) for _ in range(RUNS)]
        seconds, unknowns, value = min(runs)
        yield unknowns, seconds, value


def parallel(threads: int) -> AbstractContextManager[Any]:
    """Return the context of a run on 1 or more threads; 1 runs without the task manager."""
    if threads == 1:
        return nullcontext()
    ngs.SetNumThreads(threads)
    return ngs.TaskManager()  # type: ignore[no-any-return]


def _timed(refinements: int, setting: Grading) -> tuple[float, int, float]:
    started = time.perf_counter()
    unknowns, value = inductance(refinements, **setting)
    return time.perf_counter() - started, unknowns, value


def main(kind: str, unknowns_limit: int = 700_000) -> None:
    """Print levels as JSON lines until the next would be too large."""
    if kind == "fine":
        print(json.dumps(inductance(0, **FINE)))
        return
    for level in levels(kind):
        print(json.dumps(level), flush=True)
        if 4 * level[0] > unknowns_limit:
            return


if __name__ == "__main__":
    main(sys.argv[1])
