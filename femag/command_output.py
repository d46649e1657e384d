"""Around the work of a command: options and targets checked before, progress shown during it."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

from femag.errors import InputError

if TYPE_CHECKING:
    from rich.console import Console

PATIENCE = 1.0
"""Seconds of silence before progress shows on a terminal."""


def check_targets(json: str | None, out: Path | None, option: str = "--out") -> None:
    """Refuse before the work what cannot be written after it.

    Parameters
    ----------
    json : str or None
        Of ``--json``: a file, or - for standard output.
    out : Path or None
        Of ``--out``: a folder, there or not.
    option : str
        Option that names the folder instead.

    Raises
    ------
    InputError
        If either cannot be written.
    """
    if json is not None and json != "-":
        folder = Path(json).parent
        if not json or Path(json).is_dir() or not folder.is_dir():
            raise InputError(
                "cannot be written", key="--json", value=json,
                accepted="a file in a folder that exists, or -",
            )  # fmt: skip
    if out is not None and out.exists() and not out.is_dir():
        raise InputError("is no folder", key=option, value=str(out), accepted="a folder")


def check_file(option: str, file: Path | None, ending: str) -> None:
    """Refuse before the work a file that cannot be written after it.

    Parameters
    ----------
    option : str
        Its name, for messages.
    file : Path or None
        File to write, if any.
    ending : str
        What its name must end with, such as ".csv".

    Raises
    ------
    InputError
        If it has another ending, is a folder, or its folder does not exist.
    """
    if file is None:
        return
    if file.suffix.lower() != ending or file.is_dir() or not file.parent.is_dir():
        raise InputError(
            "cannot be written", key=option, value=str(file),
            accepted=f"a file that ends with {ending}, in a folder that exists",
        )  # fmt: skip


def quantity(option: str, text: str, unit: str) -> float:
    """Return the value in SI of an option's text.

    Parameters
    ----------
    option : str
        Its name, for messages.
    text : str
        Such as "250 uH".
    unit : str
        SI unit that it must have.

    Raises
    ------
    InputError
        If it does not read.
    """
    from femag.units import si_value

    try:
        return si_value(text, unit)
    except InputError as error:
        raise error.changed(key=option, value=text) from error


@contextmanager
def options_named(**texts: str | None) -> Iterator[None]:
    """Say what the user wrote where an argument that an option gave cannot be used.

    Parameters
    ----------
    **texts : str or None
        By the argument's name, which the option shares: the option's text, if it was given.

    Raises
    ------
    InputError
        That of the work, with option and text instead of argument and SI value.
    """
    try:
        yield
    except InputError as error:
        text = texts.get(error.key or "")
        if text is None:
            raise
        option = f"--{str(error.key).replace('_', '-')}"
        raise error.changed(key=option, value=text) from error


def check_spares(source: Path, what: str, option: str, target: str | Path | None) -> None:
    """Refuse to write over what is read.

    Parameters
    ----------
    source : Path
        File that is read.
    what : str
        What it is, such as "the design".
    option : str
        Option that names the target.
    target : str, Path or None
        File to write.

    Raises
    ------
    InputError
        If both are one file.
    """
    if target and Path(target).exists() and source.exists() and Path(target).samefile(source):
        raise InputError(
            f"is {what} itself", key=option, value=str(target), accepted="another file, or -"
        )


def make_folder(out: Path, option: str = "--out") -> None:
    """Make the folder that an option names, with all above it.

    Raises
    ------
    InputError
        If it cannot be made.
    """
    try:
        out.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise InputError(
            f"cannot be made a folder ({error.strerror})", key=option, value=str(out)
        ) from error


def terminal(stderr: bool = False) -> Console:
    """Return a console that prints names and titles as they are: no markup, no emoji codes.

    Parameters
    ----------
    stderr : bool
        Standard error, as wide as it is; else standard output, in `femag.answer.WIDTH` columns.
    """
    from rich.console import Console

    from femag.answer import WIDTH

    return Console(stderr=stderr, width=None if stderr else WIDTH, markup=False, emoji=False)


@contextmanager
def shown_progress(said: Callable[..., str]) -> Iterator[Callable[..., Any] | None]:
    """Give a callback that shows what it says on a terminal when it takes long; None if piped.

    Parameters
    ----------
    said : callable
        Text of a state of the work, from what the callback is called with.
    """
    if sys.stderr is None or not sys.stderr.isatty():
        yield None
        return
    started = time.monotonic()
    with terminal(stderr=True).status("") as status:
        status.stop()

        def show(*state: Any) -> None:
            if time.monotonic() - started > PATIENCE:
                status.update(said(*state))
                status.start()

        yield show
