"""Measured points, residuals and fits; every measurement here is invented."""

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag.current_curve import inductance_curve
from femag.errors import InputError
from femag.materials import FroehlichCurve, LinearCurve, ScaledCurve, with_permeability
from femag.measured_inductance import (
    Fit,
    MeasuredPoints,
    fitted_design,
    measured_curve,
    read_measured,
    residuals,
)
from femag.measured_inductance.fit import MOST_SOLUTIONS
from femag.measured_inductance.least_squares import CostlyResiduals, least_squares, linearised
from femag.measured_inductance.points import Kind
from femag.measured_inductance.unknowns import altered, unknown

Array = np.ndarray
CURRENTS = (0.2, 0.6, 0.9, 1.3)
"""From the linear range to beyond the knee of `small_gap`, A."""


@pytest.fixture(scope="module")
def small_gap() -> fm.Design:
    """A saturating core whose own reluctance is a fifth of the whole."""
    core = fm.PotCore(25.5e-3, 21.2e-3, 11.5e-3, 16.1e-3, 11e-3, 5.5e-3)
    coil = fm.Winding(50, fm.Block(6.4e-3, 10e-3, -4.8e-3, 4.8e-3))
    material = FroehlichCurve(2000.0, 0.45, 2.0)
    return fm.Design(core, coil, material, fm.Gap(0.1e-3), tolerance=2e-3)


@pytest.fixture(scope="module")
def linear(small_gap: fm.Design) -> fm.Design:
    return replace(small_gap, material=LinearCurve(2000.0), gaps=(fm.Gap(0.5e-3),))


def as_measured(
    design: fm.Design, currents: tuple[float, ...], kind: Kind = "apparent", noise: float = 0.0,
    seed: int = 1,
) -> MeasuredPoints:  # fmt: skip
    """Return invented points: the solved curve with scatter."""
    ones = MeasuredPoints(currents, (1.0,) * len(currents), kind)
    solved = residuals(ones, measured_curve(design, ones)) + 1.0
    scatter = np.exp(noise * np.random.default_rng(seed).standard_normal(len(currents)))
    return MeasuredPoints(currents, tuple(solved * scatter), kind)


def of(design: fm.Design, gap: float, factor: float) -> fm.Design:
    return altered(altered(design, "gap", gap), "permeability", factor)


