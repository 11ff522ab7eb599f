"""Makes ardenmoor_winter.json, the demo book. Run by hand: python sample_books/make_ardenmoor_winter.py

The market is invented, every number in it comes from the few rules below, and nothing is drawn at random, so that the
same book comes out on every machine.

Forwards     A level for each calendar month, which drifts by a fixed factor a year. Two markets are different: crude
             falls from its spot level to its long-run level, and the allowance costs what it costs to carry. The two
             products are crude plus a crack for each calendar month.
Volatilities far + (near - far) * exp(-pull * years to delivery): contracts move less the further off they are
             (P. Samuelson, "Proof that properly anticipated prices fluctuate randomly", Industrial Management Review
             6, 1965). Winter power and gas move more by a fixed factor.
             North and Quill print hours below zero, so their forwards are lognormal with a shift added; their
             volatilities are lower by as much as the shifted forward is higher, which leaves the absolute moves as
             they were. Two markets for the nights alone are normal, with volatilities in crowns. Inside its delivery
             month a day of power moves as if it had a multiple of the nearest volatility (prices of single days are
             far more volatile than those of months: common practice, no source), a day of gas likewise.
Correlations Four causes move the nine markets: fuel, weather, oil and heavy industry. A market's loadings say how much
             of its variance each cause explains, the rest is its own. The correlation of two markets is the dot
             product of their loadings, so the matrix of all of them cannot have a negative eigenvalue, but for the
             rounding to two decimals.
Blends       Gas plus allowance as a plant burns them, and two barrels of motor spirit with one of gasoil, stand as one
             leg each.
Zero curve   A few points that rise gently.

Ardenmoor has no clock change, so a month of power has 24 hours a day throughout. It rests on weekends and on three days
around midwinter.
"""

from __future__ import annotations

import calendar
import datetime
import itertools
import math
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any, NamedTuple

from spreadgui.book.records import Blend, Book, Correlation, LotRule, Mark, Market, Part, Position, ZeroPoint
from spreadgui.book.writing import write_book

TARGET = Path(__file__).with_name("ardenmoor_winter.json")
VALUATION_DATE = datetime.date(2026, 12, 1)
ZERO_RATE = 0.032
DELIVERIES = tuple(f"{year}-{month:02d}" for year in (2027, 2028) for month in range(1, 13))
# The library's own month names follow the machine's language, and the file must not.
MONTHS = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")

NORTH, SOUTH, QUILL = "Ardenmoor North", "Ardenmoor South", "Quill Island"
GAS, COAL, ALLOWANCE = "Pellan gas point", "Storrow coal", "Ardenmoor allowance"
CRUDE, SPIRIT, GASOIL = "Marrowgate crude", "Marrowgate motor spirit", "Marrowgate gasoil"

PRODUCTS = "Products 2:1"
# GJ of gas for a MWh of power.
HEAT_RATES: Mapping[str, float] = {"Quay 3": 7.1, "Loomgate": 9.4}
ZERO_CURVE: tuple[tuple[datetime.date, float], ...] = (
    (datetime.date(2027, 3, 1), 0.0295),
    (datetime.date(2027, 6, 1), 0.0305),
    (datetime.date(2027, 12, 1), 0.032),
    (datetime.date(2028, 12, 1), 0.0335),
)
# What a lot is: its size, and whether that is for the month, for each hour or for each day of it.
LOTS: Mapping[str, tuple[float, LotRule]] = {
    "CRN/MWh": (1.0, "per hour"), "CRN/GJ": (1_000.0, "per day"), "CRN/t": (1_000.0, "fixed"),
    "CRN/t CO2": (1_000.0, "fixed"), "CRN/bbl": (1_000.0, "fixed"),
}  # fmt: skip
NORTH_NIGHTS, QUILL_NIGHTS = "Ardenmoor North nights", "Quill Island nights"
# What makes the forwards lognormal, CRN/MWh, and how many times the nearest volatility a single day has.
SHIFTS: Mapping[str, float] = {NORTH: 20.0, QUILL: 15.0}
DAILY: Mapping[str, float] = {NORTH: 2.4, SOUTH: 2.1, QUILL: 2.2, GAS: 1.5}
# March to August 2027: forward and volatility of the hours from 23 to 7, both in CRN/MWh.
NIGHT_MONTHS = DELIVERIES[2:8]
NIGHTS: Mapping[str, tuple[tuple[float, float], ...]] = {
    NORTH_NIGHTS: ((21.0, 23.5), (3.5, 22.0), (-4.0, 20.5), (1.5, 19.0), (9.5, 18.0), (13.0, 17.5)),
    QUILL_NIGHTS: ((17.0, 29.0), (6.5, 27.0), (2.5, 25.0), (4.0, 23.5), (8.0, 22.0), (11.0, 21.5)),
}
NIGHT_CORRELATION, NIGHT_TIE, NIGHT_DAILY = 0.78, 0.8, 1.9
# The desk has estimated some correlations; one standard error of each.
ESTIMATED: Mapping[frozenset[str], float] = {
    frozenset((SOUTH, GAS)): 0.02, frozenset((NORTH, SOUTH)): 0.01, frozenset((SOUTH, QUILL)): 0.02,
    frozenset((NORTH, COAL)): 0.05,
}  # fmt: skip
HOLIDAYS = tuple(
    datetime.date(year + (month == 1), month, day)
    for year in (2026, 2027, 2028)
    for month, day in ((12, 25), (12, 26), (1, 1))
)

