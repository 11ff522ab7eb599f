"""From a book to its file: the same book is always the same bytes, and the old file stays whole until the new one is.

Every record stands on a line of its own and every key in the order of its declaration, so that two saves differ only
in the lines where the book does.
"""

from __future__ import annotations

import contextlib
import errno
import functools
import os
import tempfile
import typing
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import msgspec

from spreadgui.book.records import Book

_encode = msgspec.json.Encoder().encode


def book_bytes(book: Book) -> bytes:
    """The file's content for `book`, in UTF-8, ending with a line break."""
    return b"\n".join(_lines(book, "")) + b"\n"


def write_book(book: Book, path: Path) -> None:
    """Put `book` in the file at `path`, whole or not at all.

    The content goes to a new file in the same folder, to the disk, and only then under the name. Raises OSError when
    the folder or the disk refuses, and ValueError when the book holds what its file cannot give back (NaN, infinity,
    half a character pair); the file that was there is then untouched.
    """
    data = book_bytes(book)
    if not _gives_back(data, book):
        raise ValueError("the book holds a value that its file could not give back")
    write_whole(path, data)


def _gives_back(data: bytes, book: Book) -> bool:
    try:
        return msgspec.json.decode(data, type=Book) == book
    except msgspec.DecodeError:
        return False


def write_whole(path: Path, data: bytes) -> None:
    """Put `data` in the file at `path`, whole or not at all; a link is followed, the file's permissions are kept.

    Raises OSError as a plain write would: also for a file that is set to be only read. A pipe or a device is written
    to as it stands, for putting a file in its place would take it from everybody.
    """
    if path.exists() and not path.is_file() and not path.is_dir():
        path.write_bytes(data)
        return
    target = Path(os.path.realpath(path))
    if target.is_symlink():
        raise OSError(errno.ELOOP, os.strerror(errno.ELOOP), str(path))
    if target.exists() and not os.access(target, os.W_OK, effective_ids=os.access in os.supports_effective_ids):
        raise PermissionError(errno.EACCES, os.strerror(errno.EACCES), str(path))
    # The start of the name tells whose it is; the whole of it could be too long with the rest.
    handle, name = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name[:16]}.", suffix=".new")
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(name, _permissions(target))
        os.replace(name, target)
    except BaseException:
        with contextlib.suppress(OSError):
            os.unlink(name)
        raise
    _settle_folder(target.parent)


def _permissions(target: Path) -> int:
    try:
        return target.stat().st_mode & 0o777
    except FileNotFoundError:
        mask = os.umask(0)
        os.umask(mask)
        return 0o666 & ~mask


def _settle_folder(folder: Path) -> None:
    # Only this makes the new name survive a power cut; where a system cannot open a folder, the name is safe enough.
    with contextlib.suppress(OSError):
        handle = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)


def _lines(record: msgspec.Struct, indent: str) -> Iterator[bytes]:
    """The record opened up: one line an entry, and lists of records one line a record."""
    entries = list(_entries(record))
    yield indent.encode() + b"{"
    for index, (key, value) in enumerate(entries):
        comma = b"," if index + 1 < len(entries) else b""
        opening = f'{indent}  "{key}": '.encode()
        if _is_of_records(value):
            yield opening + b"["
            yield from _items(value, indent + "    ")
            yield f"{indent}  ]".encode() + comma
        else:
            yield opening + msgspec.json.format(_encode(value), indent=0) + comma
    yield indent.encode() + b"}"


def _items(records: tuple[msgspec.Struct, ...], indent: str) -> Iterator[bytes]:
    for index, record in enumerate(records):
        comma = b"," if index + 1 < len(records) else b""
        if _holds_records(type(record)) and any(_is_of_records(value) for _, value in _entries(record)):
            *opened, last = _lines(record, indent)
            yield from opened
            yield last + comma
        else:
            yield indent.encode() + msgspec.json.format(_encode(record), indent=0) + comma


def _is_of_records(value: object) -> bool:
    """Whether an entry is opened up, a line for each of its records; a list of days stays on one."""
    return isinstance(value, tuple) and all(isinstance(item, msgspec.Struct) for item in value)


def _entries(record: msgspec.Struct) -> Iterator[tuple[str, Any]]:
    omit = record.__struct_config__.omit_defaults
    for field in _fields(type(record)):
        value = getattr(record, field.name)
        if not (omit and value == field.default):
            yield field.encode_name, value


@functools.cache
def _fields(record: type[msgspec.Struct]) -> tuple[msgspec.structs.FieldInfo, ...]:
    return msgspec.structs.fields(record)


@functools.cache
def _holds_records(record: type[msgspec.Struct]) -> bool:
    return any(typing.get_origin(hint) is tuple for hint in typing.get_type_hints(record).values())
