"""The catalogue on the terminal: all cores in a list, or one with the source of every number."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import Console
from rich.table import Table
from rich.text import Text

from femag.answer import columns
from femag.geometry import (
    LIMITS,
    CatalogueCore,
    EffectiveParameters,
    effective_parameters,
)

OUTSIDE = ("outer_diameter", "length", "width", "height")
LISTED = (
    ("effective_area", 1e6, 1),
    ("effective_length", 1e3, 1),
    ("core_factor", 1e-3, 3),
)
LIST_COLUMNS = ("size", "outside", "post", "window", "Ae", "le", "C1", "source")
CORE_COLUMNS = ("dimension", "from, mm", "to, mm", "nominal, mm", "source")
EFFECTIVE_COLUMNS = ("effective parameter", *LIMITS, "published")


def print_core_list(cores: Sequence[CatalogueCore], console: Console) -> None:
    """Print a line for each core: nominal dimensions, effective parameters, source."""
    table = columns(*LIST_COLUMNS, words=["size", "source"], gap=1)
    for entry in cores:
        sizes = entry.core().sizes
        sources = {*entry.sources.values(), entry.published_source} - {""}
        outside = [sizes[name] for name in OUTSIDE if name in sizes]
        table.add_row(
            entry.size,
            "x".join(map(_mm, outside)),
            _mm(sizes["post_diameter"]),
            f"{_mm(sizes['window_diameter'])}x{_mm(sizes['window_height'])}",
            *_listed_parameters(entry),
            sources.pop() if len(sources) == 1 else "mixed",
        )
    console.print(table, highlight=False)
    console.print(
        Text(
            "mm, mm2, 1/mm; means of the limits. outside: diameter or length x width, then "
            "height; window: diameter x height. Ae, le and C1 as published, or, marked c, computed "
            "by the rules of IEC 60205 without slots. source: 'memory' marks numbers that nobody "
            "has confirmed; 'gapfield cores SIZE' shows where each number comes from."
        )
    )


def print_core(entry: CatalogueCore, console: Console) -> None:
    """Print one core: limits and source of every dimension, and the effective parameters."""
    console.print(Text(f"{entry.size}, {entry.standard}", style="bold"))
    console.print(Text(f"from {entry.file}"))
    table = columns(*CORE_COLUMNS, words=["dimension", "source"])
    for name in entry.dimensions:
        limits = entry.dimensions[name]
        numbers = (limits.low, limits.high, limits.nominal)
        texts = [f"{1e3 * number:.3f}" for number in numbers]
        table.add_row(name.replace("_", " "), *texts, entry.sources[name])
    console.print(table, highlight=False)
    console.print()
    console.print(_effective_table(entry), highlight=False)
    console.print(
        Text(
            f"Published: {entry.published_source or 'nothing known'}. The others are computed by "
            "the rules of IEC 60205 without slots. minimum and maximum: least and most core "
            "material within the limits."
        )
    )


def _listed_parameters(entry: CatalogueCore) -> list[str]:
    """Return Ae, le and C1 as published where that is known, else computed and marked so."""
    computed = None if len(entry.published) >= 3 else effective_parameters(entry.core())
    texts = []
    for key, scale, digits in LISTED:
        published = entry.published.get(key)
        if published is not None:
            texts.append(f"{scale * published:.{digits}f} ")
        else:
            assert computed is not None
            texts.append(f"{scale * _parameter(computed, key):.{digits}f}c")
    return texts


def _mm(length: float) -> str:
    return f"{round(1e3 * length, 2):g}"


def _effective_table(entry: CatalogueCore) -> Table:
    table = columns(*EFFECTIVE_COLUMNS, words=["effective parameter"])
    values = [effective_parameters(entry.core(limit)) for limit in LIMITS]
    for label, key, scale, digits in (
        ("core factor C1, 1/mm", "core_factor", 1e-3, 4),
        ("length le, mm", "effective_length", 1e3, 2),
        ("area Ae, mm2", "effective_area", 1e6, 2),
        ("least area, mm2", "least_area", 1e6, 2),
    ):
        published = entry.published.get(key)
        table.add_row(
            label,
            *(f"{scale * _parameter(value, key):.{digits}f}" for value in values),
            "-" if published is None else f"{scale * published:g}",
        )
    return table


def _parameter(effective: EffectiveParameters, key: str) -> float:
    return {
        "core_factor": effective.c1,
        "effective_length": effective.length,
        "effective_area": effective.area,
        "least_area": effective.least_area,
    }[key]
