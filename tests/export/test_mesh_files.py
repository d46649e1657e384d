"""Fields and meshes for other programs, read back."""

from dataclasses import replace
from pathlib import Path

import meshio
import numpy as np
import pytest

import femag as fm
from femag import cli
from femag.quantities.nodal_field import nodal_field


@pytest.fixture
def result(pot_26_16: fm.Design) -> fm.Result:
    return fm.solve(pot_26_16, tolerance=1e-2)


def read_field(result: fm.Result, folder: Path) -> meshio.Mesh:
    fm.write_field(result, folder / "field.vtu")
    return meshio.read(folder / "field.vtu")


def energies(field: meshio.Mesh) -> tuple[float, float]:
    """Integrals of B^2/(2 mu) and mu H^2/2 over the solid that the written triangles sweep.

    By a product rule of Gauss points on each quadratic triangle, from nothing but the file.
    """
    (cells,) = field.cells
    assert cells.type == "triangle6"
    node, weight = np.polynomial.legendre.leggauss(6)
    node, weight = (node + 1) / 2, weight / 2
    x = np.repeat(node, 6)
    y = np.outer(1 - node, node).ravel()
    w = (np.outer(weight, weight) * (1 - node)[:, None]).ravel()
    third = 1 - x - y
    shape = np.stack([third * (2 * third - 1), x * (2 * x - 1), y * (2 * y - 1),
                      4 * third * x, 4 * x * y, 4 * y * third])  # fmt: skip
    corner = field.points[cells.data[:, :3], :2]
    along, across = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
    area = np.abs(along[:, 0] * across[:, 1] - along[:, 1] * across[:, 0])
    r = np.einsum("en,nq->eq", field.points[cells.data, 0], shape)
    mu = 4e-7 * np.pi * field.cell_data["initial permeability"][0][:, None]
    squares = [
        np.sum(np.einsum("enc,nq->eqc", field.point_data[name][cells.data], shape) ** 2, axis=2)
        for name in ("B", "H")
    ]
    volume = 2 * np.pi * r * area[:, None] * w
    return float(np.sum(volume * squares[0] / (2 * mu))), float(
        np.sum(volume * squares[1] * mu / 2)
    )


def test_the_written_field_has_the_energies_of_both_sides(
    result: fm.Result, tmp_path: Path
) -> None:
    """The energy of a linear core is its co-energy; the file holds the upper half."""
    below, above = energies(read_field(result, tmp_path))
    assert 2 * below == pytest.approx(result.coenergy.lower, rel=1e-9)
    assert 2 * above == pytest.approx(result.coenergy.upper, rel=1e-9)


def test_cell_data_are_those_of_the_solution(result: fm.Result, tmp_path: Path) -> None:
    field = read_field(result, tmp_path)
    assert result.solution is not None
    mesh = result.solution.sides.mesh
    data = {name: values[0] for name, values in field.cell_data.items()}
    assert np.array_equal(data["region"], mesh.region + 1)
    assert set(np.round(data["initial permeability"], 6)) == {1.0, 2000.0}
    wound = mesh.region == mesh.names.index("winding main")
    assert data["current density"][wound] == pytest.approx(50 / (3.6e-3 * 9.6e-3))
    assert not np.any(data["current density"][~wound])
    assert 2 * result.coenergy.half_width == pytest.approx(data["local gap"].sum(), rel=1e-6)
    assert np.array_equal(
        field.point_data["B magnitude"], np.linalg.norm(field.point_data["B"], axis=1)
    )


def test_flux_at_the_nodes_is_the_integral_of_b(result: fm.Result) -> None:
    """Along the mirror plane, edge by edge: B_z is quadratic, so that Simpson's rule times r is
    exact but for its fourth degree, and the flux is what is between the ends of an edge."""
    assert result.solution is not None
    nodal = nodal_field(result.solution)
    on_plane = np.abs(nodal.points[..., 1]) == 0.0
    checked = 0
    for start, end, middle in ((0, 1, 3), (1, 2, 4), (2, 0, 5)):
        both = np.flatnonzero(on_plane[:, start] & on_plane[:, end])
        places = [start, middle, end]
        r, b = nodal.points[both][:, places, 0], nodal.flux_density[both][:, places, 1]
        flux = np.pi * (r[:, 2] - r[:, 0]) / 3 * np.sum(np.array([1, 4, 1]) * r * b, axis=1)
        inside = nodal.flux[both, end] - nodal.flux[both, start]
        assert flux == pytest.approx(inside, rel=1e-9, abs=1e-12)
        checked += len(both)
    assert checked > 5


