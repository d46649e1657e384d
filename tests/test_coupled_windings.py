"""Several windings: what must hold between their inductances, and ``gapfield windings``."""

import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag import cli
from femag.coupled_windings import WindingMatrix, winding_matrix
from femag.design import turns_per_area
from femag.field.adapt import adapted_solution, inductance_bounds
from femag.field.bounds import Bounds, both_sides
from femag.field.design_problem import field_problem
from femag.field.response import refined_response, response
from femag.mesh import coarse_mesh

INNER = fm.Winding(50, fm.Block(6.4e-3, 8e-3, -4.8e-3, 4.8e-3), "inner")
OUTER = fm.Winding(10, fm.Block(8.4e-3, 10e-3, -4.8e-3, 4.8e-3), "outer")
LOW = fm.Winding(8, fm.Block(8.4e-3, 10e-3, -4.8e-3, -0.2e-3), "low")
HIGH = fm.Winding(12, fm.Block(8.4e-3, 10e-3, 0.2e-3, 4.8e-3), "high")


@pytest.fixture
def two(pot_26_16: fm.Design) -> fm.Design:
    return replace(pot_26_16, windings=(INNER, OUTER), tolerance=5e-3)


@pytest.fixture
def three(pot_26_16: fm.Design) -> fm.Design:
    return replace(pot_26_16, windings=(INNER, LOW, HIGH), tolerance=5e-3)


def overlap(one: Bounds, other: Bounds) -> bool:
    return one.lower <= other.upper and other.lower <= one.upper


def in_series(found: WindingMatrix, signs: dict[str, int]) -> Bounds:
    """The inductance of windings in series, aiding or opposing, from the matrix."""
    places = [(found.names.index(name), sign) for name, sign in signs.items()]
    terms = [
        found.inductance[i][j] if si == sj else Bounds(*(
            -end for end in (found.inductance[i][j].upper, found.inductance[i][j].lower)
        ))
        for i, si in places
        for j, sj in places
    ]  # fmt: skip
    return Bounds(sum(t.lower for t in terms), sum(t.upper for t in terms), "H")


def test_the_diagonal_is_the_inductance_of_each_winding(two: fm.Design) -> None:
    found = winding_matrix(two)
    for place, winding in enumerate(two.windings):
        alone = fm.solve(replace(two, driven=(winding.name,)), tolerance=1e-3).inductance
        assert found.inductance[place][place].relative_half_width <= two.tolerance
        assert overlap(found.inductance[place][place], alone)


def test_aiding_and_opposing_series_are_sums_of_the_matrix(two: fm.Design) -> None:
    found = winding_matrix(two, 1e-3)
    aiding = fm.solve(replace(two, driven=("inner", "outer")), tolerance=1e-3).inductance
    assert overlap(in_series(found, {"inner": 1, "outer": 1}), aiding)
    turned = {
        region: -density
        for region, density in turns_per_area(replace(two, driven=("outer",))).items()
    }
    problem = field_problem(two)
    problem = replace(problem, turns_per_area={**problem.turns_per_area, **turned})
    opposing = inductance_bounds(adapted_solution(problem, 1.0, 1e-3)[0])
    assert overlap(in_series(found, {"inner": 1, "outer": -1}), opposing)
    assert opposing.upper < aiding.lower


def test_linkages_are_reciprocal_on_either_side(three: fm.Design) -> None:
    assert max(winding_matrix(three).reciprocity) < 1e-12


def test_turns_scale_what_they_must(two: fm.Design) -> None:
    found = winding_matrix(two)
    more = winding_matrix(replace(two, windings=(replace(INNER, turns=150), OUTER)))
    for scale, (i, j) in ((9, (0, 0)), (3, (0, 1)), (1, (1, 1))):
        assert more.inductance[i][j].value == pytest.approx(
            scale * found.inductance[i][j].value, rel=1e-9
        )
    (before,), (after,) = found.pairs, more.pairs
    assert after.leakage_of_first.value == pytest.approx(9 * before.leakage_of_first.value)
    assert after.leakage_of_second.value == pytest.approx(before.leakage_of_second.value)
    assert after.coupling.value == pytest.approx(before.coupling.value, rel=1e-9)
    assert after.forward_ratio.value == pytest.approx(before.forward_ratio.value / 3, rel=1e-9)


