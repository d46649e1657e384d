"""The design file as tables: what each key is and what it accepts.

The description of a key is what messages print as accepted.
"""

from __future__ import annotations

from functools import partial
from typing import Annotated, Literal

from pydantic import (
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    PlainValidator,
    model_validator,
)
from pydantic_core import PydanticCustomError

from femag.errors import InputError
from femag.geometry import ALUMINIUM, COPPER, DETAILS, FAMILIES, LIMITS, Detail, Limit
from femag.materials import Steinmetz, is_material_file, loss_of_table
from femag.materials.loss_table import TABLE
from femag.units import ACCEPTED, TEMPERATURE, celsius, si_value

METALS = {"copper": COPPER, "aluminium": ALUMINIUM}


def read_quantity(unit: str, text: object) -> float:
    """Return the number in SI of a text, for pydantic."""
    try:
        return si_value(text, unit)
    except InputError as error:
        raise PydanticCustomError("quantity", "{problem}", {"problem": error.problem}) from error


def read_temperature(text: object) -> float:
    """Return the degrees Celsius of a text, for pydantic."""
    try:
        return celsius(text)
    except InputError as error:
        raise PydanticCustomError("quantity", "{problem}", {"problem": error.problem}) from error


Length = Annotated[
    float, BeforeValidator(partial(read_quantity, "m")), Field(description=ACCEPTED["m"])
]
Current = Annotated[
    float, BeforeValidator(partial(read_quantity, "A")), Field(description=ACCEPTED["A"])
]
Frequency = Annotated[
    float, BeforeValidator(partial(read_quantity, "Hz")), Field(description=ACCEPTED["Hz"])
]
Temperature = Annotated[float, BeforeValidator(read_temperature), Field(description=TEMPERATURE)]
CoreFactor = Annotated[float, BeforeValidator(partial(read_quantity, "1/m"))]
FluxDensity = Annotated[float, BeforeValidator(partial(read_quantity, "T"))]
Inductance = Annotated[float, BeforeValidator(partial(read_quantity, "H"))]
Power = Annotated[float, BeforeValidator(partial(read_quantity, "W"))]
Force = Annotated[float, BeforeValidator(partial(read_quantity, "N"))]


class _Table(BaseModel):
    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)


def _read_point(pair: object) -> tuple[float, float]:
    if not isinstance(pair, list | tuple) or len(pair) != 2:
        raise PydanticCustomError("quantity", "not a pair of H and B")
    return read_quantity("A/m", pair[0]), read_quantity("T", pair[1])


def material_table(given: object) -> object:
    """Return the table that a material's text alone stands for; what is no text, as it is."""
    if not isinstance(given, str):
        return given
    return {"file" if is_material_file(given) else "name": given}


Point = Annotated[tuple[float, float], BeforeValidator(_read_point)]


Loss = Annotated[Steinmetz, PlainValidator(partial(loss_of_table, key="core.material.loss"))]


class MaterialTable(_Table):
    """A magnetisation curve by its parameters, its points, or where it is found."""

    permeability: float | None = Field(
        default=None, description="initial relative permeability, such as 2000"
    )
    saturation: FluxDensity | None = Field(default=None, description=ACCEPTED["T"])
    exponent: float | None = Field(default=None, description="knee exponent, a number from 1 to 20")
    name: str | None = Field(
        default=None,
        description="a material of the library, such as 'mnzn-power'; beside points text for print",
    )
    file: str | None = Field(default=None, description="the path of a material file, TOML or CSV")
    temperature: Temperature | None = Field(default=None, description=TEMPERATURE)
    points: list[Point] | None = Field(
        default=None, description="a list of pairs such as [['25 A/m', '0.09 T'], ...]"
    )
    source: str | None = Field(default=None, description="text in quotes")
    notes: list[str] = Field(default=[], description="a list of texts")
    loss: Loss | None = Field(default=None, description=TABLE)

    @model_validator(mode="before")
    @classmethod
    def _of_text(cls, given: object) -> object:
        return material_table(given)


class DimensionsTable(_Table):
    """Dimensions of the assembled set; which ones depends on the family."""

    outer_diameter: Length | None = Field(default=None, description=ACCEPTED["m"])
    window_diameter: Length
    post_diameter: Length
    height: Length
    window_height: Length
    hole_diameter: Length = 0.0
    length: Length | None = Field(default=None, description=ACCEPTED["m"])
    width: Length | None = Field(default=None, description=ACCEPTED["m"])
    leg_opening: Length | None = Field(default=None, description=ACCEPTED["m"])
    waist: Length | None = Field(default=None, description=ACCEPTED["m"])
    front: Length | None = Field(default=None, description=ACCEPTED["m"])


class CoreTable(_Table):
    """The core."""

    size: str | None = Field(default=None, description="a size of the catalogue, such as 'P 26/16'")
    limit: Limit = Field(default="nominal", description=" or ".join(map(repr, LIMITS)))
    catalogue: str | None = Field(default=None, description="the path of a catalogue file")
    family: str | None = Field(default=None, description=" or ".join(map(repr, FAMILIES)))
    core_factor: CoreFactor | None = Field(default=None, description="such as '0.39 1/mm'")
    name: str = Field(default="", description="text in quotes")
    material: MaterialTable = Field(
        description="a name such as 'mnzn-power-25C', the path of a TOML or CSV file, or a table, "
        "such as { permeability = 2000 } or { name = 'mnzn-power', temperature = '60 C' }"
    )
    dimensions: DimensionsTable | None = Field(
        default=None, description="a table of lengths, [core.dimensions]"
    )


