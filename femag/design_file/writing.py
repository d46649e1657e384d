"""Design files out: what reads back to an equal design."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict
from typing import Any

import tomli_w

from femag.design import Design
from femag.design_file.tables import METALS
from femag.geometry import DIMENSIONS, Conductor, Foil, Gap, LitzWire, RoundWire, Winding
from femag.materials import FroehlichCurve, LinearCurve, MagnetisationCurve
from femag.units import exact_text

Document = dict[str, Any]


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
