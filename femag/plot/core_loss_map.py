"""Loss density over the section of the core."""

from __future__ import annotations

from typing import TYPE_CHECKING

import matplotlib as mpl
import numpy as np
from matplotlib.colors import ListedColormap, LogNorm
from matplotlib.tri import Triangulation

from femag.plot.flux_map import draw_outlines
from femag.quantities import CoreLoss, field_map
from femag.result import Result

if TYPE_CHECKING:
    from matplotlib.axes import Axes

DECADES = 3.0
"""Of loss density on the colour scale, below its upper end."""
KILO = 1e3


def core_loss_map(result: Result, ax: Axes) -> Axes:
    """Draw the density of the core loss under the ripple, on a logarithmic scale.

    99 % of the core's volume lies below the upper end of the scale.

    Parameters
    ----------
    result : Result
        With a core loss and its fields.
    ax : Axes
        Where to draw.

    Raises
    ------
    ValueError
        If the result has no core loss, or was read from a file and holds no fields.
    """
    loss, ripple = result.core_loss, result.design.ripple
    if loss is None or loss.swing is None or ripple is None:
        raise ValueError("the result holds no core loss with its fields: solve a design with both")
    fields = field_map(loss.swing.as_solution)
    mesh = Triangulation(KILO * fields.r, KILO * fields.z, fields.triangles)
    mesh.set_mask(fields.role != "core")
    top = _top(loss) / KILO
    density = loss.waveform_factor * loss.material.loss_density(
        ripple.frequency, 0.5 * fields.flux_density
    )
    colour = ax.tripcolor(
        mesh,
        np.maximum(density / KILO, 1e-3 * top / 10.0**DECADES),
        shading="gouraud",
        cmap=ListedColormap(mpl.colormaps["GnBu"](np.linspace(0.0, 1.0, 256))),
        norm=LogNorm(top / 10.0**DECADES, top),
        rasterized=True,
    )
    draw_outlines(ax, fields)
    core = KILO * fields.outlines["core"].reshape(-1, 2)
    margin = 0.06 * np.ptp(core[:, 1])
    ax.set(
        xlim=(0.0, core[:, 0].max() + margin),
        ylim=(core[:, 1].min() - margin, core[:, 1].max() + margin),
        xlabel="r, mm",
        ylabel="z, mm",
        aspect="equal",
    )
    ax.set_title(_title(result, loss), fontsize=10)
    bar = ax.figure.colorbar(colour, ax=ax, extend="both", shrink=0.8)
    bar.set_label("core loss, kW/m$^3$; 99 % of the core lies below the top")
    return ax


def _top(loss: CoreLoss) -> float:
    """Return the loss density in W/m3 at the upper end of the scale."""
    return max(share.loss_density for share in loss.volume_shares)


def _title(result: Result, loss: CoreLoss) -> str:
    ripple = result.design.ripple
    assert ripple is not None
    return (
        f"core loss, {loss.total:.3g} W in all\n"
        f"ripple {ripple.peak_to_peak:g} A at {ripple.frequency / KILO:g} kHz, "
        f"peak {result.current:g} A"
    )
