"""The hand calculation of a core: one reluctance network, solved with every fringing formula."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from femag.errors import InputError
from femag.geometry import Gap, PotCore, gap_length, half_window_height
from femag.hand.effective import core_sections
from femag.hand.fringing import FORMULAS, GapShape, no_fringing
from femag.hand.network import Branch, network_state
from femag.materials import AIR, MagnetisationCurve

Tube = tuple[float, float, MagnetisationCurve]
"""Length in m, area in m2, and curve of one branch."""


@dataclass(frozen=True)
class HandEstimate:
    """What one fringing formula makes of a design.

    Parameters
    ----------
    name : str
        Name of the formula.
    inductance : float
        Energy inductance 2 W'/I^2 of the network, H.
    in_range : bool
        Whether every gap of the design is inside the formula's range.
    range : str
        The range in words.
    source : str
        Citation, and how it was checked.
    """

    name: str
    inductance: float
    in_range: bool
    range: str
    source: str


def hand_estimates(
    core: PotCore,
    gaps: Sequence[Gap],
    turns: int,
    current: float,
    curve: MagnetisationCurve,
) -> tuple[HandEstimate, ...]:
    """Return the estimate of every formula; without a gap, of the network alone.

    Parameters
    ----------
    core : PotCore
        The core.
    gaps : sequence of Gap
        At most one for each kind of leg; none for an ungapped core.
    turns : int
        Turns that carry the current.
    current : float
        A.
    curve : MagnetisationCurve
        What the core is made of.

    Raises
    ------
    InputError
        If turns or current cannot be used.
    NumericalError
        If the network cannot be solved.
    """
    shapes = gap_shapes(core, gaps)
    formulas = FORMULAS if shapes else FORMULAS[:1]
    return tuple(
        HandEstimate(
            name=formula.name,
            inductance=_inductance(core, gaps, turns, current, curve, formula.factor),
            in_range=all(formula.in_range(shape) for shape in shapes),
            range=formula.range,
            source=formula.source,
        )
        for formula in formulas
    )


def plain_inductance(
    core: PotCore,
    gaps: Sequence[Gap],
    turns: int,
    current: float,
    curve: MagnetisationCurve,
) -> float:
    """Return the energy inductance in H of the network without fringing.

    Parameters and errors are those of `hand_estimates`.
    """
    return _inductance(core, gaps, turns, current, curve, no_fringing)


def gap_shapes(core: PotCore, gaps: Sequence[Gap]) -> tuple[GapShape, ...]:
    """Return the shape of the gap in the post and of that in the ring, as far as there are any.

    A spacer opens both legs in the middle, so that in the post it adds to the gap that is ground.
    """
    spacer, half_height = gap_length(gaps, "all"), half_window_height(core, gaps)
    post = spacer + gap_length(gaps, "post")
    shapes = []
    if post > 0.0:
        shapes.append(GapShape(post, core.post_radius, core.hole_radius, half_height, "post"))
    if spacer > 0.0:
        shapes.append(GapShape(spacer, core.outer_radius, core.window_radius, half_height, "ring"))
    return tuple(shapes)


def pot_network(
    core: PotCore,
    gaps: Sequence[Gap],
    mmf: float,
    curve: MagnetisationCurve,
    factor: Callable[[GapShape], float],
) -> tuple[Branch, ...]:
    """Return the branches of a gapped pot core, closed in a loop, with the winding in the post.

    Parameters
    ----------
    core : PotCore
        The core.
    gaps : sequence of Gap
        Its gaps.
    mmf : float
        Ampere turns, A.
    curve : MagnetisationCurve
        What the core is made of.
    factor : callable
        Fringing factor of a gap; its excess over 1 is a branch parallel to the gap's block.
    """
    shapes: dict[str, GapShape] = {shape.leg: shape for shape in gap_shapes(core, gaps)}
    links: list[tuple[str, list[Tube]]] = []
    for section in core_sections(core, gap_length(gaps, "post")):
        links.append((section.name, [(section.length, section.area, curve)]))
        if (shape := shapes.get(section.name)) is not None:
            areas = (shape.area, shape.area * (factor(shape) - 1.0))
            gap_tubes: list[Tube] = [(shape.length, area, AIR) for area in areas if area > 0.0]
            links.append((f"{section.name} gap", gap_tubes))
    nodes = [name for name, _ in links]
    return tuple(
        Branch(node, end, length, area, law, mmf if node == "post" else 0.0)
        for (node, tubes), end in zip(links, nodes[1:] + nodes[:1], strict=True)
        for length, area, law in tubes
    )


def _inductance(
    core: PotCore,
    gaps: Sequence[Gap],
    turns: int,
    current: float,
    curve: MagnetisationCurve,
    factor: Callable[[GapShape], float],
) -> float:
    if not (np.isfinite(current) and current != 0.0):
        raise InputError(
            "a current is needed", key="current", value=current,
            accepted="a current that is not 0",
        )  # fmt: skip
    if turns < 1:
        raise InputError("no turns", key="turns", value=turns, accepted="1 or more")
    branches = pot_network(core, gaps, turns * current, curve, factor)
    return network_state(branches).energy_inductance(current)