def test_the_order_of_the_windings_does_not_matter(two: fm.Design) -> None:
    (one,), (other,) = (
        winding_matrix(replace(two, windings=windings, driven=("inner",))).pairs
        for windings in ((INNER, OUTER), (OUTER, INNER))
    )
    assert (other.first, other.second) == ("outer", "inner")
    assert overlap(one.leakage_of_first, other.leakage_of_second)
    assert overlap(one.leakage_of_second, other.leakage_of_first)
    assert overlap(one.coupling, other.coupling)
    assert overlap(one.forward_ratio, other.backward_ratio)
    assert overlap(one.series_of_first, other.series_of_second)


def test_the_numbers_of_a_pair_belong_together(two: fm.Design) -> None:
    found = winding_matrix(two, 1e-3)
    (pair,) = found.pairs
    (first, mutual), (_, second) = ([b.value for b in row] for row in found.inductance)
    lost = 1.0 - pair.coupling.value**2
    assert 0.0 < pair.coupling.lower < pair.coupling.upper < 1.0
    assert pair.leakage_of_first.value == pytest.approx(lost * first, rel=2e-3)
    assert pair.leakage_of_second.value == pytest.approx(lost * second, rel=2e-3)
    assert pair.opposed_inductance.upper >= pair.leakage_of_first.lower
    assert pair.forward_ratio.value == pytest.approx(mutual / first, rel=1e-4)
    assert pair.backward_ratio.value == pytest.approx(mutual / second, rel=1e-4)
    assert pair.magnetising_inductance.value == pytest.approx(5 * mutual, rel=1e-9)
    total = pair.magnetising_inductance.value + pair.series_of_first.value
    assert total == pytest.approx(first, rel=1e-9)
    total = pair.magnetising_inductance.value / 25 + pair.series_of_second.value
    assert total == pytest.approx(second, rel=1e-9)


def test_leakage_is_as_close_as_the_inductance_though_it_is_a_thirtieth_of_it(
    two: fm.Design,
) -> None:
    (pair,) = winding_matrix(two).pairs
    assert pair.leakage_of_first.relative_half_width < two.tolerance
    assert pair.series_of_first.half_width < pair.magnetising_inductance.half_width / 3
    fine = winding_matrix(two, 1e-4).pairs[0]
    for name in ("leakage_of_first", "leakage_of_second", "coupling", "forward_ratio",
                 "opposed_inductance", "series_of_first", "series_of_second"):  # fmt: skip
        coarse_one, fine_one = getattr(pair, name), getattr(fine, name)
        assert overlap(coarse_one, fine_one), name
        assert fine_one.half_width < coarse_one.half_width, name


def test_three_windings_are_worth_their_series_connection(three: fm.Design) -> None:
    found = winding_matrix(three, 1e-3)
    assert [(pair.first, pair.second) for pair in found.pairs] == [
        ("inner", "low"), ("inner", "high"), ("low", "high"),
    ]  # fmt: skip
    together = fm.solve(replace(three, driven=("inner", "low", "high"))).inductance
    assert overlap(in_series(found, {"inner": 1, "low": 1, "high": 1}), together)
    halves = fm.solve(replace(three, driven=("low", "high"))).inductance
    assert overlap(in_series(found, {"low": 1, "high": 1}), halves)
    for pair in found.pairs:
        assert 0.0 < pair.coupling.lower < pair.coupling.upper < 1.0


def test_a_magnet_changes_nothing_in_a_linear_core(two: fm.Design) -> None:
    magnet = fm.Magnet(remanence=0.4, recoil_permeability=1.05)
    filled = replace(two, gaps=(fm.Gap(0.5e-3, permeability=1.05),))
    with_magnet = replace(two, gaps=(fm.Gap(0.5e-3, magnet=magnet),))
    assert winding_matrix(with_magnet).inductance == winding_matrix(filled).inductance


def test_saturation_lowers_the_matrix_at_the_bias_and_hardly_the_leakage(two: fm.Design) -> None:
    design = replace(two, material=fm.FroehlichCurve(2000, 0.45, 2))
    weak, strong = winding_matrix(design), winding_matrix(replace(design, current=5.0))
    linear = winding_matrix(two)
    assert weak.inductance[0][0].value == pytest.approx(
        winding_matrix(replace(design, current=1e-6)).inductance[0][0].value, rel=0.01
    )
    assert overlap(winding_matrix(replace(design, current=1e-6)).inductance[0][0],
                   linear.inductance[0][0])  # fmt: skip
    assert strong.inductance[0][0].value < 0.2 * linear.inductance[0][0].value
    assert strong.pairs[0].opposed_inductance.value == pytest.approx(
        linear.pairs[0].opposed_inductance.value, rel=0.01
    )


