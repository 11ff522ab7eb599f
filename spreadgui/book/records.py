"""The records of a book: plain frozen values, one class for each thing a desk writes down.

A book is never altered; an edit makes a new one that shares all untouched records with the old. That is what makes
undo exact, lets the pricing thread read without locks, and lets the slate find the touched rows by identity.

Volatilities and correlations are annualised decimals, the zero rate is continuous (ACT/365F), a delivery is a month
written "2027-01". The volatilities of a market with normal dynamics are absolute: in its unit, a root of a year.

Version 2 of the file added what has a default here: dynamics, shift and calendar of a market, the daily volatility of
a mark, exercise and quoted premium of a position, the gap tolerance of a book. A file of version 1 reads as it stands.
"""

from __future__ import annotations

import datetime
from typing import Final, Literal

from msgspec import Struct

FORMAT: Final = "spreadgui book"
VERSION: Final = 2

Side = Literal["long", "short"]
Kind = Literal["call", "put", "forward"]
Exercise = Literal["once", "business days", "all days"]
Dynamics = Literal["lognormal", "shifted lognormal", "normal"]
ValuationMethod = Literal["kirk", "modified_kirk", "bjerksund_stensland", "yardstick"]


class Mark(Struct, frozen=True, forbid_unknown_fields=True, omit_defaults=True, gc=False):
    """The forward (in the market's unit) and the volatility of one delivery.

    `volatility` holds to the start of the delivery, `daily_volatility` from there to the day that is exercised; where
    there is none, the first goes on.
    """

    delivery: str
    forward: float
    volatility: float
    daily_volatility: float | None = None


class Market(Struct, frozen=True, forbid_unknown_fields=True, omit_defaults=True):
    """A market, the unit it is quoted in, how its forwards move, its calendar, and its marks.

    Under shifted lognormal dynamics it is forward + `shift` that is lognormal. `business_days` has a 1 for each day of
    the week from Monday on that is one, `holidays` are those that are none. `tie_strength` is how fast the correlation
    of two of its deliveries decays, per year apart.
    """

    name: str
    unit: str
    tie_strength: float = 0.0
    dynamics: Dynamics = "lognormal"
    shift: float = 0.0
    business_days: str = "1111100"
    holidays: tuple[datetime.date, ...] = ()
    note: str = ""
    marks: tuple[Mark, ...] = ()


class Correlation(Struct, frozen=True, forbid_unknown_fields=True, gc=False):
    """The correlation of two markets; the order of the two does not matter."""

    first: str
    second: str
    correlation: float


class Position(Struct, frozen=True, forbid_unknown_fields=True, omit_defaults=True, gc=False):
    """One line of the book.

    A call pays max(long_ratio * F_long - short_ratio * F_short - strike, 0) per unit of quantity at the expiry, a put
    the opposite, a forward the difference itself. A leg left empty makes an outright. Marks typed into the row
    (`own_...`) win over the book's. What is still None makes the row incomplete, not wrong.

    With an `exercise` other than once it is a strip: one option for each (business) day of the delivery month, each
    over an equal part of the quantity and exercised the business day before; its `expiry` is then not used.
    `quoted_premium` is what somebody asks or bids for one unit of the payoff, whichever side the desk is on.
    """

    name: str = ""
    side: Side = "long"
    kind: Kind = "call"
    quantity: float | None = None
    long_leg: str = ""
    long_delivery: str = ""
    long_ratio: float = 1.0
    short_leg: str = ""
    short_delivery: str = ""
    short_ratio: float = 1.0
    strike: float = 0.0
    expiry: datetime.date | None = None
    exercise: Exercise = "once"
    own_forward_long: float | None = None
    own_forward_short: float | None = None
    own_vol_long: float | None = None
    own_vol_short: float | None = None
    own_correlation: float | None = None
    quoted_premium: float | None = None
    note: str = ""


class Book(Struct, frozen=True, forbid_unknown_fields=True, kw_only=True):
    """A whole book: what is held, and the marks of one day to value it with.

    `method` names the formula that values and sensitivities come from under (shifted) lognormal dynamics. A formula
    is trusted for a position while its gap to the Yardstick is at most `gap_tolerance`, a decimal of the premium.
    """

    format: Literal["spreadgui book"] = FORMAT
    version: int = VERSION
    title: str
    currency: str
    valuation_date: datetime.date
    zero_rate: float = 0.0
    method: ValuationMethod = "yardstick"
    gap_tolerance: float = 0.01
    note: str = ""
    markets: tuple[Market, ...] = ()
    correlations: tuple[Correlation, ...] = ()
    positions: tuple[Position, ...] = ()
