"""Reluctance networks: any graph of branches, each with its own curve, solved for node potentials.

The co-energy of all branches is a convex function of the node potentials, and its slopes are
the fluxes that leave the nodes: its minimum is the state in which every node's fluxes sum to
zero. Newton's method with a line search finds it for any increasing curves.

References
----------
W. Millar, "Some general theorems for non-linear systems possessing resistance", Phil. Mag. 42
(1951) 1150, for content and co-content of nonlinear networks (cited from memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from femag.errors import InputError, NewtonError, NumericalError
from femag.line_search import step_length
from femag.materials import MagnetisationCurve
from femag.units import MU_0

Array = NDArray[np.float64]
Index = NDArray[np.int64]

MAXIMUM_ITERATIONS = 200
ACCURACY = 1e-18
"""Squared Newton decrement over the co-energy before the last full step."""


@dataclass(frozen=True)
class Branch:
    """A flux tube of one section and one material between two nodes.

    Its field strength is (potential of start - potential of end + mmf) / length, and its flux
    counts from start to end.

    Parameters
    ----------
    start, end : str
        Names of the nodes; equal for a tube closed on itself.
    length : float
        m.
    area : float
        m2.
    curve : MagnetisationCurve
        B against H in the tube.
    mmf : float
        Ampere turns in the branch, A.
    """

    start: str
    end: str
    length: float
    area: float
    curve: MagnetisationCurve
    mmf: float = 0.0

    def __post_init__(self) -> None:
        for key in ("length", "area"):
            value = getattr(self, key)
            if not (np.isfinite(value) and value > 0):
                raise InputError(
                    "a branch must have a positive size", key=key, value=value,
                    accepted="a number above 0",
                )  # fmt: skip
        if not np.isfinite(self.mmf):
            raise InputError("ampere turns out of range", key="mmf", value=self.mmf)


@dataclass(frozen=True)
class NetworkState:
    """The solved network.

    Parameters
    ----------
    branches : tuple of Branch
        The network.
    nodes : tuple of str
        Names of the nodes.
    potential : array, (nodes,)
        Magnetic potential, A; zero at the first node of each connected part.
    field_strength, flux : array, (branches,)
        H in A/m and flux in Wb, from start to end.
    coenergy : float
        Sum over the branches of volume times co-energy density, J.
    history : tuple of float
        Squared Newton decrement over the co-energy, one entry an iteration.
    """

    branches: tuple[Branch, ...]
    nodes: tuple[str, ...]
    potential: Array
    field_strength: Array
    flux: Array
    coenergy: float
    history: tuple[float, ...]

    def flux_linkage(self, current: float) -> float:
        """Return the flux linkage in Wb of the winding that drives all mmf with `current` (A)."""
        mmf = np.array([branch.mmf for branch in self.branches])
        return float(self.flux @ mmf) / current

    def flux_through(self, node: str) -> float:
        """Return the flux in Wb that leaves a node along the branches that start there."""
        starts = np.array([branch.start == node for branch in self.branches])
        return float(np.sum(self.flux[starts]))

    def energy_inductance(self, current: float) -> float:
        """Return 2 W'/I^2 in H for the current (A) behind all mmf."""
        return 2.0 * self.coenergy / current**2


def network_state(branches: Sequence[Branch]) -> NetworkState:
    """Return potentials, fluxes and co-energy of a reluctance network.

    Raises
    ------
    InputError
        If there is no branch.
    NewtonError
        If Newton's method does not converge; the error holds the history.
    NumericalError
        If the node equations cannot be solved.
    """
    tubes = _tubes(branches)
    linear = all(branch.curve.is_linear for branch in branches)
    potential = _first_potential(tubes)
    history: list[float] = []
    while True:
        gradient = _outflow(tubes, potential)
        step = _solved(_node_permeance(tubes, _strength(tubes, potential)), -gradient)
        decrement = float(-gradient @ step)
        coenergy = _coenergy(tubes, potential)
        history.append(abs(decrement) / coenergy if coenergy > 0 else 0.0)
        if linear or history[-1] <= ACCURACY:
            return _state(tubes, potential + step, history)
        if len(history) == MAXIMUM_ITERATIONS:
            raise NewtonError("Newton's method did not converge on the network", history)
        length = step_length(partial(_slope, tubes, potential, step), decrement)
        potential = potential + length * step


@dataclass(frozen=True)
class _Tubes:
    """The branches as arrays: `drop` maps free potentials to the fall along each branch."""

    branches: tuple[Branch, ...]
    nodes: tuple[str, ...]
    free: Index
    drop: Array
    mmf: Array
    length: Array
    area: Array
    groups: tuple[tuple[MagnetisationCurve, Index], ...]


