"""The commands ``gapfield report`` and ``gapfield check``: the machine, and whether it works."""

from __future__ import annotations

from typing import Annotated

import typer

from femag.errors import InputError

FoldersArgument = Annotated[
    list[str] | None,
    typer.Argument(metavar="[FOLDER]...", help="Folders of the validation set; all by default."),
]


def report_command() -> None:
    """Print versions and system libraries for a bug report.

    Also when something is missing: then it says what.
    """
    from femag.environment import environment

    found = environment()
    rows = [
        ("system", found.system),
        ("python", found.python),
        ("encoding", found.encoding),
        *found.threads.items(),
        *found.versions.items(),
        *found.system_libraries.items(),
        ("meshing", found.meshing),
    ]
    width = max(len(name) for name, _ in rows)
    for name, text in rows:
        typer.echo(f"{name:<{width}}  {text}")


def check_command(folders: FoldersArgument = None) -> int:
    """Compare with outside references, on this machine.

    Prints the validation table, about a minute; exit code 1 if a row fails.
    """
    from validation.__main__ import FOLDERS, main

    for folder in folders or ():
        if folder not in FOLDERS:
            raise InputError(
                "no folder of the validation set", key="FOLDER", value=folder,
                accepted=", ".join(FOLDERS),
            )  # fmt: skip
    return main(folders or ())
