"""Design files: TOML in and out, checked key by key.

The tables below are the file format; the description of each key says what it accepts and is
what messages print.
"""

from __future__ import annotations

import difflib
import tomllib
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import asdict
from functools import partial
from pathlib import Path
from typing import Annotated, Any, Literal, get_args

import tomli_w
from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, ValidationError
from pydantic_core import PydanticCustomError

from femag.design import Design
from femag.errors import InputError, entry_key
from femag.geometry import (
    ALUMINIUM,
    COPPER,
    DIMENSIONS,
    LIMITS,
    Block,
    Conductor,
    Foil,
    Former,
    Gap,
    Limit,
    LitzWire,
    PotCore,
    RoundWire,
    Winding,
    catalogue_core,
)
from femag.materials import FroehlichCurve, LinearCurve, MagnetisationCurve
from femag.units import ACCEPTED, TEMPERATURE, celsius, exact_text, si_value

Document = dict[str, Any]

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


def read_design(path: str | Path) -> Design:
    """Return the design that a TOML file describes.

    Raises
    ------
    InputError
        If the file cannot be read or used; it names the file, the key and the value.
    """
    try:
        text = Path(path).read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError("not UTF-8 text", file=str(path), accepted="a TOML file") from error
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})", file=str(path)) from error
    return design_from_toml(text, str(path))


def design_from_toml(text: str, file: str | None = None) -> Design:
    """Return the design that a TOML text describes; `file` is for messages.

    Raises
    ------
    InputError
        If the text cannot be used.
    """
    try:
        document = tomllib.loads(text)
    except (ValueError, RecursionError) as error:  # ValueError: also numbers too long to read
        problem = " ".join(str(error).split())
        raise InputError(f"not valid TOML ({problem})", file=file) from error
    return design_from_document(document, file)


def design_from_document(document: Mapping[str, Any], file: str | None = None) -> Design:
    """Return the design that a nested mapping describes, quantities being texts with units.

    Raises
    ------
    InputError
        If a key or a value cannot be used.
    """
    try:
        folder = Path(file).parent if file else Path()
        return _design(DesignTable.model_validate(document), folder)
    except ValidationError as error:
        raise _first_error(error, file) from error
    except InputError as error:
        if error.file is not None:  # another file than the design's
            raise
        value = written_value(document, error.key)
        raise InputError(
            error.problem,
            key=error.key,
            value=error.value if value is None else value,
            accepted=error.accepted,
            file=file,
        ) from error


def design_document(design: Design) -> Document:
    """Return the nested mapping that `design_from_document` turns into an equal design."""
    lengths = {name: exact_text(getattr(design.core, name), "m", "m") for name in DIMENSIONS}
    document: Document = {
        "title": design.title,
        "core": {
            "family": "pot",
            "name": design.core.name,
            "material": _material_document(design.material),
            "dimensions": lengths,
        },
        "gap": [_gap_document(gap) for gap in design.gaps],
        "winding": [_winding_document(winding) for winding in design.windings],
        "drive": {"current": exact_text(design.current, "A")},
        "solve": {"tolerance": float(design.tolerance)},
    }
    if design.driven:
        document["drive"]["winding"] = list(design.driven)
    return document


def design_toml(design: Design) -> str:
    """Return the design file of a design."""
    return tomli_w.dumps(design_document(design))


def written_value(document: Mapping[str, Any], key: str | None) -> object:
    """Return what stands at a dotted key; in a list the first entry is meant unless numbered."""
    found: Any = document
    for part in (key or "").split("."):
        if isinstance(found, list) and part.isdigit() and int(part) < len(found):
            found = found[int(part)]
            continue
        if isinstance(found, list) and found:
            found = found[0]
        if not isinstance(found, Mapping) or part not in found:
            return None
        found = found[part]
    return None if isinstance(found, Mapping | list) else found


def _design(table: DesignTable, folder: Path) -> Design:
    with _keyed("permeability saturation exponent", "core.material."):
        material = _curve(table.core.material)
    return Design(
        core=_core(table.core, folder),
        windings=tuple(_winding(entry, index) for index, entry in enumerate(table.winding)),
        material=material,
        gaps=tuple(_gap(entry, index) for index, entry in enumerate(table.gap)),
        current=table.drive.current,
        tolerance=table.solve.tolerance,
        driven=tuple(table.drive.winding),
        title=table.title,
    )


