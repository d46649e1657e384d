"""Windings as they lie in the window: over each other, in sections, turn by turn or as blocks."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError, entry_key
from femag.geometry.conductors import current_outline
from femag.geometry.gaps import Gap
from femag.geometry.layers import (
    Former,
    Layers,
    check_fit,
    in_millimetres,
    laid_turns,
    winding_room,
)
from femag.geometry.section import Polygon, Region, rectangle
from femag.geometry.windings import Block, Winding

Array = NDArray[np.float64]
Detail = Literal["block", "turn"]

DETAILS: tuple[Detail, ...] = ("block", "turn")

ON_MIDDLE = 1e-12
"""Distance from z = 0 in m below which a corner lies on it: what rounding leaves of zero."""


@dataclass(frozen=True, eq=False)
class CoilSection:
    """Turns of a winding side by side with its other sections.

    Parameters
    ----------
    block : Block
        Least rectangle that holds the turns, m; all of the section without a conductor.
    turns : int
        How many.
    layers : Layers or None
        Where each lies; None without a conductor.
    """

    block: Block
    turns: int
    layers: Layers | None = None

    @property
    def outline(self) -> Polygon:
        """Corners (r, z) in m of what carries the turns' current when it is spread evenly."""
        if self.layers is not None:
            return self.layers.outline
        block = self.block
        return rectangle(block.inner_radius, block.outer_radius, block.bottom, block.top)


@dataclass(frozen=True, eq=False)
class Coil:
    """A winding as it lies in the window.

    Parameters
    ----------
    winding : Winding
        What was asked for.
    sections : tuple of CoilSection
        From the lowest upwards.
    """

    winding: Winding
    sections: tuple[CoilSection, ...]

    @property
    def layers(self) -> tuple[Layers, ...]:
        """Layers of each section; none without a conductor."""
        return tuple(section.layers for section in self.sections if section.layers is not None)

    @property
    def wire_length(self) -> float:
        """Length of all turns along their middle, m; leads and crossings are left out."""
        return sum(layers.wire_length for layers in self.layers)

    @property
    def mean_turn_length(self) -> float:
        """Wire length over turns, m."""
        return self.wire_length / self.winding.turns

    @property
    def fill_of_room(self) -> float:
        """Metal over the room of all sections, 1."""
        metal = sum(layers.copper_area for layers in self.layers)
        return metal / sum(layers.room.area for layers in self.layers)


def laid_coils(
    windings: Sequence[Winding], window: Block, gaps: Sequence[Gap] = ()
) -> tuple[Coil, ...]:
    """Return the windings as they lie in a window.

    Parameters
    ----------
    windings : sequence of Winding
        One with a conductor and without a block is laid over those before it that are so too,
        with the tape of its former in between; others lie in their block or in all of the window.
    window : Block
        Room between post, ring and plates, m.
    gaps : sequence of Gap
        The core's gaps, which `gap_clearance` counts from.

    Raises
    ------
    InputError
        If turns do not fit, blocks leave the window or windings overlap.
    """
    coils: list[Coil] = []
    below: tuple[float, Former] | None = None
    for index, winding in enumerate(windings):
        try:
            if winding.conductor is None or winding.block is not None:
                coils.append(_coil_in(winding, _room_of_block(winding, window)))
                continue
            room, former = _room_over(winding, window, gaps, below)
            coils.append(_coil_in(winding, room))
        except InputError as error:
            key = (error.key or "conductor").removeprefix("winding.")
            raise error.changed(key=f"{entry_key('winding', index)}.{key}") from error
        below = max(section.block.outer_radius for section in coils[-1].sections), former
    _check_overlaps(coils)
    return tuple(coils)


def turns_of_sections(turns: int, sections: int) -> tuple[int, ...]:
    """Return the turns of each section from the lowest upwards, which differ by one at most.

    Parameters
    ----------
    turns : int
        To be spread.
    sections : int
        How many there are.

    Notes
    -----
    The larger shares lie in pairs about the middle, near it first; a single one lies in the
    section in the middle. So the counts are symmetric about the middle, except for an odd number
    of turns in an even number of sections: there the last one goes below the middle.
    """
    share, larger = divmod(turns, sections)
    by_distance = sorted(range(sections), key=lambda place: (abs(2 * place + 1 - sections), place))
    first = sections % 2 if larger % 2 == 0 else 0
    extra = by_distance[first : first + larger]
    return tuple(share + (place in extra) for place in range(sections))


def coil_regions(coil: Coil, detail: Detail) -> tuple[Region, ...]:
    """Return the regions that carry the current of a coil, within the window.

    Parameters
    ----------
    coil : Coil
        As laid.
    detail : {"block", "turn"}
        Each section with its current spread evenly over its turns and their insulation, or each
        turn of a conductor by itself.
    """
    name = coil.winding.name
    if detail == "turn" and coil.layers:
        return tuple(
            _winding_part(f"winding {name}, turn {number}", name, polygon, 1)
            for number, polygon in enumerate(_turn_polygons(coil), 1)
        )
    single = len(coil.sections) == 1
    return tuple(
        _winding_part(
            f"winding {name}" if single else f"winding {name}, section {number}",
            name,
            section.outline,
            section.turns,
        )
        for number, section in enumerate(coil.sections, 1)
    )


