"""The session against a plain list of books: whatever is done and undone, the two agree."""

from __future__ import annotations

import datetime
from dataclasses import dataclass

import pytest
from hypothesis import HealthCheck, settings
from hypothesis import strategies as st
from hypothesis.stateful import RuleBasedStateMachine, invariant, precondition, rule

from spreadgui.book.changes import Change, insert_rows, remove_rows, set_book, set_fields
from spreadgui.book.records import Book, Position
from spreadgui.book.session import BookSession


def book_of(*names: str) -> Book:
    return Book(
        title="",
        currency="CRN",
        valuation_date=datetime.date(2026, 12, 1),
        positions=tuple(Position(name) for name in names),
    )


@dataclass(frozen=True)
class Failing:
    """A change that raises, as one made for another book would."""

    words: str = "fail"

    def apply(self, book: Book) -> Book:
        raise IndexError(len(book.positions))

    def inverse(self) -> Change:
        return self


class SessionAgainstAList(RuleBasedStateMachine):
    """The model: every book since the opening in a list, a place in it, and the place that was saved."""

    def __init__(self) -> None:
        super().__init__()
        start = book_of("a", "b")
        self.session = BookSession(start)
        self.history = [start]
        self.words: list[str] = []
        self.at = 0
        self.saved: int | None = 0
        self.revision = self.session.revision
        self.told = 0
        self.expected_told = 0
        self.session.subscribe(self.listen)

    def listen(self) -> None:
        self.told += 1

    def moved(self) -> None:
        self.revision += 1
        self.expected_told += 1

    def make(self, change: Change, after: Book) -> None:
        self.session.apply(change)
        if self.saved is not None and self.saved > self.at:
            self.saved = None
        del self.history[self.at + 1 :], self.words[self.at :]
        self.history.append(after)
        self.words.append(change.words)
        self.at += 1
        self.moved()

    def with_positions(self, positions: list[Position]) -> Book:
        now = self.history[self.at]
        return Book(
            title=now.title, currency="CRN", valuation_date=datetime.date(2026, 12, 1), positions=tuple(positions)
        )

    def rows(self) -> list[Position]:
        return list(self.history[self.at].positions)

    @precondition(lambda self: self.rows())
    @rule(data=st.data(), strike=st.floats(-9, 9))
    def set_strike(self, data: st.DataObject, strike: float) -> None:
        rows = self.rows()
        row = data.draw(st.integers(0, len(rows) - 1))
        rows[row] = Position(rows[row].name, strike=strike)
        self.make(
            set_fields(self.session.book, {row: {"strike": strike}}, f"strike {strike}"), self.with_positions(rows)
        )

    @rule(data=st.data(), names=st.text("xyz", min_size=1, max_size=3))
    def insert(self, data: st.DataObject, names: str) -> None:
        rows = self.rows()
        at = data.draw(st.integers(0, len(rows)))
        new = [Position(name) for name in names]
        rows[at:at] = new
        self.make(insert_rows(self.session.book, at, new, f"insert {names}"), self.with_positions(rows))

    @precondition(lambda self: self.rows())
    @rule(data=st.data())
    def remove(self, data: st.DataObject) -> None:
        rows = self.rows()
        gone = data.draw(st.sets(st.integers(0, len(rows) - 1), min_size=1, max_size=3))
        kept = [position for row, position in enumerate(rows) if row not in gone]
        self.make(remove_rows(self.session.book, list(gone), f"remove {len(gone)}"), self.with_positions(kept))

    @rule(title=st.text("tT", max_size=3))
    def retitle(self, title: str) -> None:
        change = set_book(self.session.book, "title", title, f"title {title}")
        now = self.history[self.at]
        after = Book(title=title, currency="CRN", valuation_date=now.valuation_date, positions=now.positions)
        self.make(change, after)

    @rule()
    def undo(self) -> None:
        self.session.undo()
        if self.at:
            self.at -= 1
            self.moved()

    @rule()
    def redo(self) -> None:
        self.session.redo()
        if self.at + 1 < len(self.history):
            self.at += 1
            self.moved()

    @rule()
    def save(self) -> None:
        self.session.mark_saved()
        self.saved = self.at
        self.expected_told += 1

    @rule(names=st.text("pq", max_size=3))
    def open(self, names: str) -> None:
        book = book_of(*names)
        self.session.open(book)
        self.history, self.words, self.at, self.saved = [book], [], 0, 0
        self.moved()

    @rule()
    def fail(self) -> None:
        with pytest.raises(IndexError):
            self.session.apply(Failing())

    @invariant()
    def agrees(self) -> None:
        assert self.session.book == self.history[self.at]
        assert self.session.revision == self.revision
        assert self.session.modified == (self.saved != self.at)
        assert self.session.undo_words == (self.words[self.at - 1] if self.at else None)
        assert self.session.redo_words == (self.words[self.at] if self.at < len(self.words) else None)
        assert self.told == self.expected_told


