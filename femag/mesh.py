"""Meshes of a section: the one module that touches gmsh.

Straight-sided triangles, so that polygonal sections are represented exactly. The gmsh model is
global: one meshing at a time in a process, other threads wait.
"""

from __future__ import annotations

import ctypes
import signal
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field, replace
from threading import Lock
from types import ModuleType
from typing import Any

import numpy as np
from numpy.typing import NDArray
from skfem import MeshTri

from femag.errors import InputError, MissingLibraryError, NumericalError
from femag.geometry import (
    SURROUNDINGS,
    Section,
    parts_extent,
    region_areas,
    scaled_section,
    singular_corners,
)

Array = NDArray[np.float64]
Index = NDArray[np.int64]

COARSENESS = 1.1
"""Element size at a corner over the room around it."""
FINENESS = 8e-3
"""Smallest element size along thin parts over the extent; their triangles are long then."""
THINNEST = 1e-5
"""Smallest width of a part over the extent."""
CORNER_ROUNDS = 2
"""How often elements at singular corners are divided before the first solution."""
GROWTH = 0.5
"""Largest element size over the distance from the middle plus the extent of the parts."""


_ONE_AT_A_TIME = Lock()


@dataclass(frozen=True)
class SectionMesh:
    """A triangle mesh that knows its regions and walls.

    Parameters
    ----------
    section : Section
        What was meshed.
    triangles : MeshTri
        The mesh, r and z in m.
    region : int array, (elements,)
        Index into `names`.
    names : tuple of str
        Region names; the surroundings come first.
    """

    section: Section
    triangles: MeshTri
    region: Index
    names: tuple[str, ...]
    walls: dict[str, Index] = field(default_factory=dict, repr=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "walls", _wall_facets(self.section, self.triangles))

    def __repr__(self) -> str:
        areas = region_areas(self.section)
        lines = [f"SectionMesh, {self.triangles.nelements} triangles"]
        for index, name in enumerate(self.names):
            count = np.count_nonzero(self.region == index)
            lines.append(f"  {name:<20} {areas[name] * 1e6:12.4f} mm2 {count:7d} triangles")
        return "\n".join(lines)

    def elements_of(self, name: str) -> Index:
        """Return the elements of a region."""
        return np.flatnonzero(self.region == self.names.index(name))


def coarse_mesh(section: Section, corner_rounds: int = CORNER_ROUNDS) -> SectionMesh:
    """Return a mesh that resolves every region with few elements, finer at singular corners.

    Parameters
    ----------
    section : Section
        What is meshed.
    corner_rounds : int
        How often elements at singular corners are divided.

    Raises
    ------
    InputError
        If regions overlap.
    NumericalError
        If the meshed areas differ from those of the polygons.
    MissingLibraryError
        If gmsh or a system library that it needs is missing.
    """
    _check_thickness(section)
    unit = 2.0 ** np.ceil(np.log2(parts_extent(section)))  # gmsh's tolerances are absolute
    points, corners, region = _drawn_mesh(scaled_section(section, 1.0 / unit))
    triangles = MeshTri(points * unit, corners)
    singular = singular_corners(section)
    for _ in range(corner_rounds):
        triangles, region = _divided(triangles, _touching(triangles, singular), region)
    names = (SURROUNDINGS, *(part.name for part in section.regions))
    mesh = SectionMesh(section, triangles, region, names)
    _check_areas(mesh)
    return mesh


def _drawn_mesh(section: Section) -> tuple[Array, Index, Index]:
    """Return points (2, n), triangles (3, m) and the region of each triangle, from gmsh."""
    with _gmsh_session() as gmsh:
        try:
            surfaces = _build_surfaces(gmsh, section)
            _set_corner_sizes(gmsh, section)
            _limit_growth(gmsh, section)
            gmsh.model.mesh.generate(2)
            return _read_triangles(gmsh, surfaces)
        except InputError:
            raise
        except Exception as error:  # gmsh raises bare exceptions
            raise NumericalError(f"gmsh cannot mesh this section ({error})") from error


