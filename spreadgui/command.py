"""The command line: the window, and the same work without one.

Bad input gives one line on stderr for each fault, exit status 2, and nothing is written.
"""

from __future__ import annotations

import argparse
import datetime
import os
import sys
from collections.abc import Callable, Iterable, Sequence
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import NoReturn, TypeVar

import msgspec

import spreadgui
from spreadgui import shipped
from spreadgui.book.entries import EntryError, quoted
from spreadgui.book.entries import date as read_date
from spreadgui.book.faults import BookError, Fault
from spreadgui.book.loading import load
from spreadgui.book.reading import read_book
from spreadgui.book.records import Book

Result = TypeVar("Result")

# A second thread takes a third off a large book; more would wait for one another.
_HANDS = 2
CLEAN, FAULTY, BROKEN = 0, 2, 3
_NO_SCREEN = (
    "spreadgui: there is no display to open a window on; without one, try "
    "`spreadgui value BOOK --csv -` or `spreadgui picture BOOK --png FILE`"
)


class CommandError(Exception):
    """The command cannot do what it was asked; the message is one line for the user."""


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command; gives the exit status."""
    given = list(sys.argv[1:] if arguments is None else arguments)
    try:
        return _dispatch(given)
    except BookError as error:
        _tell(str(fault) for fault in error.faults)
    except CommandError as error:
        _tell([f"spreadgui: {error}"])
    except BrokenPipeError:
        # The reader of our output has gone; Python must not stumble over that again when it closes stdout.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 1
    except KeyboardInterrupt:
        return 130
    except Exception as error:
        if sys.flags.dev_mode:
            raise
        _tell([f"spreadgui: a fault of this program, not of your input: {type(error).__name__}: {error}"])
        return BROKEN
    return FAULTY


def _dispatch(given: list[str]) -> int:
    commands: dict[str, Callable[[list[str]], int]] = {"value": _value, "check": _check, "picture": _picture}
    if given and given[0] in commands:
        return commands[given[0]](given[1:])
    return _window(given)


class _Parser(argparse.ArgumentParser):
    """Tells a wrong argument in one line, as everything else is told; the usage is in --help."""

    def error(self, message: str) -> NoReturn:
        self.exit(FAULTY, f"{self.prog}: {message} (see {self.prog} --help)\n")


def _parser(name: str, about: str) -> argparse.ArgumentParser:
    return _Parser(prog=name, description=about, allow_abbrev=False)


def _window(given: list[str]) -> int:
    parser = _parser("spreadgui", "Opens the window on a book; without one, on the demo book.")
    parser.epilog = (
        "Without a window: spreadgui value BOOK|POSITIONS.csv, spreadgui check BOOK, "
        "spreadgui picture BOOK --png FILE; each explains itself with --help."
    )
    parser.add_argument("book", nargs="?", metavar="BOOK")
    parser.add_argument("--version", action="version", version=f"spreadgui {spreadgui.__version__}")
    options = parser.parse_args(given)
    path = Path(options.book) if options.book else shipped.sample_book("ardenmoor_winter")
    if not _has_display():
        _placed(path, lambda: load(path, datetime.date.today()))  # a wrong path is told of here as well
        sys.stderr.write(_NO_SCREEN + "\n")
        return CLEAN
    from spreadgui.desk.program import run_window

    return run_window(path, demo=options.book is None)


def _has_display() -> bool:
    if sys.platform in ("win32", "darwin") or os.environ.get("QT_QPA_PLATFORM"):
        return True
    return bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))


def _value(given: list[str]) -> int:
    parser = _parser("spreadgui value", "Values every position of a book, or of a CSV file of positions.")
    parser.add_argument("book", metavar="BOOK|POSITIONS.csv", type=Path)
    parser.add_argument("--date", metavar="YYYY-MM-DD", help="the valuation date, instead of the book's (or of today)")
    parser.add_argument("--csv", metavar="FILE|-", help="write one line a position; - for standard output")
    parser.add_argument("--json", metavar="FILE|-", help="write the same as JSON; - for standard output")
    options = parser.parse_args(given)
    if options.csv == "-" == options.json:
        raise CommandError("only one of --csv and --json can go to standard output")
    for option, target in (("--csv", options.csv), ("--json", options.json)):
        _spare(options.book, option, target)
    book = _book_to_value(options.book, options.date)
    from spreadgui.valuation import table

    with ThreadPoolExecutor(_HANDS) as hands:
        valued = table.value_book(book, hands)
    if options.csv is None and options.json is None:
        _print(table.summary_text(valued))
    if options.csv is not None:
        _put(options.csv, table.csv_text(valued))
    if options.json is not None:
        _put(options.json, table.json_text(valued))
    return CLEAN


def _book_to_value(path: Path, date: str | None) -> Book:
    day = _day(date)
    book = _placed(path, lambda: load(path, day or datetime.date.today()))
    return book if day is None else msgspec.structs.replace(book, valuation_date=day)


def _day(text: str | None) -> datetime.date | None:
    if text is None:
        return None
    try:
        return read_date(text)
    except EntryError as error:
        raise CommandError(f"--date: {error}") from None


def _check(given: list[str]) -> int:
    parser = _parser("spreadgui check", "Tells every fault of a book as `where: what`.")
    parser.add_argument("book", metavar="BOOK", type=Path)
    options = parser.parse_args(given)
    book = _placed(options.book, lambda: read_book(options.book))
    from spreadgui.market.check import faults_of

    faults = faults_of(book)
    for fault in faults:
        _print(str(fault))
    if not faults:
        _print(f"{options.book}: no fault in {len(book.positions)} positions and {len(book.markets)} markets")
    return FAULTY if faults else CLEAN


def _picture(given: list[str]) -> int:
    parser = _parser("spreadgui picture", "Draws the whole window on a book into a PNG file, without a screen.")
    parser.add_argument("book", metavar="BOOK", type=Path)
    parser.add_argument("--png", metavar="FILE", type=Path, required=True)
    parser.add_argument("--size", metavar="WxH", default="1600x1000", help="in pixels (default 1600x1000)")
    parser.add_argument("--dark", action="store_true", help="the dark look instead of the light one")
    parser.add_argument("--row", metavar="N", type=int, default=1, help="the position that is looked at (default 1)")
    options = parser.parse_args(given)
    width, height = _size(options.size)
    _spare(options.book, "--png", str(options.png))
    book = _placed(options.book, lambda: read_book(options.book))
    if not 1 <= options.row <= max(1, len(book.positions)):
        raise CommandError(f"--row: expected a number from 1 to {len(book.positions)}, got {options.row}")
    os.environ["QT_QPA_PLATFORM"] = "offscreen"
    from spreadgui.desk.picture import draw_window

    png = draw_window(book, options.book, width, height, dark=options.dark, row=options.row - 1)
    _write(options.png, png)
    return CLEAN


def _size(text: str) -> tuple[int, int]:
    parts = text.lower().split("x")
    if len(parts) == 2 and all(part.isascii() and part.isdigit() for part in parts):
        width, height = int(parts[0]), int(parts[1])
        if 320 <= width <= 8000 and 200 <= height <= 8000:
            return width, height
    raise CommandError(f"--size: expected WIDTHxHEIGHT from 320x200 to 8000x8000, got {quoted(text)}")


def _placed(path: Path, read: Callable[[], Result]) -> Result:
    """What `read` gives; a fault without a place of its own gets the path for one."""
    try:
        return read()
    except BookError as error:
        raise BookError(fault if fault.where else Fault(str(path), fault.what) for fault in error.faults) from None


def _spare(book: Path, option: str, target: str | None) -> None:
    """Refuse to write over the very file that is read."""
    if target not in (None, "-") and os.path.realpath(str(target)) == os.path.realpath(book):
        raise CommandError(f"{option}: {target} is the book itself, and would be lost")


def _put(target: str, text: str) -> None:
    if target == "-":
        _print(text, end="")
    else:
        _write(Path(target), text.encode())


def _write(path: Path, data: bytes) -> None:
    from spreadgui.book.writing import write_whole

    try:
        write_whole(path, data)
    except OSError as error:
        raise CommandError(f"{path}: cannot be written: {error.strerror or error}") from None


def _print(text: str, end: str = "\n") -> None:
    if sys.stdout is None:  # started with standard output closed
        raise CommandError("there is no standard output to write to")
    sys.stdout.write(text + end)
    sys.stdout.flush()


def _tell(lines: Iterable[str]) -> None:
    for line in lines if sys.stderr is not None else ():
        sys.stderr.write(f"{line}\n")