def test_the_diagonal_at_a_bias_is_the_slope_of_the_flux_linkage(two: fm.Design) -> None:
    design = replace(two, material=fm.FroehlichCurve(2000, 0.45, 2), current=2.5)
    low, high = (fm.solve(design, current=2.5 + step, tolerance=3e-4) for step in (-0.02, 0.02))
    slope = (high.flux_linkage - low.flux_linkage) / 0.04
    assert winding_matrix(design, 1e-3).inductance[0][0].value == pytest.approx(slope, rel=5e-3)


def test_local_gaps_sum_to_the_width(three: fm.Design) -> None:
    problem = field_problem(three)
    excitations = [
        turns_per_area(replace(three, driven=(winding.name,))) for winding in three.windings
    ]
    found = response(both_sides(problem, coarse_mesh(problem.section)), excitations)
    for mix in ([1.0, 0.0, 0.0], [1.0, -2.0, 0.5]):
        currents = np.array(mix)
        width = currents @ (found.upper - found.lower) @ currents
        assert found.local_gap(currents).sum() == pytest.approx(width, rel=1e-6)
        assert found.local_gap(currents).min() >= 0.0
    finer = refined_response(found, [np.array([1.0, 0.0, 0.0])])
    assert np.all(np.linalg.eigvalsh(found.upper - finer.upper) > 0.0)
    assert np.all(np.linalg.eigvalsh(finer.lower - found.lower) > 0.0)


def test_one_winding_is_refused_in_one_line(
    tmp_path: Path, pot_26_16: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "one.toml"
    file.write_text(fm.design_toml(pot_26_16))
    assert cli.main(["windings", str(file)]) == 2
    error = capsys.readouterr().err
    assert error == (
        f"gapfield: {file}: winding: one winding couples to none; accepted: two [[winding]] or "
        "more\n"
    )


@pytest.mark.parametrize(
    ("options", "line"),
    [
        (["--tolerance", "2"], "--tolerance = 2.0: tolerance out of range"),
        (["--tolerance", "0"], "--tolerance = 0.0: tolerance out of range"),
        (["--current", "3"], "--current = '3': "),
        (["--json", "{design}"], "--json = "),
    ],
)
def test_bad_options_get_one_line(
    tmp_path: Path,
    two: fm.Design,
    capsys: pytest.CaptureFixture[str],
    options: list[str],
    line: str,
) -> None:
    file = tmp_path / "two.toml"
    file.write_text(fm.design_toml(two))
    assert cli.main(["windings", str(file), *(o.format(design=file) for o in options)]) == 2
    error = capsys.readouterr().err
    assert line in error
    assert error.count("\n") == 1


def test_the_command_prints_80_columns_and_writes_every_key(
    tmp_path: Path, two: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    file, answer = tmp_path / "two.toml", tmp_path / "windings.json"
    named = (replace(INNER, name="[bold] primary"), OUTER)
    file.write_text(fm.design_toml(replace(two, windings=named, title="two windings")))
    assert cli.main(["windings", str(file), "--json", str(answer)]) == 0
    printed = capsys.readouterr().out
    assert max(len(line.rstrip()) for line in printed.splitlines()) <= 80
    for words in ("two windings", "[bold] primary, 50 turns", "coupling", "rigorous"):
        assert words in printed
    document = json.loads(answer.read_text())
    windings = document["windings"]
    assert windings["names"] == ["[bold] primary", "outer"]
    assert windings["turns"] == [50, 10]
    assert windings["inductance_matrix"][0][1] == windings["inductance_matrix"][1][0]
    for key in ("coupling", "leakage", "turns_ratio"):
        assert windings[key][0][0] is None
        assert windings[key][0][1]["lower"] < windings[key][0][1]["upper"]
    assert windings["leakage"][0][1]["value"] > 20 * windings["leakage"][1][0]["value"]
    assert windings["turns_ratio"][0][1]["value"] == pytest.approx(0.2, rel=0.02)
    assert len(windings["equivalents"]) == 1


def test_solve_points_to_the_command(
    tmp_path: Path, two: fm.Design, capsys: pytest.CaptureFixture[str]
) -> None:
    file = tmp_path / "two.toml"
    file.write_text(fm.design_toml(two))
    assert cli.main(["solve", str(file)]) == 0
    assert "gapfield windings" in capsys.readouterr().out
