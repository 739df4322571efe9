"""A long journal costs a recorder no more than a short one: in SQLite's steps, and in its query plans."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from shopfloor.journal.entries import Entry
from shopfloor.journal.events import Journal
from shopfloor.journal.pieces import IssuedPlan
from shopfloor.model.actuals import Key, Kind, Piece
from tests.journal.floor import CLOCK, LATE, MIN, journal, machine, pieces, strike, work

LONG = (
    3_000  # orders in the way; each is started, stopped, resumed and finished, each machine goes down and up
)


def entries(book: Journal) -> list[Entry]:
    """Return one entry of every kind, none of which is a repeat or refused."""
    last = book.events()[-1].seq
    return [
        work("started", "TQ-1", "WASH", 205),
        work("stopped", "TQ-1", "WASH", 206, reason="x"),
        work("resumed", "TQ-1", "WASH", 207),
        work("left", "TQ-1", "WASH", 208, left_s=600),
        work("finished", "TQ-1", "WASH", 209),
        machine("down", "CMM", 210, reason="x"),
        machine("up", "CMM", 211),
        Entry(Kind.CREW, 212 * MIN, data={"heads": 3}),
        Entry(Kind.ADDED, 213 * MIN, order="TQ-9", data={"operations": [("CMM", 600)]}),
        Entry(Kind.CHANGED, 214 * MIN, order="TQ-9", data={"operations": [("CMM", 900)], "due_s": 9000}),
        Entry(Kind.CANCELLED, 215 * MIN, order="TQ-9"),
        Entry(Kind.REMARK, 216 * MIN, machine="CMM", data={"text": "word"}),
        replace(work("finished", "TQ-1", "WASH", 217), corrects=last + 5),
        strike(last + 7),
    ]


def long_journal() -> Journal:
    """Return a journal of 30,000 entries, written without being judged, as after a busy shift."""
    rows = [(f"X-{k}", "CMM", 1, k, k + 1) for k in range(LONG)]
    book = Journal.in_memory(_plan(rows))
    listed: list[tuple[str, int, str, str, str]] = []
    for k in range(LONG):
        at = k * 4
        listed += [
            ("started", at, f"X-{k}", "CMM", "{}"),
            ("stopped", at + 1, f"X-{k}", "CMM", '{"reason": "x"}'),
            ("resumed", at + 2, f"X-{k}", "CMM", "{}"),
            ("finished", at + 3, f"X-{k}", "CMM", "{}"),
            ("down", at, "", "WASH", '{"reason": "x"}'),
            ("up", at + 1, "", "WASH", "{}"),
            ("down", at, "", "CMM", '{"reason": "x"}'),
            ("up", at, "", "CMM", "{}"),
            ("remark", at, f"X-{k}", "CMM", '{"text": "x"}'),
            ("crew", at, "", "", '{"heads": 3}'),
        ]
    database = book._connection
    database.execute("BEGIN")
    for seq, (kind, at, order, name, data) in enumerate(listed, 2):
        piece = 1 if order and kind != "remark" else 0
        unit = 1 if kind == "started" else 0
        database.execute(
            "INSERT INTO event VALUES (?, ?, ?, ?, '', '', ?, ?, ?, ?, 0, ?, '', ?, '', ?)",
            (seq, f"e{seq}", kind, at, order, name, piece, unit, seq, at, data),
        )
        if kind in ("stopped", "finished"):
            database.execute("INSERT INTO run VALUES (?, ?, 1, 1, ?, ?)", (order, name, at - 1, at))
    database.execute("COMMIT")
    return book


def _plan(rows: list[tuple[str, str, int, int, int]]) -> IssuedPlan:
    extra = tuple(
        Piece(Key(order, name), MIN, unit, start * MIN, end * MIN) for order, name, unit, start, end in rows
    )
    return IssuedPlan("0" * 64, "plan.json", CLOCK, 8 * 3600, pieces() + extra, {})


def recorded(book: Journal) -> tuple[list[int], list[str]]:
    """Record one entry of every kind; return the steps each took, in tens, and the statements asked."""
    steps = [0]
    statements: dict[str, None] = {}

    def step() -> None:
        steps[-1] += 1

    listed = entries(book)
    book._connection.set_progress_handler(step, 10)
    book._connection.set_trace_callback(lambda text: statements.setdefault(text))
    for entry in listed:
        book.record([entry], LATE)
        steps.append(0)
    book._connection.set_progress_handler(None, 0)
    book._connection.set_trace_callback(None)
    return steps[:-1], list(statements)


@pytest.fixture(scope="module")
def busy() -> Journal:
    return long_journal()


def test_recording_takes_as_many_steps_in_a_long_journal_as_in_an_empty_one(busy: Journal) -> None:
    short, _ = recorded(journal())
    long, _ = recorded(busy)
    assert sum(short) > 100
    for few, many in zip(short, long, strict=True):
        assert many <= 2 * few + 30


def test_every_question_a_recorder_asks_goes_through_an_index(busy: Journal) -> None:
    fresh = journal()
    _, statements = recorded(fresh)
    asked = [text for text in statements if text.startswith(("SELECT", "DELETE"))]
    assert len(asked) > 20
    for text in asked:
        plan = [row[3] for row in fresh._connection.execute(f"EXPLAIN QUERY PLAN {text}")]
        assert not [line for line in plan if re.match(r"SCAN (event|visit|run)\b", line)], (text, plan)
        assert not [line for line in plan if "AUTOMATIC" in line], (text, plan)


def test_the_state_of_a_long_journal_reads_each_table_once(busy: Journal) -> None:
    asked: list[str] = []
    busy._connection.set_trace_callback(asked.append)
    busy.events()
    busy._connection.set_trace_callback(None)
    assert len(asked) == 2
