"""Real widgets on Qt's offscreen platform, in a theme, with readings that are really priced."""

import os

os.environ.setdefault("QT_QPA_PLATFORM", "offscreen")

import datetime
from collections.abc import Callable, Iterator

import pytest
from msgspec.structs import replace
from PySide6.QtGui import QFont, QPalette
from PySide6.QtWidgets import QApplication
from pytestqt.qtbot import QtBot

from spreadgui.book.records import Book, Correlation, Mark, Market, Position
from spreadgui.desk.look import theme as look
from spreadgui.desk.panels.reading import ReadingPane
from spreadgui.valuation.reading import Reading, read_position
from spreadgui.valuation.slate import build_slate

MARKETS = (
    Market("Ardenmoor South", "CRN/MWh", marks=(Mark("2027-12", 87.5, 0.34),)),
    Market("Ardenmoor North", "CRN/MWh", marks=(Mark("2027-12", 84.9, 0.37),)),
    Market("Pellan gas point", "CRN/GJ", marks=(Mark("2027-12", 9.2, 0.41),)),
)
CORRELATIONS = (
    Correlation("Ardenmoor South", "Pellan gas point", 0.8),
    Correlation("Ardenmoor South", "Ardenmoor North", 0.9),
)
SPARK = Position(
    name="Spark", quantity=74_400.0, long_leg="Ardenmoor South", long_delivery="2027-12", short_leg="Pellan gas point",
    short_delivery="2027-12", short_ratio=7.1, strike=12.0, expiry=datetime.date(2027, 11, 28),
)  # fmt: skip
POSITIONS = {
    "spark": SPARK,
    "sold spark": replace(SPARK, name="Sold spark", side="short"),
    "exchange": replace(SPARK, name="Exchange", strike=0.0),
    "floor": replace(
        SPARK, name="Floor", side="short", kind="put", short_leg="Ardenmoor North", short_ratio=1.0, strike=-2.0
    ),
    "outright": replace(SPARK, name="Cap", short_leg="", short_delivery="", short_ratio=1.0, strike=90.0),
    "forward": replace(SPARK, name="Swap", kind="forward"),
    "incomplete": replace(SPARK, name="Half", quantity=None, expiry=None),
    "refused": replace(SPARK, name="Wrong", short_ratio=-7.1),
    "huge": replace(SPARK, name="Huge", side="short", quantity=987_654_321_012.0),
    "hopeless": replace(SPARK, name="Hopeless", strike=5_000.0),
}

Read = Callable[..., Reading]
MakePane = Callable[..., ReadingPane]


@pytest.fixture
def light(qapp: QApplication) -> Iterator[look.Theme]:
    """The light theme, put on, at nine points; what the application was before is put back."""
    font = QFont(qapp.font())
    theme = look.Theme(look.LIGHT, 9.0)
    look.apply(qapp, theme)
    yield theme
    qapp.setStyleSheet("")
    qapp.setPalette(QPalette())
    qapp.setFont(font)


@pytest.fixture(scope="session")
def read() -> Read:
    """The reading of one of POSITIONS under a method of the book."""

    def read_one(name: str, method: str = "kirk") -> Reading:
        book = Book(
            title="Rows", currency="CRN", valuation_date=datetime.date(2026, 12, 1), zero_rate=0.032, method=method,
            markets=MARKETS, correlations=CORRELATIONS, positions=tuple(POSITIONS.values()),
        )  # fmt: skip
        return read_position(build_slate(book, 3), list(POSITIONS).index(name))

    return read_one


@pytest.fixture
def make_pane(light: look.Theme, qtbot: QtBot) -> MakePane:
    """A pane on the screen, 620 by 330 unless told otherwise."""

    def make(width: int = 620, height: int = 330) -> ReadingPane:
        pane = ReadingPane(light)
        qtbot.addWidget(pane)
        pane.resize(width, height)
        with qtbot.waitExposed(pane):
            pane.show()
        pane.activateWindow()
        qtbot.waitUntil(pane.isActiveWindow)
        return pane

    return make
