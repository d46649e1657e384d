"""Turns laid in layers on a former: does it fit, where the turns lie, how long the wire is.

The turns are rings: neither the pitch of the helix nor the step from layer to layer takes room.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from femag.errors import InputError, number
from femag.geometry.conductors import Conductor, Metal, as_laid, resistivity
from femag.geometry.gaps import Gap, gap_length
from femag.geometry.section import Polygon, rectangle
from femag.geometry.windings import Block, Winding

Array = NDArray[np.float64]

SLACK = 1e-10
"""Share of the room by which turns may exceed it, for rounding."""

SHOWN = 1e-7
"""Step in m to which a missing length is rounded up for print."""


@dataclass(frozen=True)
class Former:
    """What keeps the conductors away from the core and from each other, all in m.

    Parameters
    ----------
    wall : float
        Thickness of the tube round the post.
    flange : float
        Thickness of each flange.
    post_clearance : float
        Between post and tube.
    plate_clearance : float
        Between each plate and its flange.
    ring_clearance : float
        Between the outermost conductor and the ring.
    gap_clearance : float
        Least distance between conductors and a leg that has an air gap, measured along r.
    tape : float
        Insulation between the winding and the one that it is laid over.
    """

    wall: float = 0.0
    flange: float = 0.0
    post_clearance: float = 0.0
    plate_clearance: float = 0.0
    ring_clearance: float = 0.0
    gap_clearance: float = 0.0
    tape: float = 0.0

    def __post_init__(self) -> None:
        accepted = "a length of 0 or more"
        for field in fields(self):
            key, value = f"former.{field.name}", getattr(self, field.name)
            if not 0.0 <= number(value, key, accepted) < np.inf:
                raise InputError("out of range", key=key, value=value, accepted=accepted)


@dataclass(frozen=True, eq=False)
class Layers:
    """Turns in layers that grow outwards.

    Parameters
    ----------
    conductor : RoundWire, LitzWire or Foil
        As laid: foil has its width.
    room : Block
        What was there to fill.
    block : Block
        The least rectangle that holds the turns with their insulation.
    turns_in_layers : tuple of int
        Turns of each layer from inside; all but the last are full.
    positions : array, (turns, 2)
        Centres (r, z) of the turns in m: by layers, and upwards in each.
    """

    conductor: Conductor
    room: Block
    block: Block
    turns_in_layers: tuple[int, ...]
    positions: Array

    @property
    def turns(self) -> int:
        """Number of turns."""
        return len(self.positions)

    @property
    def outline(self) -> Polygon:
        """Corners (r, z) in m of what all turns with their insulation cover together.

        It is the block, less what the last layer leaves free at both ends of it: the same room for
        each turn, so that a uniform current in it is that of the turns, spread evenly.
        """
        block, last = self.block, self.turns_in_layers[-1]
        if last == self.turns_in_layers[0]:
            return rectangle(block.inner_radius, block.outer_radius, block.bottom, block.top)
        step = block.inner_radius + (len(self.turns_in_layers) - 1) * self.conductor.radial_size
        middle, half = _middle(block), 0.5 * last * self.conductor.axial_size
        upper = (
            (block.outer_radius, middle + half), (step, middle + half),
            (step, block.top), (block.inner_radius, block.top),
        )  # fmt: skip
        lower = (
            (block.inner_radius, block.bottom), (step, block.bottom),
            (step, middle - half), (block.outer_radius, middle - half),
        )  # fmt: skip
        return (*lower, *upper)

    @property
    def copper_area(self) -> float:
        """Area of the metal of all turns, m2."""
        return self.turns * self.conductor.copper_area

    @property
    def fill_of_block(self) -> float:
        """Metal over the block, 1."""
        return self.copper_area / self.block.area

    @property
    def fill_of_room(self) -> float:
        """Metal over the room, 1."""
        return self.copper_area / self.room.area

    @property
    def wire_length(self) -> float:
        """Length of all turns along their middle, m; leads are left out."""
        return float(2 * np.pi * self.positions[:, 0].sum())

    @property
    def mean_turn_length(self) -> float:
        """Wire length over turns, m."""
        return self.wire_length / self.turns

    def __repr__(self) -> str:
        return (
            f"Layers of {self.turns} turns in {len(self.turns_in_layers)} layers, fill of the "
            f"room {self.fill_of_room:.3f}, mean turn length {self.mean_turn_length * 1e3:.4g} mm"
        )


def winding_room(former: Former, window: Block, gaps: Sequence[Gap] = ()) -> Block:
    """Return the room in m that former and clearances leave of a window.

    Parameters
    ----------
    former : Former
        Former and clearances.
    window : Block
        Room between post, ring and plates.
    gaps : sequence of Gap
        The core's gaps: `gap_clearance` counts from the post with any gap, and from the ring too
        with a spacer in all legs.

    Raises
    ------
    InputError
        If nothing is left; the message has the missing space.
    """
    near_post = former.post_clearance + former.wall
    near_ring = former.ring_clearance
    if gaps:
        near_post = max(near_post, former.gap_clearance)
    if gap_length(gaps, "all") > 0.0:
        near_ring = max(near_ring, former.gap_clearance)
    inner, outer = window.inner_radius + near_post, window.outer_radius - near_ring
    margin = former.plate_clearance + former.flange
    bottom, top = window.bottom + margin, window.top - margin
    for low, high, way in ((inner, outer, "radially"), (bottom, top, "axially")):
        if not low < high:
            raise InputError(
                f"the former leaves no room {way}: more than {in_millimetres(low - high)} missing",
                key="former",
                accepted="a former and clearances that fit in the window",
            )
    return Block(inner, outer, bottom, top)


def missing_room(
    turns: int, conductor: Conductor, depth: float, height: float
) -> tuple[float, float]:
    """Return by how much a room is too small along r and along z in m; (0, 0) if all fits.

    Parameters
    ----------
    turns : int
        Number of turns.
    conductor : RoundWire, LitzWire or Foil
        What they are laid with.
    depth, height : float
        Of the room along r and z, m; a depth below 0 is that much too little.

    Raises
    ------
    InputError
        If `conductor` is none.

    Notes
    -----
    With both lengths added to the room the turns fit, and with any less they do not. Along z no
    more is asked for than one turn takes; what is missing along r is at the height that results.
    """
    conductor = as_laid(conductor, height)
    layers = math.ceil(turns / max(1, _fitting(height, conductor.axial_size)))
    radial = layers * conductor.radial_size - depth
    axial = conductor.axial_size - height
    return (
        radial if radial > SLACK * depth else 0.0,
        axial if axial > SLACK * height else 0.0,
    )


def check_fit(
    turns: int, conductor: Conductor, depth: float, height: float, sections: int = 1
) -> None:
    """Refuse turns for which there is too little room.

    Parameters
    ----------
    turns : int
        Number of turns.
    conductor : RoundWire, LitzWire or Foil
        What they are laid with.
    depth, height : float
        Of the room of each section along r and z, m; a depth below 0 is that much too little.
    sections : int
        Number of equal rooms that the turns are spread over as evenly as may be.

    Raises
    ------
    InputError
        If they do not fit: the message has the missing space of a section along r or z, and how
        many turns would fit.
    """
    radial, axial = missing_room(math.ceil(turns / sections), conductor, depth, height)
    if not (radial or axial):
        return
    laid = as_laid(conductor, height)
    room_for = _fitting(height, laid.axial_size) * _fitting(max(depth, 0.0), laid.radial_size)
    wide = f"one turn is too wide for the height by {in_millimetres(axial)}" if axial else ""
    thick = f"layers too thick by {in_millimetres(radial)}" if radial else ""
    where = " in their sections" if sections > 1 else ""
    raise InputError(
        f"the turns do not fit{where}: {' and '.join(part for part in (wide, thick) if part)}",
        key="winding.turns",
        value=turns,
        accepted=f"at most {sections * room_for} in this room" if room_for else "none in this room",
    )


def laid_turns(turns: int, conductor: Conductor, room: Block) -> Layers:
    """Return turns laid in layers, in square (in line) order, from the inside of the room outwards.

    Parameters
    ----------
    turns : int
        Number of turns.
    conductor : RoundWire, LitzWire or Foil
        What they are laid with; a foil has one turn in each layer.
    room : Block
        The window less former and clearances, see `winding_room`.

    Returns
    -------
    Layers
        Turns touch each other, and each layer, the last included, is centred along z, so that a
        winding in a symmetric room is symmetric.

    Raises
    ------
    InputError
        If the turns do not fit: the message has the missing space along r or z, and how many
        turns would fit; or if an argument is out of range.
    """
    _check_room(room)
    depth, height = _extent(room)
    check_fit(Winding(turns).turns, conductor, depth, height)
    conductor = as_laid(conductor, height)
    in_full_layer = _fitting(height, conductor.axial_size)
    layer, place = np.divmod(np.arange(int(turns)), in_full_layer)
    turns_in_layers = np.bincount(layer)
    r = room.inner_radius + (layer + 0.5) * conductor.radial_size
    place_from_middle = place - 0.5 * (turns_in_layers[layer] - 1)
    z = _middle(room) + place_from_middle * conductor.axial_size
    return Layers(
        conductor,
        room,
        _block_of(conductor, room, turns_in_layers),
        tuple(turns_in_layers.tolist()),
        np.column_stack([r, z]),
    )


def dc_resistance(layers: Layers, metal: Metal, temperature: float) -> float:
    """Return the resistance of laid turns to direct current in ohm, without their leads.

    Parameters
    ----------
    layers : Layers
        The turns.
    metal : Metal
        What their conductor is made of.
    temperature : float
        In degrees Celsius.

    Raises
    ------
    InputError
        If the temperature is out of range.
    """
    return resistivity(metal, temperature) * layers.wire_length / layers.conductor.copper_area


def _block_of(conductor: Conductor, room: Block, turns_in_layers: NDArray[np.int64]) -> Block:
    """Return the rectangle round the turns, held inside the room against rounding."""
    depth = len(turns_in_layers) * conductor.radial_size
    half_height = 0.5 * turns_in_layers[0] * conductor.axial_size
    middle = _middle(room)
    return Block(
        room.inner_radius,
        float(min(room.inner_radius + depth, room.outer_radius)),
        float(max(middle - half_height, room.bottom)),
        float(min(middle + half_height, room.top)),
    )


def _fitting(room: float, size: float) -> int:
    """Return how many pieces of a size fit in a row; rounding of the room is allowed for."""
    return math.floor(room / size * (1.0 + SLACK))


def _extent(room: Block) -> tuple[float, float]:
    return room.outer_radius - room.inner_radius, room.top - room.bottom


def _middle(room: Block) -> float:
    return 0.5 * (room.bottom + room.top)


def _check_room(room: object) -> None:
    accepted = "a Block of finite size at radii of 0 or more"
    if not isinstance(room, Block):
        raise InputError("not a room", key="room", value=room, accepted=accepted)
    sides = (room.inner_radius, room.outer_radius, room.bottom, room.top)
    if room.inner_radius < 0.0 or not np.isfinite(sides).all():
        raise InputError("out of range", key="room", value=room, accepted=accepted)


def in_millimetres(length: float) -> str:
    """Return a length as text in mm, rounded up so that adding it is enough."""
    return f"{math.ceil(length / SHOWN - 1e-8) * SHOWN * 1e3:.10g} mm"
