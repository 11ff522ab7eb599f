"""The acts table: everything a user can do by menu, key or button, each declared once.

Menus, the tool bar, tooltips and the tests read this table. A new act is one entry here and one handler of its id where
the window joins them (`window.handlers`).
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Act:
    """One act: its menu, whether the tool bar has it (`on_bar`), whether a divider goes before it (`parted`).

    The key of a `grid_only` act works while the keyboard is in the grid: elsewhere it would change cells unseen.
    """

    id: str
    words: str
    menu: str
    help: str
    keys: str = ""
    icon: str = ""
    on_bar: bool = False
    parted: bool = False
    grid_only: bool = False


MENUS = ("Book", "Edit", "View", "Help")

ACTS: tuple[Act, ...] = (
    Act("new", "New book", "Book", "Start an empty book with the markets and marks of this one.", "Ctrl+N", "new"),
    Act("open", "Open…", "Book", "Open a book, or a CSV list of positions.", "Ctrl+O", "open", on_bar=True),
    Act("save", "Save", "Book", "Write the book to its file.", "Ctrl+S", "save", on_bar=True),
    Act("save_as", "Save as…", "Book", "Write the book to another file.", "Ctrl+Shift+S", "save-as"),
    Act("quit", "Quit", "Book", "Close the window.", "Ctrl+Q", parted=True),
    Act("undo", "Undo", "Edit", "Take the last change back.", "Ctrl+Z", "undo", on_bar=True, parted=True),
    Act("redo", "Redo", "Edit", "Make the last undone change again.", "Ctrl+Shift+Z", "redo", on_bar=True),
    Act("edit_cell", "Edit cell", "Edit", "Change the current cell.", "F2", parted=True, grid_only=True),
    Act("clear", "Clear cells", "Edit", "Empty the selected cells; own marks return to Marks.", "Delete",
        grid_only=True),
    Act("insert_row", "Insert row", "Edit", "A new position under the current one.", "Ctrl+I", "insert-row",
        on_bar=True, parted=True),
    Act("duplicate_rows", "Duplicate rows", "Edit", "The selected positions once more.", "Ctrl+D", "duplicate-row",
        on_bar=True),
    Act("delete_rows", "Delete rows", "Edit", "Take the selected positions out.", "Ctrl+Backspace", "delete-row",
        on_bar=True),
    Act("go_positions", "Go to Positions", "View", "Put the keyboard into the grid.", "Ctrl+1"),
    Act("go_marks", "Go to Marks", "View", "Put the keyboard into the marks.", "Ctrl+4"),
    Act("go_correlations", "Go to Correlations", "View", "Put the keyboard into the correlations.", "Ctrl+5"),
    Act("go_blends", "Go to Blends", "View", "Put the keyboard into the blends.", "Ctrl+6"),
    Act("go_landscape", "Go to Landscape", "View", "Put the keyboard into the Landscape.", "Ctrl+2"),
    Act("go_reading", "Go to Reading", "View", "Put the keyboard into the Reading.", "Ctrl+3"),
    Act("switch_look", "Light or dark", "View", "Switch between the light and the dark look.", "Ctrl+L", "theme-dark",
        parted=True),
    Act("cautions", "Model cautions", "Help", "What these values are, and what they are not.", "F1", "warning"),
    Act("about", "About spreadgui", "Help", "The version of this program.", icon="about"),
)  # fmt: skip
