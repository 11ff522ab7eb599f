"""A wrong book file: every fault is named with its place, in whole sentences, and nothing but BookError comes out."""

from __future__ import annotations

import codecs
import contextlib
import copy
import json
import os
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from spreadgui import shipped
from spreadgui.book import reading
from spreadgui.book.faults import BookError, Fault
from spreadgui.book.reading import MOST_FAULTS, parse_book, read_book
from spreadgui.book.records import VERSION, Book

NOBODY = 65534  # the number that unprivileged users have by custom; any number above zero would do

GOOD: dict[str, Any] = {
    "format": "spreadgui book",
    "version": 1,
    "title": "Winter",
    "currency": "CRN",
    "valuation_date": "2026-12-01",
    "zero_rate": 0.03,
    "markets": [
        {
            "name": "North",
            "unit": "CRN/MWh",
            "marks": [{"delivery": "2027-01", "forward": 80.0, "volatility": 0.5}],
        }
    ],
    "correlations": [{"first": "North", "second": "Gas", "correlation": 0.5}],
    "positions": [{"name": f"p{row}", "quantity": 1.0, "strike": 2} for row in range(5)],
}
DIGITS_PYTHON_REFUSES = 5000


def with_entry(path: list[str | int], value: object) -> bytes:
    """The good book with the entry at `path` set to `value`."""
    raw = copy.deepcopy(GOOD)
    place: Any = raw
    for step in path[:-1]:
        place = place[step]
    place[path[-1]] = value
    return json.dumps(raw).encode()


def without_entry(path: list[str | int]) -> bytes:
    raw = copy.deepcopy(GOOD)
    place: Any = raw
    for step in path[:-1]:
        place = place[step]
    del place[path[-1]]
    return json.dumps(raw).encode()


def faults_of(data: bytes) -> list[str]:
    with pytest.raises(BookError) as caught:
        parse_book(data)
    return [str(fault) for fault in caught.value.faults]


def faults_of_file(path: Path) -> list[str]:
    with pytest.raises(BookError) as caught:
        read_book(path)
    return [str(fault) for fault in caught.value.faults]


def test_the_good_book_of_these_tests_opens() -> None:
    book = parse_book(json.dumps(GOOD).encode())
    assert book.positions[3].strike == 2.0
    assert isinstance(book.positions[3].strike, float)


def test_many_faults_are_told_at_once_each_with_its_place() -> None:
    raw = copy.deepcopy(GOOD)
    raw["valuation_date"] = "2027-02-30"
    raw["markets"][0]["marks"][0]["forward"] = None
    del raw["markets"][0]["unit"]
    raw["correlations"][0]["correlation"] = "0.5"
    raw["positions"][3]["strike"] = "12,5x"
    raw["positions"][3]["side"] = "buy"
    raw["positions"][4]["colour"] = "red"
    raw["extra"] = 1
    assert faults_of(json.dumps(raw).encode()) == [
        'valuation_date: expected a day written as "2027-01-15", got "2027-02-30"',
        "markets[0].unit: is missing",
        "markets[0].marks[0].forward: expected a number, got null",
        'correlations[0].correlation: expected a number, got "0.5"',
        'positions[3].side: expected one of "long", "short", got "buy"',
        'positions[3].strike: expected a number, got "12,5x"',
        "positions[4].colour: is not an entry that this file has",
        "extra: is not an entry that this file has",
    ]


@pytest.mark.parametrize(
    ("path", "place"),
    [
        (["title"], "title"),
        (["currency"], "currency"),
        (["valuation_date"], "valuation_date"),
        (["markets", 0, "name"], "markets[0].name"),
        (["markets", 0, "unit"], "markets[0].unit"),
        (["markets", 0, "marks", 0, "delivery"], "markets[0].marks[0].delivery"),
        (["markets", 0, "marks", 0, "forward"], "markets[0].marks[0].forward"),
        (["markets", 0, "marks", 0, "volatility"], "markets[0].marks[0].volatility"),
        (["correlations", 0, "first"], "correlations[0].first"),
        (["correlations", 0, "second"], "correlations[0].second"),
        (["correlations", 0, "correlation"], "correlations[0].correlation"),
    ],
)
def test_a_needed_entry_that_is_absent_is_named(path: list[str | int], place: str) -> None:
    assert faults_of(without_entry(path)) == [f"{place}: is missing"]


