"""Air gaps as an engineer orders them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from femag.errors import InputError, number

Leg = Literal["post", "all"]


@dataclass(frozen=True)
class Gap:
    """One air gap.

    Parameters
    ----------
    length : float
        Total length in m: ground away from the post, or added to the height by a spacer.
    leg : {"post", "all"}
        In the centre post only, or in all legs (a spacer between the halves).
    """

    length: float
    leg: Leg = "post"

    def __post_init__(self) -> None:
        accepted = "a length above 0; leave the gap out for an ungapped core"
        if not 0.0 < number(self.length, "gap.length", accepted) < np.inf:
            raise InputError(
                "the gap must be positive",
                key="gap.length",
                value=self.length,
                accepted=accepted,
            )
        if self.leg not in ("post", "all"):
            raise InputError(
                "unknown leg", key="gap.leg", value=self.leg, accepted="'post' or 'all'"
            )


def gap_length(gaps: Sequence[Gap], leg: Leg) -> float:
    """Return the length in m of the gap that is ordered for `leg`, 0 if there is none.

    Raises
    ------
    InputError
        If one leg has several gaps; their places would have to be said.
    """
    lengths = [gap.length for gap in gaps if gap.leg == leg]
    if len(lengths) > 1:
        raise InputError(
            f"{len(lengths)} gaps with leg = {leg!r}", key="gap", accepted="one gap for each leg"
        )
    return lengths[0] if lengths else 0.0
