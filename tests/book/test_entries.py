"""Every kind of entry: what it takes, what it refuses and in which words, and that its text reads back."""

from __future__ import annotations

import datetime
import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from spreadgui.book import entries
from spreadgui.book.entries import Entry, EntryError, quoted
from spreadgui.book.fields import BY_KEY, FIELDS
from spreadgui.book.records import Position

PATIENT = settings(deadline=None, max_examples=60)

NUMERIC = {
    "number": entries.NUMBER,
    "optional number": entries.OPTIONAL_NUMBER,
    "zero number": entries.ZERO_NUMBER,
    "ratio": entries.RATIO,
    "quantity": entries.QUANTITY,
    "volatility": entries.VOLATILITY,
    "correlation": entries.CORRELATION,
}
EVERY = {
    **NUMERIC,
    "words": entries.WORDS,
    "date": entries.DATE,
    "delivery": entries.DELIVERY,
    "choice": entries.choice("long", "short"),
}

finite = st.floats(allow_nan=False, allow_infinity=False)
VALUES = [
    pytest.param(entries.NUMBER, finite, id="number"),
    pytest.param(entries.OPTIONAL_NUMBER, finite | st.none(), id="optional number"),
    pytest.param(entries.ZERO_NUMBER, finite, id="zero number"),
    pytest.param(entries.RATIO, st.floats(min_value=0.0, exclude_min=True, allow_infinity=False), id="ratio"),
    pytest.param(entries.QUANTITY, st.floats(min_value=0.0, allow_infinity=False) | st.none(), id="quantity"),
    pytest.param(entries.VOLATILITY, st.floats(min_value=0.0, allow_infinity=False) | st.none(), id="volatility"),
    pytest.param(entries.CORRELATION, st.floats(-1.0, 1.0) | st.none(), id="correlation"),
    pytest.param(entries.DATE, st.dates() | st.none(), id="date"),
    pytest.param(
        entries.DELIVERY,
        st.dates().map(lambda day: day.isoformat()[:7]) | st.just(""),
        id="delivery",
    ),
    pytest.param(entries.WORDS, st.text().map(str.strip), id="words"),
    pytest.param(entries.choice("call", "put"), st.sampled_from(["call", "put"]), id="choice"),
]


@pytest.mark.parametrize(("entry", "values"), VALUES)
def test_the_text_of_a_value_reads_back_as_that_value_to_the_last_digit(
    entry: Entry, values: st.SearchStrategy[entries.Value]
) -> None:
    @PATIENT
    @given(values)
    def holds(value: entries.Value) -> None:
        assert entry.read(entry.text(value)) == value

    holds()


def test_the_default_of_every_optional_field_reads_back_from_its_text() -> None:
    for field in FIELDS:
        if not field.needed:
            default = getattr(Position(), field.key)
            assert field.entry.read(field.entry.text(default)) == default, field.key


def test_the_fields_are_those_of_a_position_in_the_same_order() -> None:
    assert tuple(field.key for field in FIELDS) == Position.__struct_fields__
    assert list(BY_KEY) == list(Position.__struct_fields__)


def test_the_choices_offered_are_the_ones_a_position_holds() -> None:
    assert BY_KEY["side"].entry.choices == ("long", "short")
    assert BY_KEY["kind"].entry.choices == ("call", "put", "forward")


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("0", 0.0),
        ("-0", 0.0),
        ("+5", 5.0),
        ("  5\t", 5.0),
        ("5.", 5.0),
        (".5", 0.5),
        ("-.5", -0.5),
        ("1e3", 1000.0),
        ("1E-3", 0.001),
        ("−12.5", -12.5),
        ("1e−3", 0.001),
        ("1 250.5", 1250.5),
        ("-1 250 000", -1250000.0),
        ("−1\u00a0250.5", -1250.5),
        ("1\u2009250\u2009000", 1250000.0),
        ("12\u202f345.", 12345.0),
        ("000 001", 1.0),
        ("1.7976931348623157e308", 1.7976931348623157e308),
        ("5e-324", 5e-324),
        ("0" * 5000 + "7", 7.0),
    ],
)
def test_a_number_is_taken_with_either_minus_and_with_grouped_digits(text: str, value: float) -> None:
    assert entries.NUMBER.read(text) == value