class TestReading:
    def write(self, path: Path, text: str) -> Path:
        file = path / "points.csv"
        file.write_text(text, encoding="utf-8")
        return file

    @pytest.mark.parametrize(
        ("text", "kind"),
        [
            ("# bench 2\nI [A]; L_inc [uH]\n0,5;650\n1;640,5\n2;500\n", "incremental"),
            (
                "I (mA),incremental inductance (mH)\n500,0.65\n1000,0.6405\n2000,0.5\n",
                "incremental",
            ),
            ("L apparent in nH\tDC bias current / A\n650e3\t.5\n640500\t1\n5e5\t2\n", "apparent"),
            ("i/A;L_app/H;note\n0.5;650e-6;a\n1;640.5e-6;b\n2;500e-6;c\n", "apparent"),
        ],
    )
    def test_usual_forms_of_a_file_hold_the_same_points(
        self, tmp_path: Path, text: str, kind: str
    ) -> None:
        points = read_measured(self.write(tmp_path, text))
        assert points.current == pytest.approx((0.5, 1.0, 2.0), rel=1e-14)
        assert points.inductance == pytest.approx((650e-6, 640.5e-6, 500e-6), rel=1e-14)
        assert points.kind == kind
        assert points.source == str(tmp_path / "points.csv")
        assert points.notes == (("columns not used: note",) if "note" in text else ())

    def test_a_kind_is_taken_from_the_argument_or_assumed_and_said(self, tmp_path: Path) -> None:
        file = self.write(tmp_path, "I [A];L [uH]\n1;640\n2;500\n")
        assert read_measured(file, "incremental").kind == "incremental"
        assert read_measured(file, "incremental").notes == ()
        assert read_measured(file).kind == "apparent"
        assert "taken as apparent" in read_measured(file).notes[0]

    def test_the_argument_chooses_between_two_columns(self, tmp_path: Path) -> None:
        file = self.write(tmp_path, "I [A];L_app [uH];L_inc [uH]\n1;640;600\n2;500;300\n")
        assert read_measured(file, "incremental").inductance == pytest.approx((600e-6, 300e-6))
        assert read_measured(file, "apparent").inductance == pytest.approx((640e-6, 500e-6))
        with pytest.raises(InputError, match=r"2 columns of inductance; accepted: one, or kind"):
            read_measured(file)

    @pytest.mark.parametrize(
        ("text", "problem"),
        [
            ("", "no rows"),
            ("I [A]\n1\n2\n", "one column"),
            ("1;640\n2;500\n", "no column of current"),
            ("I;L [uH]\n1;640\n2;500\n", "the unit is missing"),
            ("I [A];L\n1;640\n2;500\n", "the unit is missing"),
            ("I [V];L [uH]\n1;640\n2;500\n", "not a unit of this quantity"),
            ("I [A];L [uF]\n1;640\n2;500\n", "unknown unit 'uF'"),
            ("I [A];L energy [uH]\n1;640\n2;500\n", "no column of inductance"),
            ("I rms [A];L [uH]\n1;640\n2;500\n", "no column of current"),
            ("I [A];I [mA];L [uH]\n1;1000;640\n2;2000;500\n", "2 columns of current"),
            ("I [A];L inc app [uH]\n1;640\n2;500\n", "apparent and incremental at once"),
            ("I [A];L [uH]\n", "0 measured points"),
            ("I [A];L [uH]\n1;640\n", "1 measured points"),
            ("I [A];L [uH]\n0;640\n2;500\n", "a measured current is zero"),
            ("I [A];L [uH]\n1;640\n1;500\n", "a measured current stands twice"),
            ("I [A];L [uH]\n1;640\n-2;500\n", "measured currents of both signs"),
            ("I [A];L [uH]\n1;640\n2;-500\n", "a measured inductance is not above zero"),
            ("I [A];L [uH]\n1;640\n2;1e999\n", "a measured inductance is not above zero"),
            ("I [A];L [uH]\n1;640\n2;nan\n", "not a number"),
            ("I [A];L [uH]\n1;640\n2\n", "1 instead of 2 cells"),
            ("I [A],L [uH]\n1,5,640\n2,500\n", "decimal commas need semicolons"),
        ],
    )
    def test_an_unusable_file_is_refused_in_one_line(
        self, tmp_path: Path, text: str, problem: str
    ) -> None:
        file = self.write(tmp_path, text)
        with pytest.raises(InputError, match=problem) as caught:
            read_measured(file)
        assert "\n" not in str(caught.value)
        assert str(caught.value).startswith(str(file))

    def test_an_unreadable_file_is_refused_in_one_line(self, tmp_path: Path) -> None:
        with pytest.raises(InputError, match="cannot be read"):
            read_measured(tmp_path / "none.csv")
        with pytest.raises(InputError, match="cannot be read"):
            read_measured(tmp_path)
        (tmp_path / "binary.csv").write_bytes(b"\xff\xfe\x00I")
        with pytest.raises(InputError, match="not UTF-8 text"):
            read_measured(tmp_path / "binary.csv")

    def test_a_kind_that_is_none_or_not_that_of_the_header_is_refused(self, tmp_path: Path) -> None:
        file = self.write(tmp_path, "I [A];L_inc [uH]\n1;640\n2;500\n")
        with pytest.raises(InputError, match="the header says incremental, not apparent"):
            read_measured(file, "apparent")
        with pytest.raises(InputError, match="unknown kind of inductance"):
            read_measured(file, "energy")  # type: ignore[arg-type]
        with pytest.raises(InputError, match="2 currents and 1 inductances"):
            MeasuredPoints((1.0, 2.0), (1e-3,))


class TestResiduals:
    def test_they_are_the_solved_inductance_over_the_measured_one_less_1(
        self, small_gap: fm.Design
    ) -> None:
        curve = inductance_curve(small_gap, [1.3, 0.4, 0.9], drops=())
        solved = {point.current: point for point in curve.points}
        for kind in ("apparent", "incremental"):
            values = [getattr(solved[i], f"{kind}_inductance") for i in (0.9, 1.3)]
            points = MeasuredPoints((0.9, 1.3), (values[0] / 1.02, values[1] / 0.9), kind)
            assert residuals(points, curve) == pytest.approx([0.02, -0.1], abs=1e-14)

    def test_a_curve_without_a_measured_current_is_refused(self, linear: fm.Design) -> None:
        curve = inductance_curve(linear, [1.0, 2.0], drops=())
        with pytest.raises(InputError, match="the curve was not solved at this measured current"):
            residuals(MeasuredPoints((1.0, 1.5), (1e-3, 1e-3)), curve)


@pytest.fixture(scope="module")
def two_points(linear: fm.Design) -> MeasuredPoints:
    return as_measured(linear, (1.0, 2.0))


