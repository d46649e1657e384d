import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.field.bounds import both_sides, field_solution
from femag.field.design_problem import field_problem
from femag.materials import TabulatedCurve, library_material
from femag.mesh import coarse_mesh
from femag.units import MU_0

CURVES = [curve for material in fm.material_library() for _, curve in material.curves]
NAMES = [curve.name for curve in CURVES]
DOCUMENT = Path(__file__).parents[2] / "docs/materials.md"


def flux_density(name: str, h: float) -> float:
    return float(fm.material(name).flux_density(np.array(h)))


def test_names_hold_a_temperature_or_take_one() -> None:
    curve = fm.material("mnzn-power", 25.0)
    assert fm.material("mnzn-power-25C") == curve
    assert fm.material("MnZn-power-25C") == curve
    assert fm.material("mnzn-power-60C") == fm.material("mnzn-power", 60.0)
    assert fm.material("silicon-steel") == fm.material("silicon-steel-25C")
    assert fm.material("powder-60").name == "powder-60"


@pytest.mark.parametrize(
    ("name", "temperature", "line"),
    [
        (
            "mnzn-powder",
            None,
            "name = 'mnzn-powder': no material of this name; accepted: mnzn-power",
        ),
        ("mnzn-power", None, "temperature: mnzn-power has curves at several temperatures"),
        (
            "mnzn-power",
            120.0,
            "temperature = '120 C': out of the range of mnzn-power; accepted: 25",
        ),
        ("mnzn-power-25C", 25.0, "temperature = '25 C': stands beside the temperature in"),
        ("silicon-steel", 100.0, "out of the range of silicon-steel; accepted: 25 C, or none"),
        ("powder-60", 25.0, "accepted: no temperature, since the data have none"),
        (3, None, "name = 3: not a name"),
    ],
)
def test_what_the_library_has_not_is_refused(name: str, temperature, line: str) -> None:
    with pytest.raises(fm.InputError) as caught:
        fm.material(name, temperature)
    assert line in str(caught.value)
    assert "\n" not in str(caught.value)


def test_every_material_says_where_it_comes_from() -> None:
    for material in fm.material_library():
        assert re.search("invented|from memory", material.source), material.name
        for _, curve in material.curves:
            assert curve.notes == (), material.name
            assert material.source in curve.label


def test_power_ferrite_has_the_flux_densities_of_published_tables() -> None:
    """Ferrite makers' tables of power grades of mu_i 2200 to 2300, B at 1200 A/m: 0.47 to 0.49 T
    at 25 C and 0.38 to 0.39 T at 100 C; at least 0.33 T at 250 A/m and 100 C. mu_i at 25 C holds
    within 20 to 25 %."""
    assert 0.47 <= flux_density("mnzn-power-25C", 1200.0) <= 0.49
    assert 0.38 <= flux_density("mnzn-power-100C", 1200.0) <= 0.39 + 1e-12
    assert flux_density("mnzn-power-100C", 250.0) >= 0.33
    assert fm.material("mnzn-power-25C").initial_permeability == pytest.approx(2250.0, rel=0.2)


def test_silicon_steel_keeps_the_minima_of_its_standard() -> None:
    """EN 10106 (from memory): 1.49, 1.60 and 1.70 T at 2500, 5000 and 10000 A/m."""
    for h, b in ((2500.0, 1.49), (5000.0, 1.60), (10_000.0, 1.70)):
        assert flux_density("silicon-steel", h) == pytest.approx(b, rel=1e-12)


@pytest.mark.parametrize("name", ["mnzn-power-25C", "mnzn-power-100C", "mnzn-inductor-25C"])
def test_ferrite_is_designed_to_three_tenths_of_a_tesla(name: str) -> None:
    """Common practice, no source: 0.3 T peak in one direction.

    There the core is still more permeable than a gapped one ever is as a whole (about 100), and
    at 0.4 T less than half of that is left.
    """
    curve = fm.material(name)
    low, high = (
        float(curve.differential_permeability(curve.field_strength(np.array(b)))) / MU_0
        for b in (0.30, 0.40)
    )
    assert low > 100.0
    assert high < 0.5 * low


def test_silicon_steel_is_saturated_above_one_point_six_tesla() -> None:
    """Common practice, no source."""
    curve = fm.material("silicon-steel")
    steepest = float(np.max(curve.differential_permeability(np.geomspace(1.0, 1e3, 2000))))
    at = curve.differential_permeability(curve.field_strength(np.array([1.0, 1.6])))
    assert at[0] > 0.1 * steepest
    assert at[1] < 0.01 * steepest
    assert 1.6 < curve.saturation < 2.1


