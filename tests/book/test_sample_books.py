"""The sample books are what they claim: clean, reproducible, plausible, and explained by their guide."""

from __future__ import annotations

import datetime
import itertools
import json
import re
import runpy
from pathlib import Path
from typing import Any

import msgspec
import numpy as np
import pytest

from spreadgui.book.entries import delivery_start
from spreadgui.book.faults import BookError
from spreadgui.book.positions_csv import parse_positions
from spreadgui.book.reading import parse_book, read_book
from spreadgui.book.records import Book, Market, Position
from spreadgui.book.schema import book_schema, schema_bytes
from spreadgui.book.writing import book_bytes
from spreadgui.market.check import faults_of
from spreadgui.market.contracts import Law, ResolvedPosition, Shape, resolve
from spreadgui.market.quotes import Quotes
from spreadgui.market.time import years
from spreadgui.pricing import kirk
from spreadgui.shipped import folder, sample_book

SAMPLES = ("ardenmoor_winter", "one_spark")
GUIDE = (folder("sample_books") / "README.md").read_text(encoding="utf-8")
MISTAKE = re.compile(r"^\| `(.+?)` \| `(.+?)` \| `(.+)` \|$", re.MULTILINE)
SOUTH, GAS, ALLOWANCE = "Ardenmoor South", "Pellan gas point", "Ardenmoor allowance"
CRUDE, SPIRIT, GASOIL = "Marrowgate crude", "Marrowgate motor spirit", "Marrowgate gasoil"


@pytest.fixture(scope="module")
def demo() -> Book:
    return read_book(sample_book("ardenmoor_winter"))


# --- the files -------------------------------------------------------------------------------------------------------


def test_the_script_makes_the_committed_demo_book_to_the_byte() -> None:
    made = runpy.run_path(str(folder("sample_books") / "make_ardenmoor_winter.py"))["demo_book"]()
    assert book_bytes(made) == sample_book("ardenmoor_winter").read_bytes()


@pytest.mark.parametrize("name", SAMPLES)
def test_reading_then_writing_a_sample_changes_no_byte(name: str) -> None:
    assert book_bytes(read_book(sample_book(name))) == sample_book(name).read_bytes()


@pytest.mark.parametrize("name", SAMPLES)
def test_a_sample_has_no_fault_and_every_row_is_ready_to_price(name: str) -> None:
    book = read_book(sample_book(name))
    assert faults_of(book) == []
    assert [resolved.troubles for resolved in _resolved(book)] == [[]] * len(book.positions)


# --- the schema ------------------------------------------------------------------------------------------------------


def test_the_committed_schema_is_the_one_the_records_give() -> None:
    assert schema_bytes() == (folder("sample_books") / "book.schema.json").read_bytes()


def test_the_schema_explains_every_record_and_every_entry() -> None:
    records = book_schema()["$defs"]
    assert set(records) == {
        "Book", "Market", "Mark", "Blend", "Part", "ZeroPoint", "Correlation", "Position",
    }  # fmt: skip
    for record in records.values():
        assert record["description"]
        assert all(entry["description"].endswith(".") for entry in record["properties"].values())


@pytest.mark.parametrize("name", SAMPLES)
def test_a_sample_uses_only_the_entries_of_the_schema_and_all_it_requires(name: str) -> None:
    schema = book_schema()
    _hold_against(json.loads(sample_book(name).read_bytes()), schema, schema["$defs"])


def test_what_the_schema_requires_the_reader_requires() -> None:
    raw = json.loads(sample_book("one_spark").read_bytes())
    raw["blends"] = [{"name": "Mix", "unit": "CRN/MWh", "parts": [{"market": SOUTH, "weight": 1.0}]}]
    raw["zero_curve"] = [{"date": "2027-12-01", "rate": 0.03}]
    places = {"Book": raw, "Market": raw["markets"][0], "Mark": raw["markets"][0]["marks"][0]}
    places |= {"Correlation": raw["correlations"][0], "Position": raw["positions"][0]}
    places |= {"Blend": raw["blends"][0], "Part": raw["blends"][0]["parts"][0]}
    places |= {"ZeroPoint": raw["zero_curve"][0]}
    for name, record in book_schema()["$defs"].items():
        for key in record["required"]:
            kept = places[name].pop(key)
            with pytest.raises(BookError, match=rf"\b{key}: is missing"):
                parse_book(json.dumps(raw).encode())
            places[name][key] = kept
    assert faults_of(parse_book(json.dumps(raw).encode())) == []


