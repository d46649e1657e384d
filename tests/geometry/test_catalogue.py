from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.design_file import design_from_toml
from femag.geometry import (
    LIMITS,
    CatalogueCore,
    catalogue,
    catalogue_core,
    effective_parameters,
    matching_cores,
)

SIZES = (
    *(f"P {size}" for size in ("9/5", "11/7", "14/8", "18/11", "22/13", "26/16", "30/19", "36/22",
                               "42/29")),
    *(f"RM {size}" for size in (5, 6, 8, 10, 12, 14)),
    *(f"PQ {size}" for size in ("20/16", "20/20", "26/20", "26/25", "32/20", "32/30", "35/35",
                                "40/40", "50/50")),
    *(f"ETD {size}" for size in ("29/16/10", "34/17/11", "39/20/13", "44/22/15", "49/25/16",
                                 "54/28/19", "59/31/22")),
    *(f"EC {size}" for size in (35, 41, 52, 70)),
    *(f"PM {size}" for size in ("50/39", "62/49", "74/59", "87/70", "114/93")),
    "EP 13",
)  # fmt: skip

OWN = """\
family = "pot"
[[core]]
size = "P 1/1"
source = "drawing"
[core.dimensions]
outer_diameter = "26 -1 mm"
window_diameter = "21.2 +0.8 mm"
post_diameter = "11.5 +-0.2 mm"
hole_diameter = "0 mm"
height = "16.3 -0.4 mm"
window_height = "11 +0.4 mm"
"""


def test_every_size_of_the_standard_is_there_with_the_source_of_every_number() -> None:
    cores = {core.size: core for core in catalogue()}
    assert set(SIZES) <= set(cores)
    for core in cores.values():
        assert core.standard.startswith("IEC 63093-")
        assert set(core.sources) == set(core.dimensions)
        assert set(core.sources.values()) <= {"memory", "data sheet", "fitted"}


@pytest.mark.parametrize("core", catalogue(), ids=lambda core: core.size)
def test_limits_are_ordered_and_near_the_name(core: CatalogueCore) -> None:
    for limits in core.dimensions.values():
        assert limits.low <= limits.nominal <= limits.high <= 1.2 * limits.low
    named = [float(part) for part in core.size.split()[1].split("/")]
    sizes = core.core().sizes
    outside = sizes.get("outer_diameter", sizes.get("length"))
    if core.family != "rm":
        assert outside == pytest.approx(1e-3 * named[0], rel=0.04)
    if len(named) > 1:
        height = sizes["height"] / 2 if core.family == "etd" else sizes["height"]
        assert height == pytest.approx(1e-3 * named[1], abs=0.8e-3)


def test_material_grows_from_minimum_to_maximum() -> None:
    for core in catalogue():
        found = [effective_parameters(core.core(limit)) for limit in LIMITS]
        volumes, factors = [one.volume for one in found], [one.c1 for one in found]
        assert volumes == sorted(volumes)
        assert factors == sorted(factors, reverse=True)


def test_nominal_dimensions_are_means_of_the_limits() -> None:
    """Pot 22/13, as published in data sheets (in geometries/pot.toml), averaged by hand."""
    core = catalogue_core("P 22/13").core()
    assert isinstance(core, fm.PotCore)
    found = 1e3 * np.array([core.outer_diameter, core.window_diameter, core.post_diameter,
                            core.hole_diameter, core.height, core.window_height])  # fmt: skip
    np.testing.assert_allclose(found, [21.6, 18.2, 9.25, 4.5, 13.4, 9.4], rtol=1e-12)


@pytest.mark.parametrize(("size", "published"), [("P 22/13", 0.068), ("P 36/22", 0.041)])
def test_core_factor_without_slots_lies_under_the_published_one(
    size: str, published: float
) -> None:
    """Data sheets count the slots; the shares are measured, in docs/hand-formulas.md."""
    core = catalogue_core(size)
    share = effective_parameters(core.core()).c1 / core.published["core_factor"] - 1
    assert share == pytest.approx(-published, abs=1e-3)


def test_a_design_may_name_a_size(pot_26_16: fm.Design) -> None:
    text = fm.design_toml(pot_26_16)
    start, end = text.index('family = "pot"'), text.index("[core.material]")
    sized = text[:start] + 'size = "p26/16"\nlimit = "maximum"\n' + text[end:]
    sized = sized[: sized.index("[core.dimensions]")] + sized[sized.index("[[winding]]") :]
    design = design_from_toml(sized)
    assert design.core == catalogue_core("P 26/16").core("maximum")
    assert design.core.name == "P 26/16, maximum"
    again = design_from_toml(fm.design_toml(design))
    assert (again, again.core.name) == (design, design.core.name)


