"""The design as a value: core, gaps, windings, material, drive, and what follows from them."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence
from dataclasses import asdict, dataclass, field, replace
from typing import Any

from femag.errors import InputError, number
from femag.geometry import (
    DETAILS,
    Block,
    Coil,
    Core,
    Detail,
    Gap,
    Region,
    Section,
    Winding,
    coil_regions,
    core_regions,
    half_window_height,
    is_mirror_symmetric,
    laid_coils,
    open_section,
    polygon_area,
    upper_half,
)
from femag.materials import MagnetisationCurve
from femag.part_tolerances import PartTolerances
from femag.requirements import Requirements
from femag.ripple import Ripple

FAR_RADIUS = 60.0
"""Radius of the meshed space over the core's largest extent; what it cuts off is in the bounds."""


MOST_SINGLE_TURNS = 200
"""Turns of all conductors up to which the field takes each by itself."""

CURRENTS = (1e-12, 1e9)
"""Smallest and largest current that is solved, A."""


@dataclass(frozen=True)
class Design:
    """A gapped inductor, as it is to be signed off.

    Parameters
    ----------
    core : Core
        The core.
    windings : tuple of Winding
        At least one.
    material : MagnetisationCurve
        What the core is made of.
    gaps : tuple of Gap
        Air gaps; none for an ungapped core.
    current : float
        Peak current of the driven windings, A.
    tolerance : float
        Wanted half width between the bounds over the value.
    driven : tuple of str
        Names of the windings that carry the current, in series; the first winding when empty.
    title : str
        For print.
    detail : {"block", "turn"}
        How the field sees windings that have a conductor: as blocks of uniform current, or turn by
        turn.
    requirements : Requirements
        Limits that the design has to keep; none unless given.
    ripple : Ripple, optional
        What of the current alternates; its highest current is `current`.
    part_tolerances : PartTolerances, optional
        Of the parts, for the tolerance budget; they move no result.
    """

    core: Core
    windings: tuple[Winding, ...]
    material: MagnetisationCurve
    gaps: tuple[Gap, ...] = ()
    current: float = 1.0
    tolerance: float = 1e-3
    driven: tuple[str, ...] = ()
    title: str = ""
    detail: Detail = "block"
    requirements: Requirements = field(default_factory=Requirements)
    ripple: Ripple | None = None
    part_tolerances: PartTolerances | None = None

    def __post_init__(self) -> None:
        for name, kind in (("windings", Winding), ("gaps", Gap), ("driven", str)):
            value = getattr(self, name)
            entries = (value,) if isinstance(value, kind) else tuple(value)
            object.__setattr__(self, name, entries)
        _check_names(self.windings, self.driven)
        _check_detail(self.detail, self.windings)
        _check_core(self.core, self.material)
        if not isinstance(self.requirements, Requirements):
            raise InputError(
                "not requirements", key="require", value=self.requirements,
                accepted="Requirements(inductance_least=380e-6)",
            )  # fmt: skip
        if not isinstance(self.title, str) or not self.title.isprintable():
            raise InputError(
                "not printable", key="title", value=self.title,
                accepted="one line of printable text",
            )  # fmt: skip
        accepted = "a number from 1e-6 to below 1, such as 1e-3"
        if not 1e-6 <= number(self.tolerance, "solve.tolerance", accepted) < 1.0:
            raise InputError(
                "tolerance out of range",
                key="solve.tolerance",
                value=self.tolerance,
                accepted=accepted,
            )
        accepted = f"{CURRENTS[0]:g} A to {CURRENTS[1]:g} A, of either sign"
        if not CURRENTS[0] <= abs(number(self.current, "drive.current", accepted)) <= CURRENTS[1]:
            raise InputError(
                "a drive current is needed",
                key="drive.current",
                value=self.current,
                accepted=accepted,
            )
        whole_section(self)

    @property
    def driven_windings(self) -> tuple[Winding, ...]:
        """The windings that carry the current."""
        names = self.driven or (self.windings[0].name,)
        return tuple(winding for winding in self.windings if winding.name in names)

    @property
    def turns(self) -> int:
        """Turns that carry the current, summed."""
        return sum(winding.turns for winding in self.driven_windings)


def whole_section(design: Design) -> Section:
    """Return the full section in open space.

    Raises
    ------
    InputError
        If the parts do not fit.
    """
    coils = winding_parts(design)
    _check_part_names(coils)
    return section_around(design.core, design.gaps, coils)


def section_around(core: Core, gaps: Sequence[Gap], parts: Sequence[Region]) -> Section:
    """Return the full section of a core with the parts of its windings, in open space."""
    half_window = half_window_height(core, gaps)
    extent = max(core.turned.ring_outer_radius, half_window + core.turned.largest_thickness)
    return open_section((*core_regions(core, gaps), *parts), FAR_RADIUS * extent)


def winding_parts(design: Design) -> tuple[Region, ...]:
    """Return the regions that carry the turns of all windings."""
    return tuple(part for coil in wound_coils(design) for part in coil_regions(coil, design.detail))


