"""How hard the material is driven, and how the bounds close with finer meshes."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import cycle
from typing import TYPE_CHECKING, Any

import numpy as np

from femag.plot.curve_figures import highest_field_strength
from femag.result import Result
from femag.review import MeshStep

if TYPE_CHECKING:
    from matplotlib.axes import Axes

MARKERS = "osD^v"
SAMPLES = 400
ROOM = 1.15
"""Right end of the picture over the largest H that is marked."""


def material_curve(result: Result, ax: Axes) -> Axes:
    """Draw B against H of the core's material, and where its sections stand at the current.

    Parameters
    ----------
    result : Result
        Whose material and mean flux densities.
    ax : Axes
        Where to draw.
    """
    material = result.design.material
    means = {mean.name: mean.flux_density for mean in result.section_means}
    marked = material.field_strength(np.array(list(means.values())))
    end = max(highest_field_strength(material), ROOM * float(marked.max()))
    h = np.linspace(0.0, 1.0, SAMPLES) ** 2 * end
    ax.plot(h, material.flux_density(h), color="black", linewidth=1.6)
    points = np.array(getattr(material, "points", ())).reshape(-1, 2)
    shown = points[points[:, 0] <= end]
    if len(shown):
        ax.plot(*shown.T, "+", color="0.3", markersize=7, label="points of the data")
    for (name, b), strength, marker in zip(means.items(), marked, cycle(MARKERS)):
        ax.plot(strength, b, marker, color="black", markerfacecolor="white", markersize=6,
                label=f"{name}, {b:.3f} T")  # fmt: skip
    ax.set(xlim=(0.0, end), xlabel="field strength H, A/m", ylabel="flux density B, T")
    ax.set_ylim(bottom=0.0)
    ax.legend(loc="lower right", frameon=False, title=f"section means at {result.current:g} A")
    return ax


def convergence(meshes: Sequence[MeshStep], ax: Axes, tolerance: float) -> Axes:
    """Draw both bounds of the inductance on a row of meshes, off the last midpoint.

    Parameters
    ----------
    meshes : sequence of MeshStep
        From the coarsest.
    ax : Axes
        Where to draw.
    tolerance : float
        Half width that was asked for, over the value; drawn as a band.
    """
    final = meshes[-1].inductance.value
    unknowns = [step.unknowns for step in meshes]
    ends = np.array(
        [(step.inductance.lower, step.inductance.value, step.inductance.upper) for step in meshes]
    )
    lower, middle, upper = 100.0 * (ends.T / final - 1.0)
    look: dict[str, Any] = {"color": "black", "linewidth": 1.2, "markersize": 6}
    ax.axhspan(-100 * tolerance, 100 * tolerance, color="0.91", linewidth=0.0, zorder=0,
               label=f"tolerance, {100 * tolerance:g} %")  # fmt: skip
    ax.plot(unknowns, upper, marker="v", label="upper bound", **look)
    ax.plot(unknowns, middle, marker="o", linestyle=(0, (2, 2)), markerfacecolor="white",
            label="middle", **look)  # fmt: skip
    ax.plot(unknowns, lower, marker="^", label="lower bound", **look)
    ax.set(xlabel="unknowns of both sides", ylabel="off the last middle, %")
    ax.set_xlim(left=0.0, right=1.05 * unknowns[-1])
    ax.legend(loc="best", frameon=False)
    return ax
