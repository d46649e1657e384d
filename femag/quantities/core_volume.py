"""How the flux density spreads over the volume of the core."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from femag.field.bounds import FieldSolution

Array = NDArray[np.float64]

SHARES = (0.5, 0.9, 0.99)


@dataclass(frozen=True)
class VolumeShare:
    """A share of the core's volume and the flux density that it stays below.

    Parameters
    ----------
    share : float
        Of the core's volume.
    flux_density : float
        Magnitude, T.
    """

    share: float
    flux_density: float


def volume_shares(
    solution: FieldSolution, shares: tuple[float, ...] = SHARES
) -> tuple[VolumeShare, ...]:
    """Return the flux density that each share of the core's volume stays below.

    Unlike the largest value, which grows without limit at a sharp corner as the mesh is refined,
    these hardly depend on the mesh. From the flux side, at its quadrature points.
    """
    magnitude, volume = _core_flux_density(solution)
    order = np.argsort(magnitude)
    filled = np.cumsum(volume[order])
    place = np.searchsorted(filled, np.array(shares) * filled[-1])
    found = magnitude[order][np.minimum(place, len(order) - 1)]
    return tuple(VolumeShare(share, float(b)) for share, b in zip(shares, found, strict=True))


def core_share_above(solution: FieldSolution, flux_density: float) -> float:
    """Return the share of the core's volume in which |B| is above a flux density in T."""
    magnitude, volume = _core_flux_density(solution)
    return float(volume[magnitude > flux_density].sum() / volume.sum())


def _core_flux_density(solution: FieldSolution) -> tuple[Array, Array]:
    """Return |B| in T and volume in m3 at the core's quadrature points."""
    mesh = solution.sides.mesh
    cores = [mesh.names.index(r.name) for r in mesh.section.regions if r.role == "core"]
    inside = np.isin(mesh.region, cores)
    b = solution.flux.field[inside]
    weight = solution.sides.discretisation.weight[inside]
    return np.hypot(b[:, 0], b[:, 1]).ravel(), weight.ravel()