@pytest.mark.parametrize(
    ("path", "place"),
    [
        (["colour"], "colour"),
        (["Title"], "Title"),
        ([""], '""'),
        (["a\nb"], "a\N{REPLACEMENT CHARACTER}b"),
        (["markets", 0, "colour"], "markets[0].colour"),
        (["markets", 0, "marks", 0, "bid"], "markets[0].marks[0].bid"),
        (["correlations", 0, "source"], "correlations[0].source"),
        (["positions", 2, "Strike"], "positions[2].Strike"),
    ],
)
def test_an_entry_that_the_file_does_not_have_is_named(path: list[str | int], place: str) -> None:
    assert faults_of(with_entry(path, 1)) == [f"{place}: is not an entry that this file has"]


def test_unknown_entries_are_told_in_the_order_of_the_file() -> None:
    raw = {**GOOD, **{f"x{number}": number for number in (7, 3, 9, 1, 4, 8, 2)}}
    assert [fault.split(":")[0] for fault in faults_of(json.dumps(raw).encode())] == [
        f"x{number}" for number in (7, 3, 9, 1, 4, 8, 2)
    ]


KINDS = [
    (["title"], "words in quotes", str),
    (["currency"], "words in quotes", str),
    (["note"], "words in quotes", str),
    (["valuation_date"], 'a day written as "2027-01-15"', "day"),
    (["zero_rate"], "a number", float),
    (["method"], 'one of "kirk", "modified_kirk", "bjerksund_stensland", "yardstick"', "choice"),
    (["markets"], "a list in brackets", list),
    (["correlations"], "a list in brackets", list),
    (["positions"], "a list in brackets", list),
    (["markets", 0], "an object in braces", dict),
    (["correlations", 0], "an object in braces", dict),
    (["positions", 3], "an object in braces", dict),
    (["markets", 0, "name"], "words in quotes", str),
    (["markets", 0, "tie_strength"], "a number", float),
    (["markets", 0, "marks"], "a list in brackets", list),
    (["markets", 0, "marks", 0], "an object in braces", dict),
    (["markets", 0, "marks", 0, "delivery"], "words in quotes", str),
    (["markets", 0, "marks", 0, "forward"], "a number", float),
    (["correlations", 0, "first"], "words in quotes", str),
    (["correlations", 0, "correlation"], "a number", float),
    (["positions", 3, "name"], "words in quotes", str),
    (["positions", 3, "side"], 'one of "long", "short"', "choice"),
    (["positions", 3, "kind"], 'one of "call", "put", "forward"', "choice"),
    (["positions", 3, "quantity"], "a number or null", "number or null"),
    (["positions", 3, "long_ratio"], "a number", float),
    (["positions", 3, "strike"], "a number", float),
    (["positions", 3, "expiry"], 'a day written as "2027-01-15" or null', "day or null"),
    (["positions", 3, "own_correlation"], "a number or null", "number or null"),
]
JUNK: list[tuple[Any, str, set[Any]]] = [
    (None, "null", {"number or null", "day or null"}),
    (True, "true", set()),
    (False, "false", set()),
    (7, "7", {float, "number or null"}),
    (2.5, "2.5", {float, "number or null"}),
    (10**400, "1" + "0" * 59 + "…", set()),
    ("words", '"words"', {str}),
    ("12", '"12"', {str}),
    ("", '""', {str}),
    ({"a": [1, {"b": None}]}, "an object in braces", {dict}),
    ([], "a list in brackets", {list}),
    ([[[]]], "a list in brackets", {list}),
]