def _tubes(branches: Sequence[Branch]) -> _Tubes:
    if not branches:
        raise InputError("a network without branches", key="branches", accepted="at least one")
    nodes = tuple(dict.fromkeys(name for b in branches for name in (b.start, b.end)))
    number = {name: index for index, name in enumerate(nodes)}
    ends = np.array([(number[b.start], number[b.end]) for b in branches])
    drop = np.zeros((len(branches), len(nodes)))
    np.add.at(drop, (np.arange(len(branches)), ends[:, 0]), 1.0)
    np.add.at(drop, (np.arange(len(branches)), ends[:, 1]), -1.0)
    graph = coo_array((np.ones(len(branches)), ends.T), shape=(len(nodes), len(nodes)))
    _, part = connected_components(graph, directed=False)
    grounded = np.unique(part, return_index=True)[1]
    free = np.setdiff1d(np.arange(len(nodes)), grounded)
    curves = [branch.curve for branch in branches]
    distinct = [curve for i, curve in enumerate(curves) if curve not in curves[:i]]
    return _Tubes(
        branches=tuple(branches),
        nodes=nodes,
        free=free,
        drop=drop[:, free],
        mmf=np.array([branch.mmf for branch in branches]),
        length=np.array([branch.length for branch in branches]),
        area=np.array([branch.area for branch in branches]),
        groups=tuple(
            (curve, np.array([i for i, other in enumerate(curves) if other == curve]))
            for curve in distinct
        ),
    )


def _strength(tubes: _Tubes, potential: Array) -> Array:
    return np.asarray((tubes.drop @ potential + tubes.mmf) / tubes.length)


def _flux(tubes: _Tubes, strength: Array) -> Array:
    density = np.empty_like(strength)
    for curve, index in tubes.groups:
        density[index] = curve.flux_density(np.abs(strength[index]))
    return np.copysign(density, strength) * tubes.area


def _outflow(tubes: _Tubes, potential: Array) -> Array:
    """Return the flux that leaves each free node: the slope of the co-energy."""
    return np.asarray(tubes.drop.T @ _flux(tubes, _strength(tubes, potential)))


def _node_permeance(tubes: _Tubes, strength: Array) -> Array:
    """Return the node equations' matrix of differential permeances, the co-energy's curvature."""
    slope = np.empty_like(strength)
    for curve, index in tubes.groups:
        slope[index] = curve.differential_permeability(np.abs(strength[index]))
    permeance = slope * tubes.area / tubes.length
    return np.asarray(tubes.drop.T @ (permeance[:, None] * tubes.drop))


def _coenergy(tubes: _Tubes, potential: Array) -> float:
    strength = np.abs(_strength(tubes, potential))
    density = np.empty_like(strength)
    for curve, index in tubes.groups:
        density[index] = curve.coenergy_density(strength[index])
    return float(tubes.area * tubes.length @ density)


def _first_potential(tubes: _Tubes) -> Array:
    """Return the potentials of the network with every curve at its initial slope."""
    matrix = _node_permeance(tubes, np.zeros_like(tubes.mmf))
    initial = np.empty_like(tubes.mmf)
    for curve, index in tubes.groups:
        initial[index] = MU_0 * curve.initial_permeability
    return _solved(matrix, -tubes.drop.T @ (initial * tubes.area / tubes.length * tubes.mmf))


def _slope(tubes: _Tubes, potential: Array, step: Array, length: float) -> float:
    return float(_outflow(tubes, potential + length * step) @ step)


def _solved(matrix: Array, load: Array) -> Array:
    try:
        solution = np.linalg.solve(matrix, load)
    except np.linalg.LinAlgError as error:
        raise NumericalError(f"the node equations cannot be solved ({error})") from error
    if not np.all(np.isfinite(solution)):
        raise NumericalError("the node equations have no finite solution")
    return np.asarray(solution)


def _state(tubes: _Tubes, potential: Array, history: Sequence[float]) -> NetworkState:
    strength = _strength(tubes, potential)
    at_nodes = np.zeros(len(tubes.nodes))
    at_nodes[tubes.free] = potential
    return NetworkState(
        branches=tubes.branches,
        nodes=tubes.nodes,
        potential=at_nodes,
        field_strength=strength,
        flux=_flux(tubes, strength),
        coenergy=_coenergy(tubes, potential),
        history=tuple(history),
    )
