"""Saving is whole or not at all: real failures, a real limit of the disk, and a real kill leave the old file whole."""

from __future__ import annotations

import contextlib
import datetime
import errno
import os
import stat
import subprocess
import sys
import tempfile
import threading
from collections.abc import Iterator
from pathlib import Path

import pytest

from spreadgui.book.reading import read_book
from spreadgui.book.records import Book, Position
from spreadgui.book.writing import book_bytes, write_book, write_whole

NOBODY = 65534  # the number that unprivileged users have by custom; any number above zero would do


def book_of(rows: int) -> Book:
    positions = tuple(Position(f"position {row}", quantity=float(row)) for row in range(rows))
    return Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1), positions=positions)


OLD, NEW = book_of(3), book_of(5)


@contextlib.contextmanager
def umask(mask: int) -> Iterator[None]:
    before = os.umask(mask)
    try:
        yield
    finally:
        os.umask(before)


@contextlib.contextmanager
def folder_of_somebody_without_rights() -> Iterator[Path]:
    """A folder and a process that hold no more rights than its permissions give: root steps down for a while."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        root = os.geteuid() == 0
        if root:
            os.chown(folder, NOBODY, NOBODY)
            os.seteuid(NOBODY)
        try:
            yield folder
        finally:
            folder.chmod(0o700)
            if root:
                os.seteuid(0)


def mode(path: Path) -> int:
    return stat.S_IMODE(path.stat().st_mode)


def test_a_new_file_is_written_and_is_the_only_one(tmp_path: Path) -> None:
    path = tmp_path / "book.json"
    write_book(NEW, path)
    assert read_book(path) == NEW
    assert list(tmp_path.iterdir()) == [path]


def test_a_file_named_without_a_folder_goes_to_the_working_folder(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    write_book(NEW, Path("book.json"))
    assert os.listdir(tmp_path) == ["book.json"]


def test_a_save_over_a_longer_file_leaves_nothing_of_it(tmp_path: Path) -> None:
    path = tmp_path / "book.json"
    write_book(book_of(500), path)
    write_book(OLD, path)
    assert path.read_bytes() == book_bytes(OLD)


@pytest.mark.parametrize("permissions", [0o600, 0o640, 0o664, 0o755])
def test_the_permissions_of_the_file_are_kept(tmp_path: Path, permissions: int) -> None:
    path = tmp_path / "book.json"
    write_book(OLD, path)
    path.chmod(permissions)
    with umask(0o077):
        write_book(NEW, path)
    assert mode(path) == permissions
    assert read_book(path) == NEW


@pytest.mark.parametrize(("mask", "permissions"), [(0o022, 0o644), (0o077, 0o600), (0o002, 0o664)])
def test_a_new_file_has_the_permissions_that_any_new_file_has(tmp_path: Path, mask: int, permissions: int) -> None:
    path = tmp_path / "book.json"
    with umask(mask):
        write_book(NEW, path)
        assert os.umask(mask) == mask
    assert mode(path) == permissions


def test_a_link_stays_a_link_and_the_file_behind_it_changes(tmp_path: Path) -> None:
    (tmp_path / "deep").mkdir()
    target = tmp_path / "deep" / "book.json"
    write_book(OLD, target)
    first, second = tmp_path / "first.json", tmp_path / "second.json"
    first.symlink_to(Path("deep") / "book.json")
    second.symlink_to(first)
    write_book(NEW, second)
    assert first.is_symlink()
    assert second.is_symlink()
    assert not target.is_symlink()
    assert read_book(target) == NEW
    assert sorted(os.listdir(tmp_path)) == ["deep", "first.json", "second.json"]
    assert os.listdir(tmp_path / "deep") == ["book.json"]


def test_a_link_to_a_file_still_absent_makes_that_file(tmp_path: Path) -> None:
    link = tmp_path / "link.json"
    link.symlink_to("later.json")
    write_book(NEW, link)
    assert link.is_symlink()
    assert read_book(tmp_path / "later.json") == NEW


def test_a_link_that_leads_to_itself_is_an_os_error_and_stays(tmp_path: Path) -> None:
    loop = tmp_path / "loop"
    loop.symlink_to(loop)
    with pytest.raises(OSError, match="symbolic links") as caught:
        write_book(NEW, loop)
    assert caught.value.errno == errno.ELOOP
    assert loop.is_symlink()
    assert list(tmp_path.iterdir()) == [loop]


def test_a_name_as_long_as_the_disk_takes_is_saved(tmp_path: Path) -> None:
    path = tmp_path / ("n" * 250 + ".json")
    write_book(NEW, path)
    write_book(OLD, path)
    assert read_book(path) == OLD
    path = tmp_path / ("ž" * 120 + ".json")
    write_book(OLD, path)
    assert read_book(path) == OLD


def test_a_folder_in_the_way_is_an_os_error_and_leaves_no_litter(tmp_path: Path) -> None:
    (tmp_path / "book.json").mkdir()
    with pytest.raises(IsADirectoryError):
        write_book(NEW, tmp_path / "book.json")
    with pytest.raises(FileNotFoundError):
        write_book(NEW, tmp_path / "absent" / "book.json")
    assert os.listdir(tmp_path) == ["book.json"]
    assert os.listdir(tmp_path / "book.json") == []


def test_a_folder_that_may_not_be_written_leaves_the_old_file_whole() -> None:
    with folder_of_somebody_without_rights() as folder:
        path = folder / "book.json"
        write_book(OLD, path)
        folder.chmod(0o500)
        with pytest.raises(PermissionError):
            write_book(NEW, path)
        assert read_book(path) == OLD
        assert list(folder.iterdir()) == [path]


def test_a_file_set_to_be_only_read_is_not_replaced() -> None:
    with folder_of_somebody_without_rights() as folder:
        path = folder / "book.json"
        write_book(OLD, path)
        path.chmod(0o444)
        with pytest.raises(PermissionError):
            write_book(NEW, path)
        assert read_book(path) == OLD
        assert mode(path) == 0o444
        assert list(folder.iterdir()) == [path]


def test_a_pipe_is_written_to_and_stays_a_pipe(tmp_path: Path) -> None:
    pipe = tmp_path / "pipe"
    os.mkfifo(pipe)
    came: list[bytes] = []
    reader = threading.Thread(target=lambda: came.append(pipe.read_bytes()))
    reader.start()
    write_whole(pipe, b"name,side\n")
    reader.join()
    assert came == [b"name,side\n"]
    assert stat.S_ISFIFO(pipe.stat().st_mode)
    assert list(tmp_path.iterdir()) == [pipe]


# The limit on a file's size is the kernel's, so the write fails in the middle just as on a full disk.
_DISK_TOO_SMALL = """
import datetime, resource, signal, sys
from pathlib import Path
from spreadgui.book.records import Book, Position
from spreadgui.book.writing import book_bytes, write_book
path = Path(sys.argv[1])
positions = tuple(Position(f"position {row}", quantity=float(row)) for row in range(5000))
book = Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1), positions=positions)
assert len(book_bytes(book)) > 3 * 65536
signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
resource.setrlimit(resource.RLIMIT_FSIZE, (65536, 65536))
try:
    write_book(book, path)