# t CO2 a GJ of natural gas burnt: 56.1 kg/GJ, the default factor of the 2006 IPCC Guidelines (cited from memory).
GAS_CARBON = 0.0561


class Shape(NamedTuple):
    """What a market is like: unit, tie strength, volatilities near and far, their pull, winter's factor, loadings."""

    unit: str
    tie_strength: float
    near: float
    far: float
    pull: float
    winter: float
    loadings: tuple[float, float, float, float]  # fuel, weather, oil, heavy industry
    note: str


SHAPES: Mapping[str, Shape] = {
    NORTH: Shape(
        "CRN/MWh",
        0.55,
        0.64,
        0.30,
        1.6,
        1.10,
        (0.60, 0.70, 0.12, 0.26),
        "Baseload. Lot 1 MW over the delivery month. Winter-high; cheap in spring, when hours below zero occur.",
    ),
    SOUTH: Shape(
        "CRN/MWh",
        0.50,
        0.58,
        0.27,
        1.6,
        1.12,
        (0.70, 0.62, 0.14, 0.22),
        "Baseload. Lot 1 MW over the delivery month. Dearer than North when the Quill cable is full.",
    ),
    QUILL: Shape(
        "CRN/MWh",
        0.75,
        0.88,
        0.42,
        1.8,
        1.06,
        (0.42, 0.78, 0.08, 0.12),
        "Baseload. Lot 1 MW over the delivery month. Windy, so low in the gusty months and volatile in all of them.",
    ),
    GAS: Shape("CRN/GJ", 0.45, 0.62, 0.31, 1.5, 1.15, (0.93, 0.16, 0.22, 0.10), "Lot 1,000 GJ a day over the month."),
    COAL: Shape("CRN/t", 0.15, 0.34, 0.21, 1.0, 1.00, (0.40, 0.02, 0.34, 0.58), "Lot 1,000 t."),
    ALLOWANCE: Shape("CRN/t CO2", 0.12, 0.40, 0.33, 0.8, 1.00, (0.36, 0.16, 0.16, 0.66), "Lot 1,000 t."),
    CRUDE: Shape("CRN/bbl", 0.14, 0.37, 0.25, 1.1, 1.00, (0.14, 0.00, 0.96, 0.08), "Lot 1,000 bbl."),
    SPIRIT: Shape("CRN/bbl", 0.22, 0.39, 0.27, 1.1, 1.00, (0.10, 0.02, 0.92, 0.05), "Lot 1,000 bbl."),
    GASOIL: Shape("CRN/bbl", 0.20, 0.38, 0.26, 1.1, 1.00, (0.20, 0.10, 0.91, 0.12), "Lot 1,000 bbl."),
}

