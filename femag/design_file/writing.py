"""Design files out: what reads back to an equal design."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict
from typing import Any

import tomli_w

from femag.design import Design
from femag.design_file.tables import METALS
from femag.geometry import Conductor, Core, Foil, Gap, LitzWire, RoundWire, Winding
from femag.materials import (
    FroehlichCurve,
    LinearCurve,
    MagnetisationCurve,
    TabulatedCurve,
    loss_document,
)
from femag.part_tolerances import SHARES, PartTolerances
from femag.requirements import Requirements
from femag.ripple import Ripple
from femag.units import exact_text

Document = dict[str, Any]

WIDTH = 80
"""Most characters of a list on one line."""


def design_document(design: Design) -> Document:
    """Return the nested mapping that `design_from_document` turns into an equal design."""
    document: Document = {
        "title": design.title,
        "core": _core_document(design.core, design.material),
        "gap": [_gap_document(gap) for gap in design.gaps],
        "winding": [_winding_document(winding) for winding in design.windings],
        "drive": {"current": exact_text(design.current, "A")},
        "solve": {"tolerance": float(design.tolerance)},
    }
    if design.detail != "block":
        document["solve"]["detail"] = design.detail
    if design.driven:
        document["drive"]["winding"] = list(design.driven)
    if design.requirements:
        document["require"] = _requirements_document(design.requirements)
    if design.ripple is not None:
        document["drive"] |= _ripple_document(design.ripple)
    if design.part_tolerances is not None:
        document["tolerance"] = _tolerance_document(design.part_tolerances)
    return document


def design_toml(design: Design) -> str:
    """Return the design file of a design; lists that fit on a line stand on one."""
    return _with_short_lists(tomli_w.dumps(design_document(design)))


def _with_short_lists(text: str) -> str:
    """Return TOML as tomli_w writes it, one entry of a list a line, with its short lists joined.

    A line that ends with an opening bracket begins a list: texts end with a quote there.
    """
    done: list[str] = []
    begun: list[int] = []
    for line in text.splitlines():
        done.append(line)
        if line.endswith("["):
            begun.append(len(done) - 1)
        elif begun and line.strip() in ("]", "],"):
            start = begun.pop()
            entries = " ".join(entry.strip() for entry in done[start + 1 : -1]).removesuffix(",")
            joined = f"{done[start]}{entries}{line.strip()}"
            if len(joined) <= WIDTH and not any(entry.endswith("[") for entry in done[start + 1 :]):
                done[start:] = [joined]
    return "".join(f"{line}\n" for line in done)


def _core_document(core: Core, material: MagnetisationCurve) -> Document:
    document: Document = {"family": core.family, "name": core.name}
    published = getattr(core, "core_factor", None)
    if published is not None:
        document["core_factor"] = exact_text(published, "1/m")
    lengths = {name: exact_text(length, "m", "m") for name, length in core.sizes.items()}
    loss = {} if material.loss is None else {"loss": loss_document(material.loss)}
    return document | {"material": _material_document(material) | loss, "dimensions": lengths}


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
        case TabulatedCurve(points, name, source, notes):
            return {
                "name": name,
                "source": source,
                "notes": list(notes),
                "points": [
                    [exact_text(h, "A/m"), exact_text(b, "T")] for h, b in points if h > 0.0
                ],
            }
        case _:
            raise TypeError(f"{type(curve).__name__} has no place in a design file")


def _ripple_document(ripple: Ripple) -> Document:
    frequency = {"frequency": exact_text(ripple.frequency, "Hz")}
    if ripple.shape == "samples":
        samples = [[float(share), exact_text(a, "A")] for share, a in ripple.samples]
        return {"waveform": samples} | frequency
    document: Document = {"ripple": exact_text(ripple.peak_to_peak, "A")} | frequency
    if ripple.shape == "triangle":
        return document | {"rise": float(ripple.rise)}
    return document | {"shape": ripple.shape}


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
    if gap.rim_length is not None:
        document["rim_length"] = exact_text(gap.rim_length, "m", "m")
    if gap.step is not None:
        document["step"] = _lengths_document(asdict(gap.step))
    for name in ("chamfer", "edge_radius"):
        if getattr(gap, name) != 0.0:
            document[name] = exact_text(getattr(gap, name), "m", "m")
    if gap.magnet is not None:
        document["magnet"] = {
            "remanence": exact_text(gap.magnet.remanence, "T"),
            "recoil_permeability": float(gap.magnet.recoil_permeability),
        }
    return document


def _tolerance_document(tolerances: PartTolerances) -> Document:
    return {
        name: float(half) if name in SHARES else exact_text(half, "m", "m")
        for name, half in asdict(tolerances).items()
        if half
    }


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
    if winding.sections != 1:
        document["sections"] = int(winding.sections)
    if winding.divider != 0.0:
        document["divider"] = exact_text(winding.divider, "m", "m")
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


def _requirements_document(requirements: Requirements) -> Document:
    document: Document = {
        limit.key: f"{float(limit.value)!r} C"
        if limit.unit == "C"
        else exact_text(limit.value, limit.unit)
        for limit in requirements.limits()
    }
    return document | {"fit": True} if requirements.fit else document


def _lengths_document(lengths: Mapping[str, float]) -> Document:
    return {name: exact_text(value, "m", "m") for name, value in lengths.items()}
