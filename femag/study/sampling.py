"""Values between limits: evenly spaced ones, and samples that fill a box of several keys.

Samples are scipy.stats.qmc's: Latin hypercube or scrambled Sobol points.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Literal, get_args

import numpy as np

from femag.design_file import as_written, plain_value
from femag.errors import InputError
from femag.study.plan import MOST_CASES, Factor

Method = Literal["sobol", "latin hypercube"]
METHODS: tuple[Method, ...] = get_args(Method)
ACCEPTED_RANGE = "[first, last], or [first, last, 'log'] of numbers above 0"
ACCEPTED_STEPS = "a list of values, or 'first:last:number', or 'first:last:number:log'"
DIGITS = 9
"""Significant digits of sampled values, so that they read well."""


@dataclass(frozen=True)
class Span:
    """What lies between two values of a key.

    Parameters
    ----------
    key : str
        Dotted key of the design file.
    first, last : float
        SI.
    log : bool
        Whether equal ratios count as equal steps.
    whole : bool
        Whether only whole numbers are meant.
    """

    key: str
    first: float
    last: float
    log: bool = False
    whole: bool = False

    def at(self, share: float) -> Any:
        """Return the value as in a design file at a share of the way, 0 to 1."""
        if self.whole:
            low, high = sorted((self.first - 0.5, self.last + 0.5))
            place = share if self.last >= self.first else 1.0 - share
            inside = math.floor(_between(low, high, place, self.log and low > 0.0) + 0.5)
            return int(min(max(inside, low + 0.5), high - 0.5))
        value = _between(self.first, self.last, share, self.log)
        rounded = float(f"{value:.{DIGITS}g}")
        low, high = sorted((self.first, self.last))
        return as_written(self.key, min(max(rounded, low), high))


def _between(first: float, last: float, share: float, log: bool) -> float:
    if log:
        return float(first * (last / first) ** share)
    return first + (last - first) * share


def span_of(key: str, values: Sequence[Any], accepted: str = ACCEPTED_RANGE) -> Span:
    """Return the span of ``[first, last]`` or ``[first, last, "log"]``.

    Parameters
    ----------
    key : str
        Dotted key.
    values : sequence
        As in a design file.
    accepted : str
        For messages.

    Raises
    ------
    InputError
        If they are none.
    """
    ends, spacing = values[:2], values[2:]
    if isinstance(values, str) or len(ends) != 2 or list(spacing) not in ([], ["log"], ["even"]):
        raise InputError("not a range", key=key, value=values, accepted=accepted)
    first, last = (plain_value(key, end) for end in ends)
    numbers = [isinstance(end, int | float) and not isinstance(end, bool) for end in (first, last)]
    log = list(spacing) == ["log"]
    if not all(numbers) or first == last or (log and min(first, last) <= 0.0):
        raise InputError("not a range", key=key, value=values, accepted=accepted)
    return Span(key, first, last, log, isinstance(first, int) and isinstance(last, int))


def steps_of(key: str, text: str) -> list[Any]:
    """Return the values of ``first:last:number`` or ``first:last:number:log``.

    Raises
    ------
    InputError
        If the text does not read.
    """
    parts = [part.strip() for part in text.split(":")]
    if len(parts) not in (3, 4) or not (parts[2].isascii() and parts[2].isdigit()):
        raise InputError("not a row of steps", key=key, value=text, accepted=ACCEPTED_STEPS)
    number = int(parts[2][:9])
    if not 2 <= number <= MOST_CASES:
        raise InputError(f"{number} steps", key=key, value=text, accepted=f"2 to {MOST_CASES}")
    ends = [_number_or_text(part) for part in parts[:2]]
    span = span_of(key, [*ends, *parts[3:]], ACCEPTED_STEPS)
    if span.whole:
        steps = [_between(span.first, span.last, k / (number - 1), span.log) for k in range(number)]
        return [round(step) for step in steps]
    return [span.at(step / (number - 1)) for step in range(number)]


def _number_or_text(part: str) -> Any:
    for kind in (int, float):
        try:
            return kind(part)
        except ValueError:
            pass
    return part


@dataclass(frozen=True)
class Sample:
    """Cases that fill a box of several keys.

    Parameters
    ----------
    ranges : mapping of str to sequence
        Ends of each key: ``("0.1 mm", "2 mm")``, or numbers in SI, with ``"log"`` as a third where
        equal ratios count as equal steps.
    cases : int
        Number of cases; for Sobol points a power of 2.
    method : {"sobol", "latin hypercube"}
        How they are drawn.
    seed : int
        Of the random numbers; the same seed gives the same cases.
    """

    ranges: Mapping[str, Sequence[Any]]
    cases: int
    method: Method = "sobol"
    seed: int = 0

    def __post_init__(self) -> None:
        if self.method not in METHODS:
            accepted = " or ".join(map(repr, METHODS))
            raise InputError("unknown", key="sample.method", value=self.method, accepted=accepted)
        if not 1 <= self.cases <= MOST_CASES or self.seed < 0:
            raise InputError(
                "out of range", key="sample", value=(self.cases, self.seed),
                accepted=f"1 to {MOST_CASES} cases, seed 0 or above",
            )  # fmt: skip
        if self.method == "sobol" and self.cases & (self.cases - 1):
            raise InputError(
                "no power of 2", key="sample.cases", value=self.cases,
                accepted="256 or the like for 'sobol', any number for 'latin hypercube'",
            )  # fmt: skip
        if not self.ranges:
            raise InputError("empty", key="ranges", accepted="one key or more")

    def factor(self) -> Factor:
        """Return the factor whose rows are the cases.

        Raises
        ------
        InputError
            If a range cannot be used.

        References
        ----------
        scipy.stats.qmc: Sobol (scrambled), LatinHypercube.
        """
        from scipy.stats import qmc

        spans = [
            span_of(key, [as_written(key, value) for value in values])
            for key, values in self.ranges.items()
        ]
        engine = qmc.Sobol if self.method == "sobol" else qmc.LatinHypercube
        points = np.asarray(engine(len(spans), rng=self.seed).random(self.cases))
        rows = tuple(
            tuple(span.at(share) for span, share in zip(spans, point, strict=True))
            for point in points.tolist()
        )
        return Factor("sample", tuple(self.ranges), rows, alike=True)