def refined_mesh(mesh: SectionMesh, marked: Index) -> tuple[SectionMesh, Index]:
    """Return the mesh with the marked elements divided, and the parent of each new element.

    The new mesh is conforming and nested in the old one.
    """
    triangles, parent = _divided(mesh.triangles, marked, np.arange(mesh.triangles.nelements))
    return SectionMesh(mesh.section, triangles, mesh.region[parent], mesh.names), parent


def uniformly_refined_mesh(mesh: SectionMesh) -> SectionMesh:
    """Return the mesh with every triangle divided into four."""
    triangles = mesh.triangles.refined(1)
    return SectionMesh(mesh.section, triangles, np.tile(mesh.region, 4), mesh.names)


def moved_mesh(mesh: SectionMesh, section: Section, points: Array) -> SectionMesh:
    """Return the mesh with its nodes at other places (2, n) in m, now a mesh of `section`.

    Raises
    ------
    NumericalError
        If the areas of its regions are not those of the section.
    """
    moved = SectionMesh(section, MeshTri(points, mesh.triangles.t), mesh.region, mesh.names)
    _check_areas(moved)
    return moved


def _divided(triangles: MeshTri, marked: Index, number: Index) -> tuple[MeshTri, Index]:
    """Return the mesh with marked elements divided, and the numbers that children inherit.

    scikit-fem carries subdomains through the division, so that a number travels as one subdomain
    for each of its binary digits.
    """
    digits = range(int(number.max()).bit_length())
    tags = {str(digit): np.flatnonzero(number >> digit & 1) for digit in digits}
    divided = triangles.with_subdomains(tags).refined(marked)
    inherited = np.zeros(divided.nelements, dtype=np.int64)
    for digit in digits:
        inherited[divided.subdomains[str(digit)]] += 1 << digit
    return replace(divided, _subdomains=None), inherited


def _touching(triangles: MeshTri, points: Array) -> Index:
    """Return the elements that have one of the points (n, 2) as a corner."""
    offset = np.abs(triangles.p.T[:, None, :] - points[None]).max(axis=2)
    near = np.any(offset < 1e-9 * np.ptp(triangles.p), axis=1)
    return np.flatnonzero(near[triangles.t].any(axis=0))


@contextmanager
def _gmsh_session() -> Iterator[ModuleType]:
    try:
        import gmsh
    except (ImportError, OSError) as error:
        raise MissingLibraryError(
            f"gmsh does not load ({error}); on Debian or Ubuntu install libgl1 libglu1-mesa "
            "libxcursor1 libxft2 libxinerama1 libgomp1"
        ) from error
    with _ONE_AT_A_TIME:
        yield from _initialised(gmsh)


def _initialised(gmsh: ModuleType) -> Iterator[ModuleType]:
    with _broken_pipes_as_before():
        gmsh.initialize(interruptible=False, readConfigFiles=False)
    try:
        for name, value in (
            ("General.Terminal", 0),
            ("General.NumThreads", 1),
            ("Mesh.Algorithm", 6),
            ("Mesh.MeshSizeExtendFromBoundary", 1),
            ("Mesh.LcIntegrationPrecision", 1e-3),
            ("Mesh.Smoothing", 0),
            ("Mesh.RandomSeed", 1),
        ):
            gmsh.option.setNumber(name, value)
        yield gmsh
    finally:
        gmsh.finalize()


@contextmanager
def _broken_pipes_as_before() -> Iterator[None]:
    """Undo what gmsh does to SIGPIPE: a write to a pipe or socket that is closed would be deadly.

    Python's own `signal` would not do: it sees no changes by others and needs the main thread.
    """
    if not hasattr(signal, "SIGPIPE"):
        yield
        return
    get, put = ctypes.pythonapi.PyOS_getsig, ctypes.pythonapi.PyOS_setsig
    get.restype = put.restype = ctypes.c_void_p
    put.argtypes = (ctypes.c_int, ctypes.c_void_p)
    before = get(signal.SIGPIPE)
    try:
        yield
    finally:
        put(signal.SIGPIPE, before)