except OSError as error:
    print(error.errno)
"""


@pytest.mark.parametrize("old", [OLD, None])
def test_a_disk_that_fills_up_leaves_the_old_file_whole_and_no_litter(tmp_path: Path, old: Book | None) -> None:
    path = tmp_path / "book.json"
    if old is not None:
        write_book(old, path)
    ran = subprocess.run(
        [sys.executable, "-c", _DISK_TOO_SMALL, path], capture_output=True, text=True, check=True, timeout=120
    )
    assert ran.stdout.strip() == str(errno.EFBIG)
    if old is None:
        assert os.listdir(tmp_path) == []
    else:
        assert read_book(path) == old
        assert list(tmp_path.iterdir()) == [path]


# One process imports once and forks the savers, for 20 fresh interpreters would take the test's time.
_KILLED_SAVERS = """
import datetime, os, random, signal, sys, time
from pathlib import Path
from spreadgui.book.reading import read_book
from spreadgui.book.records import Book, Position
from spreadgui.book.writing import write_book
path = Path(sys.argv[1])
def book_of(rows):
    positions = tuple(Position(f"position {row}", quantity=float(row)) for row in range(rows))
    return Book(title="", currency="CRN", valuation_date=datetime.date(2026, 12, 1), positions=positions)
books = [book_of(2000), book_of(1500)]
write_book(books[0], path)
rest = random.Random(20261201)
seen = []
for _ in range(20):
    out, started = os.pipe()
    child = os.fork()
    if child == 0:
        saves = 0
        while True:
            write_book(books[saves % 2], path)
            saves += 1
            if saves == 1:
                os.write(started, b"x")
    os.read(out, 1)
    time.sleep(rest.uniform(0.0, 0.03))
    os.kill(child, signal.SIGKILL)
    _, status = os.waitpid(child, 0)
    assert os.WTERMSIG(status) == signal.SIGKILL
    os.close(out)
    os.close(started)
    seen.append(books.index(read_book(path)))
print(len(seen), *sorted(set(seen)))
"""


def test_a_kill_in_the_middle_of_saving_leaves_one_of_the_two_books_whole(tmp_path: Path) -> None:
    path = tmp_path / "book.json"
    ran = subprocess.run(
        [sys.executable, "-c", _KILLED_SAVERS, path], capture_output=True, text=True, timeout=120, check=False
    )
    assert ran.stderr == ""
    kills, *books_seen = ran.stdout.split()
    assert kills == "20"
    assert set(books_seen) <= {"0", "1"}
    left = [name for name in os.listdir(tmp_path) if name != "book.json"]
    assert all(name.startswith(".book.json.") and name.endswith(".new") for name in left)
    write_book(OLD, path)
    assert read_book(path) == OLD
