"""What a recorder asks of a journal: answered through an index, however long the journal is."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import replace
from typing import Any, NamedTuple

from shopfloor.journal.walk import WORK
from shopfloor.model.actuals import Event, Key, Kind, Piece

_COLUMNS = (
    "seq, id, kind, at_s, at_text, who, order_id, machine, piece, unit, corrects, place, entered, entered_s, "
    "accepted, data"
)
_VISIT = "v.order_id, v.machine, v.piece, v.seconds, v.unit, v.start_s, v.end_s, v.round, v.part, v.parts"
_WORK = ", ".join(repr(kind.value) for kind in sorted(WORK))
_NAMES_TRIED = 20_000  # names compared in search of the one that was meant


class Clash(NamedTuple):
    """Two operations at one place, or one order at two, at the same time; the other one is named."""

    rule: str
    key: Key
    start_s: int
    end_s: int


class Lookup:
    """The entries of an open journal, asked one question at a time."""

    def __init__(self, connection: sqlite3.Connection) -> None:
        self._connection = connection

    def _ask(self, query: str, *values: Any) -> sqlite3.Cursor:
        return self._connection.execute(query, values)

    def _events(self, rest: str, *values: Any) -> Iterator[Event]:
        return map(event_of, self._ask(f"SELECT {_COLUMNS} FROM event {rest}", *values))

    # ---- single entries ---------------------------------------------------------------------------

    def last_seq(self) -> int:
        """Return the number of the last entry, 0 in an empty journal."""
        return int(self._ask("SELECT coalesce(max(seq), 0) FROM event").fetchone()[0])

    def by_seq(self, seq: int) -> Event | None:
        """Return entry number `seq`."""
        return next(self._events("WHERE seq = ?", seq), None)

    def by_id(self, name: str) -> Event | None:
        """Return the entry with an id."""
        return next(self._events("WHERE id = ?", name), None)

    def last_entered_s(self) -> int | None:
        """Return when the last entry was made, by its recorder's clock."""
        row = self._ask("SELECT entered_s FROM event ORDER BY seq DESC LIMIT 1").fetchone()
        return None if row is None or row[0] is None else int(row[0])

    def corrector(self, seq: int) -> Event | None:
        """Return the entry that counts and corrects entry `seq`, if there is one."""
        for event in self._events("WHERE corrects = ? AND corrects > 0", seq):
            by = self.corrector(event.seq)
            if by is None:
                return event
            if by.kind is not Kind.WITHDRAWN:
                return by  # the correction was replaced, not taken back
        return None

    def counts(self, seq: int) -> bool:
        """Whether an entry counts: no entry that counts corrects it."""
        return self.corrector(seq) is None

    def to_undo(self, who: str) -> Event | None:
        """Return the last entry that may be struck out; with `who`, the last of that person."""
        rest = "WHERE who = ? ORDER BY seq DESC" if who else "ORDER BY seq DESC"
        for event in self._events(rest, *([who] if who else [])):
            if event.kind not in (Kind.WITHDRAWN, Kind.ISSUED) and self.counts(event.seq):
                return event
        return None

    # ---- entries about one thing ------------------------------------------------------------------

    def _counting(self, events: Iterable[Event]) -> list[Event]:
        return sorted((event for event in events if self.counts(event.seq)), key=lambda event: event.moment)

    def work(self, key: Key) -> list[Event]:
        """Return what counts about one operation, in order of time."""
        rest = f"WHERE order_id = ? AND machine = ? AND piece = ? AND kind IN ({_WORK})"
        return self._counting(self._events(rest, *key))

    def on_order(self, order: str, *kinds: Kind) -> list[Event]:
        """Return what counts of these kinds about one order, in order of time."""
        rest = f"WHERE order_id = ? AND kind IN ({', '.join('?' * len(kinds))})"
        return self._counting(self._events(rest, order, *kinds))

    def outage_before(self, machine: str, unit: int, moment: tuple[int, int]) -> Event | None:
        """Return the last down or up of one track that counts and comes before `moment`."""
        return self._outage(machine, unit, moment, before=True)

    def outage_after(self, machine: str, unit: int, moment: tuple[int, int]) -> Event | None:
        """Return the first down or up of one track that counts and comes after `moment`."""
        return self._outage(machine, unit, moment, before=False)

    def _outage(self, machine: str, unit: int, moment: tuple[int, int], *, before: bool) -> Event | None:
        sign, way = ("<", "DESC") if before else (">", "ASC")
        found: list[Event] = []
        for kind in (Kind.DOWN, Kind.UP):
            rest = (
                f"WHERE machine = ? AND kind = ? AND unit = ? AND (at_s, place) {sign} (?, ?) "
                f"ORDER BY at_s {way}, place {way}"
            )
            events = self._events(rest, machine, kind, unit, *moment)
            found += [event for event in [next((e for e in events if self.counts(e.seq)), None)] if event]
        pick = max if before else min
        return pick(found, key=lambda event: event.moment) if found else None

    def plans(self) -> list[Event]:
        """Return the plans issued that count, without their pieces, in order of time."""
        return self._counting(self._events("WHERE kind = 'issued'"))

    # ---- the names of things ----------------------------------------------------------------------

    def order_named(self, text: str) -> str | None:
        """Return the order of that name, or the only one that differs from it by case alone."""
        rows = self._ask(
            "SELECT DISTINCT order_id, source FROM visit WHERE order_id = ? COLLATE NOCASE", text
        )
        return _only(text, {name for name, source in rows if self.counts(source)})

    def machine_named(self, text: str) -> str | None:
        """Return the machine of that name, or the only one that differs from it by case alone."""
        query = "SELECT source FROM visit WHERE machine = ? COLLATE NOCASE AND machine = ? LIMIT 1"
        row = self._ask(query, text, text).fetchone()
        if row is not None and self.counts(row[0]):  # nearly always; the rest looks at every visit there is
            return text
        rows = self._ask("SELECT DISTINCT machine, source FROM visit WHERE machine = ? COLLATE NOCASE", text)
        return _only(text, {name for name, source in rows if self.counts(source)})

    def visits(self, order: str, machine: str = "") -> dict[Key, tuple[int, Piece]]:
        """Return the operations of an order, each with the entry that last said something about it."""
        rows = self._ask(
            f"SELECT source, {_VISIT} FROM visit v JOIN event e ON e.seq = v.source "
            "WHERE v.order_id = ? COLLATE NOCASE AND v.order_id = ? AND (? = '' OR v.machine = ?) "
            "ORDER BY e.at_s, e.place",
            order,
            order,
            machine,
            machine,
        )
        counts: dict[int, bool] = {}
        found: dict[Key, tuple[int, Piece]] = {}
        for source, *row in rows:
            if counts.setdefault(source, self.counts(source)):
                piece = piece_of(row)
                found[piece.key] = source, piece
        return found

    def brought(self, order: str) -> set[int]:
        """Return the entries that count and brought an order into the shift: a plan, or the order added."""
        rows = self._ask(
            "SELECT DISTINCT v.source FROM visit v JOIN event e ON e.seq = v.source "
            "WHERE v.order_id = ? COLLATE NOCASE AND v.order_id = ? AND e.kind IN ('issued', 'added')",
            order,
            order,
        )
        return {source for (source,) in rows if self.counts(source)}

    def units(self, machine: str) -> int:
        """Return how many units of a machine are known."""
        query = "SELECT unit FROM visit WHERE machine = ? COLLATE NOCASE ORDER BY unit DESC LIMIT 1"
        row = self._ask(query, machine).fetchone()
        return 1 if row is None else max(1, int(row[0]))

    def names(self, column: str) -> list[str]:
        """Return the first names of orders (`order_id`) or machines (`machine`)."""
        query = f"SELECT DISTINCT {column} FROM visit WHERE source = ? LIMIT {_NAMES_TRIED}"
        found: dict[str, None] = {}
        for plan in self.plans()[-1:]:
            found.update(dict.fromkeys(row[0] for row in self._ask(query, plan.seq)))
        for kind in (Kind.ADDED, Kind.CHANGED):
            for event in self._events(f"WHERE kind = ? LIMIT {_NAMES_TRIED}", kind):
                found.update(dict.fromkeys(row[0] for row in self._ask(query, event.seq)))
        return list(found)

    # ---- runs -------------------------------------------------------------------------------------

    def clashes(self, key: Key) -> list[Clash]:
        """Return what runs at the same time as an operation, on its unit or with its order elsewhere."""
        found: dict[Clash, None] = {}
        mine = "SELECT unit, start_s, end_s FROM run WHERE order_id = ? AND machine = ? AND piece = ?"
        for unit, start, end in self._ask(mine, *key).fetchall():
            for rule, where, names in (
                ("unit-busy", "machine = ? AND unit = ?", (key.machine, unit)),
                ("order-elsewhere", "order_id = ? AND machine <> ?", (key.order, key.machine)),
            ):
                rows = self._ask(
                    f"SELECT order_id, machine, piece, start_s, end_s FROM run WHERE {where} "
                    "AND end_s > ? AND start_s < ? AND NOT (order_id = ? AND machine = ? AND piece = ?) "
                    "ORDER BY end_s LIMIT 5",
                    *names,
                    start,
                    end,
                    *key,
                )
                for order, machine, piece, begun, ended in rows:
                    found[Clash(rule, Key(order, machine, piece), begun, ended)] = None
        return list(found)

    def pieces(self, seq: int) -> list[Piece]:
        """Return what operations an entry brings, in order of start, then by name."""
        rows = self._ask(
            f"SELECT {_VISIT} FROM visit v WHERE source = ? ORDER BY start_s, order_id, machine, piece",
            seq,
        )
        return [piece_of(row) for row in rows]