@pytest.mark.parametrize(("path", "expected", "kind"), KINDS, ids=lambda value: str(value)[:40])
def test_a_value_of_any_other_type_is_refused_where_it_stands(
    path: list[str | int], expected: str, kind: object
) -> None:
    place = "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in path)[1:]
    for value, shown, taken_by in JUNK:
        if kind in taken_by:
            continue
        assert faults_of(with_entry(path, value)) == [f"{place}: expected {expected}, got {shown}"]


def test_a_list_of_junk_is_told_item_by_item() -> None:
    assert faults_of(with_entry(["positions"], [None, 1, "x", [], {"strike": {}}])) == [
        "positions[0]: expected an object in braces, got null",
        "positions[1]: expected an object in braces, got 1",
        'positions[2]: expected an object in braces, got "x"',
        "positions[3]: expected an object in braces, got a list in brackets",
        "positions[4].strike: expected a number, got an object in braces",
    ]


@pytest.mark.parametrize("word", ["NaN", "Infinity", "-Infinity", "1e999", "-1e999"])
def test_a_number_that_is_not_finite_is_refused_where_it_stands(word: str) -> None:
    data = json.dumps(GOOD).replace('"zero_rate": 0.03', f'"zero_rate": {word}').encode()
    (fault,) = faults_of(data)
    assert fault.startswith("zero_rate: expected a number, got ")


def test_half_a_character_pair_is_refused_where_it_stands() -> None:
    assert faults_of(with_entry(["positions", 1, "name"], "a\ud800")) == [
        'positions[1].name: expected words in quotes, got "a\N{REPLACEMENT CHARACTER}"'
    ]


def test_more_faults_than_anyone_reads_are_cut_and_counted() -> None:
    raw = {**GOOD, "positions": [{"strike": "x", "side": 1} for _ in range(1000)]}
    faults = faults_of(json.dumps(raw).encode())
    assert len(faults) == MOST_FAULTS + 1
    assert faults[0] == 'positions[0].side: expected one of "long", "short", got 1'
    assert faults[-1] == f"and {2000 - MOST_FAULTS} more faults of this kind"


def test_an_entry_standing_twice_is_named_where_the_file_is_faulty() -> None:
    data = json.dumps(GOOD).replace('"zero_rate": 0.03', '"zero_rate": "x", "zero_rate": 0.03').encode()
    assert faults_of(data) == ["zero_rate: stands more than once"]


# Whole files that are none of ours.


def test_an_absent_file_a_folder_and_an_impossible_name_are_told_apart(tmp_path: Path) -> None:
    plain = tmp_path / "plain"
    plain.write_bytes(b"{}")
    assert faults_of_file(tmp_path / "absent.json") == ["there is no such file"]
    assert faults_of_file(tmp_path) == ["this is a folder, not a file"]
    assert faults_of_file(plain / "below") == ["the file cannot be read: Not a directory"]
    assert faults_of_file(Path("nul\0byte")) == ["the file cannot be read: embedded null byte"]
    (too_long,) = faults_of_file(tmp_path / ("x" * 300))
    assert too_long.startswith("the file cannot be read: ")
    loop = tmp_path / "loop"
    loop.symlink_to(loop)
    (looping,) = faults_of_file(loop)
    assert looping.startswith("the file cannot be read: ")


@contextlib.contextmanager
def as_somebody_without_rights(folder: Path) -> Iterator[None]:
    """Root may read everything, so as root step down for a while; anybody else is somebody already."""
    if os.geteuid() != 0:
        yield
        return
    os.chown(folder, NOBODY, NOBODY)
    os.seteuid(NOBODY)
    try:
        yield
    finally:
        os.seteuid(0)


def test_a_file_without_permission_is_refused_in_a_sentence() -> None:
    # Not in tmp_path, whose parents pytest opens to nobody else.
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        path = folder / "book.json"
        path.write_bytes(json.dumps(GOOD).encode())
        path.chmod(0o000)
        with as_somebody_without_rights(folder):
            assert faults_of_file(path) == ["the file cannot be read: Permission denied"]
            folder.chmod(0o000)
            refused = faults_of_file(path)
            folder.chmod(0o700)
        assert refused == ["the file cannot be read: Permission denied"]


