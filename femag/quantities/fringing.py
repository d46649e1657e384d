"""What the gap's reluctance is in the field, beside the plain one."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from femag.design import Design
from femag.field.bounds import FieldSolution
from femag.field.current_share import changed_fields
from femag.geometry.gaps import post_pieces, spacer_pieces
from femag.units import MU_0

Array = NDArray[np.float64]


def gap_factor(design: Design, solution: FieldSolution) -> float | None:
    """Return plain gap reluctance over the reluctance outside the core.

    The latter is 2 W'/phi^2 with the co-energy W' stored outside the core (gap, fringing and
    window leakage) and the flux per turn phi; both are means of the two sides. Without
    saturation it equals the total reluctance N^2/L less the core's share of it. With magnets both
    are what the current changes. None without a gap, and where a step closes the only one.
    """
    plain = plain_gap_reluctance(design)
    if plain == 0.0:
        return None
    linkages = np.array(solution.flux_linkage_of_sides)
    if solution.idle is not None:
        linkages = linkages - solution.idle.flux_linkage_of_sides
    flux = float(np.mean(linkages)) / design.turns
    return plain / (2.0 * _coenergy_outside_core(solution) / flux**2)


def plain_gap_reluctance(design: Design) -> float:
    """Return the sum of the plain reluctances of all openings in 1/H, without fringing.

    An opening has the permeance mu times the integral of area over length between its faces; where
    a step closes a part of it, it has no reluctance.
    """
    core, gaps = design.core, design.gaps
    post = (core.turned.hole_radius, core.turned.post_radius)
    ring = (core.turned.ring_inner_radius, core.turned.ring_outer_radius)
    legs = ((post_pieces(gaps, core.window_height), post), (spacer_pieces(gaps), ring))
    return sum(
        1.0 / (MU_0 * piece.permeability * piece.area_over_length(*radii))
        for pieces, radii in legs
        for piece in pieces
        if not piece.shape.closed
    )


def _coenergy_outside_core(solution: FieldSolution) -> float:
    """Return what the current adds to the co-energy outside of the core in J, mean of the sides."""
    laws, weight = solution.sides.laws, solution.sides.discretisation.weight
    mesh = solution.sides.mesh
    in_core = [mesh.names.index(r.name) for r in mesh.section.regions if r.role == "core"]
    outside = ~np.isin(mesh.region, in_core)
    b, h = changed_fields(solution)
    density = laws.energy_density(_size(b)) + laws.coenergy_density(_size(h))
    return float(np.sum((weight * density)[outside]) / 2)


def _size(field: Array) -> Array:
    return np.asarray(np.hypot(field[:, 0], field[:, 1]))