@pytest.fixture(scope="module")
def fit_of_two_points(linear: fm.Design, two_points: MeasuredPoints) -> Fit:
    """From a gap 1.2 times as long."""
    return fitted_design(altered(linear, "gap", 1.2), two_points)


class TestFit:
    @pytest.mark.slow
    def test_gap_and_permeability_of_a_known_design_are_recovered(
        self, small_gap: fm.Design
    ) -> None:
        begun: list[int] = []
        points = as_measured(of(small_gap, 1.1, 1.2), CURRENTS)
        fit = fitted_design(small_gap, points, progress=begun.append)
        assert fit.gap == pytest.approx(0.11e-3, rel=1e-3)
        assert fit.permeability_factor == pytest.approx(1.2, rel=1e-3)
        assert isinstance(fit.design.material, FroehlichCurve)
        assert fit.design.material.permeability == pytest.approx(2400.0, rel=1e-3)
        assert fit.design.material.saturation == 0.45
        assert np.max(np.abs(fit.residuals_before)) > 0.05
        assert np.max(np.abs(fit.residuals_after)) < 1e-4
        assert fit.note == ""
        assert begun == list(range(1, fit.solutions + 1))
        assert fit.solutions <= MOST_SOLUTIONS

    def test_the_standard_error_of_the_gap_alone_is_that_of_a_mean(self, linear: fm.Design) -> None:
        """Experimental standard deviation of the mean, JCGM 100:2008 (GUM), 4.2.3.

        A linear core has one inductance, so the fit averages log L, and the error of log(gap) is
        that of the mean over the slope d log L/d log gap, which `solve` gives.
        """
        points = as_measured(linear, (0.5, 1.0, 1.5, 2.0, 3.0), noise=0.01)
        fit = fitted_design(altered(linear, "gap", 1.3), points)
        logs = np.log(points.inductance)
        near = [fm.solve(altered(linear, "gap", g), tolerance=2e-4) for g in (0.98, 1.02)]
        low, high = (np.log(result.apparent_inductance) for result in near)
        slope = (high - low) / np.log(1.02 / 0.98)
        mean = np.std(logs, ddof=1) / np.sqrt(len(logs))
        assert fit.gap_error is not None
        assert fit.gap is not None
        assert fit.gap_error / fit.gap == pytest.approx(mean / abs(slope), rel=0.02)
        solved = np.log(fm.solve(fit.design, tolerance=2e-4).apparent_inductance)
        assert solved == pytest.approx(np.mean(logs), abs=2e-4)
        assert fit.permeability_factor == 1.0
        assert fit.permeability_error is None
        assert fit.note.startswith("only the gap was fitted: of a linear core")

    def test_only_the_ratios_of_weights_count_and_a_heavy_point_is_met(
        self, linear: fm.Design
    ) -> None:
        solved = as_measured(linear, (1.0, 2.0, 3.0))
        level = solved.inductance[0]
        points = MeasuredPoints(solved.current, (level, 1.02 * level, 1.02 * level))
        heavy = fitted_design(linear, points, weights=(1e4, 1.0, 1.0))
        same = fitted_design(linear, points, weights=(1e6, 1e2, 1e2))
        assert heavy.gap == pytest.approx(0.5e-3, rel=1e-3)
        assert same.gap == pytest.approx(heavy.gap, rel=1e-12)
        assert same.gap_error == pytest.approx(heavy.gap_error, rel=1e-9)
        for weights in ((1.0, 1.0), (1.0, 1.0, 0.0)):
            with pytest.raises(InputError, match="weights"):
                fitted_design(linear, points, weights=weights)

    def test_turns_scale_out(
        self, linear: fm.Design, two_points: MeasuredPoints, fit_of_two_points: Fit
    ) -> None:
        """L goes with the square of the turns at equal ampere turns, so the gap stays."""
        (coil,) = linear.windings
        twice = replace(linear, windings=(replace(coil, turns=2 * coil.turns),))
        scaled = MeasuredPoints((0.5, 1.0), tuple(4.0 * np.array(two_points.inductance)))
        fit = fitted_design(altered(twice, "gap", 1.2), scaled)
        assert fit.gap == pytest.approx(fit_of_two_points.gap, rel=1e-9)
        assert fit_of_two_points.gap == pytest.approx(0.5e-3, rel=1e-3)

    def test_negative_currents_give_the_same_fit(
        self, linear: fm.Design, two_points: MeasuredPoints, fit_of_two_points: Fit
    ) -> None:
        mirrored = replace(two_points, current=(-1.0, -2.0))
        fit = fitted_design(altered(linear, "gap", 1.2), mirrored)
        assert fit.gap == pytest.approx(fit_of_two_points.gap, rel=1e-9)

    def test_of_an_ungapped_core_the_permeability_is_fitted(self, linear: fm.Design) -> None:
        """L = mu N^2/C1 where no flux leaves the core: all but 2e-3 of it at 10 000."""
        ungapped = replace(linear, gaps=(), material=LinearCurve(1e4))
        level = as_measured(ungapped, (1.0, 2.0)).inductance[0]
        fit = fitted_design(ungapped, MeasuredPoints((1.0, 2.0), (1.5 * level, 1.5 * level)))
        assert fit.permeability_factor == pytest.approx(1.5, rel=2e-3)
        assert fit.gap is None
        assert fit.gap_error is None
        assert fit.note == ""

    def test_points_far_below_the_knee_leave_the_permeability_alone(
        self, small_gap: fm.Design
    ) -> None:
        start = replace(small_gap, tolerance=5e-3)
        fit = fitted_design(start, as_measured(of(start, 1.1, 1.0), (0.01, 0.02, 0.03)))
        assert (
            fit.note == "only the gap was fitted: the points cannot tell it from the permeability"
        )
        assert fit.permeability_factor == 1.0
        assert fit.correlation is None
        assert fit.gap == pytest.approx(0.11e-3, rel=1e-3)

    def test_two_points_fit_the_gap_alone(self, small_gap: fm.Design) -> None:
        start = replace(small_gap, tolerance=2e-2)
        fit = fitted_design(start, as_measured(of(start, 1.1, 1.0), (0.02, 0.3)))
        assert fit.gap == pytest.approx(0.11e-3, rel=1e-3)
        assert fit.note == "only the gap was fitted: both need three points or more"

    def test_a_fit_that_runs_to_a_bound_says_so(self, linear: fm.Design) -> None:
        fit = fitted_design(linear, MeasuredPoints((1.0, 2.0), (1.0, 1.0)))
        assert "the gap went to a bound, 0.05 of what the design says" in fit.note
        assert fit.gap_error is None
        assert "\n" not in fit.note


