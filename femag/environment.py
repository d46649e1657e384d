"""The machine and the libraries that answers come from, for bug reports."""

from __future__ import annotations

import ctypes
import locale
import os
import platform
import re
import sys
from collections.abc import Callable
from dataclasses import dataclass
from importlib.metadata import PackageNotFoundError, requires, version

SYSTEM_LIBRARIES = {
    "libGL.so.1": "libgl1",
    "libGLU.so.1": "libglu1-mesa",
    "libXcursor.so.1": "libxcursor1",
    "libXft.so.2": "libxft2",
    "libXinerama.so.1": "libxinerama1",
    "libgomp.so.1": "libgomp1",
}
"""What gmsh loads on Linux, and the Debian packages that hold it."""
THREADS = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")
MISSING = "missing"


@dataclass(frozen=True)
class Environment:
    """What a bug report should say; no names of users, files or machines.

    Parameters
    ----------
    system : str
        Operating system, processor and number of processors.
    python : str
        Version and implementation.
    encoding : str
        Of text that is printed, and of the locale.
    threads : dict of str to str
        Environment variables that limit threads, where they are set.
    versions : dict of str to str
        Of this package and of what it requires; "missing" where it is not installed.
    system_libraries : dict of str to str
        On Linux "found" or the Debian package to install, for each library that gmsh needs.
    meshing : str
        "works", or why a triangle mesh of a square cannot be had.
    """

    system: str
    python: str
    encoding: str
    threads: dict[str, str]
    versions: dict[str, str]
    system_libraries: dict[str, str]
    meshing: str


def environment() -> Environment:
    """Return the environment; nothing that is missing or broken stops it."""
    return Environment(
        system=f"{platform.platform()}, {os.cpu_count()} processors",
        python=f"{platform.python_version()} ({platform.python_implementation()})",
        encoding=f"{getattr(sys.stdout, 'encoding', None)}, {locale.getpreferredencoding(False)}",
        threads={name: os.environ[name] for name in THREADS if name in os.environ},
        versions=_versions(),
        system_libraries=_system_libraries(),
        meshing=outcome_of(_mesh_of_a_square),
    )


def _versions() -> dict[str, str]:
    try:
        texts = requires("gapfield") or []
    except PackageNotFoundError:
        texts = []
    needed = [re.split(r"[^A-Za-z0-9._-]", text)[0] for text in texts if "extra ==" not in text]
    return {name: _version(name) for name in ("gapfield", *sorted(needed))}


def _version(name: str) -> str:
    try:
        return version(name)
    except PackageNotFoundError:
        return MISSING


def _system_libraries() -> dict[str, str]:
    if sys.platform != "linux":
        return {}
    found = {}
    for name, package in SYSTEM_LIBRARIES.items():
        try:
            ctypes.CDLL(name)
            found[name] = "found"
        except OSError:
            found[name] = f"{MISSING}: on Debian or Ubuntu install {package}"
    return found


def outcome_of(trial: Callable[[], None]) -> str:
    """Return "works", or the first line of what a trial raises."""
    try:
        trial()
    except Exception as error:  # whatever is broken is what the report is for
        lines = str(error).splitlines() or [""]
        return f"{type(error).__name__}: {lines[0]}"
    return "works"


def _mesh_of_a_square() -> None:
    from femag.geometry import Region, open_section, rectangle
    from femag.mesh import coarse_mesh

    coarse_mesh(open_section((Region("square", "air", rectangle(0.01, 0.02, -0.01, 0.01)),), 0.1))
