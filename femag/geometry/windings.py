"""Windings as they are asked for: turns, conductor, and the room that they have."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

from femag.errors import InputError, number
from femag.geometry.conductors import COPPER, Conductor, Metal, resistivity

if TYPE_CHECKING:
    from femag.geometry.layers import Former

MOST_TURNS = 1_000_000

MOST_SECTIONS = 100


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
    """Turns in a block, or laid from a conductor.

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
        window, over the windings before it that are laid there; the turns then carry the current.
    former : Former, optional
        What keeps the conductor away from the core; when left out, that of the winding below.
    metal : Metal
        What the conductor is made of.
    temperature : float
        Of the conductor, degrees Celsius, for its resistance.
    sections : int
        Number of equal chambers side by side along z that the turns are spread over.
    divider : float
        Thickness of the walls between the sections, m.
    """

    turns: int
    block: Block | None = None
    name: str = "main"
    conductor: Conductor | None = None
    former: Former | None = None
    metal: Metal = COPPER
    temperature: float = 20.0
    sections: int = 1
    divider: float = 0.0

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
        self._check_sections()

    def _check_sections(self) -> None:
        key, accepted = "winding.sections", f"a whole number from 1 to {MOST_SECTIONS}"
        sections = number(self.sections, key, accepted)
        if not (1 <= sections <= MOST_SECTIONS and sections == int(sections)):
            raise InputError(
                "sections out of range", key=key, value=self.sections, accepted=accepted
            )
        if sections > self.turns:
            raise InputError(
                "more sections than turns", key=key, value=self.sections,
                accepted=f"at most {self.turns}, a turn in each",
            )  # fmt: skip
        key, accepted = "winding.divider", "a length of 0 or more"
        if not 0.0 <= number(self.divider, key, accepted) < math.inf:
            raise InputError("out of range", key=key, value=self.divider, accepted=accepted)
        if self.divider > 0.0 and sections == 1:
            raise InputError(
                "a divider needs sections", key=key, value=self.divider,
                accepted="winding.sections of 2 or more beside it",
            )  # fmt: skip
