"""Whether the shaped faces of a gap fit the post."""

from __future__ import annotations

from collections.abc import Sequence

from femag.errors import InputError, entry_key
from femag.geometry.gaps import SLACK, Gap, GapPiece, gap_length, ordered_gap, post_pieces


def check_post_faces(
    gaps: Sequence[Gap], window_height: float, hole_radius: float, post_radius: float
) -> None:
    """Refuse shaped faces that do not fit the post; lengths in m.

    Raises
    ------
    InputError
        If a step or an edge is too large for the post, or the faces reach into each other.
    """
    ground = ordered_gap(gaps, "post")
    if ground is None or not ground.is_shaped:
        return
    key = entry_key("gap", list(gaps).index(ground))
    pieces = post_pieces(gaps, window_height)
    for piece in pieces:
        _check_radii(ground, piece, hole_radius, post_radius, key)
    half = (window_height + gap_length(gaps, "all")) / 2
    slack = SLACK * window_height
    floors = [-half, *(piece.reach(hole_radius, post_radius)[1] for piece in pieces)]
    ceilings = [*(piece.reach(hole_radius, post_radius)[0] for piece in pieces), half]
    flat = [-half, *(piece.top for piece in pieces)], [*(piece.bottom for piece in pieces), half]
    for low, high, flat_low, flat_high in zip(floors, ceilings, *flat, strict=True):
        if low > high - slack and flat_high > flat_low:
            raise InputError(
                "the faces of the gap leave no post beside it", key=f"{key}.{_deepest(ground)}",
                accepted=f"faces less than {(flat_high - flat_low) * 1e3:g} mm deep in all",
            )  # fmt: skip


def _deepest(gap: Gap) -> str:
    """Return the key of what makes the faces deep."""
    depths = {
        "rim_length": ((gap.rim_length or 0.0) - gap.length) / 2,
        "step.length": (gap.step.length - gap.length) / 2 if gap.step else 0.0,
        "chamfer": gap.chamfer,
        "edge_radius": gap.edge_radius,
    }
    return max(depths, key=lambda name: depths[name])


def _check_radii(gap: Gap, piece: GapPiece, r0: float, r1: float, key: str) -> None:
    """Refuse a step or an edge that is too large for the faces of a piece; lengths in m."""
    if gap.chamfer > 0.0 and max(piece.shares) * piece.shape.taper >= r1 - r0:
        raise InputError(
            "the taper is steeper than the chamfer", key=f"{key}.chamfer", value=gap.chamfer,
            accepted="none beside faces of 45 degrees or more",
        )  # fmt: skip
    flat_end = min(piece.shape.flat_end(r0, r1, share) for share in piece.shares if share)
    edge = "chamfer" if gap.chamfer > 0.0 else "edge_radius"
    if not r0 < flat_end:
        raise InputError(
            "nothing of the face is left", key=f"{key}.{edge}", value=getattr(gap, edge),
            accepted=f"less than {(r1 - r0) * 1e3:g} mm",
        )  # fmt: skip
    if gap.step is not None and not r0 < gap.step.diameter / 2 < flat_end:
        raise InputError(
            "the step lies outside of the face", key=f"{key}.step.diameter",
            value=gap.step.diameter,
            accepted=f"more than {2e3 * r0:g} mm and less than {2e3 * flat_end:g} mm",
        )  # fmt: skip
