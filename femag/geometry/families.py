"""The families of cores: which dimensions each has, and the core that they make."""

from __future__ import annotations

from collections.abc import Mapping

from femag.errors import InputError
from femag.geometry.outlines import OUTLINE_SIZES
from femag.geometry.pot import DIMENSIONS, PotCore
from femag.geometry.round_leg import COMMON_SIZES, RoundLegCore

FAMILIES: dict[str, tuple[str, ...]] = {
    "pot": DIMENSIONS,
    **{family: (*COMMON_SIZES, *names) for family, names in OUTLINE_SIZES.items()},
}
"""Names of the dimensions of each family."""


def core_of_family(
    family: str, sizes: Mapping[str, float], core_factor: float | None = None, name: str = ""
) -> PotCore | RoundLegCore:
    """Return the core of a family that has the given dimensions.

    Parameters
    ----------
    family : str
        A key of `FAMILIES`.
    sizes : mapping of str to float
        The dimensions that it lists, m; ``hole_diameter`` may be left out.
    core_factor : float, optional
        Published sum of length over area, 1/m; not for pot cores, which are solved as they are.
    name : str
        For print.

    Raises
    ------
    InputError
        If the family is not known, or a dimension is missing, not one of the family's, or out of
        range.
    """
    names = FAMILIES.get(family)
    if names is None:
        accepted = ", ".join(map(repr, FAMILIES))
        raise InputError("unknown family", key="core.family", value=family, accepted=accepted)
    required = [name for name in names if name != "hole_diameter"]
    for key in (*required, *sizes):
        if key not in names or (key in required and key not in sizes):
            raise InputError(
                "missing" if key in names else f"not a dimension of the family {family!r}",
                key=f"core.dimensions.{key}", value=sizes.get(key), accepted=", ".join(names),
            )  # fmt: skip
    if family != "pot":
        return RoundLegCore(family, **sizes, core_factor=core_factor, name=name)
    if core_factor is not None:
        raise InputError(
            "a pot core is solved as it is", key="core.core_factor", value=core_factor,
            accepted="none with family = 'pot'",
        )  # fmt: skip
    return PotCore(**sizes, name=name)
