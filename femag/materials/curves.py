"""Magnetisation curves: B against H, both ways, with their energy and co-energy densities.

Every curve is isotropic, strictly increasing, passes through the origin and takes and returns
magnitudes (arrays of any shape, SI). The two energy densities are Legendre conjugates,
``w(B) + w'(H) >= B H`` with equality on the curve, which is what the bounds rest on.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Protocol

import numpy as np
from numpy.typing import NDArray
from scipy.special import beta, betainc, betaincc

from femag.errors import InputError, number
from femag.materials.steinmetz import Steinmetz
from femag.units import MU_0

Array = NDArray[np.float64]


HIGHEST_PERMEABILITY = 1e6
"""Of any soft magnetic material; beyond it the fields of an ungapped core lose digits."""


class MagnetisationCurve(Protocol):
    """What the field solver asks of a material."""

    @property
    def is_linear(self) -> bool:
        """Whether B is proportional to H."""

    @property
    def initial_permeability(self) -> float:
        """Relative permeability at H = 0."""

    @property
    def label(self) -> str:
        """One line for tables and figures."""

    @property
    def loss(self) -> Steinmetz | None:
        """Parameters of the core loss; None if they are not known."""

    def flux_density(self, field_strength: Array) -> Array:
        """B in T for H in A/m."""

    def field_strength(self, flux_density: Array) -> Array:
        """H in A/m for B in T."""

    def differential_permeability(self, field_strength: Array) -> Array:
        """dB/dH in H/m at H in A/m."""

    def coenergy_density(self, field_strength: Array) -> Array:
        """Integral of B dH from 0 to H, J/m3."""

    def energy_density(self, flux_density: Array) -> Array:
        """Integral of H dB from 0 to B, J/m3."""


def _require_permeability(value: float, *, above: bool = False) -> None:
    accepted = f"a number {'above' if above else 'from'} 1 up to {HIGHEST_PERMEABILITY:g}"
    size = number(value, "permeability", accepted)
    if not 1.0 <= size <= HIGHEST_PERMEABILITY or (above and size == 1.0):
        raise InputError(
            "relative permeability out of range",
            key="permeability",
            value=value,
            accepted=accepted,
        )


@dataclass(frozen=True)
class LinearCurve:
    """B = mu0 mu_r H.

    Parameters
    ----------
    permeability : float
        Relative permeability mu_r, 1 or more.
    loss : Steinmetz, optional
        Parameters of the core loss.
    """

    permeability: float
    loss: Steinmetz | None = None

    def __post_init__(self) -> None:
        _require_permeability(self.permeability)

    @property
    def is_linear(self) -> bool:
        """Whether B is proportional to H."""
        return True

    @property
    def initial_permeability(self) -> float:
        """Relative permeability at H = 0."""
        return self.permeability

    @property
    def label(self) -> str:
        """One line for tables and figures."""
        return f"linear, relative permeability {self.permeability:g}"

    def flux_density(self, field_strength: Array) -> Array:
        """B in T for H in A/m."""
        return MU_0 * self.permeability * field_strength

    def field_strength(self, flux_density: Array) -> Array:
        """H in A/m for B in T."""
        return flux_density / (MU_0 * self.permeability)

    def differential_permeability(self, field_strength: Array) -> Array:
        """dB/dH in H/m at H in A/m."""
        return np.full_like(field_strength, MU_0 * self.permeability)

    def coenergy_density(self, field_strength: Array) -> Array:
        """Integral of B dH from 0 to H, J/m3."""
        return 0.5 * MU_0 * self.permeability * field_strength**2

    def energy_density(self, flux_density: Array) -> Array:
        """Integral of H dB from 0 to B, J/m3."""
        return 0.5 * flux_density**2 / (MU_0 * self.permeability)


AIR = LinearCurve(1.0)


@dataclass(frozen=True)
class ScaledCurve:
    """B(H) = B_of(factor H): a material whose paths are `factor` times as short as they look.

    Parameters
    ----------
    of : MagnetisationCurve
        The material.
    factor : float
        Above 0.
    """

    of: MagnetisationCurve
    factor: float

    def __post_init__(self) -> None:
        accepted = "a number above 0"
        if not 0.0 < number(self.factor, "factor", accepted) < np.inf:
            raise InputError("out of range", key="factor", value=self.factor, accepted=accepted)

    @property
    def is_linear(self) -> bool:
        """Whether B is proportional to H."""
        return self.of.is_linear

    @property
    def initial_permeability(self) -> float:
        """Relative permeability at H = 0."""
        return self.factor * self.of.initial_permeability

    @property
    def label(self) -> str:
        """One line for tables and figures."""
        return f"{self.of.label}, at {self.factor:.4g} H"

    @property
    def loss(self) -> Steinmetz | None:
        """Parameters of the core loss, those of the material."""
        return self.of.loss

    def flux_density(self, field_strength: Array) -> Array:
        """B in T for H in A/m."""
        return self.of.flux_density(self.factor * field_strength)

    def field_strength(self, flux_density: Array) -> Array:
        """H in A/m for B in T."""
        return self.of.field_strength(flux_density) / self.factor

    def differential_permeability(self, field_strength: Array) -> Array:
        """dB/dH in H/m at H in A/m."""
        return self.factor * self.of.differential_permeability(self.factor * field_strength)

    def coenergy_density(self, field_strength: Array) -> Array:
        """Integral of B dH from 0 to H, J/m3."""
        return self.of.coenergy_density(self.factor * field_strength) / self.factor

    def energy_density(self, flux_density: Array) -> Array:
        """Integral of H dB from 0 to B, J/m3."""
        return self.of.energy_density(flux_density) / self.factor


@dataclass(frozen=True)
class ResaturatedCurve:
    """B(H) = s B_of(H/s): the same initial permeability, the polarisation saturating at s times it.

    Parameters
    ----------
    of : MagnetisationCurve
        The material.
    share : float
        s, above 0.
    """

    of: MagnetisationCurve
    share: float

    def __post_init__(self) -> None:
        accepted = "a number above 0"
        if not 0.0 < number(self.share, "share", accepted) < np.inf:
            raise InputError("out of range", key="share", value=self.share, accepted=accepted)

    @property
    def is_linear(self) -> bool:
        """Whether B is proportional to H."""
        return self.of.is_linear

    @property
    def initial_permeability(self) -> float:
        """Relative permeability at H = 0."""
        return self.of.initial_permeability

    @property
    def label(self) -> str:
        """One line for tables and figures."""
        return f"{self.of.label}, saturating at {self.share:.4g} of that"

    @property
    def loss(self) -> Steinmetz | None:
        """Parameters of the core loss, those of the material."""
        return self.of.loss

    def flux_density(self, field_strength: Array) -> Array:
        """B in T for H in A/m."""
        return self.share * self.of.flux_density(field_strength / self.share)

    def field_strength(self, flux_density: Array) -> Array:
        """H in A/m for B in T."""
        return self.share * self.of.field_strength(flux_density / self.share)

    def differential_permeability(self, field_strength: Array) -> Array:
        """dB/dH in H/m at H in A/m."""
        return self.of.differential_permeability(field_strength / self.share)

    def coenergy_density(self, field_strength: Array) -> Array:
        """Integral of B dH from 0 to H, J/m3."""
        return self.share**2 * self.of.coenergy_density(field_strength / self.share)

    def energy_density(self, flux_density: Array) -> Array:
        """Integral of H dB from 0 to B, J/m3."""
        return self.share**2 * self.of.energy_density(flux_density / self.share)


@dataclass(frozen=True)
class FroehlichCurve:
    r"""Saturating curve of Froehlich-Kennelly type with an exponent for the knee.

    .. math:: B = \mu_0 H + J_s \, m(H/a), \quad m(t) = t\,(1 + t^n)^{-1/n},
              \quad a = J_s / (\mu_0 (\mu_i - 1))

    The polarisation saturates at J_s, so the slope tends to mu0.

    Parameters
    ----------
    permeability : float
        Initial relative permeability mu_i, above 1.
    saturation : float
        Saturation polarisation J_s, T.
    exponent : float
        Knee exponent n, 1 (softest, Froehlich and Kennelly) or more.
    loss : Steinmetz, optional
        Parameters of the core loss.

    References
    ----------
    O. Froelich, Elektrotech. Z. 2 (1881) 134; A. E. Kennelly, Trans. AIEE 8 (1891) 485, for
    n = 1 (both cited from memory). The co-energy for n > 1 is our own reduction to the
    incomplete beta function: with s = t^n/(1 + t^n),
    int_0^t m = t m - B_s(2/n, 1 - 1/n)/n.
    """

    permeability: float
    saturation: float
    exponent: float = 1.0
    loss: Steinmetz | None = None

    def __post_init__(self) -> None:
        _require_permeability(self.permeability, above=True)
        saturation = "a positive flux density, such as 0.45 T"
        if not 0.0 < number(self.saturation, "saturation", saturation) < np.inf:
            raise InputError(
                "saturation polarisation must be positive",
                key="saturation",
                value=self.saturation,
                accepted=saturation,
            )
        exponent = "1 (soft knee) to 20 (sharp)"
        if not 1.0 <= number(self.exponent, "exponent", exponent) <= 20.0:
            raise InputError(
                "knee exponent out of range",
                key="exponent",
                value=self.exponent,
                accepted=exponent,
            )

    @property
    def is_linear(self) -> bool:
        """Whether B is proportional to H."""
        return False

    @property
    def initial_permeability(self) -> float:
        """Relative permeability at H = 0."""
        return self.permeability

    @property
    def label(self) -> str:
        """One line for tables and figures."""
        return (
            f"saturating, initial permeability {self.permeability:g}, "
            f"saturation {self.saturation:g} T, exponent {self.exponent:g}"
        )

    @property
    def _knee(self) -> float:
        return self.saturation / (MU_0 * (self.permeability - 1.0))

    def flux_density(self, field_strength: Array) -> Array:
        """B in T for H in A/m."""
        h = field_strength / self._knee
        return MU_0 * field_strength + self.saturation * _magnetisation(h, self.exponent)

    def differential_permeability(self, field_strength: Array) -> Array:
        """dB/dH in H/m at H in A/m."""
        n = self.exponent
        h = field_strength / self._knee
        return MU_0 * (1.0 + (self.permeability - 1.0) * (1.0 + h**n) ** (-1.0 - 1.0 / n))

    def field_strength(self, flux_density: Array) -> Array:
        """H in A/m for B in T.

        Newton's method from below: B(H) is concave and lies under both its initial tangent
        and its asymptote, so the larger of the two crossings never exceeds the root and the
        iterates rise to it.
        """
        b = np.asarray(flux_density, dtype=float)
        h = np.maximum(b / (MU_0 * self.permeability), (b - self.saturation) / MU_0)
        for _ in range(100):
            step = (b - self.flux_density(h)) / self.differential_permeability(h)
            h = h + np.maximum(step, 0.0)
            if np.all(step <= 4e-16 * h):
                return h
        return h

    def coenergy_density(self, field_strength: Array) -> Array:
        """Integral of B dH from 0 to H, J/m3."""
        h = field_strength / self._knee
        return (
            0.5 * MU_0 * field_strength** 2
            + self.saturation * self._knee * _magnetisation_integral(h, self.exponent)
        )

    def energy_density(self, flux_density: Array) -> Array:
        """Integral of H dB from 0 to B, J/m3."""
        h = self.field_strength(flux_density)
        return flux_density * h - self.coenergy_density(h)


def with_permeability(curve: MagnetisationCurve, factor: float) -> MagnetisationCurve:
    """Return a curve with its initial permeability times a factor; its saturation stays.

    Linear and Froehlich curves by their permeability, any other as B(H) = curve(factor H).

    Raises
    ------
    InputError
        If the permeability leaves its range.
    """
    match curve:
        case LinearCurve() | FroehlichCurve():
            return replace(curve, permeability=curve.permeability * factor)
        case ScaledCurve(of, before):
            return ScaledCurve(of, before * factor)
        case _:
            return ScaledCurve(curve, factor)


def with_saturation(curve: MagnetisationCurve, factor: float) -> MagnetisationCurve:
    """Return a curve with its saturation times a factor; its initial permeability stays."""
    match curve:
        case LinearCurve():
            return curve
        case FroehlichCurve():
            return replace(curve, saturation=curve.saturation * factor)
        case ResaturatedCurve(of, before):
            return ResaturatedCurve(of, before * factor)
        case _:
            return ResaturatedCurve(curve, factor)


def _magnetisation(t: Array, n: float) -> Array:
    return t * (1.0 + t**n) ** (-1.0 / n)


def _magnetisation_integral(t: Array, n: float) -> Array:
    """Integral of m from 0 to t, accurate for small and large t alike."""
    t = np.asarray(t, dtype=float)
    if n == 1.0:
        series = t**2 * (1 / 2 - t * (1 / 3 - t * (1 / 4 - t * (1 / 5 - t * (1 / 6 - t / 7)))))
        return np.where(t < 1e-3, series, t - np.log1p(t))
    if n == 2.0:
        return np.asarray(t**2 / (1.0 + np.sqrt(1.0 + t**2)))
    p, q = 2.0 / n, 1.0 - 1.0 / n
    power = t**n
    rest = 1.0 / (1.0 + power)
    share = np.where(power < 1.0, betainc(p, q, power * rest), betaincc(q, p, rest))
    return np.asarray(t * _magnetisation(t, n) - beta(p, q) / n * share)
