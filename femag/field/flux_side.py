"""The flux side: A = r u e_phi with u in P2, minimising the energy less the work of the turns.

It bounds the co-energy from below.

References
----------
P. Hammond and J. Penman, "Calculation of inductance and capacitance by means of dual energy
principles", Proc. IEE 123 (1976) 554.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from femag.field.discretisation import Discretisation
from femag.field.laws import Laws, axial_field
from femag.field.numbering import Numbering
from femag.field.problem import FieldProblem
from femag.field.side import Side

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def flux_side(
    problem: FieldProblem,
    discretisation: Discretisation,
    laws: Laws,
    numbering: Numbering | None = None,
) -> Side:
    """Return the flux side: B from u, u = 0 on far and tangential walls.

    B_r = -r du/dz and B_z = 2 u + r du/dr hold no 1/r, and u is free on the axis. In a magnet
    w(B) = |B - Br|^2 / (2 mu).
    """
    numbering = numbering or _free_unknowns(discretisation)
    shape = discretisation.flux_shape
    return Side(
        name="flux side",
        shape=shape,
        numbering=numbering,
        source=np.zeros((len(shape), 2, shape.shape[3])),
        load=turns_load(
            discretisation, numbering, turn_density(problem.turns_per_area, discretisation)
        ),
        weight=discretisation.weight,
        law=laws.of_flux_density,
        density=laws.energy_density,
        flattens=False,
        fixed=axial_field(-laws.remanence, shape.shape[3]),
    )


def turns_load(discretisation: Discretisation, numbering: Numbering, turns: Array) -> Array:
    """Return the load per ampere (size,) of turns per area (elements, 1) in 1/m2."""
    weighted = turns * discretisation.weight
    return numbering.vector(np.einsum("eiq,eq->ei", discretisation.radius_shape, weighted))


def turn_density(turns_per_area: Mapping[str, float], discretisation: Discretisation) -> Array:
    """Return the turns per area of every element, 1/m2, (elements, 1), from those of regions."""
    mesh = discretisation.mesh
    return np.array([turns_per_area.get(name, 0.0) for name in mesh.names])[mesh.region][:, None]


def _free_unknowns(discretisation: Discretisation) -> Numbering:
    walls, basis = discretisation.mesh.walls, discretisation.basis
    fixed_facets = np.concatenate([walls["far"], walls["tangential"]])
    free = np.ones(basis.N, dtype=bool)
    free[basis.get_dofs(fixed_facets).all()] = False
    number = np.where(free, np.cumsum(free) - 1, -1)
    return Numbering(number[discretisation.element_dofs], int(free.sum()))