def test_own_cores_come_from_a_folder_or_a_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, pot_26_16: fm.Design
) -> None:
    (tmp_path / "own.toml").write_text(OWN)
    with pytest.raises(fm.InputError):
        catalogue_core("P 1/1")
    assert catalogue_core("P 1/1", [tmp_path / "own.toml"]).core().hole_diameter == 0.0
    monkeypatch.setenv("GAPFIELD_CORES", str(tmp_path))
    assert catalogue_core("P 1/1").sources["height"] == "drawing"

    monkeypatch.delenv("GAPFIELD_CORES")
    design = 'core = { size = "P 1/1", catalogue = "own.toml", material = { permeability = 9 } }\n'
    (tmp_path / "design.toml").write_text(design + "[[winding]]\nturns = 1\n")
    core = fm.read_design(tmp_path / "design.toml").core
    assert core.post_diameter == pytest.approx(11.5e-3)


@pytest.mark.parametrize(
    ("good", "bad", "line"),
    [
        (
            '"26 -1 mm"',
            '"26 - mm"',
            "P 1/1: dimensions.outer_diameter = '26 - mm': not a dimension",
        ),
        ('"26 -1 mm"', "26", "not a dimension with limits"),
        ('"26 -1 mm"', '"26 -1 A"', "not a unit of this quantity"),
        ('"26 -1 mm"', '"20 -1 mm"', "must be smaller than outer_diameter"),
        ("height =", "hight =", "P 1/1: dimensions.height: missing"),
        ('family = "pot"', 'family = "cup"', "family = 'cup': unknown family"),
        ('size = "P 1/1"', "", "core.size: missing"),
        ("[[core]]", "[core", "not valid TOML"),
    ],
)
def test_bad_catalogues_get_one_line(tmp_path: Path, good: str, bad: str, line: str) -> None:
    file = tmp_path / "own.toml"
    file.write_text(OWN.replace(good, bad, 1))
    with pytest.raises(fm.InputError) as caught:
        catalogue([file])
    assert str(caught.value).startswith(f"{file}: ")
    assert line in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("core", "line"),
    [
        ('size = "P 27/16"', "core.size = 'P 27/16': no core of this size; accepted: P 26/16"),
        ('size = "P 26/16"\nfamily = "pot"', "core.family = 'pot': stands beside core.size"),
        ('family = "pot"\nlimit = "minimum"', "core.limit = 'minimum': needs core.size"),
        ('size = "P 26/16"\nlimit = "middle"', "core.limit = 'middle': not usable"),
        ('size = "P 26/16"\ncatalogue = "none.toml"', "none.toml: cannot be read"),
        ('family = "pot"', "core.dimensions: missing; accepted: core.size, or family and"),
        ("", "core.family: missing; accepted: core.size, or family and dimensions"),
    ],
)
def test_bad_core_tables_get_one_line(core: str, line: str) -> None:
    text = f"[core]\n{core}\nmaterial = {{ permeability = 9 }}\n[[winding]]\nturns = 1\n"
    with pytest.raises(fm.InputError) as caught:
        design_from_toml(text)
    assert line in str(caught.value)


def test_matching_finds_one_or_some_or_says_what_is_near() -> None:
    cores = catalogue()
    assert [core.size for core in matching_cores(cores, "p 36/22")] == ["P 36/22"]
    assert len(matching_cores(cores, "")) == len(cores)
    assert {core.size for core in matching_cores(cores, "P3")} == {"P 30/19", "P 36/22"}
    with pytest.raises(fm.InputError, match="no core of this size"):
        matching_cores(cores, "zz")


@pytest.mark.slow
@pytest.mark.parametrize("core", catalogue(), ids=lambda core: core.size)
def test_every_core_solves_within_its_tolerance(core: CatalogueCore) -> None:
    """Gap of a twentieth of the post, winding in the whole window, 0.2 %."""
    body = core.core()
    result = fm.solve(
        fm.Design(
            core=body,
            gaps=fm.Gap(body.sizes["post_diameter"] / 20),
            windings=fm.Winding(20),
            material=fm.FroehlichCurve(2200, 0.46, 2),
            tolerance=2e-3,
        )
    )
    assert result.inductance.relative_half_width <= 2e-3
    assert 1.0 < result.gap_factor < 1.6


def test_the_name_of_a_core_moves_no_result(pot_26_16: fm.Design) -> None:
    named = replace(pot_26_16, core=replace(pot_26_16.core, name="mine"))
    assert named == pot_26_16
    assert fm.solve(named).design_hash == fm.solve(pot_26_16).design_hash