SessionAgainstAList.TestCase.settings = settings(
    deadline=None, max_examples=40, stateful_step_count=25, suppress_health_check=[HealthCheck.too_slow]
)
TestSessionAgainstAList = SessionAgainstAList.TestCase


def edit(session: BookSession, strike: float) -> None:
    session.apply(set_fields(session.book, {0: {"strike": strike}}, f"set strike {strike:g}"))


def test_the_revision_never_comes_back_through_undo_redo_or_opening() -> None:
    session = BookSession(book_of("a"))
    seen = [session.revision]
    for act in (lambda: edit(session, 1.0), session.undo, session.redo, lambda: session.open(book_of("b"))):
        act()
        seen.append(session.revision)
    assert seen == [seen[0] + step for step in range(5)]


def test_nothing_happens_where_there_is_nothing_to_undo_or_redo() -> None:
    session = BookSession(book_of("a"))
    heard: list[int] = []
    session.subscribe(lambda: heard.append(session.revision))
    before = session.revision
    session.undo()
    session.redo()
    assert session.revision == before
    assert heard == []
    assert not session.modified


def test_undo_back_to_the_saved_book_is_unmodified_again() -> None:
    session = BookSession(book_of("a"))
    edit(session, 1.0)
    session.mark_saved()
    edit(session, 2.0)
    assert session.modified
    session.undo()
    assert not session.modified
    session.undo()
    assert session.modified
    session.redo()
    assert not session.modified


def test_a_new_edit_after_save_and_undo_stays_modified_however_far_one_goes_back() -> None:
    session = BookSession(book_of("a"))
    edit(session, 1.0)
    session.mark_saved()
    session.undo()
    edit(session, 2.0)  # as many changes as when saved, yet another book
    assert session.modified
    session.undo()
    assert session.modified
    session.redo()
    assert session.modified
    session.mark_saved()
    assert not session.modified


def test_a_change_that_raises_leaves_book_history_and_listeners_as_they_were() -> None:
    session = BookSession(book_of("a"))
    edit(session, 1.0)
    edit(session, 2.0)
    session.undo()
    session.mark_saved()
    heard: list[int] = []
    session.subscribe(lambda: heard.append(session.revision))
    before = (session.book, session.revision, session.modified, session.undo_words, session.redo_words)
    with pytest.raises(IndexError):
        session.apply(Failing())
    assert (session.book, session.revision, session.modified, session.undo_words, session.redo_words) == before
    assert heard == []
    session.redo()
    assert session.book.positions[0].strike == 2.0


def test_every_listener_hears_of_each_change_when_the_session_has_already_become_it() -> None:
    session = BookSession(book_of("a"))
    heard: list[tuple[str, float, bool]] = []
    for name in ("first", "second"):
        session.subscribe(lambda name=name: heard.append((name, session.book.positions[0].strike, session.modified)))
    edit(session, 1.0)
    session.mark_saved()
    session.undo()
    assert heard == [
        ("first", 1.0, True),
        ("second", 1.0, True),
        ("first", 1.0, False),
        ("second", 1.0, False),
        ("first", 0.0, True),
        ("second", 0.0, True),
    ]


def test_untouched_positions_are_shared_with_the_book_before() -> None:
    session = BookSession(book_of("a", "b", "c"))
    before = session.book
    edit(session, 1.0)
    assert session.book.positions[1] is before.positions[1]
    assert session.book.positions[2] is before.positions[2]
    session.undo()
    assert session.book.positions[0] is before.positions[0]
