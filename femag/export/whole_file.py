"""Files written under another name and renamed, so that a reader never sees half of one."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from femag.errors import InputError


@contextmanager
def whole_file(path: str | Path) -> Iterator[Path]:
    """Give a temporary path beside `path` to write to; rename it when the block succeeds.

    Links are followed. Devices and pipes cannot be renamed onto and are refused.

    Raises
    ------
    InputError
        If the file cannot be written.
    """
    target = Path(path).resolve()
    if target.exists() and not target.is_file():
        raise InputError("is no regular file", file=str(path), accepted="a file to write to")
    if target.exists() and not os.access(target, os.W_OK):
        raise InputError("cannot be written (write-protected)", file=str(path))
    temporary: Path | None = None
    try:
        handle, name = tempfile.mkstemp(
            dir=target.parent, prefix=".gapfield-", suffix=target.suffix
        )
        temporary = Path(name)
        os.close(handle)
        yield temporary
        temporary.chmod(0o666 & ~_file_mask())
        with temporary.open("rb") as written:
            os.fsync(written.fileno())
        temporary.replace(target)
    except OSError as error:
        raise InputError(f"cannot be written ({error.strerror})", file=str(path)) from error
    finally:
        if temporary is not None:
            temporary.unlink(missing_ok=True)


def _file_mask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask
