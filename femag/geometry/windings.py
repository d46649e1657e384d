"""Windings as blocks of uniform current density in the window."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

from femag.errors import InputError, entry_key, number
from femag.geometry.conductors import COPPER, Conductor, Metal, resistivity
from femag.geometry.section import Region, rectangle

if TYPE_CHECKING:
    from femag.geometry.layers import Former

MOST_TURNS = 1_000_000


@dataclass(frozen=True)
class Block:
    """A rectangle of copper in the section, in m; z = 0 is the middle of the window.

    Parameters
    ----------
    inner_radius, outer_radius : float
        Radial extent.
    bottom, top : float
        Axial extent.
    """

    inner_radius: float
    outer_radius: float
    bottom: float
    top: float

    def __post_init__(self) -> None:
        for side in fields(self):
            number(getattr(self, side.name), f"winding.block.{side.name}", "a length")
        for low, high in (("inner_radius", "outer_radius"), ("bottom", "top")):
            if not getattr(self, low) < getattr(self, high):
                raise InputError(
                    f"must lie above {low}",
                    key=f"winding.block.{high}",
                    value=getattr(self, high),
                    accepted=f"more than {getattr(self, low) * 1e3:g} mm",
                )

    @property
    def area(self) -> float:
        """Area of the rectangle, m2."""
        return (self.outer_radius - self.inner_radius) * (self.top - self.bottom)


@dataclass(frozen=True)
class Winding:
    """Turns in a block.

    Parameters
    ----------
    turns : int
        Number of turns, at least 1.
    block : Block, optional
        Where the copper lies; the whole window when left out.
    name : str
        Unique in the design.
    conductor : RoundWire, LitzWire or Foil, optional
        Laid in layers, in the block if there is one, else in what the former leaves of the
        window; the turns' own block then carries the current.
    former : Former, optional
        What keeps the conductor away from the core.
    metal : Metal
        What the conductor is made of.
    temperature : float
        Of the conductor, degrees Celsius, for its resistance.
    """

    turns: int
    block: Block | None = None
    name: str = "main"
    conductor: Conductor | None = None
    former: Former | None = None
    metal: Metal = COPPER
    temperature: float = 20.0

    def __post_init__(self) -> None:
        accepted = f"a whole number from 1 to {MOST_TURNS}"
        turns = number(self.turns, "winding.turns", accepted)
        if not (1 <= turns <= MOST_TURNS and turns == int(turns)):
            raise InputError(
                "turns out of range", key="winding.turns", value=self.turns, accepted=accepted
            )
        if self.block is not None and not isinstance(self.block, Block):
            raise InputError(
                "not a block", key="winding.block", value=self.block, accepted="a Block"
            )
        if not isinstance(self.name, str) or not self.name.strip() or not self.name.isprintable():
            raise InputError(
                "not a name", key="winding.name", value=self.name,
                accepted="printable text that is not empty",
            )  # fmt: skip
        if self.former is not None and self.conductor is None:
            raise InputError(
                "a former needs a conductor", key="winding.former",
                accepted="winding.conductor beside it",
            )  # fmt: skip
        if self.former is not None and self.block is not None:
            raise InputError(
                "a former beside a block", key="winding.former",
                accepted="one of the two: the block is the room already",
            )  # fmt: skip
        resistivity(self.metal, self.temperature)


def winding_region(name: str, block: Block, window: Block, index: int) -> Region:
    """Return the region of a winding, named after it.

    Parameters
    ----------
    name : str
        The winding's name.
    block : Block
        Where its turns lie.
    window : Block
        The room that the core leaves.
    index : int
        Its place in the design from 0, for messages.

    Raises
    ------
    InputError
        If the block leaves the window.
    """
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
                key=f"{entry_key('winding', index)}.block.{side}",
                value=value,
                accepted=f"{'at least' if sign > 0 else 'at most'} {limit * 1e3:g} mm",
            )
    polygon = rectangle(block.inner_radius, block.outer_radius, block.bottom, block.top)
    return Region(f"winding {name}", "winding", polygon, parent="window")
