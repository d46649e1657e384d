"""Derivatives by every parameter, against differences of solved designs and closed forms."""

from dataclasses import replace

import numpy as np
import pytest

import femag as fm
from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.design_problem import field_problem
from femag.quantities.off_nominal import off_nominal_problem, parameters_of
from femag.quantities.parameter_slopes import sensitivities_of

SATURATING = fm.FroehlichCurve(2000, 0.45, 2)
LOPSIDED = fm.Winding(50, fm.Block(6.4e-3, 10e-3, -4.8e-3, 2.8e-3))
WOUND = fm.Winding(
    47, conductor=fm.RoundWire(0.5e-3, 0.03e-3), former=fm.Former(wall=0.6e-3, flange=0.6e-3)
)
DESIGNS = {
    "linear": {},
    "saturating": {"material": SATURATING, "current": 4.0, "windings": (LOPSIDED,)},
    "wound": {"material": SATURATING, "current": 4.0, "windings": (WOUND,)},
    "straight legs": {
        "core": fm.catalogue_core("ETD 29/16/10").core(),
        "windings": (fm.Winding(50),),
    },
    "spacer": {"gaps": (fm.Gap(0.3e-3), fm.Gap(0.2e-3, "all"))},
}
ALLOWED = {"window_diameter": 0.06, "window_height": 0.06}
"""Of the small ones, which are lost in what two meshes differ by, and in the solved core factor."""


def slow(*values: object) -> object:
    return pytest.param(*values, marks=pytest.mark.slow)


@pytest.mark.parametrize(
    ("case", "name"),
    [
        ("linear", "gap"),
        ("linear", "permeability"),
        *(
            slow(case, name)
            for case, names in {
                "linear": "post_diameter window_diameter window_height coil_radial",
                "saturating": "gap saturation post_diameter permeability coil_radial coil_axial",
                "wound": "post_diameter window_height coil_radial",
                "straight legs": "gap post_diameter window_diameter window_height permeability",
                "spacer": "gap gap.1",
            }.items()
            for name in names.split()
        ),
    ],
)
def test_derivatives_agree_with_differences_of_solved_designs(
    pot_26_16: fm.Design, case: str, name: str
) -> None:
    design = replace(pot_26_16, **DESIGNS[case])
    solution, _ = adapted_solution(field_problem(design), design.current, 1e-3)
    (found,) = sensitivities_of(design, solution, [name])
    step = 0.01 * found.parameter.value or 0.1e-3
    low, high = (
        inductance_bounds(
            adapted_solution(
                off_nominal_problem(design, {name: sign * step}), design.current, 5e-5
            )[0]
        ).value
        for sign in (-1.0, 1.0)
    )
    wanted = (high - low) / (2 * step)
    assert found.inductance == pytest.approx(wanted, rel=ALLOWED.get(name, 1.2e-2))


def test_a_changed_problem_is_that_of_a_changed_design(pot_26_16: fm.Design) -> None:
    """What the difference above rests on, beside the way through the design itself."""
    core = replace(pot_26_16.core, post_diameter=11.6e-3, window_height=10.9e-3)
    material = fm.LinearCurve(2200.0)
    block = fm.Block(6.5e-3, 10.1e-3, -4.8e-3, 4.8e-3)
    other = replace(
        pot_26_16, core=core, material=material, gaps=(fm.Gap(0.52e-3),),
        windings=(fm.Winding(50, block),),
    )  # fmt: skip
    changes = {
        "post_diameter": 0.1e-3, "window_height": -0.1e-3, "permeability": 0.1, "gap": 0.02e-3,
        "coil_radial": 0.1e-3,
    }  # fmt: skip
    found, wanted = off_nominal_problem(pot_26_16, changes), field_problem(other)
    for one, two in zip(found.section.regions, wanted.section.regions, strict=True):
        assert one.name == two.name
        np.testing.assert_allclose(one.polygon, two.polygon, atol=1e-15)
    assert found.turns_per_area == pytest.approx(wanted.turns_per_area)
    curves = {name: curve.initial_permeability for name, curve in wanted.curves.items()}
    assert {name: c.initial_permeability for name, c in found.curves.items()} == pytest.approx(
        curves
    )


