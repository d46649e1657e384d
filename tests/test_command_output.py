"""Names and titles reach the terminal as they are written."""

from dataclasses import replace
from pathlib import Path

import pytest

import femag as fm
from femag.cli import main
from femag.design_file import design_toml

NAMES = ("main [red]", "sense :smile:")
TITLE = "coil [bold] <script> :smile: [/nothing]"


@pytest.fixture
def design(pot_26_16: fm.Design, tmp_path: Path) -> Path:
    windings = (
        fm.Winding(20, name=NAMES[0], conductor=fm.RoundWire(0.4e-3, 0.03e-3)),
        fm.Winding(10, name=NAMES[1], conductor=fm.RoundWire(0.4e-3, 0.03e-3)),
    )
    file = tmp_path / "design.toml"
    odd = replace(
        pot_26_16, title=TITLE, windings=windings, ripple=fm.Ripple(0.5, 1e5), tolerance=0.05
    )
    file.write_text(design_toml(odd), encoding="utf-8")
    return file


@pytest.mark.parametrize("command", ["solve", "windings"])
def test_names_and_titles_are_no_markup(
    command: str, design: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main([command, str(design)]) == 0
    printed, errors = capsys.readouterr()
    assert errors == ""
    assert TITLE in printed.splitlines()[0]
    words = " ".join(printed.split())
    for name in NAMES:
        assert words.count(name) >= 2
    assert max(map(len, printed.splitlines())) <= 80
