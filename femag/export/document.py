"""What the JSON files of answers share: reading them, and that their numbers belong together."""

from __future__ import annotations

from pathlib import Path
from typing import TypeVar

from pydantic import BaseModel, ConfigDict, ValidationError

from femag.design import Design, design_hash
from femag.errors import InputError


class Entry(BaseModel):
    """A table of a JSON file: all keys known, all numbers finite."""

    model_config = ConfigDict(frozen=True, allow_inf_nan=False, extra="forbid")


Document = TypeVar("Document", bound=Entry)


def document_of_file(path: str | Path, kind: type[Document], what: str, command: str) -> Document:
    """Return the document that a JSON file holds.

    Parameters
    ----------
    path : path
        The file.
    kind : type
        Its format.
    what : str
        What it holds, such as "result".
    command : str
        Command that writes it.

    Raises
    ------
    InputError
        If the file cannot be read or is none of this program.
    """
    try:
        return kind.model_validate_json(Path(path).read_bytes())
    except OSError as error:
        raise InputError(f"cannot be read ({error.strerror})", file=str(path)) from error
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        raise InputError(
            f"no {what} of this program ({first['msg']})",
            key=".".join(map(str, first["loc"])) or None,
            accepted=f"JSON as written by '{command} --json'",
            file=str(path),
        ) from error


def check_against_design(document: Entry, design: Design, keys: tuple[str, ...], file: str) -> None:
    """Refuse a document whose numbers were not all written with the design beside them.

    Parameters
    ----------
    document : Entry
        The document.
    design : Design
        The design in it.
    keys : tuple of str
        What of the design stands in the document too, beside its hash.
    file : str
        For messages.

    Raises
    ------
    InputError
        If one differs.
    """
    expected = {"design_hash": design_hash(design)} | {key: getattr(design, key) for key in keys}
    for key, value in expected.items():
        if getattr(document, key) != value:
            raise InputError(
                "does not belong to the design beside it",
                key=key,
                value=getattr(document, key),
                accepted=f"{value!r}",
                file=file,
            )
