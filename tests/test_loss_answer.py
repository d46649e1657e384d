"""What the answer says about losses."""

from dataclasses import replace
from io import StringIO

import pytest
from rich.console import Console

import femag as fm
from femag.answer import WIDTH, print_answer
from femag.loss_answer import core_loss_notes

LOSS = fm.Steinmetz(1.5, 1.45, 2.6, (25e3, 300e3), (0.001, 0.3), 100.0, "invented for a test")


def answer(design: fm.Design) -> str:
    text = StringIO()
    print_answer(fm.solve(design, tolerance=1e-2), Console(file=text, width=WIDTH))
    return text.getvalue()


def words(design: fm.Design) -> str:
    return " ".join(answer(design).split())


@pytest.fixture
def design(pot_26_16: fm.Design) -> fm.Design:
    return replace(
        pot_26_16, material=fm.LinearCurve(2000.0, LOSS), ripple=fm.Ripple(0.8, 1e5, rise=0.4)
    )


def test_a_design_without_ripple_says_nothing_of_losses(pot_26_16: fm.Design) -> None:
    text = words(pot_26_16)
    assert "ripple" not in text
    assert "loss" not in text


def test_the_answer_names_ripple_loss_method_and_parameters(design: fm.Design) -> None:
    text = words(design)
    assert "ripple 0.8 A peak to peak at 100 kHz, triangle rising 0.4 of the period" in text
    assert "mean 0.6 A" in text
    assert "whole core" in text
    assert "A bias is not in it: it raises the loss" in text
    assert "Parameters at 100 C: k 1.5, alpha 1.45, beta 2.6" in text
    assert "invented for a test" in text
    assert "outside" not in text.partition("core loss")[2]
    assert "lower estimate" not in text
    assert max(map(len, answer(design).splitlines())) <= WIDTH


def test_it_says_what_is_not_known_and_what_lies_outside_of_the_fit(design: fm.Design) -> None:
    text = words(replace(design, ripple=fm.Ripple(0.8, 1e6)))
    assert "The frequency is outside of 25.0 kHz to 300 kHz, where they were fitted." in text
    assert "copper, mean current not known" in text
    assert "known losses" in text
    text = words(replace(design, material=fm.LinearCurve(2000.0)))
    assert "No core loss: the material has no loss parameters" in text


def test_a_core_with_straight_legs_calls_its_plates_a_lower_estimate(design: fm.Design) -> None:
    legs = replace(design, core=fm.catalogue_core("PQ 26/25").core(), windings=(fm.Winding(20),))
    text = answer(legs)
    assert "The plates' loss is a lower estimate" in " ".join(text.split())
    table = text.partition("core loss ")[2].splitlines()
    assert [line.split()[0] for line in table[1:4]] == ["post", "plates", "legs"]


def test_a_strong_bend_is_a_plain_percentage(design: fm.Design) -> None:
    loss = fm.solve(design, tolerance=1e-2).core_loss
    assert loss is not None
    assert "which adds 141 %" in core_loss_notes(replace(loss, bend=1.413), False)
    assert "which adds 2.8 %" in core_loss_notes(replace(loss, bend=0.0283), False)