# January to December, in the market's unit, as the first year's forwards stand.
LEVELS: Mapping[str, tuple[float, ...]] = {
    NORTH: (87.4, 83.6, 69.8, 48.6, 41.9, 46.8, 54.7, 58.9, 63.2, 71.6, 80.8, 85.3),
    SOUTH: (92.3, 88.1, 77.4, 65.9, 60.3, 60.7, 63.8, 65.2, 68.1, 76.3, 85.6, 90.2),
    QUILL: (85.7, 81.2, 68.5, 57.4, 53.6, 52.2, 54.1, 56.8, 61.4, 68.2, 77.3, 83.1),
    GAS: (9.42, 9.21, 8.34, 7.22, 6.81, 6.68, 6.72, 6.84, 7.13, 7.86, 8.71, 9.18),
    COAL: (114.5, 114.0, 113.0, 111.5, 110.5, 110.0, 110.0, 110.5, 111.5, 112.5, 113.5, 114.5),
}
DRIFT_A_YEAR: Mapping[str, float] = {NORTH: 0.965, SOUTH: 0.97, QUILL: 0.975, GAS: 0.96, COAL: 0.99}
CRACKS: Mapping[str, tuple[float, ...]] = {
    SPIRIT: (9.4, 10.1, 12.8, 15.9, 17.8, 18.9, 18.6, 17.2, 14.1, 11.2, 9.6, 9.1),
    GASOIL: (23.4, 22.3, 19.6, 17.2, 16.1, 16.0, 16.6, 18.1, 20.3, 22.1, 23.2, 23.7),
}
CRUDE_SPOT, CRUDE_LONG_RUN, CRUDE_PULL = 72.5, 65.0, 0.8
ALLOWANCE_SPOT, ALLOWANCE_CARRY = 44.2, 0.034


def years_to(delivery: str) -> float:
    """The years from the valuation date to the first day of the delivery month."""
    first = datetime.date(int(delivery[:4]), int(delivery[5:]), 1)
    return (first - VALUATION_DATE).days / 365.0


def forward(market: str, delivery: str) -> float:
    """The forward, to the cent."""
    month, ahead = int(delivery[5:]) - 1, years_to(delivery)
    if market == ALLOWANCE:
        return round(ALLOWANCE_SPOT * math.exp(ALLOWANCE_CARRY * ahead), 2)
    if market in LEVELS:
        return round(LEVELS[market][month] * DRIFT_A_YEAR[market] ** (int(delivery[:4]) - 2027), 2)
    crude = CRUDE_LONG_RUN + (CRUDE_SPOT - CRUDE_LONG_RUN) * math.exp(-CRUDE_PULL * ahead)
    return round(crude + (CRACKS[market][month] if market in CRACKS else 0.0), 2)


def volatility(market: str, delivery: str) -> float:
    """The volatility, to a tenth of a point."""
    shape = SHAPES[market]
    season = shape.winter if int(delivery[5:]) in (1, 2, 12) else 1.0
    level = season * (shape.far + (shape.near - shape.far) * math.exp(-shape.pull * years_to(delivery)))
    return round(level * shifted_share(market, delivery), 3)


def shifted_share(market: str, delivery: str) -> float:
    """The forward over the forward with its shift added, which is the lower the more is added."""
    return forward(market, delivery) / (forward(market, delivery) + SHIFTS.get(market, 0.0))


def daily_volatility(market: str, delivery: str) -> float | None:
    """The volatility of a day of the delivery month, to a hundredth; None for markets that have none."""
    if market not in DAILY:
        return None
    return round(DAILY[market] * SHAPES[market].near * shifted_share(market, delivery), 2)


def correlation(first: str, second: str) -> float:
    """The correlation of two markets, to two decimals; of a market with itself, one."""
    if first == second:
        return 1.0
    pairs = zip(SHAPES[first].loadings, SHAPES[second].loadings, strict=True)
    return round(sum(one * other for one, other in pairs), 2)


def business_days_before(delivery: str, days: int) -> datetime.date:
    """The day that many business days before the delivery month begins."""
    day = datetime.date(int(delivery[:4]), int(delivery[5:]), 1)
    while days:
        day -= datetime.timedelta(days=1)
        days -= day.weekday() < 5 and day not in HOLIDAYS
    return day


def month_days(delivery: str) -> int:
    """The days of the delivery month."""
    return calendar.monthrange(int(delivery[:4]), int(delivery[5:]))[1]


def spread(
    name: str, quantity: float, long: tuple[str, str], short: tuple[str, str], strike: float, **rest: Any
) -> Position:
    """A position on two listed legs, expiring three business days before the earlier delivery unless it says; a strip
    has its days for that."""
    legs: dict[str, Any] = {
        "long_leg": long[0],
        "long_delivery": long[1],
        "short_leg": short[0],
        "short_delivery": short[1],
    }
    expiry = rest.pop("expiry", None) or business_days_before(min(long[1], short[1]), 3)
    if "exercise" in rest:
        expiry = None
    return Position(name=name, quantity=float(quantity), strike=strike, expiry=expiry, **legs, **rest)


