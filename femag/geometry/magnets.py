"""Permanent magnets as an engineer orders them: remanence and recoil line."""

from __future__ import annotations

from dataclasses import dataclass

from femag.errors import InputError, number

STRONGEST = 2.0
"""Largest remanence that is accepted, T; no permanent magnet comes near it."""
STEEPEST = 100.0
"""Largest relative recoil permeability that is accepted."""


@dataclass(frozen=True)
class Magnet:
    """A permanent magnet on its recoil line, B = mu0 mu_rec H + Br along the axis of the core.

    Parameters
    ----------
    remanence : float
        Br in T. Above 0 it drives flux the way that a positive current does, below 0 against it.
    recoil_permeability : float
        Relative slope mu_rec of the line, 1 or more; the same across the axis.
    """

    remanence: float
    recoil_permeability: float = 1.05

    def __post_init__(self) -> None:
        accepted = f"a flux density of either sign up to {STRONGEST:g} T, not 0"
        remanence = number(self.remanence, "gap.magnet.remanence", accepted)
        if not 0.0 < abs(remanence) <= STRONGEST:
            raise InputError(
                "remanence out of range", key="gap.magnet.remanence", value=self.remanence,
                accepted=accepted,
            )  # fmt: skip
        accepted = f"a number from 1 to {STEEPEST:g}, such as 1.05"
        slope = number(self.recoil_permeability, "gap.magnet.recoil_permeability", accepted)
        if not 1.0 <= slope <= STEEPEST:
            raise InputError(
                "recoil permeability out of range", key="gap.magnet.recoil_permeability",
                value=self.recoil_permeability, accepted=accepted,
            )  # fmt: skip
