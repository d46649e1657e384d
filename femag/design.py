"""The design as a value: core, gaps, windings, material, drive, and what follows from them."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence
from dataclasses import asdict, dataclass, replace
from typing import Any

from femag.errors import InputError, entry_key, number
from femag.geometry import (
    Block,
    Former,
    Gap,
    Layers,
    PotCore,
    Region,
    Section,
    Winding,
    half_window_height,
    is_mirror_symmetric,
    laid_turns,
    open_section,
    polygon_area,
    pot_regions,
    upper_half,
    winding_region,
    winding_room,
)
from femag.materials import MagnetisationCurve

FAR_RADIUS = 60.0
"""Radius of the meshed space over the core's largest extent; what it cuts off is in the bounds."""


CURRENTS = (1e-12, 1e9)
"""Smallest and largest current that is solved, A."""


@dataclass(frozen=True)
class Design:
    """A gapped inductor, as it is to be signed off.

    Parameters
    ----------
    core : PotCore
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
    """

    core: PotCore
    windings: tuple[Winding, ...]
    material: MagnetisationCurve
    gaps: tuple[Gap, ...] = ()
    current: float = 1.0
    tolerance: float = 1e-3
    driven: tuple[str, ...] = ()
    title: str = ""

    def __post_init__(self) -> None:
        for name, kind in (("windings", Winding), ("gaps", Gap), ("driven", str)):
            value = getattr(self, name)
            entries = (value,) if isinstance(value, kind) else tuple(value)
            object.__setattr__(self, name, entries)
        _check_names(self.windings, self.driven)
        _check_core(self.core, self.material)
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
    core, gaps = design.core, design.gaps
    half_window = half_window_height(core, gaps)
    window = _window(core, gaps)
    regions = pot_regions(core, gaps)
    coils = tuple(
        winding_region(winding.name, _turns_block(winding, window, gaps, index), window, index)
        for index, winding in enumerate(design.windings)
    )
    _check_coils(coils)
    extent = max(core.outer_radius, half_window + core.plate_thickness)
    return open_section((*regions, *coils), FAR_RADIUS * extent)


def laid_windings(design: Design) -> dict[str, Layers]:
    """Return the layers of every winding that has a conductor, by name.

    Raises
    ------
    InputError
        If turns do not fit.
    """
    window = _window(design.core, design.gaps)
    return {
        winding.name: _laid(winding, window, design.gaps, index)
        for index, winding in enumerate(design.windings)
        if winding.conductor is not None
    }


def _window(core: PotCore, gaps: Sequence[Gap]) -> Block:
    half_window = half_window_height(core, gaps)
    return Block(core.post_radius, core.window_radius, -half_window, half_window)


def _turns_block(winding: Winding, window: Block, gaps: Sequence[Gap], index: int) -> Block:
    """Return where the turns lie: as laid, else in their block, else in the whole window."""
    if winding.conductor is None:
        return winding.block or window
    return _laid(winding, window, gaps, index).block


def _laid(winding: Winding, window: Block, gaps: Sequence[Gap], index: int) -> Layers:
    assert winding.conductor is not None
    own = entry_key("winding", index)
    try:
        room = winding.block or winding_room(winding.former or Former(), window, gaps)
        return laid_turns(winding.turns, winding.conductor, room)
    except InputError as error:
        key = f"{own}.{(error.key or 'conductor').removeprefix('winding.')}"
        raise error.changed(key=key) from error


def meshed_section(design: Design) -> Section:
    """Return the part that is meshed: the upper half when the design is symmetric."""
    section = whole_section(design)
    return upper_half(section) if is_mirror_symmetric(section) else section


def turns_per_area(design: Design) -> dict[str, float]:
    """Return the turns per area in 1/m2 of each driven winding's region."""
    driven = {f"winding {winding.name}": winding.turns for winding in design.driven_windings}
    return {
        region.name: driven[region.name] / polygon_area(region.polygon)
        for region in whole_section(design).regions
        if region.name in driven
    }


def design_hash(design: Design) -> str:
    """Return a hexadecimal digest of everything in the design that can move a result."""
    driven = tuple(winding.name for winding in design.driven_windings)
    core = replace(design.core, name="")
    content = asdict(replace(design, title="", driven=driven, core=core))
    content["material"]["kind"] = type(design.material).__name__
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
    if not isinstance(core, PotCore):
        raise InputError("not a core", key="core", value=core, accepted="a PotCore")
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


def _check_coils(coils: Sequence[Region]) -> None:
    for index, one in enumerate(coils):
        (r0, z0), _, (r1, z1), _ = one.polygon
        for other in coils[index + 1 :]:
            (s0, y0), _, (s1, y1), _ = other.polygon
            if min(r1, s1) - max(r0, s0) > 1e-9 * r1 and min(z1, y1) - max(z0, y0) > 1e-9 * r1:
                raise InputError(
                    f"overlaps {one.name}", key=other.name, accepted="blocks that do not overlap"
                )
