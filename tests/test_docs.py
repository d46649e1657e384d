"""What the documents say is run and compared."""

import re
from pathlib import Path

import pytest

from femag.design_file import DesignTable, design_from_toml
from femag.hand import FORMULAS

ROOT = Path(__file__).parents[1]
EXECUTED = (
    "README.md",
    "docs/guide.md",
    "docs/examples/compare-by-hand.md",
    "docs/examples/review-plots.md",
    "docs/examples/script-a-study.md",
)
DOCUMENTS = ("README.md", "DEVELOPERS.md", *sorted(
    str(path.relative_to(ROOT))
    for path in (ROOT / "docs").glob("**/*.md")
    if "reference" not in path.parts
))  # fmt: skip
RUN = r"```python\n(.*?)```(?:\n\nprints\n\n```\n(.*?)```)?"
"""A block of Python, and what it and those before it print."""


def numbers(text: str) -> list[float]:
    return [float(number) for number in re.findall(r"\d+\.?\d*", text)]


@pytest.mark.parametrize("name", EXECUTED)
def test_python_in_a_document_runs_and_prints_what_it_says(
    name: str,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    monkeypatch.chdir(tmp_path)
    text = (ROOT / name).read_text(encoding="utf-8")
    names: dict[str, object] = {}
    for block, shown in re.findall(RUN, text, re.DOTALL):
        exec(compile(block, name, "exec"), names)
        if shown:
            assert numbers(capsys.readouterr().out) == pytest.approx(numbers(shown), rel=2e-3)
    for figure in re.findall(r'savefig\("(.*?)"', text):
        assert (tmp_path / figure).stat().st_size > 5000


@pytest.mark.parametrize("name", ["docs/guide.md"])
def test_design_files_in_a_document_are_designs(name: str) -> None:
    text = (ROOT / name).read_text(encoding="utf-8")
    blocks = re.findall(r"```toml\n(.*?)```", text, re.DOTALL)
    assert blocks
    for block in blocks:
        assert design_from_toml(block).turns > 0


def test_the_first_design_and_its_requirements_are_accepted() -> None:
    text = (ROOT / "docs/start.md").read_text(encoding="utf-8")
    design, requirements = re.findall(r"```toml\n(.*?)```", text, re.DOTALL)
    found = design_from_toml(f"{design}\n{requirements}")
    assert found.ripple is not None
    assert found.requirements is not None


def test_every_key_of_the_design_file_is_documented() -> None:
    text = (ROOT / "docs/files-and-commands.md").read_text(encoding="utf-8")
    schema = DesignTable.model_json_schema()
    tables = [schema, *schema["$defs"].values()]
    for key in {key for table in tables for key in table["properties"]}:
        assert re.search(rf"[`.\[ ]{key}\b", text), key


def test_every_hand_formula_is_documented_with_its_range() -> None:
    text = (ROOT / "docs/hand-formulas.md").read_text(encoding="utf-8")
    for formula in FORMULAS:
        assert f"| {formula.name} |" in text


def test_readme_has_two_set_up_commands_and_ci_runs_the_second() -> None:
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    commands = [line for line in readme.splitlines() if "apt-get install" in line]
    assert len(commands) == 2
    assert commands[0].endswith("gapfield demo")
    assert commands[1].endswith("/pytest -n 2")
    ci = (ROOT / ".ci/run").read_text(encoding="utf-8")
    (pattern,) = re.findall(r'grep -m1 -F "(.*)" README.md', ci)
    assert [line for line in readme.splitlines() if pattern in line] == [commands[1]]


@pytest.mark.parametrize("name", DOCUMENTS)
def test_links_between_documents_lead_somewhere(name: str) -> None:
    text = (ROOT / name).read_text(encoding="utf-8")
    for target in re.findall(r"\]\(([^)#:]+)\)", text):
        assert (ROOT / name).parent.joinpath(target).exists(), target