def _winding_part(name: str, winding: str, polygon: Polygon, turns: int) -> Region:
    corners = tuple((r, 0.0 if abs(z) < ON_MIDDLE else z) for r, z in polygon)
    return Region(name, "winding", corners, parent="window", winding=winding, turns=turns)


def _turn_polygons(coil: Coil) -> list[Polygon]:
    """Return what carries the current of each turn: by sections, layers, and upwards."""
    polygons: list[Polygon] = []
    for layers in coil.layers:
        corners = layers.positions[:, None, :] + current_outline(layers.conductor)
        polygons += [tuple((r, z) for r, z in polygon) for polygon in corners.tolist()]
    return polygons


def _coil_in(winding: Winding, room: Block) -> Coil:
    """Return a winding in its room, divided into sections."""
    turns = turns_of_sections(int(winding.turns), int(winding.sections))
    chambers = _chambers(winding, room)
    if winding.conductor is None:
        parts = zip(chambers, turns, strict=True)
        return Coil(winding, tuple(CoilSection(chamber, count) for chamber, count in parts))
    depth, height = room.outer_radius - room.inner_radius, chambers[0].top - chambers[0].bottom
    check_fit(int(winding.turns), winding.conductor, depth, height, len(chambers))
    laid = [
        laid_turns(count, winding.conductor, chamber)
        for count, chamber in zip(turns, chambers, strict=True)
    ]
    return Coil(winding, tuple(CoilSection(layers.block, layers.turns, layers) for layers in laid))


def _chambers(winding: Winding, room: Block) -> tuple[Block, ...]:
    """Return the rooms of a winding's sections, from the lowest upwards."""
    sections, divider = int(winding.sections), winding.divider
    if sections == 1:
        return (room,)
    height = (room.top - room.bottom - (sections - 1) * divider) / sections
    if not height > 0.0:
        missing = in_millimetres(-sections * height)
        raise InputError(
            f"the dividers leave no room axially: more than {missing} missing",
            key="winding.divider",
            value=divider,
            accepted="dividers that fit in the room of the winding",
        )
    middle = 0.5 * (room.bottom + room.top)
    places = middle + (np.arange(sections) - 0.5 * (sections - 1)) * (height + divider)
    edges = np.column_stack([places - 0.5 * height, places + 0.5 * height])
    edges[0, 0], edges[-1, 1] = room.bottom, room.top
    return tuple(replace(room, bottom=low, top=high) for low, high in edges.tolist())


def _room_over(
    winding: Winding, window: Block, gaps: Sequence[Gap], below: tuple[float, Former] | None
) -> tuple[Block, Former]:
    """Return the room over the windings laid before, of an outer radius and a former."""
    if below is None:
        former = winding.former or Former()
        if former.tape > 0.0:
            raise InputError(
                "no winding lies below this one", key="winding.former.tape", value=former.tape,
                accepted="tape from the second winding that is laid on the former",
            )  # fmt: skip
        return winding_room(former, window, gaps), former
    outer_radius, former_below = below
    former = winding.former or replace(former_below, tape=0.0)
    room = winding_room(former, window, gaps)
    inner = max(room.inner_radius, outer_radius + former.tape)
    if not inner < room.outer_radius:
        assert winding.conductor is not None
        height = min(chamber.top - chamber.bottom for chamber in _chambers(winding, room))
        depth = room.outer_radius - inner
        check_fit(int(winding.turns), winding.conductor, depth, height, int(winding.sections))
    return replace(room, inner_radius=inner), former


def _room_of_block(winding: Winding, window: Block) -> Block:
    """Return a winding's block, held against the window; the window without a block."""
    block = winding.block
    if block is None:
        return window
    slack = 1e-9 * window.outer_radius
    for side, sign, limit_name in (
        ("inner_radius", 1, "the post"),
        ("outer_radius", -1, "the ring"),
        ("bottom", 1, "the lower plate"),
        ("top", -1, "the upper plate"),
    ):
        value, limit = getattr(block, side), getattr(window, side)
        if sign * (value - limit) < -slack:
            raise InputError(
                f"the winding reaches into {limit_name}",
                key=f"winding.block.{side}",
                value=value,
                accepted=f"{'at least' if sign > 0 else 'at most'} {limit * 1e3:g} mm",
            )
    return block


def _check_overlaps(coils: Sequence[Coil]) -> None:
    for index, one in enumerate(coils):
        for other in coils[index + 1 :]:
            if any(_overlap(a.block, b.block) for a in one.sections for b in other.sections):
                raise InputError(
                    f"overlaps winding {one.winding.name}",
                    key=f"winding {other.winding.name}",
                    accepted="blocks that do not overlap",
                )


def _overlap(one: Block, other: Block) -> bool:
    slack = 1e-9 * one.outer_radius
    radial = min(one.outer_radius, other.outer_radius) - max(one.inner_radius, other.inner_radius)
    axial = min(one.top, other.top) - max(one.bottom, other.bottom)
    return radial > slack and axial > slack