def test_cobalt_iron_saturates_at_two_point_four_tesla() -> None:
    """Common practice, no source."""
    assert fm.material("cobalt-iron").saturation == pytest.approx(2.4, rel=0.03)


def test_an_air_core_never_saturates(pot_26_16: fm.Design) -> None:
    """Common practice, and plain: the inductance is that of the coil at any current."""
    air = replace(pot_26_16, material=fm.LinearCurve(1.0))
    low, high = (fm.solve(air, current=current) for current in (1e-3, 1e6))
    assert high.inductance.value == pytest.approx(low.inductance.value, rel=1e-9)


def test_units_of_the_trade() -> None:
    """1 T = 1e4 G, mu0 = 1 G/Oe."""
    assert fm.LinearCurve(1.0).flux_density(np.array(1e3 / (4 * np.pi))) == pytest.approx(1e-4)


@pytest.mark.parametrize(("name", "half"), [("powder-26", 18e3), ("powder-60", 7.5e3)])
def test_powder_keeps_its_share_of_the_permeability(name: str, half: float) -> None:
    """1/(1 + (H/Hh)^c) of what is above mu0, the form of data sheets (from memory)."""
    curve = fm.material(name)
    h = half * np.geomspace(0.02, 20.0, 60)
    share = 1.0 / (1.0 + (h / half) ** 1.7)
    expected = 1.0 + (int(name[-2:]) - 1.0) * share
    found = curve.differential_permeability(h) / MU_0
    np.testing.assert_allclose(found, expected, rtol=0.02)


def test_the_document_lists_the_library() -> None:
    text = DOCUMENT.read_text(encoding="utf-8")
    rows = [line for line in text.splitlines() if re.match(r"\| `[a-z0-9-]+` \|", line)]
    assert rows == [documented_row(curve) for curve in CURVES]
    for material in fm.material_library():
        assert f"{material.name}: {material.source}." in text


def documented_row(curve: TabulatedCurve) -> str:
    name, _, temperature = curve.name.partition(" at ")
    h, b = curve.points[-1]
    h = float(f"{h:.3g}")
    cells = (
        f"`{name}`",
        temperature or "not stated",
        f"{curve.initial_permeability:.0f}",
        f"{b:.3g} T at {h:g} A/m",
        f"{curve.saturation:.3g} T",
    )
    return f"| {' | '.join(cells)} |"


@pytest.mark.slow
@pytest.mark.parametrize("gaps", [(), (fm.Gap(0.5e-3),)], ids=["ungapped", "gapped"])
@pytest.mark.parametrize("curve", CURVES, ids=NAMES)
def test_newton_converges_far_beyond_the_knee(
    pot_26_16: fm.Design, curve: TabulatedCurve, gaps: tuple[fm.Gap, ...]
) -> None:
    """From a thousandth to 50 times the current where the core reaches 3/4 of its saturation."""
    problem = field_problem(replace(pot_26_16, material=curve, gaps=gaps))
    sides = both_sides(problem, coarse_mesh(problem.section))
    b = 0.75 * curve.saturation
    gap_length = sum(gap.length for gap in gaps)
    knee = (37.6e-3 * float(curve.field_strength(np.array(b))) + gap_length * b / MU_0) / 50
    iterations = []
    for share in (1e-3, 0.1, 0.3, 1.0, 2.0, 5.0, 15.0, 50.0):
        solution = field_solution(sides, share * knee)
        assert solution.coenergy.lower < solution.coenergy.upper
        iterations += [len(solution.flux.history), len(solution.potential.history)]
    print(f"{curve.name}, {len(gaps)} gaps: at most {max(iterations)} iterations")
    assert max(iterations) <= 20


@pytest.mark.slow
@pytest.mark.parametrize("curve", CURVES, ids=NAMES)
def test_a_design_with_each_material_has_bounds(
    pot_26_16: fm.Design, curve: TabulatedCurve
) -> None:
    for current in (0.1, 5.0):
        design = replace(pot_26_16, material=curve, current=current)
        inductance = fm.solve(design).inductance
        assert inductance.lower < inductance.upper
        assert inductance.relative_half_width <= 1e-3
        finer = fm.solve(design, tolerance=2e-4).inductance
        assert inductance.lower <= finer.upper
        assert finer.lower <= inductance.upper


def test_bounds_hold_with_a_material_of_the_library(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, material=fm.material("mnzn-power-100C"), current=3.0)
    coarse, fine = (fm.solve(design, tolerance=tolerance).inductance for tolerance in (5e-3, 5e-4))
    assert coarse.lower < fine.lower < fine.upper < coarse.upper


def test_a_library_material_is_a_value() -> None:
    assert library_material("nizn") == library_material("NiZn")
    assert hash(fm.material("nizn")) == hash(fm.material("nizn-25C"))
