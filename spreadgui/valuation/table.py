"""A whole book valued at once, and its value table as CSV, JSON and plain text."""

from __future__ import annotations

import csv
import io
import json
import math
from collections.abc import Iterator, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass

from spreadgui.book.records import Book
from spreadgui.pricing.methods import method as method_of
from spreadgui.valuation.column import ALL_ROWS, Column, exact_texts, screen_texts
from spreadgui.valuation.columns import BY_COLUMN_KEY, VALUE_TABLE
from spreadgui.valuation.guesses import guess_total
from spreadgui.valuation.price import price_parts
from spreadgui.valuation.results import LiveResults, State
from spreadgui.valuation.shown import number_text
from spreadgui.valuation.slate import Slate, follow
from spreadgui.valuation.trust import CLOSED_FORMS, Trust, tolerance_words, trust_of


@dataclass(frozen=True)
class ValuedBook:
    """A slate with every row that can be priced priced."""

    slate: Slate
    results: LiveResults


def value_book(book: Book, executor: Executor | None = None) -> ValuedBook:
    """Price every position of `book`; a row that cannot be priced says why, all others are current. With an `executor`
    chunks of rows are mapped over it."""
    succession = follow(None, book, 1)
    results = LiveResults()
    results.follow(succession)
    for part in price_parts(succession.slate, results.pending(), executor):
        results.accept(part)
    return ValuedBook(succession.slate, results)


def csv_text(valued: ValuedBook) -> str:
    """The value table: a header of column keys, one line a position, numbers in code units to the last digit."""
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(VALUE_TABLE)
    rows = range(len(valued.slate))
    cells = [exact_texts(BY_COLUMN_KEY[key], valued.slate, valued.results, rows) for key in VALUE_TABLE]
    writer.writerows(zip(*cells, strict=True))
    return stream.getvalue()


def json_text(valued: ValuedBook) -> str:
    """The same table as JSON, under the book's title, day, currency and total; null where there is no number."""
    book = valued.slate.book
    cells = {key: _json_cells(valued, BY_COLUMN_KEY[key]) for key in VALUE_TABLE}
    head = {
        "title": book.title,
        "currency": book.currency,
        "valuation_date": book.valuation_date.isoformat(),
        "method": book.method,
        "book_value": valued.results.total_value(),
        "gap_tolerance": book.gap_tolerance,
        "cost_of_guesses": guess_total(valued.slate, valued.results)[1],
        "beyond_tolerance": {
            trust.method.key: {"positions": trust.rows, "value": trust.value, "share": trust.share}
            for trust in _trusts(valued)
        },
    }
    positions = [{key: cells[key][row] for key in VALUE_TABLE} for row in range(len(valued.slate))]
    return json.dumps({**head, "positions": positions}, indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def summary_text(valued: ValuedBook) -> str:
    """A table for a terminal: name, value, unit values, state, and the book's total."""
    book = valued.slate.book
    lines = [f"{book.title}, {book.valuation_date}, value by {method_of(book.method).name}", ""]
    lines += _aligned(list(_summary_rows(valued)))
    states = [State(int(code)).word for code in valued.results.state]
    counts = ", ".join(f"{states.count(word)} {word}" for word in dict.fromkeys(states))
    total = f"Book value {number_text(valued.results.total_value(), 0)} {book.currency}".rstrip()
    lines += ["", f"{total} ({counts})", *_trust_lines(valued)]
    lines += _guess_lines(valued)
    return "\n".join(lines)


def _guess_lines(valued: ValuedBook) -> Iterator[str]:
    """What the book owes to estimated correlations, where it has any."""
    rows, cost, share = guess_total(valued.slate, valued.results)
    if rows:
        worth = f"{number_text(cost, 0)} {valued.slate.book.currency}".rstrip()
        yield (
            f"Estimated correlations are behind {rows} positions; all of them one standard error off the same way for "
            f"the desk is {worth} from end to end, {100.0 * share:.1f} % of the book without signs"
        )


def _trusts(valued: ValuedBook) -> list[Trust]:
    return [trust_of(method, valued.slate, valued.results) for method in CLOSED_FORMS]


def _trust_lines(valued: ValuedBook) -> Iterator[str]:
    """What each closed form is beyond the tolerance for, one line each."""
    currency, tolerance = valued.slate.book.currency, tolerance_words(valued.slate)
    for trust in _trusts(valued):
        rests = ", which the values rest on," if trust.method.key == valued.slate.book.method else ""
        worth = f"{number_text(trust.value, 0)} {currency}".rstrip()
        yield (
            f"{trust.method.name}{rests} is beyond {tolerance} of premium for {trust.rows} positions worth {worth}, "
            f"{100.0 * trust.share:.0f} % of the book without signs"
        )


def _summary_rows(valued: ValuedBook) -> Iterator[tuple[str, ...]]:
    keys = ("name", "position_value", "yardstick", "bjerksund_stensland", "kirk", "formula_check", "state", "reason")
    columns, rows = [BY_COLUMN_KEY[key] for key in keys], range(len(valued.slate))
    yield tuple(column.heading for column in columns)
    yield from zip(*(screen_texts(column, valued.slate, valued.results, rows) for column in columns), strict=True)


def _aligned(rows: list[tuple[str, ...]]) -> list[str]:
    widths = [max(len(row[place]) for row in rows) for place in range(len(rows[0]))]
    numeric = range(1, 5)
    return [
        "  ".join(
            cell.rjust(width) if place in numeric else cell.ljust(width)
            for place, (cell, width) in enumerate(zip(row, widths, strict=True))
        ).rstrip()
        for row in rows
    ]


def _json_cells(valued: ValuedBook, column: Column) -> Sequence[str | float | None]:
    if column.numbers is None:
        return exact_texts(column, valued.slate, valued.results, range(len(valued.slate)))
    numbers = column.numbers(valued.slate, valued.results, ALL_ROWS).tolist()
    return [number if math.isfinite(number) else None for number in numbers]