def _hold_against(value: Any, schema: dict[str, Any], records: dict[str, Any]) -> None:
    for choice in schema.get("anyOf", ()) if isinstance(value, dict) else ():
        schema = choice if "$ref" in choice else schema
    if "$ref" in schema:
        schema = records[schema["$ref"].rpartition("/")[2]]
    if isinstance(value, list):
        assert schema["type"] == "array"
        for item in value:
            _hold_against(item, schema["items"], records)
    elif isinstance(value, dict):
        assert set(schema["required"]) <= value.keys() <= schema["properties"].keys()
        for key, entry in value.items():
            _hold_against(entry, schema["properties"][key], records)
    elif "enum" in schema:
        assert value in schema["enum"]
    else:
        allowed = {one.get("type") for one in schema.get("anyOf", [schema])}
        assert (
            allowed
            & {type(None): {"null"}, str: {"string"}, int: {"integer", "number"}, float: {"number"}}[type(value)]
        )


# --- the invented market ---------------------------------------------------------------------------------------------


def by_the_month(book: Book) -> list[Market]:
    """The markets that are marked for every month; the nights stand apart."""
    return [market for market in book.markets if market.dynamics != "normal"]


def test_the_demo_marks_nine_markets_for_two_years(demo: Book) -> None:
    months = [f"{year}-{month:02d}" for year in (2027, 2028) for month in range(1, 13)]
    assert len(by_the_month(demo)) == 9
    for market in by_the_month(demo):
        assert [mark.delivery for mark in market.marks] == months
        assert all(mark.forward > 0 and 0.2 < mark.volatility < 0.95 for mark in market.marks)
        assert market.tie_strength > 0
        assert market.unit.startswith(demo.currency + "/")


def test_the_nights_of_the_demo_are_normal_and_fall_below_zero(demo: Book) -> None:
    nights = [market for market in demo.markets if market.dynamics == "normal"]
    forwards = [mark.forward for market in nights for mark in market.marks]
    assert len(nights) == 2
    assert min(forwards) < 0.0 < max(forwards)
    assert all(15.0 < mark.volatility < 30.0 for market in nights for mark in market.marks)


def test_a_shift_leaves_the_absolute_moves_of_its_market_as_they_were(demo: Book) -> None:
    shifted = [market for market in demo.markets if market.shift]
    assert [market.name for market in shifted] == ["Ardenmoor North", "Quill Island"]
    for market in shifted:
        assert market.dynamics == "shifted lognormal"
        assert all(mark.volatility * (mark.forward + market.shift) < 0.95 * mark.forward for mark in market.marks)


def test_a_day_moves_more_than_its_month(demo: Book) -> None:
    daily = [mark for market in demo.markets for mark in market.marks if mark.daily_volatility is not None]
    assert len(daily) == 4 * 24 + 2 * 6
    assert all(mark.daily_volatility is not None and mark.daily_volatility > mark.volatility for mark in daily)


def test_every_pair_of_markets_is_correlated_and_the_matrix_is_positive_definite(demo: Book) -> None:
    months = msgspec.structs.replace(demo, markets=tuple(by_the_month(demo)), correlations=demo.correlations[:-1])
    matrix = _correlation_matrix(months)
    assert len(months.correlations) == 36
    assert demo.correlations[-1].first.endswith(" nights")
    assert not np.isnan(matrix).any()
    assert np.linalg.eigvalsh(matrix).min() > 0.05


def test_a_near_delivery_is_more_volatile_than_the_same_month_a_year_on(demo: Book) -> None:
    for market in by_the_month(demo):
        first, second = market.marks[:12], market.marks[12:]
        assert all(near.volatility > far.volatility for near, far in zip(first, second, strict=True))


def test_the_curves_have_the_shapes_their_markets_are_known_for(demo: Book) -> None:
    curves = {market.name: np.array([mark.forward for mark in market.marks]) for market in demo.markets}
    winter, spring, summer = [0, 1, 11], [3, 4], [5, 6, 7]
    for name in ("Ardenmoor North", SOUTH, "Quill Island", GAS):
        assert curves[name][winter].min() > curves[name][summer].max()
    gap = curves[SOUTH] - curves["Ardenmoor North"]
    assert gap.min() > 0
    assert gap[spring].min() > 2 * gap[winter].max()
    assert np.ptp(curves["Storrow coal"]) < 0.06 * curves["Storrow coal"].mean()
    assert (np.diff(curves[ALLOWANCE]) > 0).all()
    assert (np.diff(curves[CRUDE]) < 0).all()
    assert (curves[SPIRIT] - curves[CRUDE])[summer].min() > (curves[SPIRIT] - curves[CRUDE])[winter].max()
    assert (curves[GASOIL] - curves[CRUDE])[winter].min() > (curves[GASOIL] - curves[CRUDE])[summer].max()


