"""What the answer says about shaped gaps and magnets, and what it promises."""

from dataclasses import replace
from io import StringIO

import pytest
from rich.console import Console

import femag as fm
from femag.answer import WIDTH, print_answer


def answer(design: fm.Design) -> str:
    """The answer as one line of words, after a look at its width."""
    return " ".join(printed(fm.solve(design, tolerance=1e-2)).split())


def printed(result: fm.Result) -> str:
    text = StringIO()
    print_answer(result, Console(file=text, width=WIDTH))
    assert max(map(len, text.getvalue().splitlines())) <= WIDTH
    return text.getvalue()


SATURATING = fm.FroehlichCurve(2000.0, 0.45, 2.0)
MAGNET = fm.Gap(0.5e-3, magnet=fm.Magnet(-0.2, 1.1))


@pytest.mark.parametrize(
    ("gap", "words"),
    [
        (fm.Gap(0.5e-3, rim_length=1e-3, chamfer=0.2e-3),
         "0.5 mm gap in the post tapered to 1 mm at the rim with chamfers of 0.2 mm"),
        (fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.1e-3)), "with 0.1 mm inside of 8 mm"),
        (fm.Gap(0.5e-3, step=fm.Step(8e-3, 0.0), edge_radius=0.1e-3),
         "with none inside of 8 mm with edges of radius 0.1 mm"),
    ],
)  # fmt: skip
def test_shaped_faces_are_described_and_out_of_range(
    pot_26_16: fm.Design, gap: fm.Gap, words: str
) -> None:
    text = answer(replace(pot_26_16, gaps=(gap,)))
    assert words in text
    assert "No formula knows shaped faces" in text
    assert ("gap factor" in text) == (gap.step is None or gap.step.length > 0.0)


@pytest.mark.parametrize("material", [fm.LinearCurve(2000.0), SATURATING], ids=str)
def test_the_answer_says_what_is_guaranteed_with_a_magnet(
    pot_26_16: fm.Design, material: fm.LinearCurve
) -> None:
    text = answer(replace(pot_26_16, gaps=(MAGNET,), material=material))
    assert "with a magnet, -0.2 T, recoil 1.1" in text
    assert "flux linkage without current" in text
    assert ("The bounds are rigorous" in text) == material.is_linear
    assert ("distance of two estimates and has no bound" in text) == (not material.is_linear)


def test_without_shape_and_magnet_nothing_is_said_of_them(pot_26_16: fm.Design) -> None:
    text = answer(replace(pot_26_16, material=SATURATING))
    assert "magnet," not in text
    assert "without current" not in text
    assert "shaped" not in text


def test_small_numbers_keep_their_digits(pot_26_16: fm.Design) -> None:
    """A signal coil: flux densities of microtesla, one turn, a gap of many digits."""
    small = replace(
        pot_26_16,
        current=1e-3,
        gaps=(fm.Gap(0.579976e-3),),
        windings=(replace(pot_26_16.windings[0], turns=1),),
    )
    result = fm.solve(small, tolerance=1e-2)
    text = printed(result)
    assert "0.58 mm gap" in text
    assert "\n1 turn, 0.001 A" in text
    (head,) = (line for line in text.splitlines() if line.startswith("mean flux density"))
    assert head.split()[3] == "uT"
    for mean in result.section_means:
        assert f"{1e6 * mean.flux_density:.4f}" in text
