import builtins
import os
import signal
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.design import meshed_section, whole_section
from femag.errors import MissingLibraryError
from femag.geometry import Region, open_section, rectangle, region_areas
from femag.mesh import SectionMesh, coarse_mesh, refined_mesh, uniformly_refined_mesh


def meshed_areas(mesh: SectionMesh) -> np.ndarray:
    corners = mesh.triangles.p[:, mesh.triangles.t]
    (r1, z1), (r2, z2) = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    return np.bincount(mesh.region, np.abs(r1 * z2 - r2 * z1) / 2, minlength=len(mesh.names))


def test_meshed_areas_equal_those_of_the_polygons(pot_26_16: fm.Design) -> None:
    for section in (meshed_section(pot_26_16), whole_section(pot_26_16)):
        mesh = coarse_mesh(section)
        expected = [region_areas(section)[name] for name in mesh.names]
        np.testing.assert_allclose(meshed_areas(mesh), expected, rtol=1e-10)


def test_same_input_gives_the_same_mesh(pot_26_16: fm.Design) -> None:
    first, second = (coarse_mesh(meshed_section(pot_26_16)) for _ in range(2))
    np.testing.assert_array_equal(first.triangles.p, second.triangles.p)
    np.testing.assert_array_equal(first.triangles.t, second.triangles.t)
    np.testing.assert_array_equal(first.region, second.region)


def test_refinement_is_nested_and_keeps_regions_and_walls(pot_26_16: fm.Design) -> None:
    coarse = coarse_mesh(meshed_section(pot_26_16))
    fine, parent = refined_mesh(coarse, np.arange(0, coarse.triangles.nelements, 7))
    np.testing.assert_allclose(meshed_areas(fine), meshed_areas(coarse), rtol=1e-12)
    np.testing.assert_array_equal(fine.region, coarse.region[parent])
    centre = fine.triangles.p[:, fine.triangles.t].mean(axis=1)
    local = coarse.triangles.mapping().invF(centre[:, :, None], tind=parent)
    assert np.all(local > 0)
    assert np.all(local.sum(axis=0) < 1)
    for kind in ("far", "normal"):
        assert length(fine, kind) == pytest.approx(length(coarse, kind), rel=1e-12)


def length(mesh: SectionMesh, kind: str) -> float:
    start, end = mesh.triangles.p[:, mesh.triangles.facets[:, mesh.walls[kind]]].transpose(1, 0, 2)
    return float(np.hypot(*(end - start)).sum())


def test_uniform_refinement_divides_every_region_into_four(pot_26_16: fm.Design) -> None:
    coarse = coarse_mesh(meshed_section(pot_26_16))
    fine = uniformly_refined_mesh(coarse)
    np.testing.assert_array_equal(4 * np.bincount(coarse.region), np.bincount(fine.region))
    np.testing.assert_allclose(meshed_areas(fine), meshed_areas(coarse), rtol=1e-12)


@pytest.mark.parametrize("gap", [1e-6, 5e-6, 0.5e-3, 10.9e-3])
def test_extreme_gaps_mesh_with_few_elements(pot_26_16: fm.Design, gap: float) -> None:
    mesh = coarse_mesh(meshed_section(replace(pot_26_16, gaps=(fm.Gap(gap),))))
    assert 0 < len(mesh.elements_of("post gap")) < mesh.triangles.nelements < 12_000


@pytest.mark.parametrize(
    ("gap", "part"), [(1e-9, "post gap"), (1e-7, "post gap"), (11e-3 - 1e-12, "upper post")]
)
def test_parts_that_cannot_be_resolved_are_named(
    pot_26_16: fm.Design, gap: float, part: str
) -> None:
    design = replace(pot_26_16, gaps=(fm.Gap(gap),))
    with pytest.raises(fm.InputError, match="too thin to be meshed") as caught:
        coarse_mesh(meshed_section(design))
    assert caught.value.key == part


def test_overlapping_regions_are_refused() -> None:
    parts = (
        Region("one", "core", rectangle(1e-3, 3e-3, 0.0, 2e-3)),
        Region("two", "core", rectangle(2e-3, 4e-3, 1e-3, 3e-3)),
    )
    with pytest.raises(fm.InputError, match="one and two overlap"):
        coarse_mesh(open_section(parts, 0.05))


def test_missing_system_libraries_are_named(
    pot_26_16: fm.Design, monkeypatch: pytest.MonkeyPatch
) -> None:
    real = builtins.__import__

    def without_gmsh(name: str, *args, **kwargs):
        if name == "gmsh":
            raise OSError("libGLU.so.1: cannot open shared object file")
        return real(name, *args, **kwargs)

    monkeypatch.setattr(builtins, "__import__", without_gmsh)
    with pytest.raises(MissingLibraryError, match="install libgl1") as caught:
        coarse_mesh(meshed_section(pot_26_16))
    assert "\n" not in str(caught.value)
    assert caught.value.exit_code == 3


@pytest.mark.skipif(not hasattr(signal, "SIGPIPE"), reason="no such signal here")
@pytest.mark.parametrize("in_thread", [False, True])
def test_a_closed_pipe_is_an_error_after_meshing_not_the_end(in_thread: bool) -> None:
    """gmsh makes SIGPIPE deadly; sockets and pipes to workers would end the process silently."""
    square = open_section((Region("a", "air", rectangle(0.0, 1.0, -1.0, 1.0)),), 3.0)
    if in_thread:
        with ThreadPoolExecutor(1) as thread:
            thread.submit(coarse_mesh, square).result()
    else:
        coarse_mesh(square)
    read, write = os.pipe()
    os.close(read)
    with pytest.raises(BrokenPipeError):
        os.write(write, b"x")
    os.close(write)


def test_threads_mesh_one_after_the_other(pot_26_16: fm.Design) -> None:
    section = meshed_section(pot_26_16)
    alone = coarse_mesh(section)
    with ThreadPoolExecutor(4) as threads:
        for mesh in threads.map(coarse_mesh, [section] * 8):
            np.testing.assert_array_equal(mesh.triangles.p, alone.triangles.p)
