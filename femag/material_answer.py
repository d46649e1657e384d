"""The library of materials on the terminal."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import Console
from rich.text import Text

from femag.answer import columns
from femag.materials import Material


def print_material_list(materials: Sequence[Material], console: Console) -> None:
    """Print a line for each curve: initial permeability, last point, and the material's source."""
    table = columns("material", "at", "initial", "T", "at A/m", words=["material"])
    for material in materials:
        for temperature, curve in material.curves:
            strength, density = curve.points[-1]
            table.add_row(
                material.name,
                "-" if temperature is None else f"{temperature:g} C",
                f"{curve.initial_permeability:.4g}",
                f"{density:.3g}",
                f"{strength:.6g}",
            )
    console.print(table, highlight=False)
    console.print()
    for material in materials:
        console.print(Text(f"{material.name}: {material.source}"), highlight=False)
    console.print()
    console.print(
        Text(
            "initial: relative permeability. T, at A/m: last point of the table. Between two "
            "temperatures curves are interpolated. core.material = 'mnzn-power-25C', or "
            "{ name = 'mnzn-power', temperature = '60 C' }. Generic curves: use your supplier's "
            "for a sign-off."
        )
    )
