"""The fields of a position, each declared once: its key, how its text is read, and what a person is told of it.

The CSV reader, the grid and the help read this table. A new input column is one entry here and one field in
`records.Position`.
"""

from __future__ import annotations

from dataclasses import dataclass

from spreadgui.book import entries
from spreadgui.book.entries import Entry


@dataclass(frozen=True)
class Field:
    """One field of a position.

    `needed` fields must have a column in a CSV file and a value in each of its lines. A decimal that screens show in
    per cent says in `in_percent` what is expected there.
    """

    key: str
    entry: Entry
    heading: str
    help: str
    needed: bool = False
    in_percent: str = ""


FIELDS: tuple[Field, ...] = (
    Field("name", entries.WORDS, "Position", "The name the desk calls this position by."),
    Field(
        "side", entries.choice("long", "short"), "Side", "Long: the desk holds it. Short: the desk has sold it.", True
    ),
    Field(
        "kind",
        entries.choice("call", "put", "forward"),
        "Kind",
        "A call pays when the spread ends above the strike, a put when below; a forward pays the difference.",
        True,
    ),
    Field(
        "quantity", entries.QUANTITY, "Quantity", "Units of the payoff: what one unit of value is multiplied by.", True
    ),
    Field("long_leg", entries.WORDS, "Long leg", "The market whose forward is received."),
    Field("long_delivery", entries.DELIVERY, "Long delivery", "The delivery month of the long leg, as 2027-01."),
    Field("long_ratio", entries.RATIO, "Long ratio", "How many units of the long leg one unit of payoff takes."),
    Field("short_leg", entries.WORDS, "Short leg", "The market whose forward is paid. Empty for an outright."),
    Field("short_delivery", entries.DELIVERY, "Short delivery", "The delivery month of the short leg, as 2027-01."),
    Field(
        "short_ratio",
        entries.RATIO,
        "Short ratio",
        "How many units of the short leg one unit of payoff takes: a heat rate, a conversion, a loss factor.",
    ),
    Field(
        "strike",
        entries.ZERO_NUMBER,
        "Strike",
        "What the spread must exceed, in the unit of the payoff; may be below zero.",
    ),
    Field(
        "expiry",
        entries.DATE,
        "Expiry",
        "The day on which the option is exercised or lapses, as 2027-01-15; a strip has one for each of its days.",
        True,
    ),
    Field(
        "exercise",
        entries.choice_or_else("once", "business days", "all days"),
        "Exercise",
        "Once, at the expiry; or a strip: each business day, or each day, of the delivery month for itself, "
        "the business day before.",
    ),
    Field(
        "own_forward_long",
        entries.OPTIONAL_NUMBER,
        "Long forward",
        "The long leg's forward; typed here it wins over Marks.",
    ),
    Field(
        "own_forward_short",
        entries.OPTIONAL_NUMBER,
        "Short forward",
        "The short leg's forward; typed here it wins over Marks.",
    ),
    Field(
        "own_vol_long",
        entries.VOLATILITY,
        "Long volatility",
        "The long leg's volatility; typed here it wins over Marks.",
        in_percent="a volatility of 0 % or more",
    ),
    Field(
        "own_vol_short",
        entries.VOLATILITY,
        "Short volatility",
        "The short leg's volatility; typed here it wins over Marks.",
        in_percent="a volatility of 0 % or more",
    ),
    Field(
        "own_correlation",
        entries.CORRELATION,
        "Correlation",
        "The correlation of the two forwards; typed here it wins over the book's.",
        in_percent="a correlation from −100 to 100 %",
    ),
    Field(
        "quoted_premium",
        entries.OPTIONAL_NUMBER,
        "Quoted premium",
        "What is bid or offered for one unit of the payoff; the correlation that it implies is backed out.",
    ),
    Field("note", entries.WORDS, "Note", "Anything the desk wants to remember of this position."),
)

BY_KEY: dict[str, Field] = {field.key: field for field in FIELDS}