def test_a_magnet_stands_in_b_and_h(pot_26_16: fm.Design, tmp_path: Path) -> None:
    magnet = fm.Magnet(remanence=0.4, recoil_permeability=1.05)
    design = replace(pot_26_16, gaps=(fm.Gap(0.5e-3, magnet=magnet),), current=1e-3)
    field = read_field(fm.solve(design, tolerance=2e-2), tmp_path)
    remanence = field.cell_data["remanence"][0]
    in_magnet = np.flatnonzero(remanence)
    assert remanence[in_magnet] == pytest.approx(0.4)
    nodes = field.cells[0].data[in_magnet].ravel()
    b, h = (field.point_data[name][nodes, 1] for name in ("B", "H"))
    recoil = 1.05 * 4e-7 * np.pi * h + 0.4
    assert np.median(np.abs(b - recoil)) < 0.01 * 0.4
    assert np.median(h) < 0.0


def test_the_mesh_reads_back_with_its_regions_and_walls(result: fm.Result, tmp_path: Path) -> None:
    fm.write_mesh(result, tmp_path / "mesh.msh")
    read = meshio.read(tmp_path / "mesh.msh")
    assert result.solution is not None
    mesh = result.solution.sides.mesh
    assert np.array_equal(read.points[:, :2], mesh.triangles.p.T)
    triangles, walls = read.cells
    assert np.array_equal(triangles.data, mesh.triangles.t.T)
    groups, on_wall = read.cell_data["gmsh:physical"]
    number = {name: int(group[0]) for name, group in read.field_data.items()}
    for name in mesh.names:
        assert np.array_equal(np.flatnonzero(groups == number[name]), mesh.elements_of(name))
    low = read.points[walls.data[on_wall == number["normal wall"]], 1]
    assert not np.any(low)
    assert {name for name, group in read.field_data.items() if group[1] == 1} == {
        "far wall", "normal wall",
    }  # fmt: skip


def test_names_with_quotes_and_accents_survive(pot_26_16: fm.Design, tmp_path: Path) -> None:
    winding = replace(pot_26_16.windings[0], name='12" spoole é')
    result = fm.solve(replace(pot_26_16, windings=winding), tolerance=2e-2)
    fm.write_mesh(result, tmp_path / "mesh.msh")
    assert "winding 12' spoole é" in meshio.read(tmp_path / "mesh.msh").field_data


def test_a_result_from_a_file_has_no_field_to_write(result: fm.Result, tmp_path: Path) -> None:
    fm.write_result(result, tmp_path / "result.json")
    read = fm.read_result(tmp_path / "result.json")
    for write in (fm.write_field, fm.write_mesh):
        with pytest.raises(fm.InputError, match="holds no fields"):
            write(read, tmp_path / "file")
    assert not (tmp_path / "file").exists()


def test_the_command_writes_both(
    pot_26_16: fm.Design, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    design = tmp_path / "design.toml"
    design.write_text(fm.design_toml(replace(pot_26_16, tolerance=2e-2)))
    field, mesh = tmp_path / "a.vtu", tmp_path / "b.msh"
    assert cli.main(["solve", str(design), "--field", str(field), "--mesh", str(mesh)]) == 0
    assert len(meshio.read(field).cells[0].data) == len(meshio.read(mesh).cells[0].data)
    capsys.readouterr()
    for option, file in (("--field", mesh), ("--mesh", tmp_path / "none" / "b.msh")):
        assert cli.main(["solve", str(design), option, str(file)]) == 2
        error = capsys.readouterr().err
        assert error.startswith(f"gapfield: {option} = ")
        assert error.count("\n") == 1
