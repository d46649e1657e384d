"""Design files in: every error is one line with file, key, value and what is accepted."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from femag.design import Design
from femag.design_file.drive import drive_ripple
from femag.design_file.materials import material_curve
from femag.design_file.messages import first_error, renumbered, written_value
from femag.design_file.tables import (
    METALS,
    ConductorTable,
    CoreTable,
    DesignTable,
    FormerTable,
    GapTable,
    WindingTable,
)
from femag.errors import InputError
from femag.geometry import (
    Block,
    Conductor,
    Core,
    Foil,
    Former,
    Gap,
    LitzWire,
    Magnet,
    RoundWire,
    Step,
    Winding,
    catalogue_core,
    core_of_family,
)
from femag.part_tolerances import PartTolerances
from femag.requirements import Requirements
from femag.text_file import text_of_file


def read_design(path: str | Path) -> Design:
    """Return the design that a TOML file describes.

    Raises
    ------
    InputError
        If the file cannot be read or used; it names the file, the key and the value.
    """
    return design_from_document(read_document(path), str(path))


def read_document(path: str | Path) -> dict[str, Any]:
    """Return the nested mapping that a TOML file holds, not yet checked.

    Raises
    ------
    InputError
        If the file cannot be read.
    """
    return document_of_toml(text_of_file(path, "a TOML file"), str(path))


def design_from_toml(text: str, file: str | None = None) -> Design:
    """Return the design that a TOML text describes; `file` is for messages.

    Raises
    ------
    InputError
        If the text cannot be used.
    """
    return design_from_document(document_of_toml(text, file), file)


def document_of_toml(text: str, file: str | None = None) -> dict[str, Any]:
    """Return the nested mapping that a TOML text holds, not yet checked; `file` is for messages.

    Raises
    ------
    InputError
        If the text is no TOML.
    """
    try:
        return tomllib.loads(text)
    except (ValueError, RecursionError) as error:  # ValueError: also numbers too long to read
        problem = " ".join(str(error).split())
        raise InputError(f"not valid TOML ({problem})", file=file) from error


def check_tables(document: Mapping[str, Any], file: str | None = None) -> None:
    """Check that all keys of a document are known and each value is of its kind.

    That is what is seen without reading other files and without geometry.

    Raises
    ------
    InputError
        If one is not.
    """
    try:
        DesignTable.model_validate(document)
    except ValidationError as error:
        raise first_error(error, file) from error


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
        raise first_error(error, file) from error
    except InputError as error:
        if error.file is not None:  # another file than the design's
            raise
        raise error.changed(value=written_value(document, error.key), file=file) from error


def _design(table: DesignTable, folder: Path) -> Design:
    return Design(
        core=_core(table.core, folder),
        windings=_windings(table.winding),
        material=material_curve(table.core.material, folder),
        gaps=tuple(_gap(entry, index) for index, entry in enumerate(table.gap)),
        current=table.drive.current,
        tolerance=table.solve.tolerance,
        driven=tuple(table.drive.winding),
        title=table.title,
        detail=table.solve.detail,
        requirements=Requirements(**table.require.model_dump()),
        ripple=drive_ripple(table.drive, folder),
        part_tolerances=_part_tolerances(table),
    )


def _part_tolerances(table: DesignTable) -> PartTolerances | None:
    return None if table.tolerance is None else PartTolerances(**table.tolerance.model_dump())


def _core(table: CoreTable, folder: Path) -> Core:
    """Return the core of a size or of dimensions; paths resolve against the design file."""
    if table.size is not None:
        for key in ("family", "dimensions", "name", "core_factor"):
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
    assert table.family is not None
    assert table.dimensions is not None
    sizes = table.dimensions.model_dump(exclude_unset=True)
    return core_of_family(table.family, sizes, table.core_factor, table.name)


def _gap(table: GapTable, index: int) -> Gap:
    with renumbered("gap", index):
        if table.magnet is not None and "permeability" in table.model_fields_set:
            raise InputError(
                "stands beside a magnet", key="gap.permeability", value=table.permeability,
                accepted="gap.magnet.recoil_permeability instead",
            )  # fmt: skip
        step = None if table.step is None else Step(**table.step.model_dump())
        magnet = None if table.magnet is None else Magnet(**table.magnet.model_dump())
        return Gap(**table.model_dump(exclude={"step", "magnet"}), step=step, magnet=magnet)


def _windings(tables: Sequence[WindingTable]) -> tuple[Winding, ...]:
    """Return the windings; a key that a former leaves out is that of the winding below."""
    windings: list[Winding] = []
    below = Former()
    for index, table in enumerate(tables):
        with renumbered("winding", index):
            winding = _winding(table, below)
        windings.append(winding)
        below = replace(winding.former or below, tape=0.0)
    return tuple(windings)


def _winding(table: WindingTable, below: Former) -> Winding:
    return Winding(
        table.turns,
        None if table.block is None else Block(**table.block.model_dump()),
        table.name,
        former=_former(table.former, below),
        sections=table.sections,
        divider=table.divider,
        **({} if table.conductor is None else _conductor_and_metal(table.conductor)),
    )


def _former(table: FormerTable | None, below: Former) -> Former | None:
    return None if table is None else replace(below, **table.model_dump(exclude_unset=True))


def _conductor_and_metal(table: ConductorTable) -> dict[str, Any]:
    return {
        "conductor": _conductor(table),
        "metal": METALS[table.metal],
        "temperature": table.temperature,
    }


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
