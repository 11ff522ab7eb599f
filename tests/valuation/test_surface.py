"""A surface says what the methods say, at every node and at the marks."""

import numpy as np
import pytest

from spreadgui.book.records import Position
from spreadgui.pricing import bjerksund_stensland, kirk
from spreadgui.valuation.slate import Slate, build_slate
from spreadgui.valuation.surface import QUANTITIES, Surface, SurfaceRequest, draw_surface, quantity_of
from tests.books import DAY, book_of, cap, season, spark

RATIO, ZERO_RATE = 7.1, 0.03


def slate_of(*positions: Position) -> Slate:
    return build_slate(book_of(*positions), 3)


def drawn(position: Position, quantity: str = "value", method: str = "kirk", nodes: int = 21) -> Surface:
    return draw_surface(slate_of(position), SurfaceRequest(0, quantity, method, nodes))


def arguments(slate: Slate, surface: Surface) -> tuple[object, ...]:
    """What a method takes at every node, put together anew from the row's inputs."""
    row = {key: float(slate.values(key)[0]) for key in ("strike", "vol_long", "vol_short", "correlation", "years")}
    discount = float(np.exp(-ZERO_RATE * row["years"]))
    return (surface.long[np.newaxis, :], RATIO * surface.short[:, np.newaxis], *row.values(), discount)


def test_the_value_at_every_node_is_the_methods_own() -> None:
    slate = slate_of(spark())
    surface = draw_surface(slate, SurfaceRequest(0, "value", "bjerksund_stensland", 21))
    expected = bjerksund_stensland.value(*arguments(slate, surface))
    np.testing.assert_allclose(surface.values, expected, rtol=1e-13)
    assert (surface.revision, surface.kind, surface.unit) == (3, "call", "CRN/MWh")


@pytest.mark.parametrize(
    ("quantity", "scale"),
    [("vega_long", 0.01), ("vega_short", 0.01), ("correlation_sensitivity", 0.01), ("delta_long", 1.0)],
)
def test_sensitivities_come_in_the_scaling_of_the_screens(quantity: str, scale: float) -> None:
    slate = slate_of(spark())
    surface = draw_surface(slate, SurfaceRequest(0, quantity, "kirk", 21))
    expected = scale * getattr(kirk.sensitivities(*arguments(slate, surface)), quantity)
    np.testing.assert_allclose(surface.values, expected, rtol=1e-13)


@pytest.mark.parametrize(("quantity", "axis"), [("delta_long", 1), ("delta_short", 0)])
def test_a_delta_is_the_slope_of_the_value_in_the_markets_own_forward(quantity: str, axis: int) -> None:
    value, delta = drawn(spark(), "value", nodes=401), drawn(spark(), quantity, nodes=401)
    slope = np.gradient(value.values, (value.short, value.long)[axis], axis=axis)
    inner = slice(1, -1)
    np.testing.assert_allclose(delta.values[inner, inner], slope[inner, inner], atol=2e-3 * RATIO)


def test_theta_is_the_change_of_value_overnight_with_the_carry_of_the_premium() -> None:
    def value(days: int) -> np.ndarray:
        surface = drawn(spark(), "theta")
        slate = slate_of(spark())
        forwards_and_marks = arguments(slate, surface)[:-2]
        years = float(slate.values("years")[0]) - days / 365
        return kirk.value(*forwards_and_marks, years, np.exp(-ZERO_RATE * years))

    np.testing.assert_allclose(drawn(spark(), "theta").values, 0.5 * (value(1) - value(-1)), atol=2e-3)
    far_in_the_money = drawn(spark(strike=-500.0), "theta")
    assert (far_in_the_money.values > 0).all(), "the discount unwinds"


def test_the_current_point_is_the_marks_and_the_value_there() -> None:
    slate = slate_of(spark())
    surface = draw_surface(slate, SurfaceRequest(0, "delta_short", "kirk"))
    long, short, value = surface.current
    years = float(slate.values("years")[0])
    rest = [float(slate.values(key)[0]) for key in ("strike", "vol_long", "vol_short", "correlation")]
    found = kirk.sensitivities(108.0, RATIO * 13.0, *rest, years, np.exp(-ZERO_RATE * years))
    assert (long, short) == (108.0, 13.0)
    assert value == pytest.approx(RATIO * float(found.delta_short), rel=1e-13)
    assert surface.covers(long, short)


def test_between_the_nodes_the_value_is_bilinear_and_outside_there_is_none() -> None:
    surface = drawn(spark())
    long, short = surface.long, surface.short
    assert surface.value_at(float(long[4]), float(short[7])) == surface.values[7, 4]
    assert surface.value_at(float(long[-1]), float(short[-1])) == surface.values[-1, -1]
    middle = surface.value_at(0.5 * float(long[4] + long[5]), 0.5 * float(short[7] + short[8]))
    assert middle == pytest.approx(surface.values[7:9, 4:6].mean(), rel=1e-13)
    assert np.isnan(surface.value_at(float(long[-1]) * 1.001, float(short[0])))


