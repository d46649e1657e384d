"""What the polygon costs: error of the co-energy against the number of sides, and its order.

Run ``python -m validation.sphere.polygon_cost`` to print the table of the README.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import pairwise

from validation.rows import table_of
from validation.sphere.run import polygon_values

SIDES = (16, 32, 64, 128)


def polygon_errors(line: dict[str, str], sides: Sequence[int]) -> list[float]:
    """Return the relative error of the co-energy of a line of reference.csv for each number."""
    reference, ampere_turns = float(line["coenergy"]), float(line["ampere_turns"])
    values = (polygon_values(number, line["material"], ampere_turns) for number in sides)
    return [bounds.value / reference - 1.0 for bounds, _ in values]


def orders(errors: Sequence[float]) -> list[float]:
    """Return the order of convergence between neighbours whose sides double."""
    return [math.log2(one / two) for one, two in pairwise(errors)]


def main() -> None:
    """Print errors in ppm and orders."""
    print("material     NI (A)   " + "".join(f"{sides:>9}" for sides in SIDES) + "   orders")
    for line in table_of("sphere"):
        errors = polygon_errors(line, SIDES)
        ppm = "".join(f"{1e6 * error:9.1f}" for error in errors)
        rates = " ".join(f"{rate:.2f}" for rate in orders(errors))
        print(f"{line['material']:<12} {line['ampere_turns']:<8} {ppm}   {rates}")


if __name__ == "__main__":
    main()
