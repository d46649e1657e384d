"""The sheet in a browser: what it reads is what the solver has."""

import shutil
import subprocess
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import femag as fm
from femag.quantities import PointFields, point_fields
from femag.requirements import Requirements
from femag.review import Review, design_review
from femag.sheet import review_sheet

PLACES = {
    "upper post": (4.0e-3, 3.0e-3),
    "post gap": (6.4e-3, 0.1e-3),
    "winding main": (9.0e-3, -2.0e-3),
}
H_ERROR = 3e-6
"""Of the page's table of H of a saturating material; everything else is exact to rounding."""


def written(reviewed: Review, file: Path) -> Path:
    file.write_text(review_sheet(reviewed, "design.toml"), encoding="utf-8")
    return file


def reading(browser: Any) -> dict[str, Any]:
    """Return what the table of the marked place says, full numbers where there are any."""
    rows = browser.run(
        "[...document.querySelectorAll('#reading tbody tr')].map(row =>"
        " [row.cells[0].textContent, row.cells[1].title || row.cells[1].textContent])"
    )
    return {name: value if name == "place" else float(value) for name, value in rows}


def pixel(browser: Any, r: float, z: float) -> tuple[float, float]:
    """Return where in the window a place of the whole section is drawn."""
    left, top, wide, high = browser.run(
        "(() => { const map = document.getElementById('map');"
        " const area = map.getBoundingClientRect(); return [area.left + map.clientLeft,"
        " area.top + map.clientTop, map.clientWidth, map.clientHeight]; })()"
    )
    views = browser.run("JSON.parse(document.getElementById('field-data').textContent).views")
    r0, r1, z0, z1 = views["section"]
    return left + wide * (r - r0) / (r1 - r0), top + high * (z1 - z) / (z1 - z0)


def show_map(browser: Any) -> None:
    browser.run("document.getElementById('map').scrollIntoView()")
    browser.settle()


def at(reviewed: Review, current: float, read: dict[str, Any]) -> PointFields:
    """Return the solver's fields at the place that a reading says."""
    solution = next(s for s in reviewed.curve.solutions if s.current == current)
    return point_fields(solution, np.array([[read["radius r"]], [read["height z"]]]))


def check_reading(read: dict[str, Any], field: PointFields) -> None:
    b = field.flux_density[:, 0]
    assert [read["radial B"], read["axial B"]] == pytest.approx(b, rel=1e-9, abs=1e-12)
    assert read["|B|"] == pytest.approx(np.hypot(*b), rel=1e-9)
    assert read["flux inside r"] == pytest.approx(field.flux[0], rel=1e-9)
    assert read["H"] == pytest.approx(np.hypot(*field.field_strength[:, 0]), rel=H_ERROR)


def test_a_page_reads_the_solvers_values_and_asks_for_nothing(
    browser: Any, sheet: Path, reviewed: Review
) -> None:
    browser.open(sheet)
    assert browser.run("document.querySelector('h1').textContent") == reviewed.design.title
    show_map(browser)
    for name, place in PLACES.items():
        browser.mouse("mouseMoved", *pixel(browser, *place))
        read = reading(browser)
        assert read["place"] == name
        assert (read["radius r"], read["height z"]) == pytest.approx(place, abs=5e-5)
        check_reading(read, at(reviewed, 4.0, read))
    browser.click(*pixel(browser, *PLACES["post gap"]))
    before, drawn = reading(browser), picture_of_map(browser)
    browser.press("PageUp")
    after = reading(browser)
    assert browser.run("document.getElementById('current-value').textContent") == "6.000 A"
    assert (after["radius r"], after["height z"]) == (before["radius r"], before["height z"])
    assert after["|B|"] > 1.1 * before["|B|"]
    check_reading(after, at(reviewed, 6.0, after))
    assert picture_of_map(browser) != drawn
    assert browser.complaints() == []
    assert [url for url in browser.requests() if not url.startswith("data:")] == [sheet.as_uri()]


def picture_of_map(browser: Any) -> str:
    browser.settle()
    picture = browser.run("document.getElementById('map').toDataURL()")
    assert isinstance(picture, str)
    return picture


@pytest.mark.slow
def test_every_key_and_button_does_what_it_says(browser: Any, sheet: Path) -> None:
    browser.open(sheet)
    show_map(browser)
    browser.click(*pixel(browser, 5e-3, 5e-3))
    start = reading(browser)
    moves = {"ArrowRight": ("radius r", 1), "ArrowLeft": ("radius r", -1),
             "ArrowUp": ("height z", 1), "ArrowDown": ("height z", -1)}  # fmt: skip
    for key, (name, sign) in moves.items():
        before = reading(browser)[name]
        browser.press(key)
        assert sign * (reading(browser)[name] - before) > 0.0
    names = ("radius r", "height z")
    assert [reading(browser)[n] for n in names] == pytest.approx([start[n] for n in names])
    whole = picture_of_map(browser)
    shown = whole
    for key in ("+", "+", "-", "g"):
        browser.press(key)
        assert picture_of_map(browser) != shown
        shown = picture_of_map(browser)
    browser.press("Home")
    assert picture_of_map(browser) == whole
    for there in ("view-gap", "zoom-in"):
        browser.run(f"document.getElementById('{there}').click()")
        assert picture_of_map(browser) != whole
        browser.run("document.getElementById('view-section').click()")
        assert picture_of_map(browser) == whole
    for key, button in (("PageDown", "step-down"), ("PageUp", "step-up")):
        for _ in range(3):
            browser.press(key)
        assert browser.run(f"document.getElementById('{button}').disabled") is True
    assert browser.complaints() == []


