"""What a quoted premium implies: round trips over the hard box, honest error bars, and the right word where there is
no answer. The formulas being inverted are checked elsewhere; nothing here needs a figure from outside."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.pricing import bachelier, bjerksund_stensland, implied, kirk, margrabe, yardstick
from spreadgui.pricing.implied import Status

MARKET = {
    "forward_long": 100.0,
    "forward_short": 96.0,
    "strike": 2.0,
    "vol_long": 0.3,
    "vol_short": 0.25,
    "expiry": 1.0,
}


def hard_box(count: int, seed: int = 5) -> dict[str, np.ndarray]:
    """Correlation -0.9999..0.9999, deviations 0.005..2.5, strikes from -2 to 2 short forwards."""
    draw = np.random.default_rng(seed)
    expiry = draw.uniform(0.02, 3.0, count)
    first, second = np.exp(draw.uniform(np.log(0.005), np.log(2.5), (2, count)))
    short = draw.uniform(20.0, 200.0, count)
    return {
        "forward_long": short * np.exp(draw.normal(0.0, 0.4, count)), "forward_short": short,
        "strike": short * draw.uniform(-2.0, 2.0, count), "vol_long": first / np.sqrt(expiry),
        "vol_short": second / np.sqrt(expiry), "expiry": expiry, "discount": draw.uniform(0.8, 1.0, count),
    }  # fmt: skip


def true_correlations(count: int, seed: int = 6) -> np.ndarray:
    return np.tanh(np.random.default_rng(seed).uniform(-4.95, 4.95, count))


@pytest.mark.parametrize("kind", ["call", "put"])
def test_a_premium_of_the_yardstick_gives_its_correlation_back_within_the_stated_bar(kind: str) -> None:
    market, true = hard_box(4000), true_correlations(4000)
    premium = yardstick.value(**market, correlation=true, kind=kind)
    found = implied.correlation_with_error(premium, **market, kind=kind)
    solved = found.status == Status.SOLVED
    assert solved.mean() > 0.4
    assert (np.abs(found.correlation - true)[solved] <= found.error_bar[solved] + 1e-12).all()
    assert np.isfinite(found.correlation[solved]).all()
    # A premium made by the formula is beyond its own floor or ceiling by rounding at most, and then not identified.
    assert set(found.status.tolist()) <= {"solved", "not identified"}


def test_five_evaluations_a_quote_are_more_than_enough_on_average() -> None:
    market, true = hard_box(4000), true_correlations(4000)
    found = implied.correlation_with_error(yardstick.value(**market, correlation=true), **market)
    assert found.evaluations.mean() <= 5.0


@pytest.mark.parametrize("tick", [0.01, 0.001])
def test_a_premium_rounded_to_ticks_gives_a_bar_that_covers_the_truth_but_for_one_in_a_hundred(tick: float) -> None:
    market, true = hard_box(3000), true_correlations(3000)
    exact = yardstick.value(**market, correlation=true)
    found = implied.correlation_with_error(np.round(exact / tick) * tick, **market, tolerance=tick / 2)
    solved = found.status == Status.SOLVED
    assert solved.sum() > 500
    covered = np.abs(found.correlation - true)[solved] <= found.error_bar[solved] * (1 + 1e-6) + 1e-12
    assert covered.mean() > 0.99


@pytest.mark.parametrize("method", ["kirk", "bjerksund_stensland", "bachelier", "margrabe"])
def test_every_method_inverts_its_own_value(method: str) -> None:
    module = {
        "kirk": kirk, "bjerksund_stensland": bjerksund_stensland, "bachelier": bachelier, "margrabe": margrabe
    }[method]  # fmt: skip
    market = dict(MARKET)
    if method == "bachelier":
        market |= {"vol_long": 30.0, "vol_short": 24.0, "forward_long": 60.0}
    if method == "margrabe":
        market["strike"] = 0.0
    true = np.linspace(-0.95, 0.95, 39)
    found, status = implied.correlation(module.value(**market, correlation=true), **market, method=method)
    assert set(status.tolist()) == {"solved"}
    np.testing.assert_allclose(found, true, atol=1e-9)


def test_a_quote_out_of_reach_says_on_which_side_and_has_no_correlation() -> None:
    floor, ceiling = (float(yardstick.value(**MARKET, correlation=end)) for end in (1.0, -1.0))
    found, status = implied.correlation([floor - 0.5, ceiling + 0.5, -3.0], **MARKET)
    assert status.tolist() == ["below floor", "above ceiling", "below floor"]
    assert np.isnan(found).all()


@pytest.mark.parametrize(
    "changed",
    [{"expiry": 0.0}, {"vol_long": 0.0}, {"vol_short": 0.0}, {"discount": 0.0}],
    ids=lambda one: next(iter(one)),
)
def test_where_correlation_has_no_say_it_is_not_identified(changed: dict[str, float]) -> None:
    found, status = implied.correlation(5.0, **(MARKET | changed))
    assert str(status) == "not identified"
    assert np.isnan(found)


def test_a_forward_does_not_identify_a_correlation() -> None:
    assert str(implied.correlation(2.0, **MARKET, kind="forward")[1]) == "not identified"


def test_deep_in_the_money_a_premium_that_is_all_intrinsic_is_not_identified() -> None:
    deep = MARKET | {"forward_long": 5000.0, "vol_long": 0.05, "vol_short": 0.05}
    premium = yardstick.value(**deep, correlation=0.3)
    assert str(implied.correlation(premium, **deep)[1]) == "not identified"


@settings(deadline=None, max_examples=60)
@given(st.floats(-0.999, 0.999), st.floats(-0.999, 0.999))
def test_a_dearer_quote_implies_a_lower_correlation(first: float, second: float) -> None:
    low, high = sorted((first, second))
    premiums = yardstick.value(**MARKET, correlation=[low, high])
    found, _ = implied.correlation(premiums, **MARKET)
    assert found[0] <= found[1] + 1e-9


@pytest.mark.parametrize(
    ("changed", "named"),
    [
        ({"premium": np.nan}, "premium"), ({"premium": np.inf}, "premium"), ({"forward_long": -1.0}, "forward_long"),
        ({"vol_short": -0.1}, "vol_short"), ({"expiry": -1.0}, "expiry"), ({"strike": np.nan}, "strike"),
        ({"premium": [1.0, 2.0], "strike": [1.0, 2.0, 3.0]}, "broadcast"),
    ],
)  # fmt: skip
def test_bad_inputs_are_refused_by_name(changed: dict[str, object], named: str) -> None:
    with pytest.raises(ValueError, match=named):
        implied.correlation(**({"premium": 8.0} | MARKET | changed))


@pytest.mark.parametrize(("argument", "value"), [("method", "sorcery"), ("kind", "straddle")])
def test_unknown_methods_and_kinds_are_refused_by_name(argument: str, value: str) -> None:
    with pytest.raises(ValueError, match=argument):
        implied.correlation(8.0, **MARKET, **{argument: value})


def test_margrabe_is_inverted_for_a_strike_of_zero_only() -> None:
    with pytest.raises(ValueError, match="strike"):
        implied.correlation(8.0, **MARKET, method="margrabe")


def test_shapes_broadcast_and_empty_ones_stay_empty() -> None:
    grid, status = implied.correlation([[8.0], [9.0]], **(MARKET | {"strike": [1.0, 2.0, 3.0]}))
    assert grid.shape == status.shape == (2, 3)
    assert implied.correlation([], **MARKET)[0].shape == (0,)


@pytest.mark.parametrize("kind", ["call", "put", "forward"])
@pytest.mark.parametrize("tolerance", [None, 0.0, 0.01, 1e60])
@pytest.mark.parametrize("method", [*implied.METHODS, None])
def test_whatever_is_taken_has_a_status_that_holds_and_gives_no_warning(
    method: str | None, tolerance: float | None, kind: str
) -> None:
    """The far ends of every range, thrown together, and one quote like any other as the last: NumPy's warnings are
    errors in this suite. None stands for the spread volatility."""
    draw = np.random.default_rng(11)

    def some(*ends: float, last: float) -> np.ndarray:
        return np.append(draw.choice(ends, 1500), last)

    premiums = some(-1e60, -5.0, 0.0, 1e-300, 1e-9, 5.0, 1e60, last=8.0)
    amounts = [some(1e-60, 1e-9, 100.0, 1e60, last=last) for last in (100.0, 96.0)]
    strikes = some(-1e60, -100.0, 0.0, 50.0, 1e60, last=0.0) * (method != "margrabe")
    unit = 100.0 if method == "bachelier" else 1.0
    vols = [unit * some(0.0, 1e-300, 1e-9, 0.3, 5.0, 1e6, last=last) for last in (0.3, 0.25)]
    times = [some(0.0, 1e-300, 1.0, 1e6, last=1.0) for _ in range(2)]
    if method is None:
        found = implied.spread_volatility_with_error(
            premiums, *amounts, strikes, *times, kind=kind, tolerance=tolerance
        )
    else:
        found = implied.correlation_with_error(
            premiums, *amounts, strikes, *vols, *times, kind=kind, tolerance=tolerance, method=method
        )
    solved = found.status == Status.SOLVED
    assert solved[-1] or kind == "forward" or tolerance == 1e60
    assert np.isfinite(found[0][solved]).all()
    assert np.isfinite(found.error_bar[solved]).all()
    assert np.isnan(found[0][np.isin(found.status, [Status.BELOW_FLOOR, Status.ABOVE_CEILING])]).all()
    assert not np.isinf(found[0]).any()
    assert not np.isnan(found.error_bar[found.status == Status.NOT_IDENTIFIED]).any()


@settings(deadline=None, max_examples=80)
@given(
    st.floats(-50, 150), st.floats(-50, 150), st.floats(-60, 60), st.floats(1.0, 80.0), st.floats(0.05, 3.0),
    st.sampled_from(["call", "put"]),
)  # fmt: skip
def test_a_spread_volatility_gives_its_premium_back(
    long: float, short: float, strike: float, vol: float, expiry: float, kind: str
) -> None:
    """The spread as one normal quantity: Bachelier with all the volatility in one leg."""
    premium = float(bachelier.value(long, short, strike, vol, 0.0, 0.0, expiry, kind=kind))
    found, status = implied.spread_volatility(premium, long, short, strike, expiry, kind=kind)
    if str(status) == "solved":
        again = float(bachelier.value(long, short, strike, float(found), 0.0, 0.0, expiry, kind=kind))
        assert again == pytest.approx(premium, rel=1e-10, abs=1e-9)
    else:
        assert str(status) == "not identified"


def test_a_premium_below_intrinsic_implies_no_spread_volatility() -> None:
    found, status = implied.spread_volatility(1.0, 100.0, 90.0, 2.0, 1.0)
    assert (str(status), np.isnan(found)) == ("below floor", True)
