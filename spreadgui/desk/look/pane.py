"""The frame that every pane sits in, and the small parts they share: a choice, a headline number, a cut text."""

from PySide6.QtCore import QEvent, QSize, Qt, Slot
from PySide6.QtGui import QResizeEvent
from PySide6.QtWidgets import (
    QApplication,
    QFrame,
    QHBoxLayout,
    QLabel,
    QLayout,
    QSizePolicy,
    QStackedWidget,
    QVBoxLayout,
    QWidget,
)

from spreadgui.desk.look.choice import Choice
from spreadgui.desk.look.theme import set_focus_within, set_rank, set_tone, tabular

__all__ = ["Choice", "ElidedLabel", "Figure", "Pane"]

_MARGIN = 10
_GAP = 8
_LEAST_BODY = QSize(200, 90)


class ElidedLabel(QLabel):
    """One line of text that ends with an ellipsis where the room ends, and then tells all in its tooltip."""

    def __init__(self, text: str = "", parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._full = ""
        self._tip = ""
        self.setTextFormat(Qt.TextFormat.PlainText)
        self.setSizePolicy(QSizePolicy.Policy.Expanding, QSizePolicy.Policy.Fixed)
        self.set_text(text)

    def set_text(self, text: str, tip: str = "") -> None:
        """Show `text`; `tip` is the tooltip while the text is not cut."""
        self._full, self._tip = text, tip
        self.setAccessibleName(text)
        self._fit()

    def full_text(self) -> str:
        """The whole text, cut or not."""
        return self._full

    def is_cut(self) -> bool:
        """Whether the ellipsis is showing."""
        return self.text() != self._full

    def sizeHint(self) -> QSize:
        """As high as a line; no width of its own, since it takes what is left over."""
        return QSize(0, super().sizeHint().height())

    def minimumSizeHint(self) -> QSize:
        """May be squeezed to nothing."""
        return QSize(0, super().minimumSizeHint().height())

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Cut anew for the new width."""
        super().resizeEvent(event)
        self._fit()

    def changeEvent(self, event: QEvent) -> None:
        """Cut anew for another font or theme."""
        super().changeEvent(event)
        if event.type() in (QEvent.Type.FontChange, QEvent.Type.StyleChange):
            self._fit()

    def _fit(self) -> None:
        room = self.contentsRect().width()
        self.setText(self.fontMetrics().elidedText(self._full, Qt.TextElideMode.ElideRight, room))
        self.setToolTip(self._full if self.is_cut() else self._tip)


class Pane(QFrame):
    """A white frame with a title row and a body; the edge takes the accent while the keyboard is inside.

    The title row holds the title, a muted subtitle (subject, quantity, method, unit) that is cut when room is short,
    and small tools at its right end. A pane that has nothing to show says so with `show_empty`.
    """

    def __init__(self, title: str, body: QWidget | None = None, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._title = QLabel(title)
        self._title.setTextFormat(Qt.TextFormat.PlainText)
        self._title.setObjectName("paneTitle")
        set_rank(self._title, "title")
        self._subtitle = ElidedLabel()
        set_rank(self._subtitle, "small")
        set_tone(self._subtitle, "muted")
        self._tools = QHBoxLayout()
        self._tools.setSpacing(2)
        self._stack = QStackedWidget()
        self._stack.setObjectName("paneStack")
        self._empty = _empty_page()
        self._stack.addWidget(self._empty)
        self._lay_out()
        self.set_title(title)
        if body is not None:
            self.set_body(body)
        application = QApplication.instance()
        if isinstance(application, QApplication):
            application.focusChanged.connect(self._follow_focus)

    def title(self) -> str:
        """The words of the title."""
        return self._title.text()

    def set_title(self, title: str) -> None:
        """Name the pane; a screen reader says the same name."""
        self._title.setText(title)
        self.setAccessibleName(title)
        self._fit_tools()

    def subtitle(self) -> str:
        """The whole subtitle, even where it is shown cut."""
        return self._subtitle.full_text()

    def set_subtitle(self, text: str, tip: str = "") -> None:
        """Say what the pane shows now; `tip` adds a tooltip for when the text is not cut."""
        self._subtitle.set_text(text, tip)
        self.setAccessibleDescription(text)

    def add_tool(self, widget: QWidget) -> None:
        """Put a small widget at the right end of the title row, after those already there."""
        self._tools.addWidget(widget)
        self._fit_tools()

    def body(self) -> QWidget | None:
        """The widget that the pane shows when it is not empty."""
        return self._stack.widget(1)

    def set_body(self, body: QWidget) -> None:
        """Show `body`, in place of the one before, which is deleted."""
        old = self.body()
        if old is body:
            return
        if old is not None:
            self._stack.removeWidget(old)
            old.deleteLater()
        self._stack.addWidget(body)
        if not body.accessibleName():
            body.setAccessibleName(self.title())
        self.show_body()

    def show_empty(self, text: str) -> None:
        """Hide the body and say, in the middle of the pane, what would be here and how to get it."""
        self._empty.setText(text)
        self._empty.setAccessibleName(text)
        self._stack.setCurrentWidget(self._empty)

    def show_body(self) -> None:
        """Show the body again after `show_empty`."""
        body = self.body()
        if body is not None:
            self._stack.setCurrentWidget(body)

    def is_empty(self) -> bool:
        """Whether the empty text is showing."""
        return self._stack.currentWidget() is self._empty

    def resizeEvent(self, event: QResizeEvent) -> None:
        """A choice among the tools becomes a list where the row would push the title out."""
        super().resizeEvent(event)
        self._fit_tools()

    def changeEvent(self, event: QEvent) -> None:
        """Fit the tools to another font or theme."""
        super().changeEvent(event)
        if event.type() in (QEvent.Type.FontChange, QEvent.Type.StyleChange):
            self._fit_tools()

    def minimumSizeHint(self) -> QSize:
        """The least room: the title and the tools, every choice among them as a list, or the body if it needs more."""
        body = self._stack.minimumSizeHint().width() + 2 * _MARGIN + 2
        return QSize(max(self._row_width(narrow=True), body), super().minimumSizeHint().height())

    def _fit_tools(self) -> None:
        narrow = self._row_width(narrow=False) > self.width()
        for tool in self._tool_widgets():
            if isinstance(tool, Choice):
                tool.set_narrow(narrow)

    def _row_width(self, *, narrow: bool) -> int:
        """Pixels that the title row needs without its subtitle, choices as lists (narrow) or as rows."""
        width = self._title.sizeHint().width() + 2 * (_MARGIN + 1)
        for tool in self._tool_widgets():
            if isinstance(tool, Choice):
                width += (tool.list_width() if narrow else tool.row_width()) + _GAP
            else:
                width += tool.sizeHint().width() + _GAP
        return width

    def _tool_widgets(self) -> list[QWidget]:
        items = (self._tools.itemAt(place) for place in range(self._tools.count()))
        return [widget for item in items if item is not None and (widget := item.widget()) is not None]

    def _lay_out(self) -> None:
        row = QHBoxLayout()
        row.setSpacing(_GAP)
        row.addWidget(self._title)
        row.addWidget(self._subtitle, 1)
        row.addLayout(self._tools)
        column = QVBoxLayout(self)
        # minimumSizeHint knows that choices can give way; the layout alone would hold out for their whole rows.
        column.setSizeConstraint(QLayout.SizeConstraint.SetNoConstraint)
        column.setContentsMargins(_MARGIN, 6, _MARGIN, _MARGIN)
        column.setSpacing(6)
        column.addLayout(row)
        column.addWidget(self._stack, 1)

    @Slot(QWidget, QWidget)
    def _follow_focus(self, _old: QWidget | None, now: QWidget | None) -> None:
        # No widget at all means that a menu or another program has the keyboard for now: the place stays marked.
        if now is not None:
            set_focus_within(self, _lies_in(now, self))


class Figure(QWidget):
    """A number that matters, set large, with a small caption under it that names it and its unit."""

    def __init__(self, caption: str, *, small: bool = False, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._value = QLabel()
        self._value.setTextFormat(Qt.TextFormat.PlainText)
        self._value.setFont(tabular(self._value.font()))
        set_rank(self._value, "figure-small" if small else "figure")
        self._caption = QLabel(caption)
        self._caption.setTextFormat(Qt.TextFormat.PlainText)
        set_rank(self._caption, "small")
        set_tone(self._caption, "muted")
        column = QVBoxLayout(self)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        column.addWidget(self._value)
        column.addWidget(self._caption)
        self.setSizePolicy(QSizePolicy.Policy.Maximum, QSizePolicy.Policy.Fixed)
        self.set_value("–")

    def value(self) -> str:
        """The number as it is shown."""
        return self._value.text()

    def set_value(self, text: str, *, tone: str = "", tip: str = "") -> None:
        """Show `text`, ready made; `tone` as in `set_tone` ("muted" for a late number), `tip` the tooltip."""
        self._value.setText(text)
        set_tone(self._value, tone)
        self.setToolTip(tip)
        self._name()

    def caption(self) -> str:
        """The words under the number."""
        return self._caption.text()

    def set_caption(self, caption: str) -> None:
        """Change the words under the number, as when its unit changes."""
        self._caption.setText(caption)
        self._name()

    def _name(self) -> None:
        self.setAccessibleName(f"{self.caption()}: {self.value()}")


def _empty_page() -> QLabel:
    label = QLabel()
    label.setObjectName("paneEmpty")
    label.setTextFormat(Qt.TextFormat.PlainText)
    label.setAlignment(Qt.AlignmentFlag.AlignCenter)
    label.setWordWrap(True)
    label.setMinimumSize(_LEAST_BODY)
    return label


def _lies_in(widget: QWidget, frame: QWidget) -> bool:
    """Whether `widget` is `frame` or belongs to it, through pop-ups too."""
    current: QWidget | None = widget
    while current is not None and current is not frame:
        current = current.parentWidget()
    return current is frame
