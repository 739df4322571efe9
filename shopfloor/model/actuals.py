"""What happened on the floor: events as recorded, and the state of the shift they add up to.

An operation is named by its order, its machine and a number: :class:`Key`. The number counts the visits of
that order to that machine, and the parts of a visit that was cut, in the order in which the plan starts
them; it is 1 for nearly every operation.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import StrEnum
from typing import Any, NamedTuple


class Kind(StrEnum):
    """What an event says; the value is its word in files."""

    ISSUED = "issued"
    STARTED = "started"
    STOPPED = "stopped"
    RESUMED = "resumed"
    FINISHED = "finished"
    LEFT = "left"
    DOWN = "down"
    UP = "up"
    CREW = "crew"
    ADDED = "added"
    CHANGED = "changed"
    CANCELLED = "cancelled"
    REMARK = "remark"
    WITHDRAWN = "withdrawn"


class Status(StrEnum):
    """How an operation stands."""

    WAITING = "waiting"
    RUNNING = "running"
    BLOCKED = "blocked"
    DONE = "done"
    CANCELLED = "cancelled"


class Key(NamedTuple):
    """Names one operation, or one part of an operation that was cut."""

    order: str
    machine: str
    piece: int = 1


@dataclass(frozen=True, slots=True)
class Piece:
    """One row of a plan, or one operation of an order added during the shift, which has no times yet.

    `seconds` is how long it takes: of a planned row from start to end, breaks included.
    """

    key: Key
    seconds: int
    unit: int = 1
    start_s: int | None = None
    end_s: int | None = None
    round: int | None = None
    part: int = 1
    parts: int = 1


@dataclass(frozen=True, slots=True)
class Event:
    """One entry of a journal, never altered.

    Attributes
    ----------
    seq
        Number of the entry in its file, from 1.
    id
        Given by whoever records; a second entry of the same id is the same entry.
    at_s
        When it happened, in elapsed seconds since the shift's start; `at` is the same as local text.
    who
        Who says so; may be empty.
    order, machine, piece, unit
        What it is about; empty or 0 where that has no meaning. Unit 0 of a machine is all of it.
    corrects
        Number of the entry that this one replaces or, if it is ``withdrawn``, strikes out; else 0.
    place
        Decides between events of the same time: `seq`, or the place of the entry it replaces.
    entered
        Local time of the recording, and `entered_s` the same in seconds, where there is a clock.
    accepted
        Codes of the rules that it breaks and was recorded in spite of.
    data
        What else belongs to its kind: reason, good, scrap, seconds, heads, text and so on.
    pieces
        The plan that was issued; the operations of an order added or changed.
    """

    seq: int
    id: str
    kind: Kind
    at_s: int
    at: str = ""
    who: str = ""
    order: str = ""
    machine: str = ""
    piece: int = 0
    unit: int = 0
    corrects: int = 0
    place: int = 0
    entered: str = ""
    entered_s: int | None = None
    accepted: tuple[str, ...] = ()
    data: Mapping[str, Any] = field(default_factory=dict)
    pieces: tuple[Piece, ...] = ()

    @property
    def key(self) -> Key:
        """The operation it is about."""
        return Key(self.order, self.machine, self.piece)

    @property
    def moment(self) -> tuple[int, int]:
        """Its rank in time."""
        return self.at_s, self.place


@dataclass(frozen=True, slots=True)
class Stretch:
    """A time without a gap on one unit; `end_s` is None while it lasts."""

    unit: int
    start_s: int
    end_s: int | None = None
    reason: str = ""

    def until(self, now_s: int) -> int:
        """Its end, or now while it lasts."""
        return now_s if self.end_s is None else self.end_s


@dataclass(frozen=True, slots=True)
class Odd:
    """An event that does not follow from what went before it; the state makes the best of it."""

    place: int
    rule: str


@dataclass(frozen=True, slots=True)
class PieceState:
    """How one operation stands.

    Attributes
    ----------
    planned
        Its row in the plan in force, if it has one.
    total_s
        How long it was to take: by the plan, or by an order added or changed, as known when it started;
        None when nothing says.
    runs
        When it ran, stops taken out; times when its machine was down are still in.
    run_s
        How long it has run, without the times when its machine was down.
    left_s
        How long it will go on: reported, or `total_s` less `run_s`, never less than the least that was asked
        for; 0 when done or cancelled, None when nothing says.
    why
        What blocks it, and `blocked_s` since when.
    """

    key: Key
    status: Status
    planned: Piece | None = None
    total_s: int | None = None
    unit: int = 0
    start_s: int | None = None
    end_s: int | None = None
    runs: tuple[Stretch, ...] = ()
    pauses: tuple[Stretch, ...] = ()
    run_s: int = 0
    left_s: int | None = None
    good: int | None = None
    scrap: int | None = None
    why: str = ""
    blocked_s: int | None = None

    @property
    def touched(self) -> bool:
        """Whether work on it has begun: a replan may not move it."""
        return self.start_s is not None or self.status is Status.DONE

    @property
    def failed(self) -> bool:
        """Whether it was finished and nothing good came out: it has to be run again."""
        return self.end_s is not None and bool(self.scrap) and not self.good


@dataclass(frozen=True, slots=True)
class MachineState:
    """How a machine stands; a stretch of unit 0 is of the whole machine."""

    id: str
    units: int = 1
    outages: tuple[Stretch, ...] = ()

    def outage(self, unit: int) -> Stretch | None:
        """Return what keeps `unit` down now, if anything; unit 0 asks whether no unit is up."""
        now = [stretch for stretch in self.outages if stretch.end_s is None]
        whole = next((stretch for stretch in now if stretch.unit == 0), None)
        if whole is not None:
            return whole
        if unit:
            return next((stretch for stretch in now if stretch.unit == unit), None)
        return now[0] if {stretch.unit for stretch in now} >= set(range(1, self.units + 1)) else None

    @property
    def up(self) -> bool:
        """Whether at least one unit is up."""
        return self.outage(0) is None


@dataclass(frozen=True, slots=True)
class OrderState:
    """What happened to an order as a whole; None where nothing did."""

    order: str
    added_s: int | None = None
    cancelled_s: int | None = None
    release_s: int | None = None
    due_s: int | None = None
    priority: float | None = None
    reason: str = ""


@dataclass(frozen=True, slots=True)
class ShiftState:
    """How the shift stands at one moment.

    Attributes
    ----------
    at_s
        The moment.
    plan
        Number of the entry that issued the plan in force, 0 when there is none yet.
    pieces
        Every operation of the plan in force, every other one touched or added; in order of planned start,
        those without one last, then by name.
    machines
        By name.
    crew
        Heads present by pool, as last said; the pool without a name is the hall's. Empty when nobody said.
    orders
        Those added, changed or cancelled.
    odd
        Events that could not be, and are in the journal all the same.
    """

    at_s: int
    plan: int = 0
    pieces: Mapping[Key, PieceState] = field(default_factory=dict)
    machines: Mapping[str, MachineState] = field(default_factory=dict)
    crew: Mapping[str, int] = field(default_factory=dict)
    orders: Mapping[str, OrderState] = field(default_factory=dict)
    odd: tuple[Odd, ...] = ()

    def of(self, status: Status) -> list[PieceState]:
        """Return the operations that stand so."""
        return [piece for piece in self.pieces.values() if piece.status is status]

    @property
    def good(self) -> int:
        """Good pieces reported."""
        return sum(piece.good or 0 for piece in self.pieces.values())

    @property
    def scrap(self) -> int:
        """Scrapped pieces reported."""
        return sum(piece.scrap or 0 for piece in self.pieces.values())
