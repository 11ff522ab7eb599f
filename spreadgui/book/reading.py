"""From a file to a book, or to every fault that stands in the way."""

from __future__ import annotations

import codecs
import json
import re
from pathlib import Path
from typing import Any, Literal

import msgspec

from spreadgui.book import shape
from spreadgui.book.entries import shown
from spreadgui.book.faults import BookError, Fault
from spreadgui.book.records import FORMAT, VERSION, Book

# A book of a million positions is a tenth of this; anything longer is some other file chosen by mistake.
LARGEST_FILE = 256 * 2**20
MOST_FAULTS = 200

_BREAKS_OFF = "the file breaks off before the book ends"
# What may be left of a value where a file was cut in the middle of it.
_CUT_VALUE = re.compile(r"|t(ru?)?|f(a(ls?)?)?|n(ul?)?|-|\.|[eE][+-]?")


class _Head(msgspec.Struct):
    """What a file must say of itself before the rest is looked at; in a record it could be left to its default."""

    format: Literal["spreadgui book"]
    version: int


def read_book(path: Path) -> Book:
    """The book in the file at `path`.

    Raises BookError with every fault when the file cannot be read, is no book of ours, or is not whole.
    """
    return parse_book(read_bytes(path))


def read_bytes(path: Path) -> bytes:
    """The bytes of a file, or BookError saying why it cannot be had."""
    try:
        if path.is_dir():
            raise _refusal("this is a folder, not a file")
        with path.open("rb") as stream:
            data = stream.read(LARGEST_FILE + 1)  # not by its stated size: a device states none and never ends
    except FileNotFoundError:
        raise _refusal("there is no such file") from None
    except (OSError, ValueError) as error:
        raise _refusal(f"the file cannot be read: {getattr(error, 'strerror', None) or error}") from None
    if len(data) > LARGEST_FILE:
        raise _refusal(f"the file is larger than {LARGEST_FILE // 2**20} MiB, which no book is")
    return data


def parse_book(data: bytes) -> Book:
    """The book written in `data` (JSON in UTF-8); raises BookError with every fault otherwise."""
    data = data.removeprefix(codecs.BOM_UTF8)
    if not data.strip():
        raise _refusal("the file is empty")
    try:
        msgspec.json.decode(data, type=_Head)
        book = msgspec.json.decode(data, type=Book)
    except (msgspec.DecodeError, RecursionError, UnicodeDecodeError):
        raise _explain(data) from None
    if book.version > VERSION:
        raise _too_new(book.version)
    if book.version < 1:
        raise BookError(_version_faults(book.version))
    return _of_this_version(book)


def _of_this_version(book: Book) -> Book:
    """A book of an earlier version: all that has come since has a default that means what was meant then."""
    return book if book.version == VERSION else msgspec.structs.replace(book, version=VERSION)


def _explain(data: bytes) -> BookError:
    """Why msgspec would not take `data`: its syntax, another kind of file, a newer one, or each wrong entry.

    The standard library's reader is used here because it takes numbers out of range, so that the walk can name them.
    """
    try:
        return _explain_entries(json.loads(data.decode(), object_pairs_hook=shape.WrittenObject))
    except UnicodeDecodeError as error:
        if error.reason == "unexpected end of data":
            return BookError([Fault(_place(data, error.start), _BREAKS_OFF)])
        return BookError([Fault(_place(data, error.start), "this is not text in UTF-8, so not a book")])
    except RecursionError:
        return _refusal("the file is nested deeper than any book")
    except json.JSONDecodeError as error:
        return BookError([_syntax_fault(error)])
    except ValueError:
        return _refusal("the file holds a number with more digits than any machine reads")


def _explain_entries(raw: Any) -> BookError:
    if not isinstance(raw, dict) or raw.get("format") != FORMAT:
        return _refusal(f'this is not a book of this program: it does not say "format": "{FORMAT}"')
    version = raw.get("version")
    if isinstance(version, int) and not isinstance(version, bool) and version > VERSION:
        return _too_new(version)
    missing = [] if "version" in raw else [Fault("version", "is missing")]
    found = [*missing, *_version_faults(version), *shape.faults(raw, Book)]
    if len(found) > MOST_FAULTS:
        found = [*found[:MOST_FAULTS], Fault("", f"and {len(found) - MOST_FAULTS} more faults of this kind")]
    return BookError(found or [Fault("", "the file cannot be taken as a book")])


def _syntax_fault(error: json.JSONDecodeError) -> Fault:
    where = f"line {error.lineno}, column {error.colno}"
    if "\0" in error.doc:
        return Fault("", "this is not text, so not a book")
    tail = error.doc.rstrip()[error.pos :]
    in_escape = error.msg.startswith("Invalid \\u") and len(tail) < len("\\uXXXX")
    if _CUT_VALUE.fullmatch(tail) or in_escape or error.msg.startswith("Unterminated string"):
        return Fault(where, _BREAKS_OFF)
    return Fault(where, f"the text is not JSON: {error.msg[0].lower()}{error.msg[1:]}")


def _place(data: bytes, offset: int) -> str:
    before = data[:offset]
    line = before.count(b"\n") + 1
    line_start = before.rfind(b"\n") + 1
    return f"line {line}, column {offset - line_start + 1}"


def _version_faults(version: Any) -> list[Fault]:
    if isinstance(version, int) and not isinstance(version, bool) and version < 1:
        return [Fault("version", f"expected a whole number from 1, got {shown(version)}")]
    return []


def _too_new(version: int) -> BookError:
    return _refusal(
        f"this book is of version {shown(version)}, written by a newer program; this one reads up to version {VERSION}"
    )


def _refusal(what: str) -> BookError:
    return BookError([Fault("", what)])
