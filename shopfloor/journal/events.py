"""The journal of a shift: opened or made, written entry by entry, read whole."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from datetime import datetime
from pathlib import Path
from types import TracebackType
from zoneinfo import ZoneInfo

from shopfloor.journal import file, lookup, moments
from shopfloor.journal.collector import collector_held
from shopfloor.journal.entries import Entry
from shopfloor.journal.errors import JournalError, Refusal, RefusedError
from shopfloor.journal.pieces import IssuedPlan
from shopfloor.journal.record import Recorded, Recorder, Writer, write
from shopfloor.journal.rules import Judge
from shopfloor.journal.state import MINIMUM_LEFT_S, state
from shopfloor.model.actuals import Event, Kind, PieceState, ShiftState
from shopfloor.model.clock import Clock


class Journal:
    """An open journal; close it, or use it in a ``with`` statement.

    Attributes
    ----------
    path
        Its file.
    clock
        The shift's; every time in the journal counts from its start.
    shift_end_s
        End of the shift, None when the plan knows none.
    """

    def __init__(self, connection: sqlite3.Connection, path: Path) -> None:
        self.path, self._connection = path, connection
        with file.in_words(path, "read"):
            facts = dict(connection.execute("SELECT name, value FROM shift").fetchall())
        start, zone = facts.get("start", ""), facts.get("zone", "")
        self.clock = Clock(datetime.fromisoformat(start) if start else None, ZoneInfo(zone) if zone else None)
        self.shift_end_s = int(facts["end_s"]) if facts.get("end_s") else None
        self._last_s = int(facts.get("last_s", "0"))
        self._lookup = lookup.Lookup(connection)

    # ---- opening and closing ----------------------------------------------------------------------

    @classmethod
    def create(cls, path: Path, plan: IssuedPlan, by: Recorder, *, who: str = "") -> Journal:
        """Make the journal of a shift, its plan the first entry; the file appears whole or not at all.

        Raises
        ------
        JournalError
            If a file of that name exists, or the disk refuses.
        """
        file.create(path, lambda connection: _begin(connection, plan, by, who))
        return cls.open(path)

    @classmethod
    def open(cls, path: Path, *, write: bool = True, busy_s: float = file.BUSY_S) -> Journal:
        """Open a journal; with `write` false also one in a folder that may only be read.

        Raises
        ------
        JournalError
            If there is none, it is no journal, it is damaged, a newer release made it, or the disk refuses.
        """
        connection = file.connect(path, write=write, busy_s=busy_s)
        try:
            return cls(connection, path)
        except BaseException:
            connection.close()
            raise

    @classmethod
    def in_memory(cls, plan: IssuedPlan, by: Recorder | None = None) -> Journal:
        """Return a journal without a file, for trying things out."""
        return cls(
            file.memory(lambda connection: _begin(connection, plan, by or Recorder(), "")), Path("memory")
        )

    def close(self) -> None:
        """Close the file; nothing is lost by not doing so."""
        self._connection.close()

    def __enter__(self) -> Journal:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    # ---- writing ----------------------------------------------------------------------------------

    def record(self, entries: Sequence[Entry], by: Recorder) -> list[Recorded]:
        """Write `entries`, all of them or none; they are on the disk when this returns.

        Entries are judged in order of time (those without one are now), each with those before it in the
        journal already. One that stands there already changes nothing.

        Parameters
        ----------
        entries
            What to record.
        by
            By whose clock, and whether entries that cannot be are recorded with a mark instead of refused.

        Returns
        -------
        list of Recorded
            One an entry, in the order given. O(log n) each for a journal of n entries.

        Raises
        ------
        EntryError
            If a value cannot be used at all.
        RefusedError
            With every reason why entries cannot be.
        JournalError
            If the disk refuses or other programs keep the file in use.
        """
        found: dict[int, Recorded] = {}
        refusals: list[Refusal] = []
        last = by.now_s or 0
        order = sorted(range(len(entries)), key=lambda k: last if (at := entries[k].at_s) is None else at)
        with self._writing():
            writer = Writer(self._connection, self.clock, self._last_s, by)
            for index in order:
                outcome = writer.add(index, entries[index])
                if isinstance(outcome, Recorded):
                    found[index] = outcome
                else:
                    refusals += outcome
            if refusals:
                raise RefusedError(sorted(refusals, key=lambda one: one.index))
        return [found[index] for index in range(len(entries))]

    def issue(self, plan: IssuedPlan, by: Recorder, *, at_s: int | None = None, who: str = "") -> Recorded:
        """Write that a plan was issued, with all of it; the plan in force already is a repeat.

        `at_s` is when it takes force, else now; never before the plan in force did.

        Raises
        ------
        RefusedError
            If that is in the future, or long after the shift.
        JournalError
            If the plan is for another shift, or the disk refuses.
        """
        if plan.clock != self.clock:
            ours, theirs = (
                f"{clock.write(0)}{f' {clock.zone}' if clock.zone else ''}"
                for clock in (self.clock, plan.clock)
            )
            raise JournalError(
                f"cannot write {self.path}: its shift starts {ours}, the plan's {theirs}; open a new journal "
                "for it"
            )
        with self._writing():
            plans = self._lookup.plans()
            if plans and plans[-1].data.get("sha256") == plan.sha256:
                return Recorded(plans[-1], repeat=True)
            earliest = plans[-1].at_s if plans else 0
            when = max(earliest, at_s if at_s is not None else by.now_s or 0)
            refusals = Judge(self._lookup, self.clock, self._last_s, by.now_s).times(0, when)
            if refusals:
                raise RefusedError([replace(one, final=True) for one in refusals])
            event = _issue_event(self._lookup.last_seq() + 1, plan, when, by, who)
            write(self._connection, event)
        return Recorded(event)

    def ready(self) -> None:
        """See that entries can be written, before somebody waits for what is to be recorded.

        Raises
        ------
        JournalError
            If the disk refuses, or other programs keep the file in use.
        """
        with self._writing():
            pass

    @contextmanager
    def _writing(self) -> Iterator[None]:
        """One transaction: all of what is written inside, or nothing."""
        with file.in_words(self.path, "write"):
            self._connection.execute("BEGIN IMMEDIATE")
            try:
                yield
                self._connection.execute("COMMIT")
            except BaseException:
                if self._connection.in_transaction:  # a full disk may have ended it already
                    self._connection.execute("ROLLBACK")
                raise

    # ---- reading ----------------------------------------------------------------------------------

    def events(self) -> list[Event]:
        """Return every entry in order of recording; plans come with their pieces. O(n)."""
        with file.in_words(self.path, "read"), collector_held():
            return lookup.all_events(self._connection)

    def state(self, at_s: int | None = None, *, minimum_left_s: int = MINIMUM_LEFT_S) -> ShiftState:
        """Return how the shift stands: :func:`shopfloor.journal.state.state` of all entries."""
        return state(self.events(), at_s, minimum_left_s=minimum_left_s)

    def plan(self) -> Event:
        """Return the entry that issued the plan last, without its pieces; `data` has its hash and head."""
        with file.in_words(self.path, "read"):
            return self._lookup.plans()[-1]

    def to_undo(self, who: str = "") -> Event | None:
        """Return the last entry that may be struck out; with `who`, the last of that person."""
        with file.in_words(self.path, "read"):
            return self._lookup.to_undo(who)

    def knows(self, code: str) -> tuple[str | None, str | None]:
        """Return the order and the machine that a code names, each None if it names none."""
        with file.in_words(self.path, "read"):
            return self._lookup.order_named(code), self._lookup.machine_named(code)

    def known(self, at_s: int | None = None) -> Iterable[PieceState]:
        """Return how each operation stood at a moment, else now, for :func:`issued_plan`."""
        return self.state(at_s).pieces.values()

    def check(self) -> None:
        """Read the whole file and see whether it is sound. O(size of the file).

        Raises
        ------
        JournalError
            If it is damaged.
        """
        found = file.damage(self._connection)
        if found:
            raise JournalError(
                f"{self.path} is damaged ({found[0]}); take a copy of it and go on with a new journal"
            )


def _begin(connection: sqlite3.Connection, plan: IssuedPlan, by: Recorder, who: str) -> None:
    clock = plan.clock
    facts = {
        "start": "" if clock.start is None else clock.start.isoformat(),
        "zone": "" if clock.zone is None else str(clock.zone),
        "end_s": "" if plan.shift_end_s is None else str(plan.shift_end_s),
        "last_s": str(plan.last_s),
    }
    connection.execute("BEGIN IMMEDIATE")
    connection.executemany("INSERT INTO shift VALUES (?, ?)", sorted(facts.items()))
    write(connection, _issue_event(1, plan, 0, by, who))
    connection.execute("COMMIT")


def _issue_event(seq: int, plan: IssuedPlan, at_s: int, by: Recorder, who: str) -> Event:
    return Event(
        seq=seq,
        id=f"plan-{plan.sha256[:16]}-{seq}",
        kind=Kind.ISSUED,
        at_s=at_s,
        at=moments.write(plan.clock, at_s),
        who=who,
        place=seq,
        entered=by.entered,
        entered_s=by.now_s,
        data={"sha256": plan.sha256, "name": plan.name, "head": dict(plan.head)},
        pieces=plan.pieces,
    )


__all__ = ["Entry", "Journal", "Recorded", "Recorder", "RefusedError"]
