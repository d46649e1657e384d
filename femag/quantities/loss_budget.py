"""What heats the device, added up."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class LossBudget:
    """Losses under current and ripple, W; None where one is not known.

    Parameters
    ----------
    core : float or None
        Of the core under the ripple.
    copper_dc : float or None
        Of the mean current in all windings.
    copper_ripple : float or None
        Of the ripple in all windings: its own current and its field across the strands.
    """

    core: float | None
    copper_dc: float | None
    copper_ripple: float | None = None

    @property
    def entries(self) -> dict[str, float | None]:
        """Each loss by its name in words."""
        return {
            "core": self.core,
            "copper, mean current": self.copper_dc,
            "copper, ripple": self.copper_ripple,
        }

    @property
    def total(self) -> float:
        """Sum of the known losses, W."""
        return sum(loss for loss in self.entries.values() if loss is not None)

    @property
    def missing(self) -> tuple[str, ...]:
        """Losses that are not in the total."""
        return tuple(name for name, loss in self.entries.items() if loss is None)
