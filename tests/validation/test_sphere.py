"""The polygon's cost is of second order, so that the extrapolation is right to use."""

import pytest

from validation.rows import table_of
from validation.sphere.polygon_cost import orders, polygon_errors
from validation.sphere.run import POLYGON_COST, extrapolated


@pytest.mark.parametrize("material", ["linear 2000", "saturating"])
def test_the_polygon_costs_second_order(material: str) -> None:
    line = next(line for line in table_of("sphere") if line["material"] == material)
    errors = polygon_errors(line, (16, 32))
    assert orders(errors)[0] == pytest.approx(2.0, abs=0.05)
    assert 0.9 * POLYGON_COST / 32**2 < -errors[1] < POLYGON_COST / 32**2


def test_extrapolation_removes_an_error_of_second_order() -> None:
    assert extrapolated(1.0 - 3.0 / 16**2, 1.0 - 3.0 / 32**2) == pytest.approx(1.0, rel=1e-14)