def _build_surfaces(gmsh: Any, section: Section) -> dict[int, int]:
    """Return the region index of every surface after fragmenting the polygons."""
    polygons = (section.domain, *(region.polygon for region in section.regions))
    extent = np.ptp(np.asarray(section.domain), axis=0).max()
    gmsh.option.setNumber("Geometry.Tolerance", 1e-9 * extent)
    inputs = [(2, _plane_surface(gmsh, polygon)) for polygon in polygons]
    _, out_map = gmsh.model.occ.fragment(inputs[:1], inputs[1:])
    gmsh.model.occ.synchronize()
    members: dict[int, list[int]] = {}
    for index, pieces in enumerate(out_map):
        for _, tag in pieces:
            members.setdefault(tag, []).append(index)
    return {tag: _innermost(section, indices) for tag, indices in members.items()}


def _plane_surface(gmsh: Any, polygon: tuple[tuple[float, float], ...]) -> int:
    occ = gmsh.model.occ
    corners = [occ.addPoint(r, z, 0.0) for r, z in polygon]
    lines = [occ.addLine(a, b) for a, b in zip(corners, corners[1:] + corners[:1], strict=True)]
    return int(occ.addPlaneSurface([occ.addCurveLoop(lines)]))


def _innermost(section: Section, indices: list[int]) -> int:
    """Return the region of a surface that lies in all polygons `indices` (0: the domain)."""
    names = [SURROUNDINGS, *(region.name for region in section.regions)]
    parents = {region.name: region.parent for region in section.regions}
    chain = {names[index] for index in indices}
    for index in indices:
        lineage, name = {names[index]}, names[index]
        while name in parents:
            name = parents[name]
            lineage.add(name)
        if lineage == chain:
            return index
    pair = sorted(chain - {SURROUNDINGS})
    raise InputError(f"{' and '.join(pair)} overlap", accepted="parts that do not overlap")


def _set_corner_sizes(gmsh: Any, section: Section) -> None:
    points = np.unique(_corners(section), axis=0)
    sizes = _corner_sizes(section, points)
    for dimension, tag in gmsh.model.getEntities(0):
        r, z, _ = gmsh.model.getValue(dimension, tag, [])
        nearest = np.argmin(np.hypot(*(points - (r, z)).T))
        gmsh.model.mesh.setSize([(dimension, tag)], sizes[nearest])


def _limit_growth(gmsh: Any, section: Section) -> None:
    """Let elements grow with the distance from the middle, so that the far field has no slivers."""
    field = gmsh.model.mesh.field.add("MathEval")
    size = f"{GROWTH} * (Sqrt(x * x + y * y) + {parts_extent(section)})"
    gmsh.model.mesh.field.setString(field, "F", size)
    gmsh.model.mesh.field.setAsBackgroundMesh(field)


def _corners(section: Section) -> Array:
    return np.vstack([section.domain, *(region.polygon for region in section.regions)])


def _corner_sizes(section: Section, points: Array) -> Array:
    """Return an element size for each corner: a share of the room around it."""
    start = _corners(section)
    polygons = (section.domain, *(region.polygon for region in section.regions))
    end = np.vstack([np.roll(polygon, -1, axis=0) for polygon in polygons])
    room = COARSENESS * _room_around(points, start, end)
    return np.maximum(room, FINENESS * parts_extent(section))


def _room_around(points: Array, start: Array, end: Array) -> Array:
    """Return the distance of each point to the nearest segment that does not hold it."""
    distance = _distances(points, start, end)
    distance[distance < 1e-9 * np.ptp(start)] = np.inf
    return np.asarray(distance.min(axis=1))


