"""The field as VTU and the mesh as MSH, for other programs."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError
from femag.export.whole_file import whole_file
from femag.field.bounds import FieldSolution
from femag.field.flux_side import turn_density
from femag.mesh import SectionMesh
from femag.quantities.nodal_field import nodal_field
from femag.result import Result
from femag.units import MU_0

if TYPE_CHECKING:
    import meshio

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def write_field(result: Result, path: str | Path) -> None:
    """Write the field of a result as VTU: complete or not there.

    Quadratic triangles that share no nodes, so that B and H are neither smoothed nor thinned out.
    Point data: ``B`` (T) of the flux side, ``H`` (A/m) of the potential side, their magnitudes
    ``B magnitude`` and ``H magnitude``, and ``flux`` (Wb) through the disc inside the point. Cell
    data: ``region``, numbered as in `write_mesh`; ``initial permeability``, relative; ``remanence``
    (T); ``current density`` (A/m2); ``local gap`` (J), the element's share in the distance of the
    co-energy's bounds. x is r and y is z; of a symmetric design the half above its mirror plane.

    Parameters
    ----------
    result : Result
        As solved; one that was read from a file holds no fields.
    path : path
        The file.

    Raises
    ------
    InputError
        If the result holds no fields, or the file cannot be written.
    """
    field = field_mesh(_solution(result))
    with whole_file(path) as temporary:
        field.write(temporary, file_format="vtu")


def write_mesh(result: Result, path: str | Path) -> None:
    """Write the mesh of a result as MSH (2.2, binary): complete or not there.

    Straight triangles in groups that are named like the regions, and edges on the walls in groups
    that are named ``far wall``, ``normal wall`` and ``tangential wall``.

    Parameters
    ----------
    result : Result
        As solved; one that was read from a file holds no mesh.
    path : path
        The file.

    Raises
    ------
    InputError
        If the result holds no mesh, or the file cannot be written.
    """
    mesh = region_mesh(_solution(result).sides.mesh)
    with whole_file(path) as temporary:
        mesh.write(temporary, file_format="gmsh22", binary=True)


def _solution(result: Result) -> FieldSolution:
    if result.solution is None:
        raise InputError(
            "holds no fields", key="result", accepted="a result of solve, not one from a file"
        )
    return result.solution


def field_mesh(solution: FieldSolution) -> meshio.Mesh:
    """Return the fields on quadratic triangles that share no nodes."""
    import meshio

    nodal, sides = nodal_field(solution), solution.sides
    b, h = (_in_space(field) for field in (nodal.flux_density, nodal.field_strength))
    cells = np.arange(len(b)).reshape(-1, 6)
    turns = turn_density(sides.problem.turns_per_area, sides.discretisation)
    cell_data = {
        "region": sides.mesh.region + 1,
        "initial permeability": sides.laws.permeability[:, 0] / MU_0,
        "remanence": sides.laws.remanence[:, 0],
        "current density": solution.current * turns[:, 0],
        "local gap": solution.local_gap,
    }
    return meshio.Mesh(
        _in_space(nodal.points),
        [("triangle6", cells)],
        point_data={
            "B": b,
            "H": h,
            "B magnitude": np.linalg.norm(b, axis=1),
            "H magnitude": np.linalg.norm(h, axis=1),
            "flux": nodal.flux.ravel(),
        },
        cell_data={name: [values] for name, values in cell_data.items()},
    )


def region_mesh(mesh: SectionMesh) -> meshio.Mesh:
    """Return the mesh with its regions and walls as named groups."""
    import meshio

    triangles = mesh.triangles
    walls = {f"{kind} wall": facets for kind, facets in mesh.walls.items() if len(facets)}
    plain = [name.replace('"', "'") for name in mesh.names]  # the format puts names in quotes
    names = {name: [number + 1, 2] for number, name in enumerate(plain)}
    first = len(names) + 1
    names |= {name: [first + number, 1] for number, name in enumerate(walls)}
    edges = np.concatenate([triangles.facets.T[facets] for facets in walls.values()])
    on_wall = np.repeat(first + np.arange(len(walls)), [len(facets) for facets in walls.values()])
    groups = [mesh.region + 1, on_wall]
    return meshio.Mesh(
        _in_space(triangles.p.T),
        [("triangle", triangles.t.T), ("line", edges)],
        cell_data={"gmsh:physical": groups, "gmsh:geometrical": groups},
        field_data={name: np.array(group) for name, group in names.items()},
    )


def _in_space(plane: Array) -> Array:
    """Return vectors (..., 2) in r, z as (n, 3) in x, y and a third component of 0."""
    flat = plane.reshape(-1, 2)
    return np.column_stack([flat, np.zeros(len(flat))])
