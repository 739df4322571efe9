"""One entry on its way into a journal: what it leaves open is filled in, then it is judged and written."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import Any

from shopfloor.journal import moments
from shopfloor.journal.entries import Entry, checked, derived_id, repeats
from shopfloor.journal.errors import EntryError, Refusal
from shopfloor.journal.lookup import Lookup
from shopfloor.journal.migrations import OPEN
from shopfloor.journal.rules import BACK_SLACK_S, Judge, refusal
from shopfloor.journal.walk import WORK, Phase, walk
from shopfloor.model.actuals import Event, Key, Kind, Piece
from shopfloor.model.clock import Clock, duration


@dataclass(frozen=True, slots=True)
class Recorded:
    """An entry as it stands in the journal; `repeat` if it stood there already."""

    event: Event
    repeat: bool = False
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Recorder:
    """Who records, when by their clock, and whether they insist.

    `now_s` is None without a clock; `entered` is the same as local text.
    """

    now_s: int | None = None
    entered: str = ""
    accept: bool = False


class Writer:
    """Writes entries inside a transaction that somebody else opens and ends."""

    def __init__(self, connection: sqlite3.Connection, clock: Clock, last_s: int, by: Recorder) -> None:
        self._connection, self._clock, self._by = connection, clock, by
        self._lookup = Lookup(connection)
        self._judge = Judge(self._lookup, clock, last_s, by.now_s)

    def add(self, index: int, given: Entry) -> Recorded | list[Refusal]:
        """Write one entry, or return why not; then nothing of it is left.

        Raises
        ------
        EntryError
            If a value cannot be used at all.
        """
        entry = self._named(checked(given))
        at_s, notes, refusals = self._time(index, entry)
        if not self._by.accept and any(one.rule == "clock-back" for one in refusals):
            return refusals  # what else is wrong may follow from the wrong time
        known = self._known(index, entry, at_s)
        if isinstance(known, Recorded | Refusal):
            return known if isinstance(known, Recorded) else [known]
        entry, name = replace(self._filled(entry), at_s=at_s), known
        corrected = self._lookup.by_seq(entry.corrects) if entry.corrects else None
        refusals += self._correction(index, entry, corrected)
        if any(one.final for one in refusals):
            return refusals
        names = self._judge.names(index, entry)
        if refusals and not self._by.accept:
            return refusals + names  # what contradicts the journal may follow from the wrong time
        refusals += names
        pieces = self._pieces(index, entry)
        if isinstance(pieces, Refusal):
            return [*refusals, pieces]
        seq = self._lookup.last_seq() + 1
        replaces = corrected is not None and entry.kind is not Kind.WITHDRAWN
        place = corrected.place if corrected is not None and replaces else seq
        refusals += self._judge.circumstances(index, entry, (at_s, place))
        event = self._event(entry, seq, name, place, pieces)
        return self._commit(index, event, refusals, notes)

    # ---- filling in what was left open ------------------------------------------------------------

    def _named(self, entry: Entry) -> Entry:
        """Return `entry` with names spelt as the journal spells them, and the entry to undo found."""
        order = (self._lookup.order_named(entry.order) or entry.order) if entry.order else ""
        machine = self._machine(entry.machine)
        data = dict(entry.data)
        if "operations" in data:
            change = entry.kind is Kind.CHANGED
            data["operations"] = [
                [*(self._numbered(name) if change else (self._machine(name), 0)), seconds]
                for name, seconds in data["operations"]
            ]
        return replace(entry, order=order, machine=machine, data=data)

    def _machine(self, name: str) -> str:
        return (self._lookup.machine_named(name) or name) if name else ""

    def _time(self, index: int, entry: Entry) -> tuple[int, tuple[str, ...], list[Refusal]]:
        """Return when it happened, remarks on that, and why it cannot have been then."""
        now = self._by.now_s
        if entry.kind is Kind.WITHDRAWN:  # a mistake may be struck out long after the shift
            struck = self._lookup.by_seq(entry.corrects)
            told = now if entry.at_s is None else entry.at_s
            return told if told is not None else struck.at_s if struck is not None else 0, (), []
        if entry.at_s is not None:
            return entry.at_s, (), self._judge.times(index, entry.at_s)
        last = self._lookup.last_entered_s()
        if now is None:
            raise EntryError(
                "at",
                "",
                "at-missing",
                "is missing, and the plan has no start",
                "give the time since then, as h:mm",
            )
        if last is None or now >= last:
            return now, (), self._judge.times(index, now)
        if last - now <= BACK_SLACK_S:
            back = f"this computer's clock went back by {duration(last - now)}"
            return last, (f"{back}; the time of the last entry is taken",), []
        say = self._judge.say
        return now, (), [refusal(index, "clock-back", now=say(now), last=say(last))]

    def _known(self, index: int, entry: Entry, at_s: int) -> Recorded | Refusal | str:
        """Return the entry if it is a repeat; else its id, or why it cannot have the one it asks for."""
        if entry.id:
            event = self._lookup.by_id(entry.id)
            if event is None:
                return entry.id
            if repeats(entry, event):
                return Recorded(event, repeat=True)
            return refusal(index, "id-used", id=entry.id, seq=event.seq)
        first = name = derived_id(entry, at_s)
        again = 1
        while (event := self._lookup.by_id(name)) is not None:
            if self._lookup.counts(event.seq):
                return Recorded(event, repeat=True)
            again += 1  # what was struck out may be said once more
            name = f"{first}.{again}"
        return name

    def _filled(self, entry: Entry) -> Entry:
        """Return `entry` with the piece and the unit that must be meant."""
        if entry.kind not in WORK:
            return entry
        corrected = self._lookup.by_seq(entry.corrects) if entry.corrects else None
        if corrected is not None and (corrected.order, corrected.machine) == (entry.order, entry.machine):
            piece = entry.piece or corrected.piece
            unit = entry.unit or (corrected.unit if piece == corrected.piece else 0)
            entry = replace(entry, piece=piece, unit=unit)
        visits = self._lookup.visits(entry.order, entry.machine)
        piece = entry.piece or self._piece_meant(entry, sorted(key.piece for key in visits))
        unit = entry.unit
        if not unit and entry.kind is Kind.STARTED:
            _, row = visits.get(Key(entry.order, entry.machine, piece), (0, None))
            unit = row.unit if row is not None else 1
        return replace(entry, piece=piece, unit=unit)

    def _piece_meant(self, entry: Entry, numbers: Sequence[int]) -> int:
        """Return the first piece that the event can be about, else the first."""
        wanted = {
            Kind.STARTED: (Phase.FRESH,),
            Kind.RESUMED: (Phase.STOPPED,),
            Kind.STOPPED: (Phase.RUNNING,),
        }.get(entry.kind, (Phase.RUNNING, Phase.STOPPED))
        if len(numbers) > 1:
            phases = {
                number: walk(self._lookup.work(Key(entry.order, entry.machine, number))).phase
                for number in numbers
            }
            for phase in wanted:
                for number in numbers:
                    if phases[number] is phase:
                        return number
        return numbers[0] if numbers else 1

    def _pieces(self, index: int, entry: Entry) -> list[Piece] | Refusal:
        """Return the operations that an order added or changed brings."""
        found: dict[Key, Piece] = {}
        known = self._lookup.visits(entry.order) if entry.kind is Kind.CHANGED else {}
        for machine, number, seconds in entry.data.get("operations", ()):
            pieces = sorted(key.piece for key in known if key.machine == machine)
            words = {"order": entry.order, "machine": machine, "last": max(pieces, default=0)}
            if number and number not in pieces:
                return replace(refusal(index, "piece-unknown", piece=number, **words), final=True)
            if not number and len(pieces) > 1:
                return refusal(index, "piece-needed", **words)
            if not number:  # the only one, or a further operation
                number = pieces[0] if pieces else 1 + sum(key.machine == machine for key in found)
            key = Key(entry.order, machine, number)
            if key in found:
                raise EntryError(
                    "operations", machine, "operation-twice", "is given twice", "give each operation once"
                )
            found[key] = Piece(key, seconds, known[key][1].unit if key in known else 1)
        return list(found.values())

    def _numbered(self, name: str) -> tuple[str, int]:
        """Take `CMM:2` apart, unless that is the name of a machine; 0 stands for no number."""
        machine, colon, number = name.rpartition(":")
        known = self._lookup.machine_named(name)
        if known is not None or not colon or not (number.isdecimal() and 0 < len(number) < 6):
            return known or name, 0
        return self._machine(machine), int(number)

    # ---- judging and writing ----------------------------------------------------------------------

    def _correction(self, index: int, entry: Entry, corrected: Event | None) -> list[Refusal]:
        seq = entry.corrects
        if not seq:
            return []
        if corrected is None:
            return [refusal(index, "no-such-entry", seq=seq)]
        by = self._lookup.corrector(seq)
        if by is not None:
            return [refusal(index, "corrected-already", seq=seq, by=by.seq)]
        if corrected.kind is Kind.ISSUED:
            return [refusal(index, "plan-stays", seq=seq)]
        if entry.kind not in (corrected.kind, Kind.WITHDRAWN):
            return [refusal(index, "other-kind", seq=seq, was=corrected.kind, kind=entry.kind)]
        return []

    def _event(self, entry: Entry, seq: int, name: str, place: int, pieces: Sequence[Piece]) -> Event:
        assert entry.at_s is not None
        return Event(
            seq=seq,
            id=name,
            kind=entry.kind,
            at_s=entry.at_s,
            at=moments.write(self._clock, entry.at_s),
            who=entry.who,
            order=entry.order,
            machine=entry.machine,
            piece=entry.piece,
            unit=entry.unit,
            corrects=entry.corrects,
            place=place,
            entered=self._by.entered,
            entered_s=self._by.now_s,
            data=entry.data,
            pieces=tuple(pieces),
        )

    def _chain(self, event: Event) -> list[Event]:
        """Return an event and those it corrects, directly or not."""
        chain = [event]
        while chain[-1].corrects:
            corrected = self._lookup.by_seq(chain[-1].corrects)
            assert corrected is not None
            chain.append(corrected)
        return chain

    def _commit(
        self, index: int, event: Event, refusals: list[Refusal], notes: tuple[str, ...]
    ) -> Recorded | list[Refusal]:
        chain = self._chain(event)
        before = self._judge.look(chain)
        self._connection.execute("SAVEPOINT entry")
        self._write(event, chain)
        refusals = refusals + self._judge.aftermath(index, event, chain, before)
        if refusals:
            self._connection.execute("ROLLBACK TO entry")
            if not self._by.accept or any(one.final for one in refusals):
                self._connection.execute("RELEASE entry")
                return refusals
            # An entry is never altered, so it is written anew with its mark.
            event = replace(event, accepted=tuple(sorted({one.rule for one in refusals})))
            self._write(event, chain)
            notes += tuple(f"recorded although {one.problem}" for one in refusals)
        self._connection.execute("RELEASE entry")
        return Recorded(event, notes=notes)

    def _write(self, event: Event, chain: Iterable[Event]) -> None:
        write(self._connection, event)
        for key in sorted({one.key for one in chain if one.kind in WORK}):
            self._connection.execute("DELETE FROM run WHERE order_id = ? AND machine = ? AND piece = ?", key)
            self._connection.executemany(
                "INSERT INTO run VALUES (?, ?, ?, ?, ?, ?)",
                [(*key, one.unit, one.start_s, one.until(OPEN)) for one in walk(self._lookup.work(key)).runs],
            )


def write(connection: sqlite3.Connection, event: Event) -> None:
    """Insert an event and its pieces as they are."""
    text = json.dumps(dict(event.data), ensure_ascii=False, sort_keys=True) if event.data else "{}"
    row: tuple[Any, ...] = (
        event.seq, event.id, event.kind.value, event.at_s, event.at, event.who, event.order, event.machine,
        event.piece, event.unit, event.corrects, event.place, event.entered, event.entered_s,
        ",".join(event.accepted), text,
    )  # fmt: skip
    connection.execute(f"INSERT INTO event VALUES ({', '.join('?' * len(row))})", row)
    connection.executemany(
        "INSERT INTO visit VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
        (
            (
                event.seq, *piece.key, piece.seconds, piece.unit, piece.start_s, piece.end_s, piece.round,
                piece.part, piece.parts,
            )
            for piece in event.pieces
        ),
    )  # fmt: skip