def _only(text: str, names: set[str]) -> str | None:
    if text in names:
        return text
    return next(iter(names)) if len(names) == 1 else None


def event_of(row: Any, data: Mapping[str, Any] | None = None) -> Event:
    """Return the event that a row of the table `event` holds; `data` is its last cell, if read already."""
    *facts, accepted, text = row
    facts[2] = Kind(facts[2])
    facts.append(tuple(accepted.split(",")) if accepted else ())
    facts.append(json.loads(text) if data is None else data)
    return Event(*facts)


def piece_of(row: Any) -> Piece:
    """Return the piece that a row of the table `visit` holds, its source left out."""
    order, machine, piece, seconds, *rest = row
    return Piece(Key(order, machine, piece), seconds, *rest)


def all_events(connection: sqlite3.Connection) -> list[Event]:
    """Return every entry in order of recording, with its pieces."""
    bring: dict[int, list[Piece]] = {}
    rows = connection.execute(
        f"SELECT source, {_VISIT} FROM visit v ORDER BY source, start_s, order_id, machine, piece"
    )
    for source, *row in rows:
        bring.setdefault(source, []).append(piece_of(row))
    known: dict[str, Mapping[str, Any]] = {}  # most entries say one of a few things
    events: list[Event] = []
    for row in connection.execute(f"SELECT {_COLUMNS} FROM event ORDER BY seq"):
        data = known.get(row[-1])
        if data is None:
            data = known[row[-1]] = json.loads(row[-1])
        event = event_of(row, data)
        events.append(replace(event, pieces=tuple(bring[event.seq])) if event.seq in bring else event)
    return events
