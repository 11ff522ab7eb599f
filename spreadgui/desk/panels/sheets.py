"""Small read-only tables as plain values: what stands in each cell, how it is set, what a copy says. No Qt."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

from spreadgui.valuation.shown import number_text

DASH = "–"


@dataclass(frozen=True)
class Cell:
    """One cell: `text`, and after it `after` in small muted letters (a scaling, a unit).

    `number` sets it right-aligned; the `after` of a column of numbers stand below each other. `tone` is "", "muted" or
    "accent". A cell with a `span` covers that many columns, which is how a remark takes the room of numbers that do not
    exist. `spoken` is what a screen reader says where the text itself would not do.
    """

    text: str = ""
    after: str = ""
    number: bool = False
    tone: str = ""
    small: bool = False
    strong: bool = False
    span: int = 1
    tip: str = ""
    spoken: str = ""

    @property
    def words(self) -> str:
        """All that the cell says."""
        return f"{self.text} {self.after}".strip()


@dataclass(frozen=True)
class Heading:
    """The heading of a column: two lines at most, right-aligned over numbers.

    `apart` keeps a column of numbers further off from the one to its left.
    """

    text: str
    number: bool = False
    apart: bool = False
    tip: str = ""


@dataclass(frozen=True)
class Sheet:
    """A table: `rows` have as many cells as there are headings, spanned ones left empty.

    `marked` rows stand on a ground of their own. `copied` are the lines that a copy of the table puts on the clipboard,
    headings first, whatever the arrangement on the screen.
    """

    name: str
    headings: tuple[Heading, ...]
    rows: tuple[tuple[Cell, ...], ...]
    copied: tuple[tuple[str, ...], ...]
    marked: frozenset[int] = field(default_factory=frozenset)


NOTHING = Sheet("", (), (), ())


def tabbed(lines: Iterable[Sequence[str]]) -> str:
    """Lines of cells as tab-separated text.

    >>> tabbed([("Kirk", "1.5"), ("Margrabe", "")])
    'Kirk\\t1.5\\nMargrabe\\t\\n'
    """
    return "".join("\t".join(line) + "\n" for line in lines)


def plain_number(value: float) -> str:
    """A number for other programs: twelve significant digits, no group spaces, the keyboard's minus; "" for none.

    >>> plain_number(-1234567.25), plain_number(0.1 + 0.2), plain_number(float("nan"))
    ('-1234567.25', '0.3', '')
    """
    return f"{value:.12g}" if math.isfinite(value) else ""


def shared_decimals(values: Iterable[float], digits: int, least: int, most: int, *, reach: float = 0.0) -> int:
    """How many decimals a column needs so that its smallest number shows `digits` significant digits.

    At least `least`, at most `most`. What would be rounded away at `most`, or is smaller than `reach` times the
    largest, has no say; neither have zeros and numbers that are not finite.

    >>> shared_decimals([0.55213, 0.01311, 2.1638], 3, 2, 6), shared_decimals([14787.0, 350.1], 3, 0, 4)
    (4, 0)
    """
    sizes = [abs(value) for value in values if math.isfinite(value)]
    floor = max(0.5 * 10.0**-most, reach * max(sizes, default=0.0))
    telling = [size for size in sizes if size >= floor]
    if not telling:
        return least
    return min(max(digits - 1 - math.floor(math.log10(min(telling))), least), most)


def number_or_dash(value: float, decimals: int) -> str:
    """A number as screens write it, a dash where there is none."""
    return number_text(value, decimals) or DASH


def signed_text(value: float, decimals: int) -> str:
    """A difference: with its sign, plus as well as minus; none before a plain zero.

    >>> signed_text(0.00512, 4), signed_text(0.00001, 4)
    ('+0.0051', '0.0000')
    """
    text = number_or_dash(value, decimals)
    return f"+{text}" if value > 0 and text.strip("0.") else text
