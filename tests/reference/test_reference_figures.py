"""Every figure of the two reference tables, one test a row.
 `published.csv` holds figures printed in handbooks and papers; each row names its source and, in `evidence`, whether
the figure was seen quoted or comes from memory. A figure printed to n decimals allows half a unit of the last one.
`integrated.csv` is our own: 200 undiscounted calls over a hard box with both deltas, by adaptive integration at 55
digits in one direction and again in the other with a second arithmetic, which agreed to 5e-39.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from spreadgui.pricing import kirk, margrabe, modified_kirk, yardstick

HERE = Path(__file__).parent
INPUTS = ("F1", "F2", "K", "sigma1", "sigma2", "rho", "T")
METHODS = {"margrabe": margrabe, "kirk": kirk, "modified_kirk": modified_kirk, "exact": yardstick}


def rows(name: str) -> list[dict[str, str]]:
    with (HERE / name).open(newline="", encoding="utf-8") as table:
        return list(csv.DictReader(table))


def label(row: dict[str, str]) -> str:
    source = row.get("source", row.get("regime", ""))
    return f"{source} | {row.get('evidence', '55 digits')} | " + " ".join(row[name] for name in INPUTS)


PUBLISHED = rows("published.csv")
INTEGRATED = rows("integrated.csv")


@pytest.mark.parametrize("row", PUBLISHED, ids=[label(row) for row in PUBLISHED])
def test_a_published_figure_is_met_to_its_printed_decimals(row: dict[str, str]) -> None:
    arguments = [float(row[name]) for name in INPUTS]
    discount = np.exp(-float(row["r"]) * float(row["T"]))
    found = METHODS[row["method"]].value(*arguments, discount)
    allowed = 0.5 * 10.0 ** -int(row["printed_decimals"])
    # A ten-thousandth of the allowance on top, for figures that fall on the rounding edge itself.
    assert abs(found - float(row["value"])) <= allowed * 1.0001


@pytest.mark.parametrize("row", INTEGRATED, ids=[label(row) for row in INTEGRATED])
def test_the_yardstick_meets_an_integral_taken_at_55_digits(row: dict[str, str]) -> None:
    found = yardstick.sensitivities(*(float(row[name]) for name in INPUTS))
    exact, larger = float(row["exact"]), max(float(row["F1"]), float(row["F2"]))
    assert abs(found.value - exact) <= 1e-10 * exact + 1e-12 * larger
    assert abs(found.delta_long - float(row["delta1"])) <= 1e-11
    assert abs(found.delta_short - float(row["delta2"])) <= 1e-11


@pytest.mark.parametrize("row", INTEGRATED, ids=[label(row) for row in INTEGRATED])
def test_the_yardstick_bounds_its_own_error(row: dict[str, str]) -> None:
    value, error = yardstick.estimate(*(float(row[name]) for name in INPUTS))
    larger = max(float(row["F1"]), float(row["F2"]))
    assert abs(value - float(row["exact"])) <= error
    assert error <= 2e-11 * larger


def test_the_yardstick_lies_in_the_interval_a_paper_simulated() -> None:
    """The 95 % interval of five million antithetic paths that Harutyunyan and Masip Borràs (2018, arXiv:1812.04272)
    give beside the last two rows of `published.csv`; evidence as there."""
    found = yardstick.value(100.0, 100.0, 10.0, 0.30, 0.20, 0.999, 0.50)
    assert 0.5399 <= found <= 0.5428


def test_both_tables_are_whole() -> None:
    assert len(PUBLISHED) == 75
    assert len(INTEGRATED) == 200