@pytest.mark.slow
def test_the_wheel_zooms_only_after_a_click_and_a_drag_moves(browser: Any, sheet: Path) -> None:
    browser.open(sheet)
    show_map(browser)
    x, y = pixel(browser, 6.65e-3, 0.0)
    whole = picture_of_map(browser)
    browser.mouse("mouseWheel", x, y, deltaX=0, deltaY=-10)
    browser.settle()
    browser.run("document.getElementById('map').scrollIntoView()")
    assert picture_of_map(browser) == whole
    browser.click(x, y)
    browser.mouse("mouseWheel", x, y, deltaX=0, deltaY=-100)
    zoomed = picture_of_map(browser)
    assert zoomed != whole
    read = reading(browser)
    browser.mouse("mousePressed", x, y, button="left", clickCount=1)
    browser.mouse("mouseMoved", x - 60, y, button="left", buttons=1)
    browser.mouse("mouseReleased", x - 60, y, button="left", clickCount=1)
    assert picture_of_map(browser) != zoomed
    browser.mouse("mouseMoved", x - 60, y)
    assert reading(browser)["radius r"] == pytest.approx(read["radius r"], abs=1e-4)


@pytest.mark.slow
def test_it_reads_without_scripts(browser: Any, sheet: Path) -> None:
    browser.open(sheet, scripts=False)
    picture = browser.ask("DOM.getDocument", depth=0)
    text = browser.ask("DOM.getOuterHTML", nodeId=picture["root"]["nodeId"])["outerHTML"]
    assert "With scripts allowed this place holds a viewer" in text
    assert browser.complaints() == []


@pytest.mark.slow
def test_a_narrow_window_needs_no_sideways_scrolling(browser: Any, sheet: Path) -> None:
    browser.open(sheet, width=400, height=800)
    assert browser.run("document.documentElement.scrollWidth") <= 400


def paper(browser: Any, tmp_path: Path) -> str:
    """Return the text of the page on paper, sheet by sheet."""
    program = shutil.which("pdftotext")
    if program is None:
        pytest.skip("pdftotext (poppler-utils) is not installed: the print is not read")
    (tmp_path / "sheet.pdf").write_bytes(browser.printed())
    done = subprocess.run(
        [program, "-layout", str(tmp_path / "sheet.pdf"), "-"], capture_output=True, check=True
    )
    return done.stdout.decode("utf-8")


@pytest.mark.slow
def test_the_print_has_every_section_and_whole_figures(
    browser: Any, sheet: Path, tmp_path: Path
) -> None:
    browser.open(sheet)
    headings = browser.run("[...document.querySelectorAll('h2')].map(h => h.textContent)")
    text = paper(browser, tmp_path)
    for heading in headings:
        assert heading in text
    for number in range(1, browser.run("document.querySelectorAll('figure').length") + 1):
        assert f"Figure {number}." in text
    assert "Read the field at a point" not in text
    assert 4 <= text.count("\f") <= 9


EXTREMES = ("P 9/5", "PM 114/93")


@pytest.mark.slow
@pytest.mark.parametrize("size", EXTREMES)
def test_sheets_of_the_smallest_and_the_largest_core_open(
    browser: Any, tmp_path: Path, size: str
) -> None:
    core = fm.catalogue_core(size).core()
    design = fm.Design(
        core=core,
        gaps=fm.Gap(0.02 * core.window_height),
        windings=fm.Winding(20),
        material=fm.material("mnzn-power-100C"),
        current=0.3 * core.window_height / 0.02 / 20,
        requirements=Requirements(inductance_least=1.0, core_flux_density=2.0),
        title=f"{size} <b>&amp;</b> \"quoted\" 'path'",
    )
    reviewed = design_review(replace(design, current=abs(design.current)))
    file = written(reviewed, tmp_path / 'it\'s a "sheet".html')
    assert file.stat().st_size < 3_000_000
    browser.open(file)
    assert browser.run("document.querySelector('h1').textContent") == design.title
    assert "1 is missed" in browser.run("document.querySelector('.verdict').textContent")
    show_map(browser)
    post = core.turned.post_radius
    for place in ((0.8 * post, 0.3 * core.window_height), (1.2 * post, -1e-4)):
        browser.mouse("mouseMoved", *pixel(browser, *place))
        read = reading(browser)
        check_reading(read, at(reviewed, design.current, read))
    assert browser.complaints() == []