@pytest.mark.parametrize("position", [spark(), spark(kind="put", strike=30.0), season(), spark(strike=-20.0)])
def test_on_the_boundary_the_payoff_is_zero_and_inside_the_rectangle(position: Position) -> None:
    surface = drawn(position)
    long, short = surface.boundary
    assert long.shape == (2,)
    np.testing.assert_allclose(position.long_ratio * long - position.short_ratio * short, position.strike, atol=1e-9)
    assert all(surface.covers(*point) for point in zip(long.tolist(), short.tolist(), strict=True))


def test_a_boundary_that_passes_by_has_no_points() -> None:
    assert drawn(spark(strike=5000.0)).boundary.shape == (2, 0)
    assert drawn(spark(strike=-5000.0)).boundary.shape == (2, 0)


def test_the_rings_lie_one_and_two_deviations_of_both_log_forwards_away() -> None:
    slate = slate_of(spark())
    surface = draw_surface(slate, SurfaceRequest(0))
    root = np.sqrt(float(slate.values("years")[0]))
    rho = float(slate.values("correlation")[0])
    for count, ring in zip((1.0, 2.0), surface.rings, strict=True):
        first, second = np.log(ring[0] / 108.0) / (0.6 * root), np.log(ring[1] / 13.0) / (0.5 * root)
        # The square of the Mahalanobis distance of two correlated standard normals (textbook).
        squared = (first**2 - 2 * rho * first * second + second**2) / (1 - rho**2)
        np.testing.assert_allclose(squared, count**2, rtol=1e-9)


@pytest.mark.parametrize("changed", [{"own_vol_long": 0.0, "own_vol_short": 0.0}, {"expiry": DAY}])
def test_where_nothing_moves_there_is_no_ring(changed: dict[str, object]) -> None:
    surface = drawn(spark(**changed))
    assert surface.reason == ""
    assert surface.rings == ()


def test_a_forward_is_drawn_by_every_method_at_forwards_of_either_sign() -> None:
    agreed = spark(kind="forward", own_forward_long=-4.0, own_forward_short=0.0, strike=1.5)
    surface = drawn(agreed, method="margrabe")
    discount = np.exp(-ZERO_RATE * float(slate_of(agreed).values("years")[0]))
    difference = surface.long[np.newaxis, :] - RATIO * surface.short[:, np.newaxis] - 1.5
    np.testing.assert_allclose(surface.values, discount * difference, rtol=1e-12, atol=1e-12)
    assert surface.kind == "forward"
    np.testing.assert_allclose(drawn(agreed, "delta_short").values, -RATIO * discount)
    np.testing.assert_allclose(drawn(agreed, "theta").values, ZERO_RATE * discount * difference / 365, atol=1e-15)
    assert not drawn(agreed, "vega_long").values.any()


@pytest.mark.parametrize(
    ("position", "method", "words"),
    [
        (cap(), "kirk", "one leg"),
        (spark(expiry=None), "kirk", "The expiry is missing."),
        (spark(own_forward_long=-3.0), "kirk", "lognormal"),
        (spark(), "margrabe", "Margrabe does not cover this position. Exact for a strike of zero"),
        (spark(own_forward_long=1e306, long_ratio=1e6), "kirk", "out of the machine's reach"),
    ],
)
def test_what_cannot_be_drawn_says_why(position: Position, method: str, words: str) -> None:
    surface = drawn(position, method=method)
    assert words in surface.reason
    assert surface.values.size == 0
    assert not surface.covers(1.0, 1.0)


def test_axes_are_named_by_market_delivery_and_unit() -> None:
    assert drawn(spark()).axes == ("Ardenmoor South 2027-01, CRN/MWh", "Pellan gas point 2027-01, CRN/GJ")
    assert drawn(spark()).axis_units == ("CRN/MWh", "CRN/GJ")
    bare = spark(short_leg="", short_delivery="", own_forward_short=13.0, own_vol_short=0.5, own_correlation=0.6)
    assert drawn(bare).axes[1] == "own mark"


def test_arrays_are_read_only_finite_and_rise_along_the_axes() -> None:
    for quantity in QUANTITIES:
        surface = drawn(spark(), quantity.key)
        assert np.isfinite(surface.values).all()
        assert not surface.values.flags.writeable
        assert (np.diff(surface.long) > 0).all()
        assert (np.diff(surface.short) > 0).all()


def test_an_unknown_quantity_is_a_key_error() -> None:
    with pytest.raises(KeyError):
        quantity_of("colour")


def test_forwards_beyond_the_reach_of_the_formulas_give_a_reason() -> None:
    slate = build_slate(book_of(spark(own_forward_long=1e200, own_forward_short=1e199)), 1)
    assert "reach" in draw_surface(slate, SurfaceRequest(0)).reason