NO_NUMBERS = [
    "12,5x",
    "",
    " ",
    ".",
    "-",
    "+-5",
    "--5",
    "- 5",
    "5-",
    "1,250",
    "1,5",
    "1'250",
    "1_000",
    "0x10",
    "0b1",
    "1e",
    "e5",
    "1e5.0",
    "1e99999",
    "1.2.3",
    "12 50",
    "1 2500",
    "1250 000",
    "1  250",
    "1 250e3",
    "1.250 500",
    "nan",
    "NaN",
    "-nan",
    "inf",
    "Infinity",
    "−inf",
    "１２",
    "٣",
    "५",
    "²",
    "½",
    "5\n6",
    "5\x00",
    "5%",
    "CRN 5",
    "(5)",
    "=5",
    "True",
    "None",
    "1j",
    "1d3",
    "－5",
    "5\N{ZERO WIDTH SPACE}",
]


@pytest.mark.parametrize("text", NO_NUMBERS)
def test_what_is_no_plain_number_is_refused_in_one_exact_sentence(text: str) -> None:
    with pytest.raises(EntryError) as caught:
        entries.NUMBER.read(text)
    assert str(caught.value) == f"expected a number, got {quoted(text)}"


def test_the_sentence_quotes_what_was_typed() -> None:
    with pytest.raises(EntryError) as caught:
        entries.NUMBER.read("12,5x")
    assert str(caught.value) == 'expected a number, got "12,5x"'


@pytest.mark.parametrize("text", ["1e999", "-1e999", "9" * 400, "1 " + "000 " * 120 + "000"])
def test_a_number_past_the_machine_is_refused_and_never_becomes_infinite(text: str) -> None:
    with pytest.raises(EntryError, match=r"^expected a number within reach of the machine, got "):
        entries.NUMBER.read(text)


@pytest.mark.parametrize("text", ["9" * 200_000 + "x", "9" * 200_000 + ".4.2", "1" + " 000" * 50_000 + ".5.5"])
def test_a_cell_of_very_many_digits_is_refused_without_trying_every_way_to_cut_it(text: str) -> None:
    # Tried pair by pair, these cuts took eleven minutes; nothing measures the time here but whoever waits for it.
    with pytest.raises(EntryError, match="expected a number, got"):
        entries.NUMBER.read(text)


@pytest.mark.parametrize("name", NUMERIC)
@pytest.mark.parametrize("text", ["nan", "inf", "-inf", "1e999", "12,5x", "1_0", "１", "0x1"])
def test_no_numeric_entry_takes_a_number_that_is_none(name: str, text: str) -> None:
    with pytest.raises(EntryError, match=f'got "{text}"$'):
        NUMERIC[name].read(text)


@pytest.mark.parametrize("name", EVERY)
@given(text=st.text())
@PATIENT
def test_any_text_is_read_or_refused_with_a_sentence(name: str, text: str) -> None:
    value: entries.Value = None
    sentence = "expected nothing else"
    try:
        value = EVERY[name].read(text)
    except EntryError as error:
        sentence = str(error)
    assert sentence.startswith("expected ")
    assert sentence.isprintable()  # so of one line
    assert not isinstance(value, float) or math.isfinite(value)


@pytest.mark.parametrize(
    ("entry", "text", "sentence"),
    [
        (entries.RATIO, "0", 'expected a ratio above zero, got "0"'),
        (entries.RATIO, "-1", 'expected a ratio above zero, got "-1"'),
        (entries.QUANTITY, "−5", 'expected a quantity of zero or more (the side says long or short), got "−5"'),
        (entries.VOLATILITY, "-0.1", 'expected a volatility of zero or more, got "-0.1"'),
        (entries.CORRELATION, "1.01", 'expected a correlation from −1 to 1, got "1.01"'),
        (entries.CORRELATION, "-1.0000001", 'expected a correlation from −1 to 1, got "-1.0000001"'),
        (entries.choice("long", "short"), "buy", 'expected one of long, short, got "buy"'),
        (entries.choice("long", "short"), "", 'expected one of long, short, got ""'),
        (entries.DATE, "15.1.2027", 'expected a day written as 2027-01-15, got "15.1.2027"'),
        (entries.DELIVERY, "Jan 27", 'expected a delivery month written as 2027-01, got "Jan 27"'),
    ],
)
def test_a_value_outside_its_bounds_is_refused_with_its_own_sentence(entry: Entry, text: str, sentence: str) -> None:
    with pytest.raises(EntryError) as caught:
        entry.read(text)
    assert str(caught.value) == sentence


