"""The records of a book: plain frozen values, one class for each thing a desk writes down.

A book is never altered; an edit makes a new one that shares all untouched records with the old. That is what makes
undo exact, lets the pricing thread read without locks, and lets the slate find the touched rows by identity.

Volatilities and correlations are annualised decimals, the zero rate is continuous (ACT/365F), a delivery is a month
written "2027-01". The volatilities of a market with normal dynamics are absolute: in its unit, a root of a year.

Version 2 of the file added, each with a default: dynamics, shift, lot and calendar of a market, daily volatility and
note of a mark, standard error and note of a correlation, exercise and quoted premium of a position, and gap tolerance,
zero curve and blends of a book. A file of version 1 reads as it stands.
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
LotRule = Literal["fixed", "per hour", "per day"]
ValuationMethod = Literal["kirk", "modified_kirk", "bjerksund_stensland", "yardstick"]


class Mark(Struct, frozen=True, forbid_unknown_fields=True, omit_defaults=True, gc=False):
    """The forward (in the market's unit) and the volatility of one delivery.

    `volatility` holds to the start of the delivery, `daily_volatility` from there to the day that is exercised; where
    there is none, the first goes on. `note` says where the volatility came from.
    """

    delivery: str
    forward: float
    volatility: float
    daily_volatility: float | None = None
    note: str = ""


class Market(Struct, frozen=True, forbid_unknown_fields=True, omit_defaults=True):
    """A market, the unit it is quoted in, how its forwards move, its calendar, and its marks.

    Under shifted lognormal dynamics it is forward + `shift` that is lognormal. `business_days` has a 1 for each day of
    the week from Monday on that is one, `holidays` are those that are none. `tie_strength` is how fast the correlation
    of two of its deliveries decays, per year apart.

    A lot is `lot_size` units, or so many for each hour or each day of the delivery month (24 hours a day), as the
    `lot_rule` says.
    """

    name: str
    unit: str
    tie_strength: float = 0.0
    dynamics: Dynamics = "lognormal"
    shift: float = 0.0
    business_days: str = "1111100"
    holidays: tuple[datetime.date, ...] = ()
    lot_size: float = 1.0
    lot_rule: LotRule = "fixed"
    note: str = ""
    marks: tuple[Mark, ...] = ()


class Correlation(Struct, frozen=True, forbid_unknown_fields=True, omit_defaults=True, gc=False):
    """The correlation of two markets; the order of the two does not matter.

    One that came from an estimate has its `standard_error`, and a `note` of window and date.
    """

    first: str
    second: str
    correlation: float
    standard_error: float | None = None
    note: str = ""


class Part(Struct, frozen=True, forbid_unknown_fields=True, gc=False):
    """A market's weight in a blend: units of the market for one unit of the blend."""

    market: str
    weight: float


class Blend(Struct, frozen=True, forbid_unknown_fields=True, omit_defaults=True):
    """A named, weighted mix of markets that can stand as one leg; its forward is the weighted sum of theirs."""

    name: str
    unit: str
    parts: tuple[Part, ...] = ()
    note: str = ""


class ZeroPoint(Struct, frozen=True, forbid_unknown_fields=True, gc=False):
    """The continuous zero rate (ACT/365F) to one day."""

    date: datetime.date
    rate: float


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
    is trusted for a position while its gap to the Yardstick is at most `gap_tolerance`, a decimal of the premium. With
    points on the `zero_curve` they discount, and the flat `zero_rate` is not used.
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
    zero_curve: tuple[ZeroPoint, ...] = ()
    markets: tuple[Market, ...] = ()
    blends: tuple[Blend, ...] = ()
    correlations: tuple[Correlation, ...] = ()
    positions: tuple[Position, ...] = ()