class TestUnknowns:
    def test_a_gap_reaches_up_to_what_fits_the_post(self, linear: fm.Design) -> None:
        """The post of 11 mm leaves 22 times the gap of 0.5 mm, but 11 times one of 1 mm."""
        assert np.exp(unknown(linear, "gap").upper) == pytest.approx(20.0)
        wide = replace(linear, gaps=(fm.Gap(1e-3),))
        upper = np.exp(unknown(wide, "gap").upper)
        assert 0.99 * 11.0 < upper < 11.0
        assert altered(wide, "gap", upper).gaps[0].length < 11e-3

    def test_the_gap_in_the_post_goes_before_the_spacer(self, linear: fm.Design) -> None:
        both = replace(linear, gaps=(fm.Gap(0.1e-3, leg="all"), fm.Gap(0.5e-3)))
        assert [gap.length for gap in altered(both, "gap", 2.0).gaps] == [0.1e-3, 1e-3]
        spacer = replace(linear, gaps=(fm.Gap(0.1e-3, leg="all"),))
        assert altered(spacer, "gap", 2.0).gaps[0].length == 0.2e-3

    def test_the_permeability_stays_in_its_range(self, linear: fm.Design) -> None:
        ends = unknown(replace(linear, material=LinearCurve(3.0)), "permeability")
        assert 1.0 <= 3.0 * np.exp(ends.lower) < 1.01
        assert np.exp(ends.upper) == pytest.approx(10.0)

    @pytest.mark.parametrize(
        "curve",
        [LinearCurve(2000.0), FroehlichCurve(2000.0, 0.45, 2.0), fm.material("mnzn-power-25C")],
    )
    def test_a_factor_scales_the_initial_permeability_and_keeps_the_saturation(
        self, curve: fm.TabulatedCurve
    ) -> None:
        scaled = with_permeability(curve, 1.5)
        assert scaled.initial_permeability == pytest.approx(1.5 * curve.initial_permeability)
        if not curve.is_linear:
            far = np.array([2e3])
            assert scaled.flux_density(far / 1.5) == pytest.approx(
                curve.flux_density(far), rel=2e-3
            )
            assert scaled.flux_density(far) == pytest.approx(curve.flux_density(far), rel=0.02)
        assert with_permeability(ScaledCurve(curve, 2.0), 1.5) == ScaledCurve(curve, 3.0)