class StepTable(_Table):
    """Another length of a gap in the middle of the post."""

    diameter: Length
    length: Length


class MagnetTable(_Table):
    """A permanent magnet in a gap."""

    remanence: FluxDensity = Field(description=ACCEPTED["T"])
    recoil_permeability: float = Field(
        default=1.05, description="relative permeability, 1 or more, such as 1.05"
    )


class GapTable(_Table):
    """One air gap."""

    length: Length
    leg: Literal["post", "all"] = Field(default="post", description="'post' or 'all'")
    pieces: int = Field(default=1, description="a whole number from 1 to 100")
    pitch: Length | None = Field(default=None, description=ACCEPTED["m"])
    offset: Length = 0.0
    permeability: float = Field(default=1.0, description="relative permeability, 1 or more")
    rim_length: Length | None = Field(default=None, description=ACCEPTED["m"])
    step: StepTable | None = Field(
        default=None, description="a table such as { diameter = '6 mm', length = '0.1 mm' }"
    )
    chamfer: Length = 0.0
    edge_radius: Length = 0.0
    magnet: MagnetTable | None = Field(
        default=None,
        description="a table such as { remanence = '0.4 T', recoil_permeability = 1.05 }",
    )


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
    tape: Length = 0.0


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
    sections: int = Field(default=1, description="a whole number from 1 to 100")
    divider: Length = 0.0


Samples = tuple[tuple[float, float], ...]


def _read_waveform(given: object) -> str | Samples:
    """Return a path as it is, or pairs of share of the period and current in A."""
    if isinstance(given, str):
        return given
    if not isinstance(given, list):
        raise PydanticCustomError("quantity", "neither a path nor a list of pairs")
    return tuple(map(_read_sample, given))


def _read_sample(pair: object) -> tuple[float, float]:
    if not isinstance(pair, list | tuple) or len(pair) != 2:
        raise PydanticCustomError("quantity", "not pairs of a share of the period and a current")
    if isinstance(pair[0], bool) or not isinstance(pair[0], int | float):
        raise PydanticCustomError("quantity", "a share of the period is no number")
    return float(pair[0]), read_quantity("A", pair[1])


class DriveTable(_Table):
    """What flows."""

    current: Current = 1.0
    ripple: Current | None = Field(
        default=None, description="a current from peak to peak, such as '1 A'"
    )
    frequency: Frequency | None = Field(default=None, description=ACCEPTED["Hz"])
    shape: Literal["triangle", "sine"] = Field(
        default="triangle", description="'triangle' or 'sine'"
    )
    rise: float = Field(
        default=0.5, description="share of the period in which a triangle rises, such as 0.4"
    )
    waveform: Annotated[str | Samples, PlainValidator(_read_waveform)] | None = Field(
        default=None,
        description="the path of a CSV file of one period, or a list of pairs such as "
        "[[0, '1 A'], [0.4, '2 A'], [1, '1 A']]",
    )
    winding: list[str] = Field(default=[], description="a list of winding names, driven in series")


class ToleranceTable(_Table):
    """Half ranges of the parts: plus or minus so much."""

    gap: Length = 0.0
    post_diameter: Length = 0.0
    window_diameter: Length = 0.0
    window_height: Length = 0.0
    permeability: float = Field(default=0.0, description="a share, such as 0.25 for 25 %")
    saturation: float = Field(default=0.0, description="a share, such as 0.05 for 5 %")
    coil_radial: Length = 0.0
    coil_axial: Length = 0.0


class SolveTable(_Table):
    """How exactly."""

    tolerance: float = Field(default=1e-3, description="a number such as 1e-3")
    detail: Detail = Field(default="block", description=" or ".join(map(repr, DETAILS)))


class RequireTable(_Table):
    """What the design has to keep."""

    inductance_least: Inductance | None = Field(default=None, description=ACCEPTED["H"])
    inductance_most: Inductance | None = Field(default=None, description=ACCEPTED["H"])
    incremental_inductance: Inductance | None = Field(default=None, description=ACCEPTED["H"])
    flux_density: FluxDensity | None = Field(default=None, description=ACCEPTED["T"])
    core_flux_density: FluxDensity | None = Field(default=None, description=ACCEPTED["T"])
    loss: Power | None = Field(default=None, description=ACCEPTED["W"])
    force: Force | None = Field(default=None, description=ACCEPTED["N"])
    copper_clearance: Length | None = Field(default=None, description=ACCEPTED["m"])
    temperature: Temperature | None = Field(default=None, description=TEMPERATURE)
    fit: bool = Field(default=False, description="true or false")


class DesignTable(_Table):
    """The whole file."""

    title: str = Field(default="", description="text in quotes")
    core: CoreTable = Field(description="a table, [core]")
    gap: list[GapTable] = Field(default=[], description="tables headed [[gap]]")
    winding: list[WindingTable] = Field(description="tables headed [[winding]]")
    drive: DriveTable = Field(default=DriveTable(), description="a table, [drive]")
    solve: SolveTable = Field(default=SolveTable(), description="a table, [solve]")
    require: RequireTable = Field(default=RequireTable(), description="a table, [require]")
    tolerance: ToleranceTable | None = Field(
        default=None, description="a table of half ranges, [tolerance]"
    )
