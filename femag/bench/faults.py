"""What makes a record useless before any period is sought: a dead or a clipped channel."""

from __future__ import annotations

import numpy as np

from femag.bench.capture import Array, Capture
from femag.errors import InputError

SHORTEST_FLAT = 5
"""Samples in a row at the extreme that make a flat top."""

PILED = 4.0
"""Samples at the extreme level over those at the next level. The rounded top of a signal that a
converter has put into steps has at most 1/(sqrt(2) - 1) = 2.4 of them."""

JUMP = 0.2
"""Share of the swing: a flat top that is reached by a larger step is one of a square wave."""


def refuse_faults(capture: Capture, *, flat_tops: bool = False) -> None:
    """Refuse a capture with a constant or, unless `flat_tops`, a clipped channel.

    Raises
    ------
    InputError
        In one line that says which channel.
    """
    for label, channel in (("current", capture.current), ("voltage", capture.voltage)):
        if np.ptp(channel) <= 1e-9 * np.abs(channel).max():
            raise InputError(
                f"the {label} is constant, {channel[0]:g} throughout", file=capture.name,
                accepted="a periodic signal in both channels",
            )  # fmt: skip
        count = 0 if flat_tops else clipped_samples(channel)
        if count:
            raise InputError(
                f"the {label} is clipped: {count} samples lie on flat tops at its extremes",
                file=capture.name,
                accepted="a record within the range of the scope; --flat-tops if they are real",
            )


def clipped_samples(channel: Array) -> int:
    """Return how many samples lie at extremes with flat tops, like those of a converter at its end.

    Flat means exactly equal samples in a row at the largest or the least value, many more than at
    the next level, and reached over a slope. What an amplifier clips before noise is added is not
    found, nor a square wave that is clipped at its tops.
    """
    return sum(_samples_on_flat_tops(sign * channel) for sign in (1.0, -1.0))


def _samples_on_flat_tops(channel: Array) -> int:
    top, swing = channel.max(), np.ptp(channel)
    is_top = channel == top
    steps = np.diff(is_top.astype(np.int8), prepend=0, append=0)
    starts, ends = np.flatnonzero(steps == 1), np.flatnonzero(steps == -1)
    long = ends - starts >= SHORTEST_FLAT
    if not long.any() or is_top.sum() <= PILED * _samples_at_next_level(channel, top):
        return 0
    before = top - channel[np.maximum(starts[long] - 1, 0)]
    after = top - channel[np.minimum(ends[long], channel.size - 1)]
    sloped = np.maximum(before, after) < JUMP * swing
    return int(is_top.sum()) if 2 * np.count_nonzero(sloped) > sloped.size else 0


def _samples_at_next_level(channel: Array, top: float) -> int:
    below = channel[channel < top]
    return int(np.count_nonzero(below == below.max()))
