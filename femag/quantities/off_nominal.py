"""A design with parts off their nominal sizes, as a field problem.

One size changes, all others stay: the window's height takes from the plates, its diameter from the
ring. Turns stay where they are, except that what touches the core goes with it; they are not laid
anew in another room. Cores with straight legs keep the ratio of their published core factor to
the one that follows from their dimensions.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Any, cast

from femag.design import (
    Design,
    meshed_part,
    section_around,
    turns_per_area_of,
    winding_parts,
)
from femag.errors import InputError, entry_key
from femag.field.core_factor import core_curve
from femag.field.design_problem import curves_of_regions
from femag.field.problem import FieldProblem
from femag.geometry import (
    Core,
    Region,
    changed_gaps,
    effective_parameters,
    gap_remanences,
    half_window_height,
)
from femag.materials import MagnetisationCurve, with_permeability, with_saturation

SIZES = ("post_diameter", "window_diameter", "window_height")
SHARES = ("permeability", "saturation")
PLACES = ("coil_radial", "coil_axial")
TOUCHING = 1e-9
"""Distance over the window's radius within which a turn touches the core."""

CoreLaw = Callable[[Core, MagnetisationCurve], MagnetisationCurve]
"""The curve that fills the solved core, from the core and its material."""


@dataclass(frozen=True)
class Parameter:
    """Something in a design that a tolerance may be given for.

    Parameters
    ----------
    name : str
        ``gap`` (the first; ``gap.1`` the second), ``post_diameter``, ``window_diameter``,
        ``window_height``, ``permeability``, ``saturation``, ``coil_radial``, ``coil_axial``.
    value : float
        Nominal: m; 1 of permeability and saturation, which change by a share; 0 of the coil's
        place, which shifts.
    unit : str
        ``"m"``, or none.
    """

    name: str
    value: float
    unit: str


def parameters_of(design: Design) -> tuple[Parameter, ...]:
    """Return what can change in a design.

    A linear material has no saturation, and turns that touch the core on either side no place to
    shift along that direction.
    """
    sizes = design.core.sizes
    gaps = (
        Parameter(entry_key("gap", place), gap.length, "m") for place, gap in enumerate(design.gaps)
    )
    shares = SHARES[:1] if design.material.is_linear else SHARES
    free = (place for place in PLACES if not _touched(design, place))
    return (
        *gaps,
        *(Parameter(name, sizes[name], "m") for name in SIZES),
        *(Parameter(name, 1.0, "") for name in shares),
        *(Parameter(name, 0.0, "m") for name in free),
    )


def off_nominal_problem(
    design: Design, changes: Mapping[str, float], core_law: CoreLaw = core_curve
) -> FieldProblem:
    """Return the field problem of a design some of whose parameters are off.

    Parameters
    ----------
    design : Design
        Nominal.
    changes : mapping of str to float
        What is added to each parameter: m, or a share of permeability and saturation.
    core_law : callable
        What fills the solved core; its field solution by default.

    Raises
    ------
    InputError
        If the parts no longer fit, or the material leaves its range.
    """
    core = changed_core(design.core, changes)
    lengths = {
        place: changes.get(entry_key("gap", place), 0.0) for place in range(len(design.gaps))
    }
    heights = design.core.window_height, core.window_height
    gaps = changed_gaps(design.gaps, lengths, heights)
    parts = tuple(_moved_parts(design, core, half_window_height(core, gaps), changes))
    section = meshed_part(section_around(core, gaps, parts))
    material = core_law(core, changed_material(design.material, changes))
    return FieldProblem(
        section,
        curves_of_regions(section, core, gaps, material),
        turns_per_area_of(design, parts),
        gap_remanences(core, gaps),
    )


def changed_core(core: Core, changes: Mapping[str, float]) -> Core:
    """Return a core whose sizes are off by changes in m."""
    sizes = {name: core.sizes[name] + changes[name] for name in SIZES if changes.get(name)}
    if not sizes:
        return core
    changed = cast(Core, replace(cast(Any, core), **sizes))
    published = getattr(core, "core_factor", None)
    if published is None:
        return changed
    ratio = effective_parameters(changed).c1 / effective_parameters(core).c1
    return cast(Core, replace(cast(Any, changed), core_factor=published * ratio))


def changed_material(
    material: MagnetisationCurve, changes: Mapping[str, float]
) -> MagnetisationCurve:
    """Return a material whose permeability and saturation are off by shares."""
    for name, changed in (("permeability", with_permeability), ("saturation", with_saturation)):
        if changes.get(name):
            material = changed(material, 1.0 + changes[name])
    return material


def _moved_parts(
    design: Design, core: Core, half_window: float, changes: Mapping[str, float]
) -> Iterator[Region]:
    """Yield the turns' regions: what touches the nominal core touches the changed one."""
    for name in PLACES:
        if changes.get(name) and _touched(design, name):
            raise InputError(
                "a winding touches the core and cannot shift", key=f"tolerance.{name}",
                value=changes[name], accepted="a winding that keeps clear of the core",
            )  # fmt: skip
    radial, axial = (changes.get(name, 0.0) for name in PLACES)
    radii, heights = _walls(design.core, half_window_height(design.core, design.gaps))
    new_radii, new_heights = _walls(core, half_window)
    slack = TOUCHING * design.core.window_radius

    def place(value: float, shift: float, old: list[float], new: list[float]) -> float:
        near = [
            after for before, after in zip(old, new, strict=True) if abs(value - before) < slack
        ]
        return near[0] if near else value + shift

    for part in winding_parts(design):
        polygon = tuple(
            (place(r, radial, radii, new_radii), place(z, axial, heights, new_heights))
            for r, z in part.polygon
        )
        yield replace(part, polygon=polygon)


def _walls(core: Core, half_window: float) -> tuple[list[float], list[float]]:
    """Return the radii and the heights in m of the window's walls."""
    turned = core.turned
    radii = [turned.post_radius, core.window_radius, turned.ring_inner_radius]
    return radii, [-half_window, half_window]


def _touched(design: Design, place: str) -> bool:
    """Return whether turns touch the core in the direction of a shift."""
    axis = PLACES.index(place)
    walls = _walls(design.core, half_window_height(design.core, design.gaps))[axis]
    slack = TOUCHING * design.core.window_radius
    corners = [corner[axis] for part in winding_parts(design) for corner in part.polygon]
    return any(abs(corner - wall) < slack for corner in corners for wall in walls)