# --- the positions ---------------------------------------------------------------------------------------------------


def test_the_demo_shows_every_kind_of_position(demo: Book) -> None:
    positions = demo.positions
    options = [position for position in positions if position.kind != "forward"]
    shapes = [resolved.shape for resolved in _resolved(demo)]
    assert {position.kind for position in positions} == {"call", "put", "forward"}
    assert {position.side for position in positions} == {"long", "short"}
    assert {position.kind for position in options if position.strike < 0} == {"call", "put"}
    assert shapes.count(Shape.LONG_LEG_ONLY) >= 3
    assert any(position.long_leg == position.short_leg != "" for position in positions)
    assert any(position.long_leg and position.short_leg and _own_marks(position) for position in positions)
    blends = {blend.name for blend in demo.blends}
    assert any(position.long_leg in blends for position in positions)
    assert any(position.short_leg in blends for position in positions)
    assert {position.exercise for position in positions} == {"once", "business days", "all days"}
    assert sum(position.quoted_premium is not None for position in positions) >= 3
    assert {resolved.law for resolved in _resolved(demo)} == set(Law)


def test_the_names_of_the_demo_are_short_and_different(demo: Book) -> None:
    names = [position.name for position in demo.positions]
    assert len(set(names)) == len(names)
    assert max(map(len, names)) <= 26


def test_every_option_of_the_demo_expires_on_a_weekday_shortly_before_its_first_delivery(demo: Book) -> None:
    once = [position for position in demo.positions if position.exercise == "once"]
    assert len(once) >= 50
    for position in once:
        assert position.expiry is not None
        deliveries = [month for month in (position.long_delivery, position.short_delivery) if month]
        before = delivery_start(min(deliveries)) - position.expiry
        assert position.expiry > demo.valuation_date
        assert position.expiry.weekday() < 5
        assert datetime.timedelta(days=3) <= before <= datetime.timedelta(days=8)


def test_the_spread_options_of_the_demo_lie_on_both_sides_of_the_money_at_sensible_values(demo: Book) -> None:
    moneyness = []
    for position, inputs in zip(demo.positions, _resolved(demo), strict=True):
        lognormal = position.exercise == "once" and inputs.law is Law.LOGNORMAL
        if position.kind == "forward" or inputs.shape is not Shape.SPREAD or not lognormal:
            continue
        long, short = position.long_ratio * inputs.forward_long, position.short_ratio * inputs.forward_short
        marks = inputs.vol_long, inputs.vol_short, inputs.correlation, inputs.years, inputs.discount
        value = float(kirk.value(long, short, position.strike, *marks, kind=position.kind))
        assert 0.1 < value < 60.0, position.name
        moneyness.append((long - short - position.strike) * (1.0 if position.kind == "call" else -1.0))
    assert sum(amount > 0 for amount in moneyness) >= 10
    assert sum(amount < 0 for amount in moneyness) >= 10


CLEAN = {"Quay 3": {GAS: 7.1, ALLOWANCE: 0.398}, "Loomgate": {GAS: 9.4, ALLOWANCE: 0.527}}
THREE_TWO_ONE = {SPIRIT: 2 / 3, GASOIL: 1 / 3}


def test_a_blend_of_the_demo_has_the_moments_of_the_mix(demo: Book) -> None:
    """Against the moments of the true mix, summed over a Gauss-Hermite grid of the three forwards at the expiry."""
    mixed = [position for position in demo.positions if " clean " in position.name or "3:2:1" in position.name]
    assert len(mixed) == 5
    for position, inputs in zip(demo.positions, _resolved(demo), strict=True):
        if position not in mixed:
            continue
        time = years(demo.valuation_date, position.expiry) if position.expiry else 0.0
        if position.short_leg != CRUDE:
            mix, other, delivery = CLEAN[position.name.partition(" clean")[0]], SOUTH, position.long_delivery
            marks = inputs.forward_short, inputs.vol_short
        else:
            mix, other, delivery = THREE_TWO_ONE, CRUDE, position.short_delivery
            marks = inputs.forward_long, inputs.vol_long
        ends, weights = _ends(demo, [*mix, other], delivery, time)
        total = sum(weight * end for weight, end in zip(mix.values(), ends[:2], strict=True))
        mean, other_vol = weights @ total, Quotes.of(demo).mark(other, delivery).volatility
        variance = np.log(weights @ total**2 / mean**2) / time
        covariance = np.log(weights @ (total * ends[2]) / (mean * (weights @ ends[2]))) / time
        assert marks == pytest.approx((mean, np.sqrt(variance)), rel=1e-7)
        assert inputs.correlation == pytest.approx(covariance / np.sqrt(variance) / other_vol, rel=1e-7)