@pytest.mark.parametrize("data", [b"", b" ", b"\n\n\t\r\n", codecs.BOM_UTF8, codecs.BOM_UTF8 + b"\n"])
def test_a_file_with_nothing_in_it_is_called_empty(data: bytes, tmp_path: Path) -> None:
    path = tmp_path / "book.json"
    path.write_bytes(data)
    assert faults_of_file(path) == ["the file is empty"]


def test_a_byte_order_mark_and_windows_line_breaks_are_taken() -> None:
    text = json.dumps(GOOD, indent=1).replace("\n", "\r\n").encode()
    assert parse_book(codecs.BOM_UTF8 + text) == parse_book(json.dumps(GOOD).encode())


def test_a_file_cut_anywhere_breaks_off_and_says_so() -> None:
    raw = {**copy.deepcopy(GOOD), "note": 'č𝄞 \\ " \n', "zero_rate": -1.5e-07}
    raw["positions"][0]["expiry"] = None
    for whole in (json.dumps(raw).encode(), json.dumps(raw, ensure_ascii=False, indent=1).encode()):
        parse_book(whole)
        for length in range(1, len(whole)):
            (fault,) = faults_of(whole[:length])
            assert fault.endswith(": the file breaks off before the book ends"), whole[:length]
            assert fault.startswith("line ")


@pytest.mark.parametrize(
    "data",
    [
        bytes(range(256)),
        b"\x89PNG\r\n\x1a\n" + bytes(100),
        b"PK\x03\x04" + bytes(range(200)),
        b"\x00" * 1000,
        b'{"format": "spreadgui book\x00"}',
        json.dumps(GOOD).encode("utf-16"),
        json.dumps(GOOD).encode("utf-16-le"),
        json.dumps(GOOD).encode("utf-32"),
        json.dumps({**GOOD, "title": "Größe"}, ensure_ascii=False).encode("latin-1"),
    ],
)
def test_what_is_no_text_is_called_so(data: bytes) -> None:
    (fault,) = faults_of(data)
    assert "this is not text" in fault


def test_broken_utf8_is_shown_by_line_and_column() -> None:
    data = json.dumps(GOOD, indent=1).encode().replace(b"Winter", b"Win\xffter")
    assert faults_of(data) == ["line 4, column 15: this is not text in UTF-8, so not a book"]


@pytest.mark.parametrize(
    "data", [b"hello", b"name,side\n", b"{'a': 1}", b"{} {}", b'{"a": 1,}', b"<book/>", b"{\xc2\xa0}", b"[1 2]"]
)
def test_text_that_is_no_json_is_called_so_with_its_place(data: bytes) -> None:
    (fault,) = faults_of(data)
    assert fault.startswith("line 1, column ")
    assert ": the text is not JSON: " in fault


@pytest.mark.parametrize(
    "data",
    [b"[]", b"1", b"null", b'"spreadgui book"', b"{}", b'{"format": "another"}', b'{"format": ["spreadgui book"]}'],
)
def test_json_that_is_no_book_is_called_so(data: bytes) -> None:
    assert faults_of(data) == ['this is not a book of this program: it does not say "format": "spreadgui book"']


@pytest.mark.parametrize("version", [VERSION + 1, 99, 10**30, 10**400])
@pytest.mark.parametrize("extra", [{}, {"tides": []}, {"positions": "elsewhere"}])
def test_a_newer_book_is_refused_as_newer_whatever_else_it_holds(version: int, extra: dict[str, object]) -> None:
    (fault,) = faults_of(json.dumps({**GOOD, **extra, "version": version}).encode())
    assert fault.startswith(f"this book is of version {str(version)[:60]}")
    assert fault.endswith(f", written by a newer program; this one reads up to version {VERSION}")


@pytest.mark.parametrize(
    ("version", "shown"),
    [
        ("1", '"1"'),
        ("2", '"2"'),
        (1.5, "1.5"),
        (2.0, "2.0"),
        (None, "null"),
        (True, "true"),
        ([1], "a list in brackets"),
        ({}, "an object in braces"),
    ],
)
def test_a_version_that_is_no_whole_number_is_refused(version: object, shown: str) -> None:
    assert faults_of(with_entry(["version"], version)) == [f"version: expected a whole number, got {shown}"]


