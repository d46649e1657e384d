"""The design file as tables: what each key is and what it accepts.

The description of a key is what messages print as accepted.
"""

from __future__ import annotations

from functools import partial
from typing import Annotated, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field
from pydantic_core import PydanticCustomError

from femag.errors import InputError
from femag.geometry import ALUMINIUM, COPPER, LIMITS, Limit
from femag.units import ACCEPTED, TEMPERATURE, celsius, si_value

METALS = {"copper": COPPER, "aluminium": ALUMINIUM}


def _read_quantity(unit: str, text: object) -> float:
    try:
        return si_value(text, unit)
    except InputError as error:
        raise PydanticCustomError("quantity", "{problem}", {"problem": error.problem}) from error


def _read_temperature(text: object) -> float:
    try:
        return celsius(text)
    except InputError as error:
        raise PydanticCustomError("quantity", "{problem}", {"problem": error.problem}) from error


Length = Annotated[
    float, BeforeValidator(partial(_read_quantity, "m")), Field(description=ACCEPTED["m"])
]
Current = Annotated[
    float, BeforeValidator(partial(_read_quantity, "A")), Field(description=ACCEPTED["A"])
]
Temperature = Annotated[float, BeforeValidator(_read_temperature), Field(description=TEMPERATURE)]
FluxDensity = Annotated[float, BeforeValidator(partial(_read_quantity, "T"))]


class _Table(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


class MaterialTable(_Table):
    """A magnetisation curve by its parameters."""

    permeability: float = Field(description="initial relative permeability, such as 2000")
    saturation: FluxDensity | None = Field(default=None, description=ACCEPTED["T"])
    exponent: float | None = Field(default=None, description="knee exponent, a number from 1 to 20")


class PotDimensionsTable(_Table):
    """Dimensions of the assembled set."""

    outer_diameter: Length
    window_diameter: Length
    post_diameter: Length
    height: Length
    window_height: Length
    hole_diameter: Length = 0.0


class CoreTable(_Table):
    """The core."""

    size: str | None = Field(default=None, description="a size of the catalogue, such as 'P 26/16'")
    limit: Limit = Field(default="nominal", description=" or ".join(map(repr, LIMITS)))
    catalogue: str | None = Field(default=None, description="the path of a catalogue file")
    family: Literal["pot"] | None = Field(default=None, description="'pot'")
    name: str = Field(default="", description="text in quotes")
    material: MaterialTable = Field(
        description="a table, such as { permeability = 2000 } or "
        "{ permeability = 2000, saturation = '0.45 T', exponent = 2 }"
    )
    dimensions: PotDimensionsTable | None = Field(
        default=None, description="a table of lengths, [core.dimensions]"
    )


class GapTable(_Table):
    """One air gap."""

    length: Length
    leg: Literal["post", "all"] = Field(default="post", description="'post' or 'all'")
    pieces: int = Field(default=1, description="a whole number from 1 to 100")
    pitch: Length | None = Field(default=None, description=ACCEPTED["m"])
    offset: Length = 0.0
    permeability: float = Field(default=1.0, description="relative permeability, 1 or more")


class BlockTable(_Table):
    """A rectangle of copper."""

    inner_radius: Length
    outer_radius: Length
    bottom: Length
    top: Length


class LitzTable(_Table):
    """A bundle of strands; bare strands."""

    strands: int = Field(description="a whole number from 2")
    strand: Length
    packing: float | None = Field(
        default=None, description="share of metal in the bundle, such as 0.5"
    )
    outer_diameter: Length | None = Field(default=None, description=ACCEPTED["m"])


class ConductorTable(_Table):
    """What is wound: bare sizes, one of round, litz and foil."""

    round: Length | None = Field(default=None, description=ACCEPTED["m"])
    litz: LitzTable | None = Field(
        default=None, description="a table such as { strands = 60, strand = '0.1 mm' }"
    )
    foil: Length | None = Field(default=None, description=ACCEPTED["m"])
    width: Length | None = Field(default=None, description=ACCEPTED["m"])
    insulation: Length = 0.0
    metal: Literal["copper", "aluminium"] = Field(
        default="copper", description="'copper' or 'aluminium'"
    )
    temperature: Temperature = 20.0


class FormerTable(_Table):
    """What keeps the conductor away from the core."""

    wall: Length = 0.0
    flange: Length = 0.0
    post_clearance: Length = 0.0
    plate_clearance: Length = 0.0
    ring_clearance: Length = 0.0
    gap_clearance: Length = 0.0


class WindingTable(_Table):
    """One winding."""

    turns: int = Field(description="a whole number from 1 to 1000000")
    name: str = Field(default="main", description="a name in quotes")
    block: BlockTable | None = Field(
        default=None, description="a table of lengths, [winding.block]"
    )
    conductor: ConductorTable | None = Field(
        default=None, description="a table such as { round = '0.3 mm' }, [winding.conductor]"
    )
    former: FormerTable | None = Field(
        default=None, description="a table of lengths, [winding.former]"
    )


class DriveTable(_Table):
    """What flows."""

    current: Current = 1.0
    winding: list[str] = Field(default=[], description="a list of winding names, driven in series")


class SolveTable(_Table):
    """How exactly."""

    tolerance: float = Field(default=1e-3, description="a number such as 1e-3")


class DesignTable(_Table):
    """The whole file."""

    title: str = Field(default="", description="text in quotes")
    core: CoreTable = Field(description="a table, [core]")
    gap: list[GapTable] = Field(default=[], description="tables headed [[gap]]")
    winding: list[WindingTable] = Field(description="tables headed [[winding]]")
    drive: DriveTable = Field(default=DriveTable(), description="a table, [drive]")
    solve: SolveTable = Field(default=SolveTable(), description="a table, [solve]")
