"""Text files that users write: UTF-8, with or without a mark at its front."""

from __future__ import annotations

from pathlib import Path

from femag.errors import InputError


def text_of_file(path: str | Path, accepted: str) -> str:
    """Return the text of a file; `accepted` says in messages what it should hold.

    Raises
    ------
    InputError
        If the file cannot be read or is not UTF-8; it names the file.
    """
    try:
        return Path(path).read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError("not UTF-8 text", file=str(path), accepted=accepted) from error
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})", file=str(path)) from error
