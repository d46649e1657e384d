"""The figures of the sheet, each with what it shows in words."""

from __future__ import annotations

from base64 import b64encode
from dataclasses import dataclass
from functools import partial
from typing import Literal

from femag.geometry import PotCore
from femag.plot import (
    convergence,
    copper_map,
    core_drawing,
    core_loss_map,
    figure_bytes,
    flux_map,
    gap_map,
    inductance_figure,
    layer_bars,
    layer_field,
    material_curve,
    post_face_field,
    section_drawing,
    untitled,
)
from femag.plot.figure_file import PAGE_RESOLUTION, Draw
from femag.plot.flux_map import Window, gap_window, section_window
from femag.result import Result
from femag.review import Review

Kind = Literal["svg", "png"]
HALF = (4.4, 3.3)
"""Width and height of a figure that shares a line of the page with another, inch."""
MAP = (4.4, 4.4)
"""The same of a map, inch."""
BESIDE_MAP = 1.35
UNDER_MAP = 0.5
HIGHEST = 5.8
"""Room for the scale beside a map and for the axis under it, and the highest map, inch."""
PIXELS = 100
"""Of the page to an inch of a figure."""
TYPES = {"svg": "image/svg+xml", "png": "image/png"}


@dataclass(frozen=True)
class Figure:
    """A figure as it stands in the page.

    Parameters
    ----------
    name : str
        For links.
    caption : str
        What it shows.
    source : str
        The picture as an address that holds it.
    width : int
        Width at which it is shown where there is room, px.
    is_wide : bool
        Whether it takes the whole width.
    """

    name: str
    caption: str
    source: str
    width: int
    is_wide: bool = False


def review_figures(review: Review) -> dict[str, Figure]:
    """Return every figure of the sheet by its name."""
    drawn, current = review.drawn, f"{review.result.current:g} A"
    gapped = bool(review.design.gaps)
    inductance = partial(
        inductance_figure,
        review.curve,
        measured=review.measured,
        residuals=review.residuals or None,
    )
    figures = [
        *_drawings(review),
        _figure("section", untitled(partial(flux_map, drawn)), "png",
                _map_panel(section_window(review.design)),
                f"Flux lines over flux density at {current}: the whole section. Equal flux flows "
                "between neighbouring lines."),
        _figure("gap", untitled(partial(gap_map, drawn)), "png",
                _map_panel(gap_window(review.design)),
                f"The same around the {'outer edge of the gap' if gapped else 'post'} at "
                f"{current}, with what of the flux reaches the copper."),
        _figure("post-face", partial(post_face_field, drawn), "svg", HALF,
                _across(gapped, current)),
        _figure("layer", partial(layer_field, drawn), "svg", HALF,
                f"Flux density along the inner face of the innermost winding at {current}."),
        _figure("inductance", untitled(inductance, grid=True), "svg", (7.2, 3.7),
                "Apparent inductance (flux linkage over current) and incremental inductance (for "
                "small changes) against current.", is_wide=True),
        _figure("material", partial(material_curve, review.result), "svg", HALF,
                "Magnetisation curve of the core's material, and where the sections of the core "
                f"stand at {current}."),
        _figure("convergence",
                partial(convergence, review.meshes, tolerance=review.design.tolerance),
                "svg", HALF, "Both bounds on a row of ever finer meshes: how far off the last "
                "middle they are."),
        *_losses(review.result),
    ]  # fmt: skip
    return {figure.name: figure for figure in figures}


def _across(gapped: bool, current: str) -> str:
    """Return what the figure of the field across the gap shows."""
    if not gapped:
        return f"Axial flux density half way up the window against the radius at {current}."
    return (
        f"Axial flux density across the gap against the radius at {current}. At the sharp edges of "
        "the face it has no limit; the picture cuts it off."
    )


def _drawings(review: Review) -> list[Figure]:
    """Return the drawing of the section, and of the core as ordered where that is another."""
    design, solved = review.design, "core"
    if not isinstance(design.core, PotCore):
        solved = "the core of revolution that is solved instead of the core"
    drawings = [
        _figure("drawing", partial(section_drawing, design), "svg", (5.6, 4.2),
                f"Section through {solved}, gap and copper, dimensions in mm.", is_wide=True)
    ]  # fmt: skip
    if not isinstance(design.core, PotCore):
        drawings.append(
            _figure("core", untitled(partial(core_drawing, design.core)), "svg", (5.6, 6.4),
                    "The core as ordered, without gap, dimensions in mm: section through the legs "
                    "and view along the post.", is_wide=True)
        )  # fmt: skip
    return drawings


def _losses(result: Result) -> list[Figure]:
    """Return where the losses arise, as far as they are known."""
    figures = []
    if any(loss.layers for loss in result.copper_loss):
        figures.append(
            _figure("layer-loss", untitled(partial(layer_bars, result), grid=True), "svg", MAP,
                    "Loss of the copper by layers, from inside.")
        )  # fmt: skip
    if any(loss.crossing_of_turns for loss in result.copper_loss):
        figures.append(
            _figure("copper-loss", untitled(partial(copper_map, result)), "svg", MAP,
                    "Loss that the ripple's field causes in each turn, by length.")
        )  # fmt: skip
    if result.core_loss is not None:
        figures.append(
            _figure("core-loss", untitled(partial(core_loss_map, result)), "png", MAP,
                    "Density of the core loss under the ripple, on a logarithmic scale.")
        )  # fmt: skip
    return figures


def _map_panel(window: Window) -> tuple[float, float]:
    """Return width and height in inch of a map that shows a window beside its scale."""
    r0, r1, z0, z1 = window
    return HALF[0], min((HALF[0] - BESIDE_MAP) * (z1 - z0) / (r1 - r0) + UNDER_MAP, HIGHEST)


def _figure(
    name: str,
    draw: Draw,
    kind: Kind,
    panel: tuple[float, float],
    caption: str,
    *,
    is_wide: bool = False,
) -> Figure:
    content = figure_bytes(draw, kind, panel)
    picture = b64encode(content).decode("ascii")
    width = round(PIXELS * _width(content, kind))
    return Figure(name, caption, f"data:{TYPES[kind]};base64,{picture}", width, is_wide)


def _width(content: bytes, kind: Kind) -> float:
    """Return the width of a picture in inch."""
    if kind == "png":
        return int.from_bytes(content[16:20]) / PAGE_RESOLUTION
    return float(content.split(b'width="', 1)[1].split(b"pt", 1)[0]) / 72.0