def test_permeability_and_air_share_the_energy(pot_26_16: fm.Design) -> None:
    """Euler: L is homogeneous of degree 1 in all permeabilities, so that the core has its share."""
    solution, _ = adapted_solution(field_problem(pot_26_16), 1.0, 1e-3)
    (found,) = sensitivities_of(pot_26_16, solution, ["permeability"])
    mesh, laws = solution.sides.mesh, solution.sides.laws
    core = np.isin(mesh.region, [mesh.names.index(r.name) for r in mesh.section.regions
                                 if r.role == "core"])  # fmt: skip
    b = np.hypot(solution.flux.field[:, 0], solution.flux.field[:, 1])
    stored = np.sum((solution.sides.discretisation.weight * laws.energy_density(b))[core])
    assert found.coenergy_of_sides[0] == pytest.approx(float(stored), rel=1e-6)


def test_al_and_inductance_follow_the_co_energy(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, current=3.0)
    for one in fm.sensitivities(fm.solve(design)):
        assert one.inductance_of_sides == pytest.approx(
            [2 / 9 * slope for slope in one.coenergy_of_sides]
        )
        assert one.al_of_sides == pytest.approx([h / 2500 for h in one.inductance_of_sides])
    assert fm.sensitivities(design)[0].inductance == pytest.approx(
        fm.sensitivities(fm.solve(design))[0].inductance
    )


def test_what_a_design_can_be_off_by(pot_26_16: fm.Design) -> None:
    def names(design: fm.Design) -> list[str]:
        return [parameter.name for parameter in parameters_of(design)]

    sizes = ["post_diameter", "window_diameter", "window_height"]
    assert names(pot_26_16) == ["gap", *sizes, "permeability", "coil_radial", "coil_axial"]
    filled = replace(pot_26_16, windings=(fm.Winding(50),), material=SATURATING, gaps=())
    assert names(filled) == [*sizes, "permeability", "saturation"]
    two = replace(pot_26_16, gaps=(fm.Gap(0.3e-3), fm.Gap(0.2e-3, "all")))
    assert names(two)[:2] == ["gap", "gap.1"]


def test_turns_that_touch_the_core_go_with_it(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, windings=(fm.Winding(50),))
    problem = off_nominal_problem(design, {"post_diameter": 0.2e-3})
    (coil,) = (part for part in problem.section.regions if part.role == "winding")
    assert min(r for r, _ in coil.polygon) == pytest.approx(5.85e-3)
    with pytest.raises(fm.InputError, match="touches the core and cannot shift"):
        off_nominal_problem(design, {"coil_radial": 0.1e-3})


@pytest.mark.parametrize("offset", [5.25e-3, -5.25e-3])
def test_a_gap_at_a_plate_stays_there(pot_26_16: fm.Design, offset: float) -> None:
    design = replace(pot_26_16, gaps=(fm.Gap(0.5e-3, offset=offset),))
    problem = off_nominal_problem(design, {"gap": 0.1e-3, "window_height": 0.2e-3})
    (gap,) = (part for part in problem.section.regions if part.name == "post gap")
    heights = sorted({abs(z) for _, z in gap.polygon})
    assert heights == pytest.approx([5.0e-3, 5.6e-3])


def test_magnets_are_refused(pot_26_16: fm.Design) -> None:
    design = replace(pot_26_16, gaps=(fm.Gap(0.5e-3, magnet=fm.Magnet(0.1)),))
    with pytest.raises(fm.InputError, match="no derivatives with a magnet"):
        fm.sensitivities(design)


def test_an_unknown_parameter_is_refused(pot_26_16: fm.Design) -> None:
    solution, _ = adapted_solution(field_problem(pot_26_16), 1.0, 1e-2)
    with pytest.raises(fm.InputError, match="no such parameter; accepted: gap, post_diameter"):
        sensitivities_of(pot_26_16, solution, ["saturation"])


@pytest.mark.slow
def test_a_core_whose_plates_gain_a_corner_has_derivatives_too(pot_26_16: fm.Design) -> None:
    """A hundred-thousandth less window gives the solved plates of this core another corner."""
    core = fm.catalogue_core("PM 114/93").core()
    design = replace(pot_26_16, core=core, windings=(fm.Winding(20),), gaps=(fm.Gap(1e-3),))
    solution, _ = adapted_solution(field_problem(design), 1.0, 5e-3)
    window, post = sensitivities_of(design, solution, ["window_diameter", "post_diameter"])
    assert abs(window.inductance) < 0.1 * post.inductance
