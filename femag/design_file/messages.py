"""What is wrong with a design file, in one line."""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from typing import Any, get_args, get_origin

from pydantic import ValidationError

from femag.design_file.tables import DesignTable
from femag.errors import InputError, entry_key


def written_value(document: Mapping[str, Any], key: str | None) -> object:
    """Return what stands at a dotted key; in a list the first entry is meant unless numbered."""
    found: Any = document
    for part in (key or "").split("."):
        if isinstance(found, list) and part.isdigit() and int(part) < len(found):
            found = found[int(part)]
            continue
        if isinstance(found, list) and found:
            found = found[0]
        if not isinstance(found, Mapping) or part not in found:
            return None
        found = found[part]
    return None if isinstance(found, Mapping | list) else found


@contextmanager
def keyed(keys: str, prefix: str) -> Iterator[None]:
    """Put a prefix before the key of an error that names one of `keys`."""
    try:
        yield
    except InputError as error:
        if error.key not in keys.split():
            raise
        raise error.changed(key=prefix + error.key) from error


@contextmanager
def renumbered(name: str, index: int) -> Iterator[None]:
    """Say in an error which entry of the list `name` it is about."""
    try:
        yield
    except InputError as error:
        inside = (error.key or "").removeprefix(name).lstrip(".")
        key = f"{entry_key(name, index)}.{inside}".rstrip(".")
        raise error.changed(key=key) from error


def first_error(error: ValidationError, file: str | None, root: Any = DesignTable) -> InputError:
    """Return the first of a validation's errors as one line; `root` is the whole file's table."""
    first = min(error.errors(include_url=False), key=_unknown_keys_first)
    location = first["loc"]
    key = _dotted(location)
    if first["type"] == "extra_forbidden":
        known = _fields_at(location[:-1], root)
        near = difflib.get_close_matches(str(location[-1]), known, n=1, cutoff=0.5)
        accepted = f"nearest known key: {near[0]!r}" if near else ", ".join(known)
        return InputError("unknown key", key=key, accepted=accepted, file=file)
    inside = _inside_free_keys(location, root)
    if inside:
        location = location[:inside]
        key = _dotted(location)
    named = _up_to_last_name(location[: inside - 1] if inside else location)
    description = _fields_at(named[:-1], root)[str(named[-1])] if named else "a table"
    if first["type"] == "missing":
        return InputError("missing", key=key, accepted=description, file=file)
    problem = first["msg"] if first["type"] == "quantity" else "not usable"
    return InputError(problem, key=key, value=first["input"], accepted=description, file=file)


def _unknown_keys_first(error: Mapping[str, Any]) -> int:
    """A misspelt key is also a missing one: name the misspelling."""
    return 0 if error["type"] == "extra_forbidden" else 1


def _up_to_last_name(location: Sequence[int | str]) -> Sequence[int | str]:
    """Return a location without the numbers at its end: an entry is described with its list."""
    length = max((i for i, part in enumerate(location, 1) if isinstance(part, str)), default=0)
    return location[:length]


def _inside_free_keys(location: Sequence[int | str], table: Any) -> int:
    """Return how many parts lead to an entry of a table whose keys are free; 0 if none does."""
    for length, part in enumerate(location, 1):
        if isinstance(part, int):
            continue
        annotation = table.model_fields[part].annotation
        table = table_in(annotation)
        if not hasattr(table, "model_fields"):
            free = dict in (get_origin(annotation), get_origin(table))
            names = (i for i in range(length, len(location)) if isinstance(location[i], str))
            return next(names, -1) + 1 if free else 0
    return 0


def _dotted(location: Sequence[int | str]) -> str:
    key = ""
    for part in location:
        key = entry_key(key, part) if isinstance(part, int) else f"{key}.{part}".lstrip(".")
    return key


def _fields_at(location: Sequence[int | str], table: Any) -> dict[str, str]:
    """Return the keys of the table at a location inside of another, each with what it accepts."""
    for part in location:
        if isinstance(part, str):
            table = table_in(table.model_fields[part].annotation)
    return {name: field.description or "" for name, field in table.model_fields.items()}


def table_in(annotation: Any) -> Any:
    """Return the table class inside ``list[Table]`` or ``Table | None``."""
    return next((part for part in get_args(annotation) if part is not type(None)), annotation)