def outright(name: str, quantity: float, leg: tuple[str, str], strike: float, **rest: Any) -> Position:
    """A position on a long leg alone."""
    expiry = business_days_before(leg[1], 3)
    legs: dict[str, Any] = {"long_leg": leg[0], "long_delivery": leg[1]}
    return Position(name=name, quantity=float(quantity), strike=strike, expiry=expiry, **legs, **rest)


def power_hours(megawatts: float, delivery: str) -> float:
    """The MWh of a constant output over a delivery month."""
    return megawatts * 24.0 * month_days(delivery)


def spark(plant: str, megawatts: float, heat_rate: float, vom: float, delivery: str, **rest: Any) -> Position:
    """A gas plant's month: South power against the gas it burns."""
    name = f"{plant} spark {month_words(delivery)}"
    quantity = power_hours(megawatts, delivery)
    return spread(name, quantity, (SOUTH, delivery), (GAS, delivery), vom, short_ratio=heat_rate, **rest)


def clean_spark(plant: str, megawatts: float, heat_rate: float, vom: float, delivery: str, **rest: Any) -> Position:
    """A gas plant's month against the blend of gas and allowances that it burns."""
    name, quantity = f"{plant} clean {month_words(delivery)}", power_hours(megawatts, delivery)
    return spread(name, quantity, (SOUTH, delivery), (f"{plant} fuel", delivery), vom, **rest)


def cable(
    name: str, megawatts: float, source: str, target: str, loss: float, fee: float, delivery: str, **rest: Any
) -> Position:
    """A cable's month in one direction: a MWh that arrives takes 1 / (1 - loss) MWh at its source."""
    taken = round(1.0 / (1.0 - loss), 4)
    words, quantity = f"{name} {month_words(delivery)}", power_hours(megawatts, delivery)
    return spread(words, quantity, (target, delivery), (source, delivery), fee, short_ratio=taken, **rest)


def storage(summer: str, winter: str, gigajoules_a_day: float, **rest: Any) -> Position:
    """Gas put in over a summer month and taken out over a winter month: decided before the summer month begins."""
    name = f"Pellan store {month_words(summer)}/{month_words(winter)}"
    quantity = gigajoules_a_day * month_days(summer)
    return spread(name, quantity, (GAS, winter), (GAS, summer), 0.35, short_ratio=1.015, **rest)


def dark(megawatts: float, delivery: str, strike: float, **rest: Any) -> Position:
    """Sedgeholm's month: North power against the coal it burns."""
    name, quantity = f"Sedgeholm dark {month_words(delivery)}", power_hours(megawatts, delivery)
    return spread(name, quantity, (NORTH, delivery), (COAL, delivery), strike, short_ratio=0.36, **rest)


def night_cable(name: str, megawatts: float, strike: float, delivery: str, **rest: Any) -> Position:
    """North's nights against Quill's, eight hours of each day."""
    words, quantity = f"{name} {month_words(delivery)}", megawatts * 8.0 * month_days(delivery)
    return spread(words, quantity, (NORTH_NIGHTS, delivery), (QUILL_NIGHTS, delivery), strike, **rest)


def crack(name: str, barrels: float, product: str, strike: float, delivery: str, **rest: Any) -> Position:
    """One barrel of a product against one of crude; the option ends five business days before the month."""
    expiry = business_days_before(delivery, 5)
    words = f"{name} {month_words(delivery)}"
    return spread(words, barrels, (product, delivery), (CRUDE, delivery), strike, expiry=expiry, **rest)


def three_two_one(barrels: float, strike: float, delivery: str, **rest: Any) -> Position:
    """Three barrels of crude into two of motor spirit and one of gasoil, a barrel of crude at a time."""
    expiry = business_days_before(delivery, 5)
    name = f"3:2:1 crack {month_words(delivery)}"
    return spread(name, barrels, (PRODUCTS, delivery), (CRUDE, delivery), strike, expiry=expiry, **rest)


def month_words(delivery: str) -> str:
    """The month as the desk says it: Jan-27."""
    return f"{MONTHS[int(delivery[5:]) - 1]}-{delivery[2:4]}"


