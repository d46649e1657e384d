"""A design file with a few values changed, and all else as its owner wrote it."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any

from femag.design import Design
from femag.design_file.keys import named_files
from femag.design_file.reading import design_from_toml, document_of_toml
from femag.design_file.writing import design_document
from femag.errors import InputError

Place = tuple[str | int, ...]

_WINDING = re.compile(r"\s*\[\[\s*winding\s*\]\]")


def changed_design_file(file: Path, before: Design, after: Design, target: Path) -> str:
    """Return the text of a design file that holds another design, comments and layout kept.

    Only values that differ between the two designs are written anew, and paths of other files where
    the text goes to another folder. A first gap gets a table before the windings.

    Parameters
    ----------
    file : Path
        What the owner wrote.
    before, after : Design
        What it holds, and what the returned text holds.
    target : Path
        File that the text is for.

    Raises
    ------
    InputError
        If the file cannot be read, or no longer holds the first design.
    """
    try:
        text = file.read_bytes().decode("utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise InputError("can no longer be read", file=str(file)) from error
    line_end = "\r\n" if "\r\n" in text else "\n"
    text = text.replace("\r\n", "\n")
    mark = "\ufeff" if text.startswith("\ufeff") else ""
    if design_document(design_from_toml(text.removeprefix(mark), str(file))) != design_document(
        before
    ):
        raise InputError("has changed while the gap was looked for", file=str(file))
    changed = _changed(text.removeprefix(mark), before, after, file.parent, target.parent)
    if design_document(design_from_toml(changed, str(target))) != design_document(after):
        raise InputError(
            "cannot be changed in place", file=str(file), accepted="one table for each part"
        )
    return mark + changed.replace("\n", line_end)


def _changed(text: str, before: Design, after: Design, folder: Path, new_folder: Path) -> str:
    import tomlkit

    document = tomlkit.parse(text)
    old, new = design_document(before), design_document(after)
    for place, value in _differences(old, new):
        _set(document, place, value)
    for key, path in named_files(document_of_toml(text)):
        _set(document, tuple(key.split(".")), _path_from(new_folder, folder, path))
    if len(new["gap"]) == len(old["gap"]):
        return tomlkit.dumps(document)
    (gap,) = new["gap"]
    if "gap" in document:  # an empty list
        document["gap"] = [gap]
        return tomlkit.dumps(document)
    return _with_table(tomlkit.dumps(document), f"[[gap]]\n{tomlkit.dumps(gap)}")


def _differences(old: Any, new: Any, place: Place = ()) -> Iterator[tuple[Place, Any]]:
    """Yield place and new value of what differs, entries added to a list left out."""
    if isinstance(old, Mapping) and isinstance(new, Mapping):
        for key, value in new.items():
            yield from _differences(old.get(key), value, (*place, key))
    elif isinstance(old, list) and all(isinstance(entry, Mapping) for entry in (*old, *new)):
        for index, (first, second) in enumerate(zip(old, new, strict=False)):
            yield from _differences(first, second, (*place, index))
    elif old != new:
        yield place, new


def _set(document: Any, place: Sequence[str | int], value: Any) -> None:
    """Set a value in a document of tomlkit; a missing table is made."""
    *way, last = place
    table = document
    for part in way:
        if isinstance(part, str) and part not in table:
            table[part] = {}
        table = table[part]
    if table.get(last) != value:
        table[last] = value


def _path_from(new_folder: Path, folder: Path, path: str) -> str:
    """Return a path that means the same in another folder; in the same one as it is written."""
    if Path(path).is_absolute() or folder.resolve() == new_folder.resolve():
        return path
    try:
        return Path(os.path.relpath((folder / path).resolve(), new_folder.resolve())).as_posix()
    except ValueError:  # another drive
        return (folder / path).resolve().as_posix()


def _with_table(text: str, table: str) -> str:
    """Return a text with a table before the first winding and its comments, or else at the end."""
    text = text if text.endswith("\n") else f"{text}\n"
    appended = f"{text}\n{table}"
    wanted = document_of_toml(appended)
    lines = text.splitlines(keepends=True)
    for place in (i for i, line in enumerate(lines) if _WINDING.match(line)):
        while place and lines[place - 1].lstrip().startswith("#"):
            place -= 1
        inserted = "".join([*lines[:place], table, "\n", *lines[place:]])
        if document_of_toml(inserted) == wanted:  # no line of a text in several lines
            return inserted
    return appended