def wound_coils(design: Design) -> tuple[Coil, ...]:
    """Return every winding as it lies in the window.

    Raises
    ------
    InputError
        If turns do not fit or windings overlap.
    """
    return laid_coils(design.windings, _window(design.core, design.gaps), design.gaps)


def _window(core: Core, gaps: Sequence[Gap]) -> Block:
    half_window = half_window_height(core, gaps)
    return Block(core.turned.post_radius, core.window_radius, -half_window, half_window)


def meshed_section(design: Design) -> Section:
    """Return the part that is meshed: the upper half when the design is symmetric."""
    return meshed_part(whole_section(design))


def meshed_part(section: Section) -> Section:
    """Return the upper half of a symmetric section, and any other as it is."""
    return upper_half(section) if is_mirror_symmetric(section) else section


def turns_per_area(design: Design) -> dict[str, float]:
    """Return the turns per area in 1/m2 of each region of the driven windings.

    A region that the mirror plane cuts keeps its own.
    """
    return turns_per_area_of(design, winding_parts(design))


def turns_per_area_of(design: Design, parts: Sequence[Region]) -> dict[str, float]:
    """Return the turns per area in 1/m2 of those parts that belong to driven windings."""
    driven = {winding.name for winding in design.driven_windings}
    return {
        part.name: part.turns / polygon_area(part.polygon)
        for part in parts
        if part.winding in driven
    }


def design_hash(design: Design) -> str:
    """Return a hexadecimal digest of everything in the design that can move a result."""
    driven = tuple(winding.name for winding in design.driven_windings)
    wound = any(winding.conductor is not None for winding in design.windings)
    detail: Detail = design.detail if wound else "block"
    content = asdict(replace(design, title="", driven=driven, detail=detail))
    content.pop("requirements")
    del content["part_tolerances"]
    content["core"] |= {"name": "", "kind": type(design.core).__name__}
    content["material"]["kind"] = type(design.material).__name__
    material = content["material"]
    while "of" in material:
        material = material["of"]
    loss = material.pop("loss", None)
    if design.ripple is None:  # then neither it nor the loss moves anything
        del content["ripple"]
    elif loss is not None:
        content["loss"] = loss | {"source": ""}
    for text in ("name", "source", "notes"):
        content["material"].pop(text, None)
    text = json.dumps(_with_floats(content), sort_keys=True)
    return hashlib.sha256(text.encode()).hexdigest()


def _with_floats(content: Any) -> Any:
    """Return nested content with every number as a float, so that 2000 and 2000.0 are equal."""
    if isinstance(content, dict):
        return {key: _with_floats(value) for key, value in content.items()}
    if isinstance(content, list | tuple):
        return [_with_floats(value) for value in content]
    return content if content is None or isinstance(content, str) else float(content)


def _check_core(core: object, material: object) -> None:
    if not hasattr(core, "turned"):
        raise InputError("not a core", key="core", value=core, accepted="a core, such as PotCore")
    if not hasattr(material, "coenergy_density"):
        raise InputError(
            "not a material", key="core.material", value=material,
            accepted="a magnetisation curve, such as LinearCurve(2000)",
        )  # fmt: skip


def _check_names(windings: Sequence[Winding], driven: Sequence[str]) -> None:
    if not windings:
        raise InputError("no winding", key="winding", accepted="at least one winding")
    names = [winding.name for winding in windings]
    for name in names:
        if names.count(name) > 1:
            raise InputError(
                "two windings have one name", key="winding.name", value=name,
                accepted="names that differ",
            )  # fmt: skip
    for name in driven:
        if driven.count(name) > 1:
            raise InputError(
                "a winding is named twice", key="drive.winding", value=name,
                accepted="each winding once",
            )  # fmt: skip
        if name not in names:
            raise InputError(
                "no winding has this name",
                key="drive.winding",
                value=name,
                accepted=", ".join(names),
            )


def _check_detail(detail: Detail, windings: Sequence[Winding]) -> None:
    if detail not in DETAILS:
        raise InputError(
            "not a level of detail", key="solve.detail", value=detail,
            accepted=" or ".join(map(repr, DETAILS)),
        )  # fmt: skip
    turns = sum(winding.turns for winding in windings if winding.conductor is not None)
    if detail == "turn" and turns > MOST_SINGLE_TURNS:
        raise InputError(
            f"{turns} turns of conductors are too many to be meshed one by one",
            key="solve.detail", value=detail,
            accepted=f"'block', or 'turn' with at most {MOST_SINGLE_TURNS} turns",
        )  # fmt: skip


def _check_part_names(parts: Sequence[Region]) -> None:
    """Refuse a winding that is named like a part of another."""
    names = [part.name for part in parts]
    for part in parts:
        if names.count(part.name) > 1:
            raise InputError(
                f"a part of another winding is called {part.name!r} too", key="winding.name",
                value=part.winding, accepted="another name",
            )  # fmt: skip