def _ends(book: Book, markets: list[str], delivery: str, time: float) -> tuple[np.ndarray, np.ndarray]:
    """The forwards of three markets at `time` on a grid of outcomes, shape (3, outcomes), and the outcomes' weights."""
    nodes, node_weights = np.polynomial.hermite_e.hermegauss(20)
    normals = np.array(list(itertools.product(nodes, repeat=3))).T
    weights = np.array([np.prod(three) for three in itertools.product(node_weights, repeat=3)])
    names = [market.name for market in book.markets]
    chosen = [names.index(name) for name in markets]
    tied = np.linalg.cholesky(_correlation_matrix(book)[np.ix_(chosen, chosen)]) @ normals
    quotes = [Quotes.of(book).mark(name, delivery) for name in markets]
    forwards = np.array([[mark.forward] for mark in quotes])
    deviations = np.array([[mark.volatility * np.sqrt(time)] for mark in quotes])
    return forwards * np.exp(deviations * tied - 0.5 * deviations**2), weights / weights.sum()


def _correlation_matrix(book: Book) -> np.ndarray:
    names = [market.name for market in book.markets]
    matrix = np.full((len(names), len(names)), np.nan)
    np.fill_diagonal(matrix, 1.0)
    for pair in book.correlations:
        row, column = names.index(pair.first), names.index(pair.second)
        matrix[row, column] = matrix[column, row] = pair.correlation
    return matrix


def _resolved(book: Book) -> list[ResolvedPosition]:
    quotes = Quotes.of(book)
    return [resolve(position, quotes, book.valuation_date, book.zero_rate) for position in book.positions]


def _own_marks(position: Position) -> bool:
    own = (position.own_forward_long, position.own_forward_short, position.own_vol_long, position.own_vol_short)
    return any(mark is not None for mark in (*own, position.own_correlation))


# --- the guide -------------------------------------------------------------------------------------------------------


def test_the_guide_tells_of_every_entry_of_the_format() -> None:
    entries = {key for record in book_schema()["$defs"].values() for key in record["properties"]}
    assert not {key for key in entries if f"`{key}`" not in GUIDE}


def test_the_guide_tells_of_every_file_beside_it() -> None:
    files = {path.name for path in Path(folder("sample_books")).iterdir() if path.is_file()}
    assert not {name for name in files - {"README.md"} if f"`{name}`" not in GUIDE}


def _mistakes(heading: str) -> list[tuple[str, ...]]:
    before, _, after = GUIDE.partition("## Common mistakes")[2].partition("And in the first line")
    return MISTAKE.findall(before if heading == "book" else after)


def _faults_of_file(data: bytes) -> list[str]:
    try:
        return [str(fault) for fault in faults_of(parse_book(data))]
    except BookError as error:
        return [str(fault) for fault in error.faults]


@pytest.mark.parametrize(("right", "wrong", "message"), _mistakes("book"))
def test_a_mistake_in_a_book_gets_the_message_of_the_guide(right: str, wrong: str, message: str) -> None:
    text = sample_book("one_spark").read_text(encoding="utf-8")
    assert right in text
    assert message in _faults_of_file(text.replace(right, wrong, 1).encode())


@pytest.mark.parametrize(("right", "wrong", "message"), _mistakes("csv"))
def test_a_mistake_in_a_csv_gets_the_message_of_the_guide(right: str, wrong: str, message: str) -> None:
    text = _csv_of_the_guide()
    assert right in text
    with pytest.raises(BookError) as caught:
        parse_positions(text.replace(right, wrong, 1).encode())
    assert message in [str(fault) for fault in caught.value.faults]


def test_the_guide_holds_a_table_of_mistakes_for_both_forms() -> None:
    assert len(_mistakes("book")) >= 15
    assert len(_mistakes("csv")) >= 5


def test_the_csv_of_the_guide_reads_and_its_rows_price_in_the_demo(demo: Book) -> None:
    positions = parse_positions(_csv_of_the_guide().encode())
    quotes = Quotes.of(demo)
    assert [position.quantity for position in positions] == [282720.0, 223200.0, 186000.0]
    for position in positions:
        assert resolve(position, quotes, demo.valuation_date, demo.zero_rate).troubles == []


def _csv_of_the_guide() -> str:
    return GUIDE.partition("```csv\n")[2].partition("```")[0]