def _core(table: CoreTable, folder: Path) -> PotCore:
    """Return the core of a size or of dimensions; paths resolve against the design file."""
    if table.size is not None:
        for key in ("family", "dimensions", "name"):
            if key in table.model_fields_set:
                raise InputError(
                    "stands beside core.size", key=f"core.{key}", accepted="one of the two"
                )
        extra = () if table.catalogue is None else (folder / table.catalogue,)
        return catalogue_core(table.size, extra).core(table.limit)
    for key in ("limit", "catalogue"):
        if key in table.model_fields_set:
            raise InputError(
                "needs core.size", key=f"core.{key}", accepted="core.size = 'P 26/16' beside it"
            )
    for key in ("family", "dimensions"):
        if getattr(table, key) is None:
            raise InputError(
                "missing", key=f"core.{key}", accepted="core.size, or family and dimensions"
            )
    assert table.dimensions is not None
    return PotCore(**table.dimensions.model_dump(), name=table.name)


def _curve(table: MaterialTable) -> MagnetisationCurve:
    if table.saturation is not None:
        return FroehlichCurve(
            table.permeability, table.saturation, 1.0 if table.exponent is None else table.exponent
        )
    if table.exponent is not None:
        raise InputError(
            "an exponent needs a saturation", key="exponent", value=table.exponent,
            accepted="saturation = '0.45 T' beside it, or no exponent",
        )  # fmt: skip
    return LinearCurve(table.permeability)


def _gap(table: GapTable, index: int) -> Gap:
    with _renumbered("gap", index):
        return Gap(**table.model_dump())


def _winding(table: WindingTable, index: int) -> Winding:
    with _renumbered("winding", index):
        block = None if table.block is None else Block(**table.block.model_dump())
        former = None if table.former is None else Former(**table.former.model_dump())
        if table.conductor is None:
            return Winding(table.turns, block, table.name, former=former)
        conductor = _conductor(table.conductor)
        return Winding(
            table.turns,
            block,
            table.name,
            conductor,
            former,
            METALS[table.conductor.metal],
            table.conductor.temperature,
        )


def _conductor(table: ConductorTable) -> Conductor:
    kinds = [kind for kind in ("round", "litz", "foil") if getattr(table, kind) is not None]
    if len(kinds) != 1:
        raise InputError(
            f"{len(kinds)} kinds of conductor", key="conductor",
            accepted="one of round, litz and foil",
        )  # fmt: skip
    if table.width is not None and table.foil is None:
        raise InputError("only foil has a width", key="conductor.width", accepted="foil beside it")
    if table.round is not None:
        return RoundWire(table.round, table.insulation)
    if table.foil is not None:
        return Foil(table.foil, table.width, table.insulation)
    assert table.litz is not None
    return LitzWire(
        table.litz.strands,
        table.litz.strand,
        table.litz.packing,
        table.insulation,
        table.litz.outer_diameter,
    )


def _material_document(curve: MagnetisationCurve) -> Document:
    match curve:
        case LinearCurve(permeability):
            return {"permeability": float(permeability)}
        case FroehlichCurve(permeability, saturation, exponent):
            return {
                "permeability": float(permeability),
                "saturation": exact_text(saturation, "T"),
                "exponent": float(exponent),
            }
        case _:
            raise TypeError(f"{type(curve).__name__} has no place in a design file")


def _gap_document(gap: Gap) -> Document:
    document: Document = {"leg": gap.leg, "length": exact_text(gap.length, "m", "m")}
    if gap.pieces != 1:
        document["pieces"] = int(gap.pieces)
    if gap.pitch is not None:
        document["pitch"] = exact_text(gap.pitch, "m", "m")
    if gap.offset != 0.0:
        document["offset"] = exact_text(gap.offset, "m", "m")
    if gap.permeability != 1.0:
        document["permeability"] = float(gap.permeability)
    return document