@pytest.mark.parametrize("version", [0, -1, -(10**15)])
def test_a_version_below_the_first_is_refused_along_with_the_other_faults(version: int) -> None:
    told = f"version: expected a whole number from 1, got {version}"
    assert faults_of(with_entry(["version"], version)) == [told]
    both = json.dumps({**GOOD, "version": version, "zero_rate": "x"}).encode()
    assert faults_of(both) == [told, 'zero_rate: expected a number, got "x"']


@pytest.mark.parametrize("opening", [b"[", b'{"a":', b'{"positions":[', b'{"format":"spreadgui book","note":['])
def test_deep_nesting_is_refused_without_bringing_the_program_down(opening: bytes) -> None:
    assert faults_of(opening * 100_000) == ["the file is nested deeper than any book"]


def test_a_deep_value_that_ends_well_is_refused_where_it_stands() -> None:
    assert faults_of(with_entry(["note"], json.loads("[" * 400 + "]" * 400))) == [
        "note: expected words in quotes, got a list in brackets"
    ]


def test_a_number_with_thousands_of_digits_is_refused() -> None:
    digits = b"9" * DIGITS_PYTHON_REFUSES
    for place in (b'"zero_rate": ', b'"version": '):
        data = json.dumps({**GOOD, "zero_rate": 0, "version": 0}).encode().replace(place + b"0", place + digits)
        assert digits in data
        assert faults_of(data) == ["the file holds a number with more digits than any machine reads"]


def test_a_decimal_with_thousands_of_digits_is_the_number_it_says() -> None:
    data = json.dumps({**GOOD, "zero_rate": 0.5}).encode().replace(b"0.5,", b"0.0" + b"3" * 20_000 + b",", 1)
    assert parse_book(data).zero_rate == pytest.approx(1 / 30, rel=1e-15)


def test_a_file_larger_than_any_book_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    data = json.dumps(GOOD).encode()
    path = tmp_path / "book.json"
    path.write_bytes(data)
    monkeypatch.setattr(reading, "LARGEST_FILE", len(data))
    assert isinstance(read_book(path), Book)
    monkeypatch.setattr(reading, "LARGEST_FILE", len(data) - 1)
    (fault,) = faults_of_file(path)
    assert fault == "the file is larger than 0 MiB, which no book is"


def test_a_device_that_never_ends_is_refused_like_a_file_too_large(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(reading, "LARGEST_FILE", 2**20)
    assert faults_of_file(Path("/dev/zero")) == ["the file is larger than 1 MiB, which no book is"]


def test_a_book_is_read_from_a_pipe(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    source = tmp_path / "book.json"
    source.write_bytes(json.dumps(GOOD).encode())
    copying = "import shutil, sys; shutil.copyfileobj(open(sys.argv[1], 'rb'), open(sys.argv[2], 'wb'))"
    with subprocess.Popen([sys.executable, "-c", copying, source, pipe]):
        assert read_book(pipe) == read_book(source)


def test_a_fault_is_written_as_its_place_and_its_sentence() -> None:
    assert str(Fault("positions[3].strike", "is missing")) == "positions[3].strike: is missing"
    assert str(Fault("", "the file is empty")) == "the file is empty"
    error = BookError(iter([Fault("a", "b"), Fault("", "c")]))
    assert error.faults == (Fault("a", "b"), Fault("", "c"))
    assert str(error) == "a: b\nc"


@pytest.mark.parametrize(
    ("left_out", "said"),
    [("format", "this is not a book of this program"), ("version", "version: is missing")],
)
def test_a_file_that_does_not_say_what_it_is_is_refused(left_out: str, said: str) -> None:
    written = json.loads(shipped.sample_book("one_spark").read_bytes())
    del written[left_out]
    with pytest.raises(BookError, match=said):
        parse_book(json.dumps(written).encode())