def _check_thickness(section: Section) -> None:
    """Refuse parts so thin that coordinates do not resolve them."""
    least = THINNEST * parts_extent(section)
    for region in section.regions:
        polygon = np.asarray(region.polygon)
        room = _distances(polygon, polygon, np.roll(polygon, -1, axis=0))
        for corner in range(len(polygon)):
            room[corner, [corner, corner - 1]] = np.inf
        if room.min() < least:
            raise InputError(
                "too thin to be meshed",
                key=region.name,
                value=f"{1e3 * room.min():.3g} mm",
                accepted=f"at least {1e3 * least:.3g} mm, or none at all",
            )


def _distances(points: Array, start: Array, end: Array) -> Array:
    """Return the distances (points, segments) of points to segments."""
    along = end - start
    offset = points[:, None, :] - start[None]
    share = np.clip(np.sum(offset * along, axis=2) / np.sum(along**2, axis=1), 0.0, 1.0)
    return np.asarray(np.linalg.norm(offset - share[..., None] * along, axis=2))


def _read_triangles(gmsh: Any, surfaces: dict[int, int]) -> tuple[Array, Index, Index]:
    tags, coordinates, _ = gmsh.model.mesh.getNodes()
    place = np.zeros(int(tags.max()) + 1, dtype=np.int64)
    place[tags] = np.arange(len(tags))
    blocks, region = [], []
    for tag, index in sorted(surfaces.items()):
        _, _, nodes = gmsh.model.mesh.getElements(2, tag)
        corners = place[nodes[0]].reshape(-1, 3)
        blocks.append(corners)
        region.append(np.full(len(corners), index))
    triangles = np.vstack(blocks)
    used, compact = np.unique(triangles, return_inverse=True)
    points = coordinates.reshape(-1, 3)[used, :2]
    points[np.abs(points) < 1e-12 * np.abs(points).max()] = 0.0
    return (
        np.ascontiguousarray(points.T),
        np.ascontiguousarray(compact.reshape(-1, 3).T),
        np.concatenate(region),
    )


def _check_areas(mesh: SectionMesh) -> None:
    corners = mesh.triangles.p[:, mesh.triangles.t]
    (r1, z1), (r2, z2) = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    meshed = np.bincount(
        mesh.region, weights=np.abs(r1 * z2 - r2 * z1) / 2, minlength=len(mesh.names)
    )
    wanted = np.array([region_areas(mesh.section)[name] for name in mesh.names])
    excess = np.abs(meshed - wanted) - 1e-9 * wanted - 1e-14 * wanted.sum()
    worst = int(np.argmax(excess))
    if excess[worst] > 0.0:
        raise NumericalError(
            f"the mesh of {mesh.names[worst]} has {meshed[worst]:.6e} m2 instead of "
            f"{wanted[worst]:.6e} m2"
        )


def _wall_facets(section: Section, triangles: MeshTri) -> dict[str, Index]:
    """Return the boundary facets of each wall kind; every facet off the axis needs a wall."""
    facets = triangles.boundary_facets()
    middle = triangles.p[:, triangles.facets[:, facets]].mean(axis=1).T
    extent = np.ptp(np.asarray(section.domain), axis=0).max()
    start = np.array([wall.start for wall in section.walls])
    end = np.array([wall.end for wall in section.walls])
    distance = _distances(middle, start, end)
    nearest = distance.argmin(axis=1)
    on_wall = distance.min(axis=1) < 1e-9 * extent
    on_axis = np.abs(middle[:, 0]) < 1e-9 * extent
    if not np.all(on_wall | on_axis):
        raise InputError("the domain's outline is not covered by its walls", key="walls")
    kinds = np.array([wall.kind for wall in section.walls])[nearest]
    return {kind: facets[on_wall & (kinds == kind)] for kind in ("far", "normal", "tangential")}
