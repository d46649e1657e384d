"""The fields of a curve as data in a page: mesh and unknowns, from which the page reads values.

Corners and unknowns are kept in double precision, so that what the page evaluates in an element is
the solver's own polynomial. H follows from |B| by a table as close as `FIELD_STRENGTH_ERROR`.
"""

from __future__ import annotations

import json
from base64 import b64encode
from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from femag.current_curve import CurvePoint, InductanceCurve
from femag.design import whole_section
from femag.field.bounds import FieldSolution
from femag.materials import MagnetisationCurve
from femag.plot.flux_map import Window, gap_window, label_places, light_to_dark, section_window
from femag.quantities import field_map, typical_peak
from femag.quantities.inside_elements import nodal_u
from femag.sheet.field_strength_table import field_strength_table
from femag.sheet.texts import shown

Array = NDArray[np.float64]
Index = NDArray[np.int64]
Document = dict[str, Any]

MOST_BYTES = 1_200_000
"""Of the unknowns of all currents; currents are left out beyond that, the peak never."""
FARTHEST = 2.0
"""Largest |B| that the tables of H reach over the largest at a corner of an element."""


def field_data(curve: InductanceCurve, peak: float, grid: Sequence[float]) -> Document:
    """Return mesh, materials and fields of a curve as what JSON can hold.

    Parameters
    ----------
    curve : InductanceCurve
        With the fields at every current.
    peak : float
        Current in A that the page shows first.
    grid : sequence of float
        Currents in A that the page can step through; the peak is one of them.
    """
    design = curve.design
    solutions = {solution.current: solution for solution in curve.solutions}
    view = section_window(design)
    seen = _elements_in(solutions[peak], view)
    chosen = thinned(grid, peak, len(np.unique(_dofs(solutions[peak])[seen])))
    largest = solutions[max(chosen, key=abs)]
    points = {point.current: point for point in curve.points}
    fields = field_map(largest, 1)
    return {
        **_mesh(solutions[peak], seen),
        **_materials(solutions[peak], FARTHEST * float(fields.flux_density.max())),
        "outlines": [
            {"role": role, "ends": _packed(fields.outlines[role], "<f4")}
            for role in ("winding", "core")
            if role in fields.outlines
        ],
        "labels": [
            {"text": name, "r": r, "z": z}
            for name, (r, z) in label_places(whole_section(design).regions, view).items()
        ],
        "views": {"section": view, "gap": gap_window(design)},
        "scale": typical_peak(fields),
        "colours": [[round(255 * part) for part in light_to_dark()(i)[:3]] for i in range(256)],
        "start": chosen.index(peak),
        "currents": [_at_current(solutions[c], points[c], seen) for c in chosen],
    }


def as_script(document: Document) -> str:
    """Return JSON that may stand inside of a script element: no angle bracket ends it."""
    return json.dumps(document, separators=(",", ":")).replace("<", "\\u003c")


def thinned(grid: Sequence[float], peak: float, nodes: int) -> list[float]:
    """Return the currents whose unknowns have room in the page, with the peak, evenly thinned."""
    room = max(1, int(MOST_BYTES // (8 * 4 / 3 * nodes)))
    step = -(-len(grid) // room)
    place = list(grid).index(peak)
    return list(grid[place % step :: step])


def _elements_in(solution: FieldSolution, view: Window) -> Index:
    """Return the elements that reach into a view; below a mirror plane there is none."""
    corners = solution.sides.mesh.triangles.p[:, solution.sides.mesh.triangles.t]
    low, high = corners.min(axis=1), corners.max(axis=1)
    inside = (low[0] <= view[1]) & (high[1] >= view[2]) & (low[1] <= view[3])
    return np.flatnonzero(inside)


def _dofs(solution: FieldSolution) -> Index:
    return solution.sides.discretisation.element_dofs


def _mesh(solution: FieldSolution, seen: Index) -> Document:
    mesh = solution.sides.mesh
    used, corners = np.unique(mesh.triangles.t[:, seen].T, return_inverse=True)
    _, nodes = np.unique(_dofs(solution)[seen], return_inverse=True)
    return {
        "mirrored": mesh.section.copies == 2,
        "vertices": _packed(mesh.triangles.p[:, used].T, "<f8"),
        "corners": _packed(corners, "<u4"),
        "nodes": _packed(nodes, "<u4"),
        "region": _packed(mesh.region[seen], "<u2"),
    }


def _materials(solution: FieldSolution, largest: float) -> Document:
    """Return name and law of every region; `largest` is the |B| in T that tables reach."""
    problem = solution.sides.problem
    laws: list[MagnetisationCurve] = []
    regions = []
    for name in solution.sides.mesh.names:
        curve = problem.curve_of(name)
        if curve not in laws:
            laws.append(curve)
        regions.append(
            {
                "name": name,
                "below": name.replace("upper", "lower"),
                "law": laws.index(curve),
                "remanence": problem.remanences.get(name, 0.0),
            }
        )
    return {"regions": regions, "laws": [_law(curve, largest) for curve in laws]}


def _law(curve: MagnetisationCurve, largest: float) -> Document:
    table = field_strength_table(curve, largest)
    return {name: _packed(column, "<f8") for name, column in table._asdict().items()}


def _at_current(solution: FieldSolution, point: CurvePoint, seen: Index) -> Document:
    bounds = point.coenergy
    return {
        "current": solution.current,
        "u": _packed(nodal_u(solution)[np.unique(_dofs(solution)[seen])], "<f8"),
        "values": [
            ["flux linkage", shown(point.flux_linkage, "Wb")],
            ["apparent inductance", shown(point.apparent_inductance, "H")],
            ["incremental inductance", shown(point.incremental_inductance, "H")],
            ["co-energy", f"{shown(bounds.lower, 'J', 5)} to {shown(bounds.upper, 'J', 5)}"],
        ],
    }


def _packed(values: NDArray[Any], kind: str) -> str:
    return b64encode(np.ascontiguousarray(values, dtype=kind).tobytes()).decode("ascii")