def gas_plants() -> Iterator[Position]:
    yield spark("Quay 3", 380, 7.1, 2.8, "2027-01", note="Strike: VOM.")
    yield spark("Quay 3", 380, 7.1, 2.8, "2027-02")
    yield spark(
        "Quay 3", 380, 7.1, 2.8, "2027-03", own_forward_long=76.9, note="Power at the afternoon's bid, not at the mark."
    )
    for delivery in ("2027-10", "2027-11", "2027-12", "2028-01", "2028-02", "2028-03"):
        yield spark("Quay 3", 380, 7.1, 2.8, delivery)
    yield spark("Loomgate", 120, 9.4, 4.5, "2027-01", note="An old plant; strike: VOM and part of a start.")
    yield spark("Loomgate", 120, 9.4, 4.5, "2028-01")
    yield spark("Loomgate", 120, 9.4, 4.5, "2028-02")
    heat = "Heat sold to the town brings more than VOM costs, so the strike is below zero."
    yield spark("Kilnside heat", 45, 8.6, -3.5, "2027-03", note=heat)
    yield spark("Kilnside heat", 45, 8.6, -3.5, "2028-01")
    yield clean_spark("Quay 3", 150, 7.1, 2.8, "2027-12")
    yield clean_spark("Quay 3", 150, 7.1, 2.8, "2028-01")
    yield clean_spark("Loomgate", 60, 9.4, 4.5, "2028-02")
    yield spark("Sold", 100, 7.1, 25.0, "2028-01", side="short", quoted_premium=8.45, note="Sold against Quay 3.")
    yield spark("Floor", 100, 7.1, 12.0, "2027-10", kind="put", note="Pays when the spark ends below 12.")


def cables() -> Iterator[Position]:
    for delivery in ("2027-02", "2027-05", "2028-01"):
        yield cable("North-South", 300, NORTH, SOUTH, 0.025, 1.2, delivery)
    yield cable("South-North", 300, SOUTH, NORTH, 0.025, 1.2, "2027-11")
    yield cable("South-North", 300, SOUTH, NORTH, 0.025, 1.2, "2028-01")
    yield cable(
        "North-South rebate",
        50,
        NORTH,
        SOUTH,
        0.025,
        -1.5,
        "2027-12",
        note="The owner pays 1.5 a MWh carried, so the strike is below zero.",
    )
    yield cable(
        "North-South floor",
        80,
        NORTH,
        SOUTH,
        0.0,
        -2.0,
        "2028-02",
        kind="put",
        side="short",
        note="Pays the buyer when South ends more than 2 below North.",
    )
    for delivery in ("2027-03", "2027-12"):
        yield cable("Quill-South", 200, QUILL, SOUTH, 0.045, 2.1, delivery)
    yield cable(
        "Quill-South",
        200,
        QUILL,
        SOUTH,
        0.045,
        2.1,
        "2028-01",
        own_correlation=0.72,
        quoted_premium=12.75,
        note="Correlation as last quoted for this cable, in place of the book's; the premium is today's offer.",
    )
    yield cable("South-Quill", 200, SOUTH, QUILL, 0.045, 2.1, "2027-12")
    yield cable("South-Quill", 200, SOUTH, QUILL, 0.045, 2.1, "2028-01")


def oil_store_and_coal() -> Iterator[Position]:
    yield three_two_one(90_000.0, 14.0, "2027-03")
    yield three_two_one(90_000.0, 14.5, "2028-01")
    yield crack("Gasoil crack", 60_000, GASOIL, 22.0, "2028-01")
    yield crack("Gasoil crack floor", 40_000, GASOIL, 20.0, "2027-11", kind="put")
    yield crack("Motor spirit crack", 50_000, SPIRIT, 11.0, "2028-02")
    yield crack("Spirit crack sold", 50_000, SPIRIT, 18.0, "2028-03", side="short")
    paid = "Strike: injection and withdrawal, CRN/GJ; the ratio is the gas burnt to inject."
    yield storage("2027-06", "2027-12", 20_000, note=paid)
    yield storage("2027-07", "2028-01", 20_000)
    yield storage("2027-08", "2028-02", 20_000)
    strike = "Strike: VOM 2.4 and 0.86 t of allowance a MWh, bought earlier."
    yield dark(250, "2027-01", 40.5, note=strike)
    yield dark(250, "2027-12", 41.5)
    yield dark(250, "2028-01", 41.5)


def days_and_nights() -> Iterator[Position]:
    daily = "A strip: each business day of the month is exercised the business day before."
    yield spark("Quay 3 daily", 380, 7.1, 2.8, "2027-02", exercise="business days", note=daily)
    yield spark("Quay 3 daily", 380, 7.1, 2.8, "2028-01", exercise="business days", quoted_premium=24.15)
    yield cable("Quill daily", 200, QUILL, SOUTH, 0.045, 2.1, "2027-03", exercise="all days")
    yield spark("Peak cover", 80, 9.4, 30.0, "2028-02", side="short", exercise="business days")
    below = "Normal forwards: nights print below zero, and volatilities are in CRN/MWh."
    yield night_cable("Night cable", 120, 2.0, "2027-04", note=below)
    yield night_cable("Night cable", 120, 2.0, "2027-05", quoted_premium=1.25)
    yield night_cable("Night cable daily", 120, 2.0, "2027-06", exercise="all days")
    yield night_cable("Night floor", 60, -5.0, "2027-05", kind="put", side="short")


