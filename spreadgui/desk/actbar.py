"""Menus and tool bar, made from the acts table."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path

from PySide6.QtCore import QObject, Qt, Slot
from PySide6.QtGui import QAction
from PySide6.QtWidgets import QMainWindow, QMenu, QToolBar, QWidget

from spreadgui.desk.acts import ACTS, MENUS, Act
from spreadgui.desk.files import BookFiles
from spreadgui.desk.look.icons import set_icon
from spreadgui.desk.look.theme import Theme


class ActBar(QObject):
    """The acts of a window as actions, by id: in its menus, on its tool bar, at their keys.

    `handlers` carry the acts out; the keys of grid-only acts work within `grid`.
    """

    def __init__(
        self,
        window: QMainWindow,
        handlers: Mapping[str, Callable[[], object]],
        files: BookFiles,
        grid: QWidget,
        theme: Theme,
    ) -> None:
        super().__init__(window)
        self._files = files
        self.actions = {act.id: _action(act, handlers[act.id], theme, window) for act in ACTS}
        for act in ACTS:
            if act.grid_only:
                self.actions[act.id].setShortcutContext(Qt.ShortcutContext.WidgetWithChildrenShortcut)
                grid.addAction(self.actions[act.id])
        self._recent = QMenu("Recent books", window)
        self._recent.aboutToShow.connect(self._fill_recent)
        window.addToolBar(self._make_bar())
        self._fill_menus(window)

    def show_undo(self, undo: str | None, redo: str | None) -> None:
        """Tell what undo and redo would do, None where there is nothing."""
        for act, words in (("undo", undo), ("redo", redo)):
            verb, action = act.capitalize(), self.actions[act]
            action.setEnabled(words is not None)
            action.setToolTip(f"{verb}: {words}" if words else f"Nothing to {act}")

    def _make_bar(self) -> QToolBar:
        bar = QToolBar("Acts")
        bar.setMovable(False)
        bar.setToolButtonStyle(Qt.ToolButtonStyle.ToolButtonTextBesideIcon)
        bar.setContextMenuPolicy(Qt.ContextMenuPolicy.PreventContextMenu)
        for act in (act for act in ACTS if act.on_bar):
            if act.parted:
                bar.addSeparator()
            bar.addAction(self.actions[act.id])
        return bar

    def _fill_menus(self, window: QMainWindow) -> None:
        menus = {words: window.menuBar().addMenu(words) for words in MENUS}
        for act in ACTS:
            if act.parted:
                menus[act.menu].addSeparator()
            menus[act.menu].addAction(self.actions[act.id])
            if act.id == "open":
                menus[act.menu].addMenu(self._recent)

    @Slot()
    def _fill_recent(self) -> None:
        self._recent.clear()
        for path in self._files.recent():
            self._add_recent(path)
        if self._recent.isEmpty():
            self._recent.addAction("None yet").setEnabled(False)

    def _add_recent(self, path: Path) -> None:
        action = self._recent.addAction(path.name)
        action.setToolTip(str(path))
        action.triggered.connect(lambda: self._files.open_asking(path))


def _action(act: Act, handler: Callable[[], object], theme: Theme, parent: QObject) -> QAction:
    action = QAction(act.words, parent)
    action.setShortcut(act.keys)
    action.setToolTip(f"{act.help}  {act.keys}".strip())
    action.setStatusTip(act.help)
    action.triggered.connect(handler)
    if act.icon:
        set_icon(action, act.icon, theme)
    return action
