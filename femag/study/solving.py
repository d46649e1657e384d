"""What a worker does: a design document in, the numbers that are kept out."""

from __future__ import annotations

import time
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

from femag.design_file import design_from_document
from femag.errors import GapfieldError, MissingLibraryError
from femag.study.quantities import Value, kept

if TYPE_CHECKING:
    from femag.design import Design
    from femag.geometry import Section
    from femag.mesh import SectionMesh

MESHES = 8
"""Coarse meshes that a worker keeps: cases that differ in current or material only share one."""


@dataclass(frozen=True)
class Answer:
    """What became of a case.

    Parameters
    ----------
    values : dict or None
        Kept numbers by column; None where it failed.
    reason : str
        Why it failed, in one line.
    seconds : float
        Time that it took.
    design_hash : str
        Of the design that was solved.
    versions : dict
        Versions of the program and its libraries there.
    """

    values: dict[str, Value] | None
    reason: str = ""
    seconds: float = 0.0
    design_hash: str = ""
    versions: Mapping[str, str] | None = None


def solved_case(document: Mapping[str, Any], file: str | None, keep: tuple[str, ...]) -> Answer:
    """Return what is kept of the solution of a design document; a failure is an answer too.

    Parameters
    ----------
    document : mapping
        The design.
    file : str or None
        File that paths in it resolve against.
    keep : tuple of str
        Names of quantities.

    Raises
    ------
    MissingLibraryError
        If nothing can be solved here at all.
    """
    started = time.perf_counter()
    try:
        return _solved(document, file, keep, started)
    except MissingLibraryError:
        raise
    except GapfieldError as error:
        return failed(str(error), time.perf_counter() - started)
    except MemoryError:
        return failed("out of memory", time.perf_counter() - started)
    except Exception as error:  # a defect of one case is not the end of the others
        return failed(f"{type(error).__name__}: {error}", time.perf_counter() - started)


def _solved(
    document: Mapping[str, Any], file: str | None, keep: tuple[str, ...], started: float
) -> Answer:
    from femag.result import solve

    design = design_from_document(document, file)
    result = solve(design, mesh=_coarse_mesh_of(design))
    values = kept(result, keep)
    seconds = time.perf_counter() - started
    return Answer(values, "", seconds, result.design_hash, result.versions)


def _coarse_mesh_of(design: Design) -> SectionMesh:
    """Return the mesh that a solution starts from: a function of the section alone, so kept."""
    from femag.design import meshed_section

    return _coarse_mesh(meshed_section(design))


@lru_cache(MESHES)
def _coarse_mesh(section: Section) -> SectionMesh:
    from femag.mesh import coarse_mesh

    return coarse_mesh(section)


def failed(reason: str, seconds: float = 0.0) -> Answer:
    """Return the answer of a case that failed."""
    return Answer(None, " ".join(reason.split()) or "no reason given", seconds)
