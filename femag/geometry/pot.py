"""Pot cores from their dimensions."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from femag.errors import InputError, entry_key, number
from femag.geometry.gaps import Gap, gap_length
from femag.geometry.section import Cut, Region, rectangle

LENGTH = "a length above 0"
DIMENSIONS = (
    "outer_diameter",
    "window_diameter",
    "post_diameter",
    "hole_diameter",
    "height",
    "window_height",
)
"""Names of a pot core's dimensions."""


@dataclass(frozen=True)
class PotCore:
    """A pot core of two halves: dimensions of the assembled, ungapped set, in m.

    Parameters
    ----------
    outer_diameter, window_diameter, post_diameter : float
        Outside of the ring, inside of the ring, centre post.
    hole_diameter : float
        Hole along the axis; 0 for none.
    height : float
        Overall height of the set.
    window_height : float
        Height of the winding space of the set.
    name : str
        For print.
    """

    outer_diameter: float
    window_diameter: float
    post_diameter: float
    height: float
    window_height: float
    hole_diameter: float = 0.0
    name: str = field(default="", compare=False)

    def __post_init__(self) -> None:
        for name in DIMENSIONS:
            accepted = "a length of 0 or more" if name == "hole_diameter" else LENGTH
            value = number(getattr(self, name), f"core.dimensions.{name}", accepted)
            if not 0.0 <= value < np.inf or (value == 0.0 and accepted == LENGTH):
                raise _dimension_error("out of range", name, value, accepted)
        for smaller, larger in (
            ("hole_diameter", "post_diameter"),
            ("post_diameter", "window_diameter"),
            ("window_diameter", "outer_diameter"),
            ("window_height", "height"),
        ):
            limit = getattr(self, larger)
            if getattr(self, smaller) >= limit:
                raise _dimension_error(
                    f"must be smaller than {larger}",
                    smaller,
                    getattr(self, smaller),
                    f"less than {limit * 1e3:g} mm",
                )

    @property
    def hole_radius(self) -> float:
        """Radius of the hole, m."""
        return self.hole_diameter / 2

    @property
    def post_radius(self) -> float:
        """Radius of the post, m."""
        return self.post_diameter / 2

    @property
    def window_radius(self) -> float:
        """Inner radius of the ring, m."""
        return self.window_diameter / 2

    @property
    def outer_radius(self) -> float:
        """Outer radius of the ring, m."""
        return self.outer_diameter / 2

    @property
    def plate_thickness(self) -> float:
        """Thickness of each end plate, m."""
        return (self.height - self.window_height) / 2


def half_window_height(core: PotCore, gaps: Sequence[Gap]) -> float:
    """Return half the window height of the gapped set in m: a spacer adds to it."""
    return (core.window_height + gap_length(gaps, "all")) / 2


def pot_regions(core: PotCore, gaps: Sequence[Gap]) -> tuple[Region, ...]:
    """Return post, plates, ring, gaps and window as regions, z = 0 in the middle."""
    spacer = gap_length(gaps, "all")
    post_gap = spacer + gap_length(gaps, "post")
    _check_gap(core, gaps)
    half_window = half_window_height(core, gaps)
    half_height = half_window + core.plate_thickness
    return (
        *_leg(core.hole_radius, core.post_radius, half_window, post_gap, "post"),
        *_leg(core.window_radius, core.outer_radius, half_window, spacer, "ring"),
        Region(
            "upper plate",
            "core",
            rectangle(core.hole_radius, core.outer_radius, half_window, half_height),
        ),
        Region(
            "lower plate",
            "core",
            rectangle(core.hole_radius, core.outer_radius, -half_height, -half_window),
        ),
        Region(
            "window",
            "air",
            rectangle(core.post_radius, core.window_radius, -half_window, half_window),
        ),
    )


def pot_cuts(core: PotCore, gaps: Sequence[Gap]) -> tuple[Cut, ...]:
    """Return the cuts through the upper half whose mean flux density is reported."""
    face = (gap_length(gaps, "all") + gap_length(gaps, "post")) / 2
    half_window = half_window_height(core, gaps)
    half_height = half_window + core.plate_thickness
    return (
        Cut("post, at the gap", (core.hole_radius, face), (core.post_radius, face)),
        Cut("post, at the plate", (core.hole_radius, half_window), (core.post_radius, half_window)),
        Cut("plate, at the post", (core.post_radius, half_window), (core.post_radius, half_height)),
        Cut(
            "plate, at the ring",
            (core.window_radius, half_window),
            (core.window_radius, half_height),
        ),
        Cut(
            "ring, at the joint",
            (core.window_radius, gap_length(gaps, "all") / 2),
            (core.outer_radius, gap_length(gaps, "all") / 2),
        ),
    )


def _leg(r0: float, r1: float, half_window: float, gap: float, name: str) -> Iterator[Region]:
    if gap == 0.0:
        yield Region(name, "core", rectangle(r0, r1, -half_window, half_window))
        return
    yield Region(f"upper {name}", "core", rectangle(r0, r1, gap / 2, half_window))
    yield Region(f"{name} gap", "air", rectangle(r0, r1, -gap / 2, gap / 2))
    yield Region(f"lower {name}", "core", rectangle(r0, r1, -half_window, -gap / 2))


def _check_gap(core: PotCore, gaps: Sequence[Gap]) -> None:
    for index, gap in enumerate(gaps):
        if gap.leg == "post" and gap.length >= core.window_height:
            raise InputError(
                "the gap is longer than the post",
                key=f"{entry_key('gap', index)}.length",
                value=gap.length,
                accepted=f"less than the window height, {core.window_height * 1e3:g} mm",
            )


def _dimension_error(problem: str, name: str, value: float, accepted: str) -> InputError:
    return InputError(problem, key=f"core.dimensions.{name}", value=value, accepted=accepted)
