"""Intervals of everything that a form between two others may be."""

import numpy as np
import pytest
from numpy.typing import NDArray

from femag.field.bounds import Bounds
from femag.quantities.bounded_form import BoundedForm, over

Array = NDArray[np.float64]
SIZE = 3


def definite(random: np.random.Generator, scale: float) -> Array:
    factor = random.normal(size=(SIZE, SIZE))
    return np.asarray(scale * factor @ factor.T)


def form_and_one_inside(random: np.random.Generator) -> tuple[BoundedForm, Array]:
    """A form, and one that lies between its bounds as quadratic forms do."""
    lower, width = definite(random, 1.0) + np.eye(SIZE), definite(random, 0.1)
    root = np.linalg.cholesky(width)
    rotation, _ = np.linalg.qr(random.normal(size=(SIZE, SIZE)))
    share = rotation @ np.diag(random.uniform(0.0, 1.0, SIZE)) @ rotation.T
    return BoundedForm(lower, lower + width, "H"), lower + root @ share @ root.T


def holds(bounds: Bounds, value: float) -> bool:
    return bounds.lower - 1e-12 <= value <= bounds.upper + 1e-12


@pytest.mark.parametrize("seed", range(50))
def test_a_form_between_the_bounds_is_in_every_interval(seed: int) -> None:
    random = np.random.default_rng(seed)
    form, inside = form_and_one_inside(random)
    v, w = random.normal(size=(2, SIZE))
    assert holds(form.value(v), v @ inside @ v)
    assert holds(form.product(v, w), v @ inside @ w)
    least = v @ inside @ v - (v @ inside @ w) ** 2 / (w @ inside @ w)
    assert holds(form.least(v, w), least)
    quotient = (v @ inside @ w) / (v @ inside @ v)
    assert holds(over(form.product(v, w), form.value(v)), quotient)


def test_the_interval_of_a_product_is_the_narrowest() -> None:
    """A form that differs from the lower one along one direction only reaches either end."""
    random = np.random.default_rng(1)
    form, _ = form_and_one_inside(random)
    width = form.upper - form.lower
    v, w = random.normal(size=(2, SIZE))
    a, b = (u / np.sqrt(u @ width @ u) for u in (v, w))
    bounds = form.product(v, w)
    for sign, end in ((1.0, bounds.upper), (-1.0, bounds.lower)):
        direction = width @ (a + sign * b) / np.sqrt((a + sign * b) @ width @ (a + sign * b))
        extreme = form.lower + np.outer(direction, direction)
        assert np.linalg.eigvalsh(form.upper - extreme).min() > -1e-12
        assert v @ extreme @ w == pytest.approx(end, rel=1e-10)


def test_the_least_value_is_the_least_on_the_line() -> None:
    random = np.random.default_rng(2)
    form, _ = form_and_one_inside(random)
    v, w = random.normal(size=(2, SIZE))
    for end, matrix in (("lower", form.lower), ("upper", form.upper)):
        values = [(v + t * w) @ matrix @ (v + t * w) for t in np.linspace(-5, 5, 20001)]
        assert getattr(form.least(v, w), end) == pytest.approx(min(values), rel=1e-6)


def test_a_product_of_a_vector_with_itself_is_its_value() -> None:
    form, _ = form_and_one_inside(np.random.default_rng(3))
    v = np.array([1.0, -2.0, 0.5])
    assert form.product(v, v).lower == pytest.approx(form.value(v).lower, rel=1e-12)
    assert form.product(v, v).upper == pytest.approx(form.value(v).upper, rel=1e-12)