def _winding_document(winding: Winding) -> Document:
    document: Document = {"name": winding.name, "turns": int(winding.turns)}
    if winding.block is not None:
        document["block"] = _lengths_document(asdict(winding.block))
    if winding.conductor is not None:
        document["conductor"] = _conductor_document(winding.conductor) | {
            "metal": next(name for name, metal in METALS.items() if metal == winding.metal),
            "temperature": f"{float(winding.temperature)!r} C",
        }
    if winding.former is not None:
        document["former"] = _lengths_document(asdict(winding.former))
    return document


def _conductor_document(conductor: Conductor) -> Document:
    insulation = {"insulation": exact_text(conductor.insulation, "m", "m")}
    match conductor:
        case RoundWire(diameter):
            return {"round": exact_text(diameter, "m", "m")} | insulation
        case LitzWire(strands, strand, packing, _, outer):
            litz: Document = {"strands": int(strands), "strand": exact_text(strand, "m", "m")}
            if packing is not None:
                litz["packing"] = float(packing)
            if outer is not None:
                litz["outer_diameter"] = exact_text(outer, "m", "m")
            return {"litz": litz} | insulation
        case Foil(thickness, width):
            foil = {"foil": exact_text(thickness, "m", "m")} | insulation
            return foil if width is None else foil | {"width": exact_text(width, "m", "m")}


def _lengths_document(lengths: Mapping[str, float]) -> Document:
    return {name: exact_text(value, "m", "m") for name, value in lengths.items()}


@contextmanager
def _keyed(keys: str, prefix: str) -> Iterator[None]:
    """Put a prefix before the key of an error that names one of `keys`."""
    try:
        yield
    except InputError as error:
        if error.key not in keys.split():
            raise
        raise InputError(
            error.problem, key=prefix + error.key, value=error.value, accepted=error.accepted
        ) from error


@contextmanager
def _renumbered(name: str, index: int) -> Iterator[None]:
    """Say in an error which entry of the list `name` it is about."""
    try:
        yield
    except InputError as error:
        inside = (error.key or "").removeprefix(name).lstrip(".")
        key = f"{entry_key(name, index)}.{inside}".rstrip(".")
        raise InputError(
            error.problem, key=key, value=error.value, accepted=error.accepted
        ) from error


def _first_error(error: ValidationError, file: str | None) -> InputError:
    """Return the first of a validation's errors as one line."""
    first = min(error.errors(include_url=False), key=_unknown_keys_first)
    location = first["loc"]
    key = _dotted(location)
    if first["type"] == "extra_forbidden":
        known = _fields_at(location[:-1])
        near = difflib.get_close_matches(str(location[-1]), known, n=1, cutoff=0.5)
        accepted = f"nearest known key: {near[0]!r}" if near else ", ".join(known)
        return InputError("unknown key", key=key, accepted=accepted, file=file)
    named = _up_to_last_name(location)
    description = _fields_at(named[:-1])[str(named[-1])] if named else "a table"
    if first["type"] == "missing":
        return InputError("missing", key=key, accepted=description, file=file)
    problem = first["msg"] if first["type"] == "quantity" else "not usable"
    return InputError(problem, key=key, value=first["input"], accepted=description, file=file)


def _unknown_keys_first(error: Mapping[str, Any]) -> int:
    """A misspelt key is also a missing one: name the misspelling."""
    return 0 if error["type"] == "extra_forbidden" else 1


def _up_to_last_name(location: Sequence[int | str]) -> Sequence[int | str]:
    """Return a location without the numbers at its end: an entry is described with its list."""
    length = max((i for i, part in enumerate(location, 1) if isinstance(part, str)), default=0)
    return location[:length]


def _dotted(location: Sequence[int | str]) -> str:
    key = ""
    for part in location:
        key = entry_key(key, part) if isinstance(part, int) else f"{key}.{part}".lstrip(".")
    return key


def _fields_at(location: Sequence[int | str]) -> dict[str, str]:
    """Return the keys of the table at a location, each with what it accepts."""
    table: Any = DesignTable
    for part in location:
        if isinstance(part, str):
            table = _table_in(table.model_fields[part].annotation)
    return {name: field.description or "" for name, field in table.model_fields.items()}


def _table_in(annotation: Any) -> Any:
    """Return the table class inside ``list[Table]`` or ``Table | None``."""
    return next((part for part in get_args(annotation) if part is not type(None)), annotation)
