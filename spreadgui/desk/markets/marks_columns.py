"""The columns of Marks, each declared once. No Qt."""

from __future__ import annotations

from dataclasses import dataclass

from spreadgui.book import entries
from spreadgui.book.fields import Field
from spreadgui.market.periods import MarkField


@dataclass(frozen=True)
class MarkColumn:
    """One column. `field` is there where the column can be typed into, `scale` and `decimals` are those of screens."""

    key: str
    heading: str
    help: str
    field: Field | None = None
    scale: float = 1.0
    decimals: int = 2
    numeric: bool = True
    in_percent: bool = False

    @property
    def mark_field(self) -> MarkField:
        """The field of a mark that the column shows; KeyError for a column of none."""
        return _MARK_FIELDS[self.key]


_MARK_FIELDS: dict[str, MarkField] = {
    "forward": "forward", "volatility": "volatility", "daily_volatility": "daily_volatility",
}  # fmt: skip
_VOLATILITY = "a volatility of 0 % or more"

COLUMNS: tuple[MarkColumn, ...] = (
    MarkColumn("period", "Delivery", "A month, or the quarter, season or year of some months.", numeric=False),
    MarkColumn(
        "forward", "Forward", "In the market's unit. A longer period moves its months in proportion.",
        Field("forward", entries.NUMBER, "Forward", ""), decimals=6,
    ),
    MarkColumn(
        "volatility", "Volatility", "To the start of the delivery. A longer period moves its months in proportion.",
        Field("volatility", entries.VOLATILITY, "Volatility", "", in_percent=_VOLATILITY), 100.0, 6, in_percent=True,
    ),
    MarkColumn(
        "daily_volatility", "Daily volatility", "Inside the delivery month, for strips; empty: the other one goes on.",
        Field("daily_volatility", entries.VOLATILITY, "Daily volatility", "", in_percent=_VOLATILITY), 100.0, 6,
        in_percent=True,
    ),
    MarkColumn("positions", "Positions", "How many positions of the book read this delivery.", decimals=0),
    MarkColumn("note", "Source", "Where the volatility came from; empty for one that was typed.", numeric=False),
)  # fmt: skip