@pytest.mark.parametrize(
    ("entry", "text", "value"),
    [
        (entries.RATIO, "5e-324", 5e-324),
        (entries.QUANTITY, "0", 0.0),
        (entries.VOLATILITY, "0", 0.0),
        (entries.CORRELATION, "-1", -1.0),
        (entries.CORRELATION, "1", 1.0),
        (entries.choice("long", "short"), " LONG ", "long"),
        (entries.DATE, " 2028-02-29 ", datetime.date(2028, 2, 29)),
        (entries.DATE, "0001-01-01", datetime.date.min),
        (entries.DATE, "9999-12-31", datetime.date.max),
        (entries.DELIVERY, " 2027-12 ", "2027-12"),
    ],
)
def test_a_value_on_its_bound_is_taken(entry: Entry, text: str, value: entries.Value) -> None:
    assert entry.read(text) == value


@pytest.mark.parametrize(
    ("entry", "empty"),
    [
        (entries.WORDS, ""),
        (entries.OPTIONAL_NUMBER, None),
        (entries.ZERO_NUMBER, 0.0),
        (entries.RATIO, 1.0),
        (entries.QUANTITY, None),
        (entries.VOLATILITY, None),
        (entries.CORRELATION, None),
        (entries.DATE, None),
        (entries.DELIVERY, ""),
    ],
)
@pytest.mark.parametrize("text", ["", " ", "\t\u00a0"])
def test_an_emptied_cell_has_the_value_the_field_starts_with(entry: Entry, empty: entries.Value, text: str) -> None:
    assert entry.read(text) == empty


@pytest.mark.parametrize(
    "text",
    [
        "2027-02-30",
        "2027-02-29",
        "2027-13-01",
        "2027-00-10",
        "2027-01-00",
        "0000-01-01",
        "20270115",
        "2027-1-5",
        "27-01-15",
        "2027/01/15",
        "2027-01-15T00:00",
        "2027-W01-1",
        "2027-015",
        "２０２７-01-15",
        "-027-01-15",
        "2027-01-1५",
        "10000-01-01",
        "2027-01-15 ,",
        "2027−01−15",
    ],
)
def test_a_day_that_is_not_in_the_calendar_or_written_otherwise_is_refused(text: str) -> None:
    with pytest.raises(EntryError) as caught:
        entries.DATE.read(text)
    assert str(caught.value) == f'expected a day written as 2027-01-15, got "{text}"'


@pytest.mark.parametrize(
    "text", ["2027-13", "2027-00", "0000-01", "2027-1", "2027", "202701", "２０２７-01", "2027-01-01"]
)
def test_a_month_that_is_not_in_the_calendar_or_written_otherwise_is_refused(text: str) -> None:
    assert not entries.is_delivery(text)
    with pytest.raises(EntryError) as caught:
        entries.DELIVERY.read(text)
    assert str(caught.value) == f'expected a delivery month written as 2027-01, got "{text}"'


@PATIENT
@given(st.dates())
def test_every_month_of_the_calendar_is_a_delivery_that_starts_on_its_first_day(day: datetime.date) -> None:
    month = day.isoformat()[:7]
    assert entries.is_delivery(month)
    assert entries.delivery_start(month) == day.replace(day=1)


def test_words_lose_the_blanks_around_them_and_keep_those_within() -> None:
    assert entries.WORDS.read("  North  spark \n") == "North  spark"


@pytest.mark.parametrize("text", ["\ud800", "a\udfffb", "North \ud83d"])
def test_half_a_character_pair_is_refused_because_no_file_could_hold_it(text: str) -> None:
    with pytest.raises(EntryError, match=r"^expected whole characters, got "):
        entries.WORDS.read(text)


def test_a_message_stays_short_and_printable_whatever_was_pasted() -> None:
    assert quoted("x" * 60) == '"' + "x" * 60 + '"'
    assert quoted("x" * 61) == '"' + "x" * 60 + '…"'
    assert (
        quoted("a\nb\x1b[2J\ud800")
        == '"a\N{REPLACEMENT CHARACTER}b\N{REPLACEMENT CHARACTER}[2J\N{REPLACEMENT CHARACTER}"'
    )
    with pytest.raises(EntryError) as caught:
        entries.NUMBER.read("z" * 1_000_000)
    assert len(str(caught.value)) < 100


@pytest.mark.parametrize(
    ("value", "text"),
    [(1250.5, "1250.5"), (1250.0, "1250"), (-0.0, "0"), (1e15, "1000000000000000.0"), (1e300, "1e+300"), (None, "")],
)
def test_a_whole_number_is_written_without_a_point(value: float | None, text: str) -> None:
    assert entries.OPTIONAL_NUMBER.text(value) == text
