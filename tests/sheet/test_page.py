import html
import json
import re
from collections.abc import Callable
from dataclasses import replace
from html.parser import HTMLParser
from importlib.resources import files
from pathlib import Path

import numpy as np
import pytest

import femag as fm
from femag import cli
from femag.design_file import design_from_toml
from femag.materials import MagnetisationCurve, ScaledCurve
from femag.requirement_checks import checked_requirements
from femag.requirements import Requirements
from femag.review import Review, design_review
from femag.sheet import review_sheet
from femag.sheet.field_data import as_script, thinned
from femag.sheet.field_strength_table import field_strength_table, interpolated
from femag.sheet.page import verdict

DEMO = files("femag").joinpath("demo.toml").read_text(encoding="utf-8")
COARSE = DEMO.replace("tolerance = 1e-3", "tolerance = 1e-2")
SECTIONS = [
    "Verdict", "Part", "Field", "Field along lines", "Inductance against current",
    "Hand formulas", "Copper near the gap", "Losses", "Force", "Part tolerances", "Material",
    "How the numbers were found", "Assumptions and cautions", "Design file",
]  # fmt: skip


class Page(HTMLParser):
    """What a page holds: headings, addresses, scripts, and all its text."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.headings: list[str] = []
        self.addresses: list[str] = []
        self.scripts: list[dict[str, str | None]] = []
        self.alternatives: list[str] = []
        self.identities: list[str] = []
        self.text = ""
        self._inside: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attributes: list[tuple[str, str | None]]) -> None:
        given = dict(attributes)
        self.addresses += [given[key] or "" for key in ("src", "href") if key in given]
        if "id" in given:
            self.identities.append(given["id"] or "")
        if tag == "script":
            self.scripts.append(given)
        if tag == "img":
            self.alternatives.append(given.get("alt") or "")
        if tag in ("h2", "script", "style"):
            self._inside.append(tag)
        if tag == "h2":
            self.headings.append("")

    def handle_endtag(self, tag: str) -> None:
        if self._inside and self._inside[-1] == tag:
            self._inside.pop()

    def handle_data(self, data: str) -> None:
        if self._inside and self._inside[-1] == "h2":
            self.headings[-1] += data
        if not self._inside or self._inside[-1] == "h2":
            self.text += data


@pytest.fixture(scope="module")
def text(sheet: Path) -> str:
    return sheet.read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def page(text: str) -> Page:
    return Page(text)


def with_requirements(reviewed: Review, **limits: float | bool) -> Review:
    design = replace(reviewed.design, requirements=Requirements(**limits))
    result = replace(reviewed.result, design=design)
    return replace(reviewed, result=result, checks=checked_requirements(result))


def test_a_sheet_has_every_section_and_needs_nothing_else(text: str, page: Page) -> None:
    assert page.headings == SECTIONS
    assert len(text) < 3_000_000
    assert all(address.startswith(("data:", "#")) for address in page.addresses)
    inside = [address[1:] for address in page.addresses if address.startswith("#")]
    assert set(inside) <= set(page.identities)
    assert len(set(page.identities)) == len(page.identities)
    assert all(page.alternatives)
    assert "default-src 'none'" in html.unescape(text)


def test_a_sheet_says_what_the_result_says(reviewed: Review, page: Page) -> None:
    lower, upper = str(reviewed.result.inductance).split("(")[1].rstrip(")").split(" .. ")
    assert re.search(rf"between {lower[:5]}\S* and {upper[:5]}", page.text)
    assert reviewed.result.design_hash in page.text
    assert "Of 3 requirements, 1 is missed and 1 is not shown to be kept." in page.text
    for row in reviewed.result.hand:
        assert row.estimate.name in page.text
        assert f"{100 * row.error:+.1f} %" in page.text
    for mean in reviewed.result.section_means:
        assert f"{mean.flux_density:.4f}" in page.text


def test_what_looks_like_a_tag_is_text(page: Page) -> None:
    assert "<script>alert('a & b')</script>" in page.text
    assert "a \"b\" <i>'c'</i>.toml" in page.text
    assert [script.get("type") for script in page.scripts] == ["application/json", None]


def test_the_design_in_the_sheet_is_the_design(text: str, reviewed: Review) -> None:
    (shown,) = re.findall(r"<pre>(.*?)</pre>", text, re.DOTALL)
    assert design_from_toml(html.unescape(shown)) == reviewed.design


@pytest.mark.slow
def test_equal_reviews_give_equal_sheets(reviewed: Review) -> None:
    again = design_review(reviewed.design, [2.0, 6.0])
    assert again.result.seconds != reviewed.result.seconds
    assert review_sheet(reviewed) == review_sheet(again)


def test_names_cannot_end_the_data(reviewed: Review) -> None:
    text = as_script({"labels": [{"text": "</script><!-- &"}]})
    assert "<" not in text
    assert json.loads(text)["labels"][0]["text"] == "</script><!-- &"


@pytest.mark.parametrize(
    ("limits", "words"),
    [
        ({}, "No requirements were given"),
        ({"inductance_least": 380e-6}, "The requirement is kept"),
        ({"inductance_least": 380e-6, "inductance_most": 420e-6}, "All 2 requirements are kept"),
        ({"inductance_least": 500e-6}, "Of 1 requirement, 1 is missed"),
        (
            {"inductance_least": 500e-6, "flux_density": 0.1, "fit": True},
            "Of 3 requirements, 2 are missed and 1 is not shown to be kept",
        ),
    ],
)
def test_the_verdict_is_in_words(reviewed: Review, limits: dict[str, float], words: str) -> None:
    assert verdict(with_requirements(reviewed, **limits)) == words


def test_currents_of_the_other_sign_are_refused() -> None:
    design = design_from_toml(COARSE)
    with pytest.raises(fm.InputError, match="of the other sign than the peak current"):
        design_review(design, [-2.0, -6.0])
    with pytest.raises(fm.InputError, match="measured and other currents with the sign"):
        design_review(design, (), fm.MeasuredPoints((-2.5, -5.0), (400e-6, 390e-6)))


@pytest.mark.slow
def test_measured_points_stand_beside_the_curve() -> None:
    points = fm.MeasuredPoints((2.5, 5.0), (400e-6, 390e-6), source="bench <1>.csv")
    page = Page(review_sheet(design_review(design_from_toml(COARSE), [2.0, 6.0], points)))
    assert "Measured apparent inductance, bench <1>.csv" in page.text
    assert "solved over measured" in page.text


@pytest.mark.slow
def test_losses_forces_and_tolerances_have_their_tables(pot_26_16: fm.Design) -> None:
    wire = fm.RoundWire(0.4e-3, 0.03e-3)
    former = fm.Former(wall=0.6e-3, flange=0.6e-3)
    design = replace(
        pot_26_16,
        windings=fm.Winding(40, conductor=wire, former=former, temperature=100.0),
        material=fm.material("mnzn-power-100C"),
        ripple=fm.Ripple(0.5, 100e3),
        part_tolerances=fm.PartTolerances(gap=0.01e-3),
        tolerance=1e-2,
    )
    reviewed = design_review(design, [0.5, 1.5])
    result = reviewed.result
    assert result.tolerance_budget == reviewed.tolerances
    page = Page(review_sheet(reviewed))
    for caption in ("Loss in the copper", "Loss in the core", "Losses added up", "Forces at 1 A"):
        assert caption in page.text
    assert "winding main, layer 1" in page.text
    assert result.loss_budget is not None
    for value in (result.loss_budget.total, result.force.halves.by_work):
        assert any(text in page.text for text in (f"{1e3 * value:.1f} m", f"{value:.3f} "))
    assert "worst case" in page.text
    assert len([name for name in page.identities if name.endswith("-loss")]) == 3


@pytest.mark.slow
def test_a_magnet_leaves_the_part_tolerances_out(pot_26_16: fm.Design) -> None:
    gap = fm.Gap(0.5e-3, magnet=fm.Magnet(0.3))
    reviewed = design_review(replace(pot_26_16, gaps=gap, tolerance=2e-2), [0.5, 1.5])
    assert reviewed.tolerances is None
    assert "magnet in the gap" in Page(review_sheet(reviewed)).text


MATERIALS: list[MagnetisationCurve] = [
    fm.LinearCurve(2000.0),
    fm.FroehlichCurve(2200.0, 0.46, 2.0),
    fm.FroehlichCurve(2000.0, 0.45, 20.0),
    fm.material("mnzn-power-100C"),
    fm.material("silicon-steel"),
    ScaledCurve(fm.material("powder-26"), 1.3),
]


@pytest.mark.parametrize("curve", MATERIALS, ids=lambda curve: type(curve).__name__)
def test_the_table_of_h_is_as_close_as_what_is_shown(curve: MagnetisationCurve) -> None:
    table = field_strength_table(curve, 1.5)
    b = np.linspace(1e-6, 1.5, 20_001)
    assert interpolated(table, b) == pytest.approx(curve.field_strength(b), rel=3e-6)
    assert len(table.b) < 500


def test_currents_are_left_out_where_they_have_no_room_but_never_the_peak() -> None:
    grid = [0.5 * k for k in range(1, 10)]
    assert thinned(grid, 3.0, 2_000) == grid
    for nodes in (30_000, 100_000, 10_000_000):
        kept = thinned(grid, 3.0, nodes)
        assert 3.0 in kept
        assert len(kept) < len(grid)
        assert set(kept) <= set(grid)


Run = Callable[..., tuple[int, str, str]]


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Run:
    def run_command(*arguments: object) -> tuple[int, str, str]:
        code = cli.main([str(argument) for argument in arguments])
        captured = capsys.readouterr()
        return code, captured.out, captured.err

    return run_command


@pytest.mark.slow
def test_the_command_writes_a_failing_sheet_and_leaves_with_1(tmp_path: Path, run: Run) -> None:
    design, sheet = tmp_path / "d.toml", tmp_path / "review.html"
    design.write_text(f'{COARSE}\n[require]\ninductance_least = "500 uH"\n')
    code, out, err = run("sheet", design, "-o", sheet, "--currents", "2 A, 5 A")
    assert (code, err) == (1, "")
    assert "missed" in out
    assert str(design) in Page(sheet.read_text(encoding="utf-8")).text
    assert sorted(file.name for file in tmp_path.iterdir()) == ["d.toml", "review.html"]


@pytest.mark.parametrize(
    ("arguments", "text"),
    [
        (["sheet", "{design}"], "Missing option '--out'"),
        (["sheet", "{design}", "-o", "{folder}"], "--out = "),
        (["sheet", "{design}", "-o", "{folder}/no/r.html"], "a file in a folder that exists"),
        (["sheet", "{design}", "-o", "{design}"], "is the design itself"),
        (["sheet", "{folder}/none.toml", "-o", "{folder}/r.html"], "cannot be read"),
        (["sheet", "{design}", "-o", "{folder}/r.html", "--currents", "1 A"], "makes no curve"),
        (["sheet", "{design}", "-o", "{folder}/r.html", "--kind", "apparent"], "nothing measured"),
    ],
)
def test_bad_calls_get_one_line(tmp_path: Path, run: Run, arguments: list[str], text: str) -> None:
    design = tmp_path / "d.toml"
    design.write_text(COARSE)
    code, out, err = run(*(part.format(design=design, folder=tmp_path) for part in arguments))
    assert (code, out) == (2, "")
    assert err.count("\n") == 1
    assert text in err
    assert list(tmp_path.iterdir()) == [design]
