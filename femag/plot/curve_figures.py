"""What a gap does: inductance against current, and what it shears and what it leaves alone."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import cycle
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np
from numpy.typing import NDArray

from femag.current_curve import InductanceCurve
from femag.design import Design
from femag.materials import MagnetisationCurve

if TYPE_CHECKING:
    from matplotlib.axes import Axes

Array = NDArray[np.float64]

MOST_MARKERS = 40
"""Points up to which each is marked on its line."""
DROP_MARKERS = "D^v<>"
RESIDUALS_SHARE = 0.24
"""Share of the height that the residuals take."""
SAME_FLUX = (0.4, 0.7)
"""Shares of the largest flux at which the ampere turns that the gap takes are shown."""
TAIL = 0.02
"""Slope of B(H) over the initial one at which the picture of a material ends."""
LINEAR_TOP = 0.5
"""Flux density in T at which the picture of a linear material ends."""
FIELD_STRENGTHS = (1e-2, 1e8)
"""Range of H in A/m in which the knee is looked for."""
MATERIAL_SAMPLES = 300
UNITS = ((1.0, ""), (1e-3, "m"), (1e-6, "\N{MICRO SIGN}"), (1e-9, "n"))


class MeasuredInductance(Protocol):
    """Measured points: currents in A, inductances in H, and which inductance it is."""

    @property
    def current(self) -> Sequence[float]:
        """Currents, A."""

    @property
    def inductance(self) -> Sequence[float]:
        """Inductance at each, H."""

    @property
    def kind(self) -> str:
        """Which: "apparent" or "incremental"."""


def inductance_figure(
    curve: InductanceCurve,
    ax: Axes,
    measured: MeasuredInductance | None = None,
    residuals: Sequence[float] | Array | None = None,
) -> Axes:
    """Draw apparent and incremental inductance against current, saturation currents marked.

    Parameters
    ----------
    curve : InductanceCurve
        What to draw.
    ax : Axes
        Where to draw.
    measured : MeasuredInductance, optional
        Points to lay over it.
    residuals : sequence of float, optional
        Solved over measured inductance less 1 at each measured point; drawn in per cent on small
        axes below.
    """
    scale, prefix = _unit(curve.initial_inductance)
    apparent, incremental = _inductances(curve)
    for (current, inductance), look, label in (
        (apparent, {"linestyle": "-", "marker": "o"}, "apparent"),
        (incremental, {"linestyle": (0, (5, 2)), "marker": "s"}, "incremental"),
    ):
        ax.plot(current, inductance / scale, label=label, color="black",
                **_marked(look, len(curve.points)))  # fmt: skip
    _mark_saturation(curve, ax, scale)
    if measured is not None:
        ax.plot(measured.current, np.array(measured.inductance) / scale, "x", color="0.35",
                markersize=8, markeredgewidth=2, label=f"measured, {measured.kind}")  # fmt: skip
    ax.set(xlabel="current, A", title="inductance against current")
    top, floor = 1.12 * ax.dataLim.y1, 0.0
    if measured is not None and residuals is not None:
        floor = RESIDUALS_SHARE
        _draw_residuals(measured.current, 100.0 * np.asarray(residuals), ax)
    ax.set_ylim(-floor / (1.0 - floor) * top, top)
    ax.set_yticks([tick for tick in ax.get_yticks() if 0.0 <= tick <= top])
    ax.set_ylabel(f"inductance, {prefix}H", y=(1.0 + floor) / 2)
    ax.legend(loc="best", framealpha=0.85, edgecolor="none",
              bbox_to_anchor=(0.0, floor, 1.0, 1.0 - floor))  # fmt: skip
    return ax


def _inductances(curve: InductanceCurve) -> tuple[tuple[Array, Array], tuple[Array, Array]]:
    """Return current (A) and apparent, then incremental inductance (H), in order of current.

    Without magnets both start at the initial inductance, and the saturation currents that were
    found are points of the incremental one, too.
    """
    apparent = {point.current: point.apparent_inductance for point in curve.points}
    incremental = {point.current: point.incremental_inductance for point in curve.points}
    if not _has_magnet(curve):
        apparent[0.0] = incremental[0.0] = curve.initial_inductance
    for entry in curve.saturation:
        if entry.current is not None:
            dropped = (1.0 - entry.drop) * curve.initial_inductance
            incremental.setdefault(entry.current, dropped)
    return _sorted(apparent), _sorted(incremental)


def _sorted(values: dict[float, float]) -> tuple[Array, Array]:
    x = np.array(sorted(values))
    return x, np.array([values[key] for key in x.tolist()])


def _mark_saturation(curve: InductanceCurve, ax: Axes, scale: float) -> None:
    """Mark and name where the incremental inductance has dropped."""
    reached = [(entry.drop, entry.current) for entry in curve.saturation if entry.current]
    for (drop, current), marker in zip(reached, cycle(DROP_MARKERS), strict=False):
        dropped = (1.0 - drop) * curve.initial_inductance / scale
        label = f"{100 * drop:g} % less at {current:.3g} A"
        ax.plot([current] * 2, [0.0, dropped], color="0.55", linestyle=":", linewidth=1.2)
        ax.plot(current, dropped, marker=marker, color="black", markerfacecolor="white",
                markersize=8, linestyle="none", label=label)  # fmt: skip


def _draw_residuals(currents: Sequence[float], per_cent: Array, ax: Axes) -> None:
    """Draw residuals on axes at the foot of others, which share the current."""
    below = ax.inset_axes((0.0, 0.0, 1.0, RESIDUALS_SHARE), sharex=ax)
    below.axhline(0.0, color="0.6", linewidth=0.8)
    below.vlines(currents, 0.0, per_cent, color="0.35", linewidth=1.2)
    below.plot(currents, per_cent, "x", color="0.35", markersize=7, markeredgewidth=2)
    reach = max(1.6 * float(np.max(np.abs(per_cent))), 0.1)
    below.set_ylim(-reach, reach)
    below.tick_params(labelbottom=False)
    below.text(0.01, 0.95, "solved over measured, less 1, %", fontsize=9, va="top",
               transform=below.transAxes)  # fmt: skip


def linkage_figure(
    curve: InductanceCurve, ax: Axes, without_gap: InductanceCurve | None = None
) -> Axes:
    """Draw flux linkage against current, with and without the gap.

    Parameters
    ----------
    curve : InductanceCurve
        What to draw.
    ax : Axes
        Where to draw.
    without_gap : InductanceCurve, optional
        Of the same design without gaps.
    """
    _draw_both(curve, without_gap, ax, _linkage, ("A", "Wb"))
    ax.set_title("the device: flux linkage against current")
    ax.set_xlabel("current, A")
    return ax


def core_flux_figure(
    curve: InductanceCurve, ax: Axes, without_gap: InductanceCurve | None = None
) -> Axes:
    """Draw flux per turn against ampere turns, and the ampere turns that the gap takes.

    Parameters
    ----------
    curve : InductanceCurve
        What to draw.
    ax : Axes
        Where to draw.
    without_gap : InductanceCurve, optional
        Of the same design without gaps.
    """
    scale = _draw_both(curve, without_gap, ax, _core_flux, ("A", "Wb"))
    if without_gap is not None and not _has_magnet(curve):
        _show_what_the_gap_takes(_core_flux(curve), _core_flux(without_gap), ax, scale)
    ax.set_title("the core: flux against ampere turns")
    ax.set_xlabel("ampere turns, A")
    return ax


def material_figure(of: InductanceCurve | Design, ax: Axes) -> Axes:
    """Draw B against H of the core's material, which no gap changes.

    Parameters
    ----------
    of : InductanceCurve or Design
        Whose material.
    ax : Axes
        Where to draw.
    """
    design = of.design if isinstance(of, InductanceCurve) else of
    material = design.material
    h = np.linspace(0.0, 1.0, MATERIAL_SAMPLES) ** 2 * highest_field_strength(material)
    ax.plot(h, material.flux_density(h), color="black", linewidth=1.6)
    ax.set(xlabel="field strength H, A/m", ylabel="flux density B, T", xlim=(0.0, h[-1]))
    ax.set_ylim(bottom=0.0)
    ax.set_title("the material: B against H")
    ax.text(0.97, 0.05, "the same with and without gap", transform=ax.transAxes, ha="right",
            fontsize=9)  # fmt: skip
    return ax


def highest_field_strength(material: MagnetisationCurve) -> float:
    """Return H in A/m at which the picture of a material ends: well beyond its knee."""
    if material.is_linear:
        return float(material.field_strength(np.array([LINEAR_TOP]))[0])
    h = np.geomspace(*FIELD_STRENGTHS, 2000)
    slope = material.differential_permeability(h)
    over_last = slope - slope[-1]
    bent = (over_last < TAIL * over_last.max()) & (np.arange(h.size) > np.argmax(slope))
    return float(h[np.argmax(bent)])


def shearing_panels(
    curve: InductanceCurve, without_gap: InductanceCurve | None = None
) -> tuple[Callable[[Axes], Axes], ...]:
    """Return what draws material, core and device, to be set side by side.

    Parameters
    ----------
    curve : InductanceCurve
        What to draw.
    without_gap : InductanceCurve, optional
        Of the same design without gaps.
    """
    return (
        lambda ax: material_figure(curve, ax),
        lambda ax: core_flux_figure(curve, ax, without_gap),
        lambda ax: linkage_figure(curve, ax, without_gap),
    )


def _linkage(curve: InductanceCurve) -> tuple[Array, Array]:
    """Return current (A) and flux linkage (Wb) in order of current, with those at zero current."""
    linkages = {point.current: point.flux_linkage for point in curve.points}
    return _sorted({0.0: curve.points[0].magnet_flux_linkage} | linkages)


def _core_flux(curve: InductanceCurve) -> tuple[Array, Array]:
    """Return ampere turns (A) and flux per turn (Wb)."""
    current, linkage = _linkage(curve)
    return curve.design.turns * current, linkage / curve.design.turns


def _draw_both(
    curve: InductanceCurve,
    without_gap: InductanceCurve | None,
    ax: Axes,
    values: Callable[[InductanceCurve], tuple[Array, Array]],
    units: tuple[str, str],
) -> float:
    """Draw the curve and that without gap, and return the unit of the flux in Wb."""
    x, y = values(curve)
    scale, prefix = _unit(float(np.max(np.abs(y))))
    name = "with the gap" if curve.design.gaps else "no gap"
    name += " and its magnet" if _has_magnet(curve) else ""
    look = _marked({"linestyle": "-", "marker": "o"}, len(curve.points))
    ax.plot(x, y / scale, color="black", label=name, **look)
    if without_gap is not None:
        x, y = values(without_gap)
        ax.plot(x, y / scale, color="0.4", linestyle=(0, (5, 2)), linewidth=1.6,
                label="without the gap")  # fmt: skip
    kind = "flux linkage" if values is _linkage else "flux per turn"
    ax.set_ylabel(f"{kind}, {prefix}{units[1]}")
    ax.axhline(0.0, color="0.7", linewidth=0.6, zorder=0)
    ax.axvline(0.0, color="0.7", linewidth=0.6, zorder=0)
    ax.legend(loc="lower right" if curve.points[0].current > 0.0 else "upper left", frameon=False)
    return scale


def _show_what_the_gap_takes(
    gapped: tuple[Array, Array], ungapped: tuple[Array, Array], ax: Axes, scale: float
) -> None:
    """Show by arrows how much farther to the right the same flux lies."""
    sign = np.sign(gapped[1][np.argmax(np.abs(gapped[1]))])
    for share in SAME_FLUX:
        flux = share * min(np.max(np.abs(gapped[1])), np.max(np.abs(ungapped[1])))
        start, end = (
            sign * np.interp(flux, *np.sort(np.abs((phi, turns)), axis=1))
            for turns, phi in (ungapped, gapped)
        )
        at = sign * flux / scale
        ax.annotate("", (end, at), (start, at), arrowprops={"arrowstyle": "->", "color": "0.3"})
        ax.annotate(f"the gap takes\n{abs(end - start):.3g} A", (end, at), va="center", fontsize=8,
                    xytext=(sign * 8, -3), textcoords="offset points",
                    ha="left" if sign > 0 else "right")  # fmt: skip


def _has_magnet(curve: InductanceCurve) -> bool:
    return curve.points[0].magnet_flux_linkage != 0.0


def _unit(largest: float) -> tuple[float, str]:
    return next((one for one in UNITS if abs(largest) >= one[0]), UNITS[-1])


def _marked(look: dict[str, Any], points: int) -> dict[str, Any]:
    """Return the look of a line, without its markers where they would crowd."""
    marker = look["marker"] if points <= MOST_MARKERS else ""
    return look | {"marker": marker, "markersize": 4, "linewidth": 1.6}
