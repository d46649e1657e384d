"""Keys of tables that are read key by key: an unknown one is an error that names the nearest."""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Mapping
from typing import Any

from femag.errors import InputError


def require_known(table: Mapping[str, Any], known: Iterable[str], prefix: str = "") -> None:
    """Refuse a table with a key that is not known; `prefix` goes before it in the message.

    Raises
    ------
    InputError
        If there is one.
    """
    names = tuple(known)
    for key in table:
        if key not in names:
            near = difflib.get_close_matches(key, names, n=1, cutoff=0.5)
            accepted = f"nearest known key: {near[0]!r}" if near else ", ".join(names)
            raise InputError("unknown key", key=f"{prefix}{key}", accepted=accepted)
