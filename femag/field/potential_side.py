"""The potential side: H = T - grad Omega with Omega in P2, minimising the co-energy.

It bounds the co-energy from above.

References
----------
J. Rikabi, C. F. Bryant and E. M. Freeman, "An error-based approach to complementary
formulations of static field solutions", Int. J. Numer. Methods Eng. 26 (1988) 1963.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components

from femag.field.discretisation import Discretisation
from femag.field.flux_side import turn_density
from femag.field.laws import Laws, axial_field
from femag.field.numbering import Numbering
from femag.field.problem import FieldProblem
from femag.field.side import Side
from femag.field.source_field import source_fields

Array = NDArray[np.float64]
Index = NDArray[np.int64]


def potential_side(
    problem: FieldProblem,
    discretisation: Discretisation,
    laws: Laws,
    numbering: Numbering | None = None,
) -> Side:
    """Return the potential side: Omega is one constant on each connected far or normal wall.

    In a magnet w'(H) = mu |H + Br/mu|^2 / 2 - |Br|^2 / (2 mu).
    """
    numbering = numbering or _grouped_unknowns(discretisation)
    turns = turn_density(problem.turns_per_area, discretisation)
    source = source_fields(discretisation, turns, laws.permeability)[0]
    return Side(
        name="potential side",
        shape=np.negative(discretisation.gradient_shape),
        numbering=numbering,
        source=np.ascontiguousarray(source),
        load=np.zeros(numbering.size),
        weight=discretisation.weight,
        law=laws.of_field_strength,
        density=laws.coenergy_density,
        flattens=True,
        fixed=axial_field(laws.remanence / laws.permeability, discretisation.weight.shape[1]),
        constant=laws.magnet_energy(discretisation.weight),
    )


def _grouped_unknowns(discretisation: Discretisation) -> Numbering:
    """Return the unknown of each local function; the first wall's constant (or a point) is 0."""
    walls, basis = discretisation.mesh.walls, discretisation.basis
    facets = np.concatenate([walls["far"], walls["normal"]])
    if len(facets) == 0:
        number = np.arange(basis.N) - 1
        return Numbering(number[discretisation.element_dofs], basis.N - 1)
    group = _wall_groups(discretisation.mesh.triangles.facets[:, facets], basis.N)
    number = np.full(basis.N, -2)
    for vertex_row in discretisation.mesh.triangles.facets[:, facets]:
        number[basis.nodal_dofs[0, vertex_row]] = group[vertex_row] - 1
    number[basis.facet_dofs[0, facets]] = group[discretisation.mesh.triangles.facets[0, facets]] - 1
    free = number == -2
    constants = int(number.max()) + 1 if np.any(~free) else 0
    number[free] = constants + np.arange(np.count_nonzero(free))
    return Numbering(number[discretisation.element_dofs], constants + int(free.sum()))


def _wall_groups(wall_edges: Index, size: int) -> Index:
    """Return the number, from 0, of the connected wall that each wall vertex lies on."""
    start, end = wall_edges
    graph = coo_matrix((np.ones(len(start)), (start, end)), shape=(size, size))
    _, label = connected_components(graph, directed=False)
    on_wall = np.unique(wall_edges)
    _, compact = np.unique(label[on_wall], return_inverse=True)
    group = np.full(size, -1)
    group[on_wall] = compact
    return group