class TestLeastSquares:
    def minimum(
        self, function: Callable[[Array], Array], start: Array, bound: float, most: int = 30
    ) -> tuple[Array, int]:
        residuals = CostlyResiduals(function, most, spent=1)
        upper = np.full(len(start), bound)
        begin = linearised(residuals, start, function(start), upper)
        return least_squares(residuals, begin, -upper, upper).x, residuals.spent

    def test_an_exponential_with_known_parameters(self) -> None:
        times = np.linspace(0.1, 3.0, 8)
        data = np.exp(0.4) * np.exp(-np.exp(-0.3) * times)
        found, spent = self.minimum(
            lambda x: np.exp(x[0]) * np.exp(-np.exp(x[1]) * times) / data - 1.0, np.zeros(2), 2.0
        )
        assert found == pytest.approx([0.4, -0.3], abs=2e-4)
        assert spent <= 14

    def test_a_minimum_outside_of_the_bounds_is_met_at_the_bound(self) -> None:
        found, _ = self.minimum(lambda x: np.array([x[0] - 3.0, x[1] + 0.2]), np.zeros(2), 1.0)
        assert found == pytest.approx([1.0, -0.2], abs=1e-9)

    def test_where_there_are_no_residuals_the_step_is_shortened(self) -> None:
        def half_plane(x: Array) -> Array:
            if x[0] > 0.45:
                raise InputError("does not fit")
            return np.array([np.exp(x[0]) - np.exp(0.4), 0.1 * x[0] - 0.04])

        found, _ = self.minimum(half_plane, np.array([-1.0]), 2.0)
        assert found == pytest.approx([0.4], abs=2e-4)

    def test_the_evaluations_are_bounded(self) -> None:
        def steep(x: Array) -> Array:
            return np.array([10.0 * (x[1] - x[0] ** 2), 1.0 - x[0]])

        _, spent = self.minimum(steep, np.array([-1.2, 1.0]), 2.0, most=9)
        assert spent <= 9


@pytest.mark.slow
class TestManyFits:
    def test_the_errors_of_eight_fits_scatter_as_their_standard_errors_say(
        self, small_gap: fm.Design
    ) -> None:
        """Half the squared errors over their covariance follow F(2, points - 2).

        G. A. F. Seber and C. J. Wild, Nonlinear Regression, section 5.2 (from memory). The limits
        of the mean of eight hold 99 % and come from sampling F itself.
        """
        currents = (0.1, 0.2, 0.35, 0.5, 0.6, 0.7, 0.85, 1.0)
        known = of(small_gap, 1.1, 1.2)
        found = []
        for seed in range(8):
            fit = fitted_design(small_gap, as_measured(known, currents, "incremental", 0.01, seed))
            assert fit.note == ""
            gap = (fit.gap - 0.11e-3) / fit.gap_error
            factor = (fit.permeability_factor - 1.2) / fit.permeability_error
            together = gap**2 + factor**2 - 2.0 * fit.correlation * gap * factor
            found.append(0.5 * together / (1.0 - fit.correlation**2))
        sampled = np.random.default_rng(0).f(2, len(currents) - 2, (100_000, 8)).mean(axis=1)
        low, high = np.quantile(sampled, (0.005, 0.995))
        assert low < np.mean(found) < high

    def test_a_tabulated_material_and_straight_legs_are_recovered_too(self) -> None:
        start = fm.Design(
            core=fm.catalogue_core("PQ 20/16").core(),
            windings=fm.Winding(20),
            material=fm.material("mnzn-power-100C"),
            gaps=fm.Gap(0.1e-3),
            tolerance=2e-3,
        )
        points = as_measured(of(start, 1.15, 0.85), (0.5, 1.5, 2.5, 3.5, 5.0))
        fit = fitted_design(start, points)
        assert fit.gap == pytest.approx(0.115e-3, rel=1e-3)
        assert fit.permeability_factor == pytest.approx(0.85, rel=1e-3)
        assert isinstance(fit.design.material, ScaledCurve)
        assert fit.note == ""

    def test_incremental_inductance_gives_the_same_gap_and_permeability(
        self, small_gap: fm.Design
    ) -> None:
        points = as_measured(of(small_gap, 1.1, 1.2), (0.1, 0.3, 0.5, 0.7), "incremental")
        fit = fitted_design(small_gap, points)
        assert fit.gap == pytest.approx(0.11e-3, rel=1e-3)
        assert fit.permeability_factor == pytest.approx(1.2, rel=1e-3)
