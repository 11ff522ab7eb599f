"""The main window: assembles the panes and joins acts to those who carry them out. Nothing is computed here."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from PySide6.QtCore import QEvent, QObject, Qt, QTimer, Slot
from PySide6.QtGui import QCloseEvent
from PySide6.QtWidgets import QApplication, QLabel, QMainWindow, QSplitter, QVBoxLayout, QWidget

from spreadgui.desk.look.theme import Theme, apply, set_tone

if TYPE_CHECKING:
    from spreadgui.book.records import Book
    from spreadgui.desk.actbar import ActBar
    from spreadgui.desk.bookbar import BookBar
    from spreadgui.desk.files import BookFiles
    from spreadgui.desk.grid.pane import PositionsPane
    from spreadgui.desk.landscape.pane import LandscapePane
    from spreadgui.desk.markets.deck import MarketDeck
    from spreadgui.desk.message import MessageStrip
    from spreadgui.desk.panels.reading import ReadingPane
    from spreadgui.desk.status import StatusLine
    from spreadgui.desk.workbench import Workbench

NO_ROW = "Choose a position in the grid."
READING_HEIGHT = 350
LATE_MILLISECONDS = 120
SMALLEST = (1000, 680)  # below, the Landscape's axis runs into its own title


class Window(QMainWindow):
    """The program's window. Close it (or call `shut`) before it dies: the pricing thread ends there.

    It comes up in three steps, each painted before the next loads what it needs: the bare window (Qt alone), the panes
    on a book (`assemble`), the Landscape and the first numbers (`complete`; pyqtgraph, and SciPy on its thread).
    """

    workbench: Workbench
    files: BookFiles
    acts: ActBar
    positions: PositionsPane
    reading: ReadingPane
    message: MessageStrip
    bar: BookBar
    status: StatusLine

    def __init__(self, theme: Theme) -> None:
        super().__init__()
        self.theme = theme
        self.landscape: LandscapePane | None = None
        self.markets: MarketDeck | None = None
        self.handlers: dict[str, Callable[[], object]] = {}
        self._opening = QLabel("Opening the book…")
        self._opening.setAlignment(Qt.AlignmentFlag.AlignCenter)
        set_tone(self._opening, "muted")
        self.setCentralWidget(self._opening)
        self.setWindowTitle("spreadgui")
        self.setMinimumSize(*SMALLEST)
        self.resize(1600, 1000)

    def open_after_paint(self, book: Book, path: Path | None) -> None:
        """`assemble` once the bare window has been painted, and `complete` once the panes have."""

        def assemble() -> None:
            self.assemble(book, path)
            _AfterPaint(self.positions.view.viewport(), self.complete)

        _AfterPaint(self._opening, assemble)

    def assemble(self, book: Book, path: Path | None) -> None:
        """Put the panes on `book`; `path` is the file that saving writes to, None where there is none yet."""
        from spreadgui.desk.actbar import ActBar
        from spreadgui.desk.bookbar import BookBar
        from spreadgui.desk.files import BookFiles
        from spreadgui.desk.grid.pane import PositionsPane
        from spreadgui.desk.look.pane import Pane
        from spreadgui.desk.message import MessageStrip
        from spreadgui.desk.panels.reading import ReadingPane
        from spreadgui.desk.simulation import SimulationThread
        from spreadgui.desk.status import StatusLine
        from spreadgui.desk.workbench import Workbench

        self.workbench = Workbench(book, self)
        self.files = BookFiles(self.workbench, self)
        self.files.path = path
        self.positions = PositionsPane(self.workbench, self.theme)
        self.reading = ReadingPane(self.theme)
        self.simulations = SimulationThread(self)
        self._vacant = Pane("Landscape")
        self.message = MessageStrip()
        self.bar = BookBar(self.workbench)
        self.status = StatusLine(self.workbench, self)
        # An answer that comes at once must not make the panes flicker.
        self._late = QTimer(self, singleShot=True, interval=LATE_MILLISECONDS)
        self._late.timeout.connect(self._fade)
        self.handlers = self._handlers()
        self.acts = ActBar(self, self.handlers, self.files, self.positions, self.theme)
        self._lay_out()
        self._join()
        self._refresh_title()

    # --- assembly

    def _lay_out(self) -> None:
        from spreadgui.desk.look.icons import icon

        self.setWindowIcon(icon("app", self.theme))
        self._right = QSplitter(Qt.Orientation.Vertical)
        for pane in (self._vacant, self.reading):
            self._right.addWidget(pane)
        self._left = QSplitter(Qt.Orientation.Vertical)
        self._left.addWidget(self.positions)
        self._across = QSplitter(Qt.Orientation.Horizontal)
        for part in (self._left, self._right):
            self._across.addWidget(part)
        self._left.setChildrenCollapsible(False)
        self._left.setHandleWidth(8)
        for splitter, shares in ((self._right, (58, 42)), (self._across, (54, 46))):
            splitter.setChildrenCollapsible(False)
            splitter.setHandleWidth(8)
            splitter.setSizes([share * 20 for share in shares])
        for place, share in enumerate((54, 46)):
            self._across.setStretchFactor(place, share)
        # A window that grows gives the Landscape more to draw on; the Reading's tables need what they need.
        self._right.setStretchFactor(0, 1)
        body = QWidget()
        column = QVBoxLayout(body)
        column.setContentsMargins(10, 0, 10, 4)
        column.setSpacing(4)
        column.addWidget(self.bar)
        column.addWidget(self.message)
        column.addWidget(self._across, 1)
        self.setCentralWidget(body)
        self.setStatusBar(self.status)

    def _handlers(self) -> dict[str, Callable[[], object]]:
        """Who carries out each act of the acts table."""
        from spreadgui.desk import cautions

        return {
            "new": self.files.new,
            "open": self.files.choose,
            "save": self.files.save,
            "save_as": self.files.save_as,
            "quit": self.close,
            "undo": self.workbench.undo,
            "redo": self.workbench.redo,
            "edit_cell": self.positions.edit_current,
            "clear": self.positions.clear_cells,
            "insert_row": self.positions.insert_row,
            "duplicate_rows": self.positions.duplicate_rows,
            "delete_rows": self.positions.delete_rows,
            "go_positions": self.positions.view.setFocus,
            "go_marks": lambda: self._go_to_market("marks"),
            "go_correlations": lambda: self._go_to_market("correlations"),
            "go_blends": lambda: self._go_to_market("blends"),
            "go_landscape": self._go_to_landscape,
            "go_reading": self.reading.setFocus,
            "switch_look": self.switch_look,
            "cautions": lambda: cautions.show_cautions(self),
            "about": lambda: cautions.show_about(self),
        }

    def _join(self) -> None:
        workbench = self.workbench
        workbench.read.connect(self.reading.show_reading)
        workbench.followed.connect(self._on_followed)
        workbench.saved_changed.connect(self._refresh_title)
        workbench.failed.connect(self.message.say)
        workbench.finished.connect(self._settle_message)
        self.files.opened.connect(self.positions.show_from_the_top)
        self.files.moved.connect(self._refresh_title)
        self.files.failed.connect(self.message.say)
        self.files.done.connect(self._on_done)
        self.positions.told.connect(self.status.tell)
        self.bar.told.connect(self.status.tell)
        self.positions.row_changed.connect(self._look_at)
        self.positions.row_changed.connect(self.simulations.cancel)
        self.simulations.progressed.connect(self.reading.simulation.show_progress)
        self.simulations.done.connect(self.reading.show_simulation)
        self.simulations.failed.connect(self.reading.simulation.say)
        self.reading.simulation.cancelled.connect(self.simulations.cancel)
        self.reading.simulation.asked.connect(self._simulate)
        workbench.followed.connect(self.simulations.cancel)
        self._look_at(-1)

    def complete(self) -> None:
        """Bring in the Landscape, begin to price, and look at the first position."""
        from spreadgui.desk.landscape.pane import LandscapePane

        if self.landscape is not None:
            return
        self.landscape = LandscapePane(self.theme)
        self._right.replaceWidget(0, self.landscape)
        self._vacant.deleteLater()
        self._share_height()
        self._bring_in_markets()
        self.landscape.asked.connect(self._ask_again)
        self.workbench.drawn.connect(self.landscape.show_surface)
        self.workbench.drawn.connect(self._late.stop)  # the drawing is the last answer about a row
        if self.positions.view.current_row() < 0:
            self.positions.view.go_to(0, 0)
        self.positions.view.setFocus()
        self.workbench.begin()
        self._ask_again()

    def _bring_in_markets(self) -> None:
        """The markets under Positions: what moves the one is edited in the other."""
        from spreadgui.desk.markets.deck import MarketDeck

        self.markets = MarketDeck(self.workbench, self.theme)
        self.markets.told.connect(self.status.tell)
        height = sum(self._left.sizes())
        self._left.addWidget(self.markets)
        self._left.setStretchFactor(0, 1)
        self._left.setSizes([round(0.58 * height), height - round(0.58 * height)])

    def _share_height(self) -> None:
        """The Reading as high as its tables need, as far as the Landscape keeps the larger part."""
        height = sum(self._right.sizes())
        reading = min(READING_HEIGHT, round(0.46 * height))
        self._right.setSizes([height - reading, reading])

    # --- what is looked at

    @Slot()
    def _ask_again(self) -> None:
        self._look_at(self.positions.view.current_row())

    @Slot(int)
    def _look_at(self, row: int) -> None:
        """The Reading and the Landscape are of this row from now on."""
        if row < 0:
            self.workbench.set_focus(None, None)
            self.reading.show_nothing(NO_ROW)
            if self.landscape is not None:
                self.landscape.show_nothing(NO_ROW)
            return
        self._late.start()
        self.workbench.set_focus(row, None if self.landscape is None else self.landscape.request(row))

    @Slot()
    def _simulate(self) -> None:
        if self.workbench.focus is not None:
            self.simulations.start(self.workbench.slate, self.workbench.focus)

    def _go_to_landscape(self) -> None:
        if self.landscape is not None:
            self.landscape.setFocus()

    def _go_to_market(self, key: str) -> None:
        if self.markets is not None:
            self.markets.go_to(key)

    @Slot()
    def _on_followed(self) -> None:
        self._refresh_title()
        if self.workbench.focus is not None:
            self._late.start()

    @Slot()
    def _fade(self) -> None:
        """What the two panes show still speaks of another row or another book: fade its ink until the answer comes."""
        self.reading.show_waiting()
        if self.landscape is not None:
            self.landscape.show_waiting()

    # --- what is said

    @Slot()
    def _refresh_title(self) -> None:
        book = self.workbench.book
        self.setWindowTitle(f"{book.title or 'Untitled book'}[*] – spreadgui")
        self.setWindowModified(self.workbench.modified)
        self.acts.show_undo(self.workbench.undo_words, self.workbench.redo_words)

    @Slot(str)
    def _on_done(self, sentence: str) -> None:
        self.message.put_away()
        self.status.tell(sentence)

    @Slot()
    def _settle_message(self) -> None:
        """Pricing that works again takes its own message away."""
        failure = self.workbench.last_failure
        over = failure is not None and failure.revision < self.workbench.slate.revision
        if over and failure is not None and self.message.sentence() == failure.sentence:
            self.message.put_away()

    # --- look and end

    def switch_look(self) -> None:
        """The other look, light or dark."""
        from spreadgui.desk.look.icons import renew_icons

        self.theme = self.theme.switched()
        app = QApplication.instance()
        assert isinstance(app, QApplication)
        apply(app, self.theme)
        renew_icons(self, self.theme)
        for pane in (self.positions, self.markets, self.reading, self.landscape):
            if pane is not None:
                pane.set_theme(self.theme)

    def closeEvent(self, event: QCloseEvent) -> None:
        if hasattr(self, "files") and not self.files.may_leave():
            event.ignore()
            return
        self.shut()
        event.accept()

    def shut(self) -> None:
        """End the pricing thread, where it has begun."""
        if hasattr(self, "workbench"):
            self.simulations.close()
            self.workbench.close()


class _AfterPaint(QObject):
    """Calls `act` once, when `widget` has been painted for the first time."""

    def __init__(self, widget: QWidget, act: Callable[[], object]) -> None:
        super().__init__(widget)
        self._act = act
        widget.installEventFilter(self)

    def eventFilter(self, watched: QObject, event: QEvent) -> bool:
        if event.type() == QEvent.Type.Paint:
            watched.removeEventFilter(self)
            QTimer.singleShot(0, self._act)
        return False
