"""Core loss under the ripple by the improved generalised Steinmetz equation, point by point."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution
from femag.field.swing import Swing, swing
from femag.materials import Steinmetz
from femag.mesh import SectionMesh
from femag.quantities.shape_of_swing import shape_ratio
from femag.quantities.waveform_factor import loop_shares, waveform_factor
from femag.ripple import Ripple

Array = NDArray[np.float64]

PARTS = {"post": "post", "plates": "plate", "ring": "ring"}
"""Parts of the core, and the word that the names of their regions hold."""
SHARES = (0.5, 0.9, 0.99)


@dataclass(frozen=True)
class PartLoss:
    """Core loss of a part of the core.

    Parameters
    ----------
    name : str
        "post", "plates" or "ring" (the legs of a core with straight legs).
    volume : float
        As it is solved, m3.
    loss : float
        W.
    """

    name: str
    volume: float
    loss: float


@dataclass(frozen=True)
class LossShare:
    """A share of the core's volume and the peak flux density and loss that it stays below.

    Parameters
    ----------
    share : float
        Of the core's volume.
    flux_density : float
        Half the swing of B, T.
    loss_density : float
        W/m3.
    """

    share: float
    flux_density: float
    loss_density: float


@dataclass(frozen=True)
class CoreLoss:
    """Loss of the core under the ripple; a bias is not in the method.

    Parameters
    ----------
    total : float
        W: mean of both sides.
    total_of_sides : tuple of float
        From the flux side and from the potential side; the difference estimates the error and
        bounds nothing.
    parts : tuple of PartLoss
        Post, plates and ring.
    volume_shares : tuple of LossShare
        What half, 90 % and 99 % of the core's volume stay below.
    waveform_factor : float
        Loss over that of a sine of equal swing and frequency.
    minor_loops : int
        Loops in the waveform besides the major one.
    frequency_in_range : bool
        Whether the parameters were fitted at the ripple's frequency.
    share_in_range : float
        Share of the loss where the swing lies in the range that the parameters were fitted in.
    bend : float
        What it adds, as a share, that B does not follow the current in proportion; in `total`.
    material : Steinmetz
        Parameters that were used.
    swing : Swing or None
        The fields; None when read from a file.
    """

    total: float
    total_of_sides: tuple[float, float]
    parts: tuple[PartLoss, ...]
    volume_shares: tuple[LossShare, ...]
    waveform_factor: float
    minor_loops: int
    frequency_in_range: bool
    share_in_range: float
    bend: float
    material: Steinmetz
    swing: Swing | None = field(default=None, repr=False, compare=False)

    @property
    def mean_density(self) -> float:
        """Loss over the volume of the core, W/m3."""
        return self.total / sum(part.volume for part in self.parts)


def core_loss(solution: FieldSolution, ripple: Ripple, material: Steinmetz) -> CoreLoss:
    """Return the core loss of a ripple whose peak is the current of a solution.

    Parameters
    ----------
    solution : FieldSolution
        Fields at the peak.
    ripple : Ripple
        What alternates.
    material : Steinmetz
        Loss parameters of the core.

    Raises
    ------
    NumericalError
        If the field at the other end of the ripple cannot be solved.
    """
    between = swing(solution, ripple.trough(solution.current))
    inside = core_elements(solution.sides.mesh)
    volume = between.weight[inside]
    factor = waveform_factor(ripple, material.alpha, material.beta)
    changes = [_magnitude(change[inside]) for change in between.change_of_sides]
    straight = [
        factor * material.loss_density(ripple.frequency, 0.5 * change) for change in changes
    ]
    in_proportion = volume * 0.5 * (straight[0] + straight[1])
    exponents = material.alpha, material.beta
    ratio = shape_ratio(between, inside, in_proportion, ripple, exponents)
    of_sides = [ratio * density for density in straight]
    change, density = 0.5 * (changes[0] + changes[1]), 0.5 * (of_sides[0] + of_sides[1])
    loss = volume * density
    low, high = material.flux_densities
    fitted = (change >= 2.0 * low) & (change <= 2.0 * high)
    total = float(loss.sum())
    return CoreLoss(
        total=total,
        total_of_sides=(float(np.sum(volume * of_sides[0])), float(np.sum(volume * of_sides[1]))),
        parts=_parts(solution.sides.mesh, inside, volume, loss),
        volume_shares=_volume_shares(volume, change, density),
        waveform_factor=factor,
        minor_loops=0 if ripple.shape == "sine" else len(loop_shares(ripple, material.alpha)) - 1,
        frequency_in_range=material.frequencies[0] <= ripple.frequency <= material.frequencies[1],
        share_in_range=float(loss[fitted].sum()) / total,
        bend=total / float(in_proportion.sum()) - 1.0,
        material=material,
        swing=between,
    )


def core_elements(mesh: SectionMesh) -> NDArray[np.bool_]:
    """Return which elements of a mesh belong to the core."""
    cores = [mesh.names.index(r.name) for r in mesh.section.regions if r.role == "core"]
    return np.isin(mesh.region, cores)


def _magnitude(b: Array) -> Array:
    return np.asarray(np.hypot(b[:, 0], b[:, 1]))


def _parts(
    mesh: SectionMesh, inside: NDArray[np.bool_], volume: Array, loss: Array
) -> tuple[PartLoss, ...]:
    names = np.array(mesh.names)[mesh.region[inside]]
    parts = []
    for part, word in PARTS.items():
        here = np.char.find(names, word) >= 0
        parts.append(PartLoss(part, float(volume[here].sum()), float(loss[here].sum())))
    return tuple(parts)


def _volume_shares(volume: Array, change: Array, density: Array) -> tuple[LossShare, ...]:
    order = np.argsort(change, axis=None)
    filled = np.cumsum(volume.ravel()[order])
    places = np.searchsorted(filled, np.array(SHARES) * filled[-1])
    found = order[np.minimum(places, len(order) - 1)]
    return tuple(
        LossShare(share, float(0.5 * change.flat[i]), float(density.flat[i]))
        for share, i in zip(SHARES, found, strict=True)
    )
