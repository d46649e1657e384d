"""What the gap's reluctance is in the field, beside the plain one."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from femag.design import Design
from femag.field.bounds import FieldSolution
from femag.geometry.gaps import GapPiece, post_pieces, ring_pieces
from femag.units import MU_0


def gap_factor(design: Design, solution: FieldSolution) -> float | None:
    """Return plain gap reluctance over the reluctance outside the core; None without a gap.

    The latter is 2 W'/phi^2 with the co-energy W' stored outside the core (gap, fringing and
    window leakage) and the flux per turn phi; both are means of the two sides. Without
    saturation it equals the total reluctance N^2/L less the core's share of it.
    """
    plain = plain_gap_reluctance(design)
    if plain == 0.0:
        return None
    flux = sum(solution.flux_linkage_of_sides) / (2 * design.turns)
    outside = solution.coenergy.value * (1.0 - core_coenergy_share(solution))
    return plain / (2.0 * outside / flux**2)


def plain_gap_reluctance(design: Design) -> float:
    """Return the sum of length over mu area of all openings in 1/H, without fringing."""
    core, gaps = design.core, design.gaps
    post = np.pi * (core.post_radius**2 - core.hole_radius**2)
    ring = np.pi * (core.outer_radius**2 - core.window_radius**2)
    in_post = _length_in_air(post_pieces(gaps, core.window_height))
    return float((in_post / post + _length_in_air(ring_pieces(gaps)) / ring) / MU_0)


def _length_in_air(pieces: Sequence[GapPiece]) -> float:
    """Return the length of air in m that has the plain reluctance of all pieces."""
    return sum(piece.length / piece.permeability for piece in pieces)


def core_coenergy_share(solution: FieldSolution) -> float:
    """Return the share of the co-energy that the core holds, mean of both sides."""
    laws, weight = solution.sides.laws, solution.sides.discretisation.weight
    mesh = solution.sides.mesh
    in_core = [mesh.names.index(r.name) for r in mesh.section.regions if r.role == "core"]
    core = np.isin(mesh.region, in_core)
    b, h = solution.flux.field, solution.potential.field
    h_of_b = solution.flux.secant * np.hypot(b[:, 0], b[:, 1])
    shares = []
    for strength in (h_of_b, np.hypot(h[:, 0], h[:, 1])):
        coenergy = np.sum(weight * laws.coenergy_density(strength), axis=1)
        shares.append(coenergy[core].sum() / coenergy.sum())
    return float(np.mean(shares))
