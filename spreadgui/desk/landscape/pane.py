"""The Landscape pane: what is drawn, by which method, and how it is read off."""

from __future__ import annotations

from PySide6.QtCore import QSize, Qt, QTimer, Signal, Slot
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QVBoxLayout, QWidget

from spreadgui.desk.landscape.contours import Contours
from spreadgui.desk.landscape.legend import Legend
from spreadgui.desk.landscape.words import KEYS, PRICING, Words, subtitle_of
from spreadgui.desk.look.pane import ElidedLabel, Pane
from spreadgui.desk.look.theme import Theme, set_rank, set_tone, tabular
from spreadgui.pricing.methods import LOGNORMAL_METHODS
from spreadgui.valuation.surface import QUANTITIES, Surface, SurfaceRequest

NOTHING = "Choose a position with two legs: a quantity of it is drawn here over both forwards."
# A surface that comes back sooner replaces the old one without a flicker.
_PATIENCE_MS = 150


class LandscapePane(Pane):
    """One quantity of the current position over its two underlyings, and the choice of quantity and method.

    `asked` is sent when the user chooses another quantity or method, never when the program does.
    """

    asked = Signal()

    def __init__(self, theme: Theme, parent: QWidget | None = None) -> None:
        super().__init__("Landscape", parent=parent)
        self._shown: Surface | None = None
        self._faded = False
        self.quantities = _combo("Quantity", [(quantity.key, quantity.name, "") for quantity in QUANTITIES])
        self.methods = _combo("Method", [(method.key, method.name, method.applies) for method in LOGNORMAL_METHODS])
        self.contours = Contours(theme)
        self.legend = Legend(theme)
        self._long_title, self._short_title, self._value_title = (_small() for _ in range(3))
        self._readout = ElidedLabel()
        self._readout.setFont(tabular(self._readout.font()))
        self._late = QTimer(self)
        self._late.setSingleShot(True)
        self._late.setInterval(_PATIENCE_MS)
        self._late.timeout.connect(self._fade)
        self._lay_out_choices()
        self.set_body(self._make_body())
        self.quantities.activated.connect(self._asked)
        self.methods.activated.connect(self._asked)
        self.contours.crosshair_moved.connect(self._read_out)
        self.choose(SurfaceRequest.quantity, SurfaceRequest.method)
        self.show_nothing(NOTHING)

    @property
    def surface(self) -> Surface | None:
        """The surface shown last, blank ones too; None after `show_nothing`."""
        return self._shown

    def readout(self) -> str:
        """The line that reads the crosshair out, or where the marks stand."""
        return self._readout.full_text()

    def axis_titles(self) -> tuple[str, str]:
        """The long and the short axis as they are named."""
        return self._long_title.full_text(), self._short_title.full_text()

    def request(self, row: int) -> SurfaceRequest:
        """What to draw for a position, by the current choices."""
        return SurfaceRequest(row, self._quantity, self._method)

    def choose(self, quantity: str, method: str) -> None:
        """Choose without sending `asked`; KeyError if there is no such quantity or method."""
        for combo, key in ((self.quantities, quantity), (self.methods, method)):
            if combo.findData(key) < 0:
                raise KeyError(f"{combo.accessibleName().lower()}: no {key!r}")
        self._quantity, self._method = quantity, method
        self._show_choices()

    def show_surface(self, surface: Surface) -> None:
        """Draw a surface; one that is blank says why in its place."""
        self._late.stop()
        self._shown, self._faded = surface, False
        self.set_subtitle(subtitle_of(surface))
        if surface.reason:
            self.show_empty(surface.reason)
            return
        self._name_all(self.contours.draw(surface))
        self.show_body()

    def show_empty(self, text: str) -> None:
        """As every pane; the keyboard goes to the choices then."""
        super().show_empty(text)
        self.setFocusProxy(self.quantities)

    def show_body(self) -> None:
        """As every pane; the keyboard goes to the plot then."""
        super().show_body()
        self.setFocusProxy(self.contours)

    def show_waiting(self) -> None:
        """What is drawn no longer speaks of the book: unless another surface comes at once, its ink is faded."""
        if not (self._late.isActive() or self._faded):
            self._late.start()

    def show_nothing(self, text: str) -> None:
        """There is no position to draw; `text` says what would be here."""
        self._late.stop()
        self._shown, self._faded = None, False
        self.set_subtitle("")
        self.show_empty(text)

    def set_theme(self, theme: Theme) -> None:
        """Recolour everything."""
        self.contours.set_theme(theme)
        self.legend.set_theme(theme)
        if self._shown is not None and not self._shown.reason:
            self._name_axes()

    def is_faded(self) -> bool:
        """Whether what is drawn is late."""
        return self._faded

    def minimumSizeHint(self) -> QSize:
        """The least room: the pane's own, or the two choices side by side."""
        hint = super().minimumSizeHint()
        choices = self._choices.minimumSize().width() + 2 * self._choices.geometry().left()
        return QSize(max(hint.width(), choices), hint.height())

    def _is_drawn(self) -> bool:
        return self._shown is not None and not self._shown.reason

    def _lay_out_choices(self) -> None:
        """Between the title and the body, so that the choices can be changed while the pane has nothing to show."""
        self._choices = QHBoxLayout()
        self._choices.setSpacing(6)
        self._choices.addWidget(self.quantities)
        self._choices.addWidget(self.methods)
        self._choices.addStretch(1)
        column = self.layout()
        assert isinstance(column, QVBoxLayout)
        column.insertLayout(1, self._choices)

    def _make_body(self) -> QWidget:
        body = QWidget()
        body.setObjectName("paneBody")
        titles = QHBoxLayout()
        titles.setSpacing(12)
        self._value_title.setAlignment(Qt.AlignmentFlag.AlignRight)
        titles.addWidget(self._short_title)
        titles.addWidget(self._value_title)
        self._long_title.setAlignment(Qt.AlignmentFlag.AlignHCenter)
        column = QVBoxLayout(body)
        column.setContentsMargins(0, 2, 0, 0)
        column.setSpacing(2)
        column.addLayout(titles)
        column.addWidget(self.contours, 1)
        column.addWidget(self._long_title)
        column.addSpacing(4)
        column.addWidget(self._readout)
        column.addWidget(self.legend)
        return body

    def _name_all(self, words: Words) -> None:
        self._name_axes()
        self.legend.set_entries(words.legend())
        self.contours.setAccessibleName(words.name())

    def _name_axes(self) -> None:
        words, frame = self.contours.words, self.contours.frame
        if words is None or frame is None:
            return
        long, short = words.axis_titles(frame.long.notation, frame.short.notation)
        self._long_title.set_text(long)
        self._short_title.set_text(short)
        self._value_title.set_text(words.value_title(frame.values.notation))

    def _show_choices(self) -> None:
        self.quantities.setCurrentIndex(self.quantities.findData(self._quantity))
        self.methods.setCurrentIndex(self.methods.findData(self._method))

    @Slot()
    def _asked(self) -> None:
        chosen = str(self.quantities.currentData()), str(self.methods.currentData())
        if chosen != (self._quantity, self._method):
            self._quantity, self._method = chosen
            self.asked.emit()

    @Slot()
    def _read_out(self) -> None:
        words, place = self.contours.words, self.contours.crosshair
        if words is None:
            return
        text = words.at_marks() if place is None else words.at_crosshair(*place)
        if self._faded:
            text = PRICING.capitalize()
        self._readout.set_text(text, KEYS)
        if place is not None and self.contours.hasFocus():
            self.contours.setAccessibleDescription(text)
        else:
            self.contours.setAccessibleDescription(text if self._faded else words.description())

    @Slot()
    def _fade(self) -> None:
        if not self._is_drawn():
            self.show_empty(PRICING.capitalize())
            return
        self._faded = True
        self.set_subtitle(f"{self.subtitle()} · {PRICING}")
        self.contours.set_faded(True)
        self._read_out()


def _combo(name: str, entries: list[tuple[str, str, str]]) -> QComboBox:
    """A list of (key, words, tooltip) that is as wide as its longest words."""
    combo = QComboBox()
    combo.setAccessibleName(name)
    combo.setToolTip(name)
    for key, words, tip in entries:
        combo.addItem(words, key)
        combo.setItemData(combo.count() - 1, tip, Qt.ItemDataRole.ToolTipRole)
    return combo


def _small() -> ElidedLabel:
    label = ElidedLabel()
    set_rank(label, "small")
    set_tone(label, "muted")
    return label