def outrights_and_hedges() -> Iterator[Position]:
    yield outright("South cap sold Feb-28", power_hours(60, "2028-02"), (SOUTH, "2028-02"), 105.0, side="short")
    yield outright(
        "Gas floor Jul-27",
        10_000 * 31,
        (GAS, "2027-07"),
        6.2,
        kind="put",
        own_vol_long=0.47,
        note="Volatility as dealt, in place of the mark.",
    )
    yield outright("Allowance cap Dec-27", 40_000, (ALLOWANCE, "2027-12"), 50.0)
    hedge = {"kind": "forward", "note": "Strike: the price agreed."}
    yield outright("South hedge Jan-28", power_hours(250, "2028-01"), (SOUTH, "2028-01"), 88.5, side="short", **hedge)
    yield outright("Gas hedge Jan-28", 40_000 * 31, (GAS, "2028-01"), 8.9, **hedge)
    yield outright("Crude hedge Mar-27", 90_000, (CRUDE, "2027-03"), 70.4, **hedge)
    yield cable("North-South swap", 100, NORTH, SOUTH, 0.0, 5.5, "2028-02", side="short", **hedge)


def blends() -> Iterator[Blend]:
    """The mixes that legs name."""
    for plant, heat_rate in HEAT_RATES.items():
        parts = (Part(GAS, heat_rate), Part(ALLOWANCE, round(heat_rate * GAS_CARBON, 3)))
        yield Blend(f"{plant} fuel", "CRN/MWh", parts, "What a MWh of power burns: GJ of gas, t of allowance.")
    thirds = (Part(SPIRIT, 2.0 / 3.0), Part(GASOIL, 1.0 / 3.0))
    yield Blend(PRODUCTS, "CRN/bbl", thirds, "What a barrel of crude gives, in barrels.")


def demo_book() -> Book:
    """The demo book, made from the rules above."""
    markets = tuple(
        Market(
            name=name,
            unit=shape.unit,
            tie_strength=shape.tie_strength,
            note=shape.note,
            dynamics="shifted lognormal" if name in SHIFTS else "lognormal",
            shift=SHIFTS.get(name, 0.0),
            holidays=HOLIDAYS,
            lot_size=LOTS[shape.unit][0],
            lot_rule=LOTS[shape.unit][1],
            marks=tuple(
                Mark(month, forward(name, month), volatility(name, month), daily_volatility(name, month))
                for month in DELIVERIES
            ),
        )
        for name, shape in SHAPES.items()
    )
    nights = tuple(
        Market(
            name=name,
            unit="CRN/MWh",
            tie_strength=NIGHT_TIE,
            note="The hours from 23 to 7. Lot 1 MW over the nights of the month. Windy nights print below zero.",
            dynamics="normal",
            holidays=HOLIDAYS,
            marks=tuple(
                Mark(month, level, vol, round(NIGHT_DAILY * vol, 1))
                for month, (level, vol) in zip(NIGHT_MONTHS, marks, strict=True)
            ),
        )
        for name, marks in NIGHTS.items()
    )
    pairs = [
        Correlation(a, b, correlation(a, b), ESTIMATED.get(frozenset((a, b))))
        for a, b in itertools.combinations(SHAPES, 2)
    ]
    return Book(
        title="Ardenmoor winter",
        currency="CRN",
        valuation_date=VALUATION_DATE,
        zero_rate=ZERO_RATE,
        method="yardstick",
        note="Two winters of an invented market. Made by make_ardenmoor_winter.py, which says how.",
        zero_curve=tuple(ZeroPoint(day, rate) for day, rate in ZERO_CURVE),
        markets=(*markets, *nights),
        blends=tuple(blends()),
        correlations=(*pairs, Correlation(NORTH_NIGHTS, QUILL_NIGHTS, NIGHT_CORRELATION)),
        positions=(
            *gas_plants(),
            *cables(),
            *oil_store_and_coal(),
            *days_and_nights(),
            *outrights_and_hedges(),
        ),
    )


if __name__ == "__main__":
    write_book(demo_book(), TARGET)
