"""What can go wrong, said in one line each, with the exit code of the command line."""

from __future__ import annotations

import math
from collections.abc import Sequence
from numbers import Real
from typing import Any


class GapfieldError(Exception):
    """Any failure that a user can act on; its text is one line."""

    exit_code = 3


class InputError(GapfieldError):
    """Input that cannot be used as it stands.

    Parameters
    ----------
    problem : str
        What is wrong, without a full stop.
    key : str, optional
        Dotted key of the design file, or the argument's name.
    value : object, optional
        The offending value as the user wrote it.
    accepted : str, optional
        What would have been accepted.
    file : str, optional
        The file that holds the value.
    """

    exit_code = 2

    def __init__(
        self,
        problem: str,
        *,
        key: str | None = None,
        value: object = None,
        accepted: str | None = None,
        file: str | None = None,
    ) -> None:
        self.problem, self.key, self.value = problem, key, value
        self.accepted, self.file = accepted, file
        super().__init__(problem)

    def changed(self, **parts: object) -> InputError:
        """Return the error with another key, value or file; None leaves a part as it is."""
        kept: dict[str, Any] = {
            "key": self.key,
            "value": self.value,
            "accepted": self.accepted,
            "file": self.file,
        }
        kept |= {name: part for name, part in parts.items() if part is not None}
        return InputError(self.problem, **kept)

    def __str__(self) -> str:
        where = ": ".join(part for part in (self.file, self.key) if part)
        shown = "" if self.value is None else f" = {_shortened(repr(self.value))}"
        accepted = f"; accepted: {self.accepted}" if self.accepted else ""
        head = f"{where}{shown}: " if where else ""
        return f"{head}{self.problem}{accepted}"


def _shortened(text: str, length: int = 120) -> str:
    return text if len(text) <= length else f"{text[: length - 4]} ..."


def number(value: object, key: str, accepted: str) -> float:
    """Return a value as a float.

    Raises
    ------
    InputError
        If it is no real number; texts with units belong into design files.
    """
    if isinstance(value, bool) or not isinstance(value, Real):
        raise InputError("not a number", key=key, value=value, accepted=accepted)
    try:
        return float(value)
    except OverflowError:
        return math.inf


def entry_key(name: str, index: int) -> str:
    """Return the key of an entry of a list in the design file: ``gap``, then ``gap.1``."""
    return name if index == 0 else f"{name}.{index}"


class NumericalError(GapfieldError):
    """The computation did not deliver what was asked; the text says how far it came."""


class NewtonError(NumericalError):
    """Newton's iteration did not converge.

    Parameters
    ----------
    problem : str
        What happened.
    history : sequence of float
        Squared Newton decrement over the stored energy, one entry an iteration.
    """

    def __init__(self, problem: str, history: Sequence[float]) -> None:
        self.history = tuple(history)
        trail = ", ".join(f"{value:.1e}" for value in self.history[-6:])
        super().__init__(f"{problem} (relative decrements: {trail})")


class MissingLibraryError(GapfieldError):
    """A library that the machine should provide is not there."""
