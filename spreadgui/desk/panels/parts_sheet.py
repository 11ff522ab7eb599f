"""The markets of a position's blends: what each is marked at and what the position owes to it. No Qt."""

from __future__ import annotations

from typing import TYPE_CHECKING

from spreadgui.desk.panels.sheets import Cell, Heading, Sheet, number_or_dash, plain_number, shared_decimals

if TYPE_CHECKING:  # its module loads the formulas, which must not hold up the first paint of the window
    from spreadgui.valuation.reading import Reading

_HOW = "Moments matched: the blend is one forward with the mean, variance and covariance of its markets."


def parts_sheet(reading: Reading) -> Sheet:
    """One row a market of a blend; deltas and vegas are for the whole position, by the chain rule through the match."""
    parts, quantity = reading.parts, reading.quantity
    scale = 1.0 if reading.absolute_vols else 0.01
    rows_of = [
        (
            part,
            quantity * part.delta,
            quantity * part.vega * scale,
            part.vol * (1.0 if reading.absolute_vols else 100.0),
        )
        for part in parts
    ]
    decimals = (
        shared_decimals([part.forward for part in parts], 4, 2, 4),
        shared_decimals([vol for *_, vol in rows_of], 3, 1, 2),
        shared_decimals([delta for _, delta, _, _ in rows_of], 2, 0, 2),
        shared_decimals([vega for _, _, vega, _ in rows_of], 2, 0, 2),
    )
    headings = (
        Heading("Blend’s market", tip=_HOW),
        Heading("Leg", number=True),
        Heading("Weight", number=True, tip="Units of the market for one of the blend."),
        Heading("Forward", number=True),
        Heading("Vol" if reading.absolute_vols else "Vol, %", number=True),
        Heading("Delta\nposition", number=True, tip="Change of value per 1.00 of this market’s forward."),
        Heading(
            f"Vega\n{reading.currency}".strip(), number=True,
            tip="Change of value per point of this market’s volatility (per 1.00 of an absolute one).",
        ),
    )  # fmt: skip
    rows = tuple(
        (
            Cell(f"{part.market} {part.delivery}"),
            Cell(part.side, number=True, tone="muted", small=True),
            Cell(f"{part.weight:g}", number=True),
            Cell(number_or_dash(part.forward, decimals[0]), number=True, tip=plain_number(part.forward)),
            Cell(number_or_dash(vol, decimals[1]), number=True, tip=plain_number(vol)),
            Cell(number_or_dash(delta, decimals[2]), number=True, tip=plain_number(delta)),
            Cell(number_or_dash(vega, decimals[3]), number=True, tip=plain_number(vega)),
        )
        for part, delta, vega, vol in rows_of
    )
    first = tuple(heading.text.replace("\n", ", ") for heading in headings)
    copied = tuple(
        (
            f"{part.market} {part.delivery}",
            part.side,
            repr(part.weight),
            *map(plain_number, (part.forward, vol, delta, vega)),
        )
        for part, delta, vega, vol in rows_of
    )
    return Sheet("Parts", headings, rows, (first, *copied))
