"""A small floor for the tests of the journal: a plan, a clock, entries in short, and journals in memory."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest

from shopfloor.journal.entries import Entry
from shopfloor.journal.errors import RefusedError
from shopfloor.journal.events import Journal, Recorded, Recorder
from shopfloor.journal.pieces import IssuedPlan
from shopfloor.model.actuals import Event, Key, Kind, Piece
from shopfloor.model.calendar import Clock

START = datetime(2026, 3, 2, 6)
CLOCK = Clock(START)
LATE = Recorder(
    now_s=8 * 3600, entered="2026-03-02T14:00:00+00:00"
)  # a clock that finds nothing in the future
MIN = 60

# order, machine, unit, start and end in minutes; BENCH has two units, TQ-3 visits the CMM twice
ROWS = (
    ("TQ-1", "WASH", 1, 0, 30),
    ("TQ-1", "CMM", 1, 30, 60),
    ("TQ-2", "CMM", 1, 0, 30),
    ("TQ-2", "BENCH", 1, 30, 60),
    ("TQ-3", "BENCH", 2, 0, 30),
    ("TQ-3", "CMM", 1, 60, 90),
    ("TQ-3", "CMM", 1, 90, 100),
)


def pieces(rows: Iterable[tuple[str, str, int, int, int]] = ROWS) -> tuple[Piece, ...]:
    """Return rows as pieces, numbered as they stand."""
    found: list[Piece] = []
    for order, machine, unit, start, end in rows:
        number = 1 + sum((one.key.order, one.key.machine) == (order, machine) for one in found)
        key = Key(order, machine, number)
        found.append(Piece(key, (end - start) * MIN, unit, start * MIN, end * MIN))
    return tuple(found)


def issued(
    rows: Iterable[tuple[str, str, int, int, int]] = ROWS, *, clock: Clock = CLOCK, sha256: str = "0" * 64
) -> IssuedPlan:
    """Return a plan of `rows` for a shift of eight hours."""
    return IssuedPlan(sha256, "plan.json", clock, 8 * 3600, pieces(rows), {"schema": 1})


def journal(**options: Any) -> Journal:
    """Return a new journal in memory."""
    return Journal.in_memory(issued(**options))


def filed(path: Path, **options: Any) -> Journal:
    """Return a new journal in a file."""
    return Journal.create(path, issued(**options), Recorder())


def work(kind: Kind | str, order: str, machine: str, at: float, **more: Any) -> Entry:
    """Return an entry about an operation, `at` in minutes; what is no field of an entry is its data."""
    data = {name: more.pop(name) for name in list(more) if name not in Entry.__dataclass_fields__}
    return Entry(Kind(kind), round(at * MIN), order=order, machine=machine, data=data, **more)


def machine(kind: Kind | str, name: str, at: float, unit: int = 0, **data: Any) -> Entry:
    """Return an entry about a machine."""
    return Entry(Kind(kind), round(at * MIN), machine=name, unit=unit, data=data)


def strike(seq: int, **more: Any) -> Entry:
    """Return the entry that strikes out entry `seq`."""
    return Entry(Kind.WITHDRAWN, corrects=seq, **more)


def put(book: Journal, *entries: Entry, accept: bool = False) -> list[Recorded]:
    """Record entries one by one."""
    by = replace(LATE, accept=accept)
    return [book.record([entry], by)[0] for entry in entries]


def refused(book: Journal, *entries: Entry) -> list[str]:
    """Return why the last of `entries` is refused, the ones before it being recorded."""
    put(book, *entries[:-1])
    before = book.events()
    with pytest.raises(RefusedError) as caught:
        put(book, entries[-1])
    assert book.events() == before
    return [one.text() for one in caught.value.refusals]


def event(seq: int, entry: Entry, **more: Any) -> Event:
    """Return an event as the journal would write it, unjudged."""
    return Event(
        seq=seq,
        id=f"e{seq}",
        kind=entry.kind,
        at_s=entry.at_s or 0,
        order=entry.order,
        machine=entry.machine,
        piece=entry.piece or (1 if entry.order else 0),
        unit=entry.unit,
        corrects=entry.corrects,
        place=more.pop("place", seq),
        data=entry.data,
        **more,
    )


def plan_event(plan: Sequence[Piece] | None = None) -> Event:
    """Return the event that issues a plan, the first of its journal."""
    rows = pieces() if plan is None else tuple(plan)
    return Event(seq=1, id="plan", kind=Kind.ISSUED, at_s=0, place=1, data={"sha256": "0"}, pieces=rows)
