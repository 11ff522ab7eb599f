"""The file format as a JSON Schema (draft 2020-12), for editors and for other systems that write books.

The types, defaults and needed entries come from the records themselves, the words for a position's entries from its
field table; only the words for the other entries are said here. The schema tells what an entry may be. What entries
mean together - that a leg names a market of the book, that a delivery has a mark - only `spreadgui check` tells.
"""

from __future__ import annotations

from typing import Any

import msgspec

from spreadgui.book.fields import FIELDS
from spreadgui.book.records import VERSION, Book

DIALECT = "https://json-schema.org/draft/2020-12/schema"

_WORDS: dict[str, dict[str, str]] = {
    "Book": {
        "format": "Says that this file is a book; the same words in every one.",
        "version": f"The version of the file format; this is version {VERSION}.",
        "title": "What the desk calls this book.",
        "currency": "The money that every price and value is in, as CRN.",
        "valuation_date": "The day of the marks, from which time to expiry is counted, as 2026-12-01.",
        "zero_rate": "The zero rate that discounts every payment: a decimal a year, continuous, ACT/365F.",
        "method": "The formula that the book's values and sensitivities come from.",
        "gap_tolerance": "The largest gap to the Yardstick at which a formula is trusted, a decimal of the premium.",
        "note": "Anything the desk wants to remember of this book.",
        "zero_curve": "Zero rates by day; with none, the flat zero rate discounts.",
        "markets": "The markets that a leg can name, with their marks.",
        "blends": "Weighted mixes of markets that a leg can name like a market.",
        "correlations": "The correlations of two markets; each pair once.",
        "positions": "What is held, in the order of the grid.",
    },
    "Market": {
        "name": "The name that legs and correlations call this market by; no two alike.",
        "unit": "Money over what is delivered, as CRN/MWh.",
        "tie_strength": "How fast the correlation of two of its deliveries decays, per year apart; zero or more.",
        "dynamics": "How its forwards move; under normal dynamics its volatilities are in its unit.",
        "shift": "What is added to a forward to make it lognormal; for shifted lognormal dynamics only.",
        "business_days": "A 1 for each business day of the week and a 0 for each other, from Monday to Sunday.",
        "holidays": "The days that are no business days, whatever the day of the week.",
        "lot_size": "How many units a lot is, for each hour or day of the delivery if the rule says so.",
        "lot_rule": "Whether the lot is fixed, or so much per hour or per day of the delivery month.",
        "note": "Anything the desk wants to remember of this market.",
        "marks": "One mark for each delivery.",
    },
    "Mark": {
        "delivery": "The delivery month, as 2027-01.",
        "forward": "The forward, in the market's unit.",
        "volatility": "The volatility to the start of the delivery, an annualised decimal: 0.45 is 45 %.",
        "daily_volatility": "The volatility from there to the day that is exercised; null where it goes on as it was.",
        "note": "Where the volatility came from.",
    },
    "Correlation": {
        "first": "The name of one market.",
        "second": "The name of the other.",
        "correlation": "The correlation of their log-returns for the same delivery, a decimal from -1 to 1.",
        "standard_error": "How sure an estimated correlation is; null for one that was typed.",
        "note": "Where the correlation came from.",
    },
    "Blend": {
        "name": "The name that legs call this blend by; no two alike, nor like a market's.",
        "unit": "Money over what is delivered, as CRN/MWh.",
        "parts": "The markets it is made of.",
        "note": "Anything the desk wants to remember of this blend.",
    },
    "Part": {
        "market": "The name of a market.",
        "weight": "Units of the market for one unit of the blend; above zero.",
    },
    "ZeroPoint": {
        "date": "The day that is discounted from, as 2027-12-01.",
        "rate": "The zero rate to it: a decimal a year, continuous, ACT/365F.",
    },
    "Position": {field.key: field.help for field in FIELDS},
}


def book_schema() -> dict[str, Any]:
    """The JSON Schema of a book file, as plain dicts and lists in the order of the records' declarations.

    >>> book_schema()["$defs"]["Mark"]["required"]
    ['delivery', 'forward', 'volatility']
    """
    generated = msgspec.json.schema(Book)
    for record, words in _WORDS.items():
        properties = generated["$defs"][record]["properties"]
        for key, description in words.items():
            properties[key]["description"] = description
    return {"$schema": DIALECT, "title": "A book of options on two underlyings", **generated}


def schema_bytes() -> bytes:
    """The schema as a file: UTF-8, indented, ending with a line break."""
    return msgspec.json.format(msgspec.json.encode(book_schema()), indent=2) + b"\n"
