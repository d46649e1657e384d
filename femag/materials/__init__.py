"""Materials: magnetisation curves with consistent energy densities."""

from femag.materials.curves import AIR, FroehlichCurve, LinearCurve, MagnetisationCurve

__all__ = ["AIR", "FroehlichCurve", "LinearCurve", "MagnetisationCurve"]
