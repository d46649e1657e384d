"""Gaps with other lengths, or in a set with another window; what lies at a plate stays there."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from femag.geometry.gaps import SLACK, Gap, gap_length


def changed_gaps(
    gaps: Sequence[Gap], changes: Mapping[int, float], heights: tuple[float, float]
) -> tuple[Gap, ...]:
    """Return gaps whose faces are farther apart at every radius.

    Parameters
    ----------
    gaps : sequence of Gap
        As they were.
    changes : mapping of int to float
        What is added to the total length of each gap, m, by its place in `gaps`.
    heights : pair of float
        Window height of the ungapped set before and after, m.
    """
    longer = tuple(_longer(gap, changes.get(place, 0.0)) for place, gap in enumerate(gaps))
    before = (heights[0] + gap_length(gaps, "all")) / 2
    after = (heights[1] + gap_length(longer, "all")) / 2
    return tuple(
        _at_plate(new, after) if _is_at_plate(gap, before) else new
        for gap, new in zip(gaps, longer, strict=True)
    )


def with_gap_length(gaps: Sequence[Gap], length: float, window_height: float) -> tuple[Gap, ...]:
    """Return gaps of which the first has another total length in m, whatever its faces.

    Parameters
    ----------
    gaps : sequence of Gap
        As they were.
    length : float
        m.
    window_height : float
        Of the ungapped set, m.
    """
    first = replace(gaps[0], length=length)
    half = (window_height + gap_length(gaps, "all")) / 2
    if _is_at_plate(gaps[0], half):
        first = _at_plate(first, half)
    return first, *gaps[1:]


def _longer(gap: Gap, change: float) -> Gap:
    """Return a gap that is longer at every radius; a step without a gap stays closed."""
    rim = None if gap.rim_length is None else gap.rim_length + change
    step = gap.step
    if step is not None and step.length > 0.0:
        step = replace(step, length=step.length + change)
    return replace(gap, length=gap.length + change, rim_length=rim, step=step)


def _is_at_plate(gap: Gap, half: float) -> bool:
    """Return whether a gap in one piece reaches the plate, at `half` m from the middle."""
    reach = abs(gap.offset) + gap.length / 2
    return gap.leg == "post" and gap.pieces == 1 and abs(half - reach) < SLACK * 2 * half


def _at_plate(gap: Gap, half: float) -> Gap:
    middle = round(half - gap.length / 2, 15)  # no digits of rounding in files
    return replace(gap, offset=float(np.copysign(middle, gap.offset)))
