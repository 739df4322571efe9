"""The state of a shift, computed from its events alone. Pure: no file, no clock.

Events are taken in order of the time at which things happened, not of their arrival; among equal times, in
order of recording. An event counts unless one that counts corrects it, so that a correction leaves
everything as if the mistake had never been made, and striking out a correction brings the mistake back. What
replaces a correction corrects what that corrected.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from shopfloor.journal.collector import collector_held
from shopfloor.journal.outages import Outages
from shopfloor.journal.walk import WORK, Phase, Walk
from shopfloor.model.actuals import (
    Event,
    Key,
    Kind,
    MachineState,
    Odd,
    OrderState,
    Piece,
    PieceState,
    ShiftState,
    Status,
)

MINIMUM_LEFT_S = 60  # work that goes on longer than planned is taken to need this much more


def counting(events: Iterable[Event]) -> list[Event]:
    """Return the events that count, in order of time and place. O(n log n)."""
    listed = list(events)
    correctors: dict[int, list[Event]] = defaultdict(list)
    for event in listed:
        if event.corrects:
            correctors[event.corrects].append(event)
    struck: set[int] = set()
    replaced: set[int] = set()  # struck, but with a successor that corrects what it corrected

    def holds(event: Event) -> bool:
        return event.seq not in struck or event.seq in replaced

    # Whoever corrects was recorded later, so from the last back every answer needed is there already.
    for seq in sorted(correctors, reverse=True):
        held = [event for event in correctors[seq] if holds(event)]
        if held:
            struck.add(seq)
        if any(event.kind is not Kind.WITHDRAWN for event in held):
            replaced.add(seq)
    return sorted((event for event in listed if event.seq not in struck), key=lambda event: event.moment)


def state(
    events: Iterable[Event], at_s: int | None = None, *, minimum_left_s: int = MINIMUM_LEFT_S
) -> ShiftState:
    """Return how the shift stands.

    Parameters
    ----------
    events
        Any part of a journal, in any order; the plan comes with its ``issued`` event.
    at_s
        The moment asked for, in seconds since the shift's start; later events do not count yet, later
        corrections do. Without it, the time of the last event that counts, or 0.
    minimum_left_s
        Least time left of an operation that is not done.

    Returns
    -------
    ShiftState
        O(n log n) for n events and planned operations together.
    """
    with collector_held():
        listed = [event for event in counting(events) if event.kind is not Kind.WITHDRAWN]
        if at_s is None:
            at_s = listed[-1].at_s if listed else 0
        return _Replay([event for event in listed if event.at_s <= at_s], at_s, minimum_left_s).state()


class _Replay:
    """Sorts events by what they are about, then puts the state together."""

    def __init__(self, events: Sequence[Event], at_s: int, minimum_left_s: int) -> None:
        self.at_s, self.minimum_left_s = at_s, minimum_left_s
        self.walks: dict[Key, Walk] = {}
        self.sources: dict[Key, list[tuple[Event, Piece]]] = defaultdict(list)
        self.planned: Mapping[Key, Piece] = {}
        self.plan = 0
        self.outages: dict[str, Outages] = defaultdict(Outages)
        self.crew: dict[str, int] = {}
        self.orders: dict[str, OrderState] = {}
        self.odd: list[Odd] = []
        for event in events:
            self._take(event)

    def _take(self, event: Event) -> None:
        kind = event.kind
        if kind in WORK:
            key: Any = (event.order, event.machine, event.piece)  # equal to its Key, and sooner made
            walk = self.walks.get(key)
            if walk is None:
                walk = self.walks[event.key] = Walk()
            walk.step(event)
        elif kind in (Kind.DOWN, Kind.UP):
            rule = self.outages[event.machine].step(event)
            if rule:
                self.odd.append(Odd(event.place, rule))
        elif kind is Kind.CREW:
            self.crew[str(event.data.get("pool", ""))] = int(event.data["heads"])
        elif kind in (Kind.ADDED, Kind.CHANGED, Kind.CANCELLED):
            self.orders[event.order] = _order(self.orders.get(event.order), event)
        if kind is Kind.ISSUED:
            self.plan, self.planned = event.seq, {piece.key: piece for piece in event.pieces}
        for piece in event.pieces:
            self.sources[piece.key].append((event, piece))

    def state(self) -> ShiftState:
        """Put together what was taken."""
        added = {
            key
            for key, found in self.sources.items()
            if any(event.kind is not Kind.ISSUED for event, _ in found)
        }
        keys = {*self.planned, *self.walks, *added}
        machines = self._machines(keys)
        pieces = {key: self._piece(key, machines[key.machine]) for key in sorted(keys, key=self._rank)}
        odd = [*self.odd, *(odd for found in self.walks.values() for odd in found.odd)]
        return ShiftState(
            at_s=self.at_s,
            plan=self.plan,
            pieces=pieces,
            machines=machines,
            crew=self.crew,
            orders=self.orders,
            odd=tuple(sorted(odd, key=lambda one: (one.place, one.rule))),
        )

    def _rank(self, key: Key) -> tuple[bool, int, Key]:
        row = self.planned.get(key)
        start = row.start_s if row is not None else None
        return start is None, start or 0, key

    def _machines(self, keys: Iterable[Key]) -> dict[str, MachineState]:
        units: dict[str, int] = dict.fromkeys(self.outages, 1)
        for key in keys:
            most = max((piece.unit for _, piece in self.sources.get(key, ())), default=1)
            units[key.machine] = max(units.get(key.machine, 1), most)
        return {
            name: MachineState(name, count, tuple(self.outages[name].stretches()))
            for name, count in sorted(units.items())
        }

    def _piece(self, key: Key, machine: MachineState) -> PieceState:
        walk, row = self.walks.get(key), self.planned.get(key)
        walk = Walk() if walk is None else walk
        outages = self.outages[key.machine]
        total, report = _estimate(walk, self.sources.get(key, ()))
        run = sum(outages.up_time(one.unit, one.start_s, one.until(self.at_s)) for one in walk.runs)
        left = None if total is None else total - run
        if report is not None:
            since = sum(
                outages.up_time(one.unit, max(one.start_s, report[0]), one.until(self.at_s))
                for one in walk.runs
            )
            left = report[1] - since
        status, why, blocked = self._status(key, walk, row, machine)
        if status in (Status.DONE, Status.CANCELLED):
            left = 0
        elif left is not None:
            left = max(left, self.minimum_left_s)
        return PieceState(
            key=key,
            status=status,
            planned=row,
            total_s=total,
            unit=walk.unit,
            start_s=walk.start_s,
            end_s=walk.end_s,
            runs=tuple(walk.runs),
            pauses=tuple(walk.pauses),
            run_s=run,
            left_s=left,
            good=walk.good,
            scrap=walk.scrap,
            why=why,
            blocked_s=blocked,
        )

    def _status(
        self, key: Key, walk: Walk, row: Piece | None, machine: MachineState
    ) -> tuple[Status, str, int | None]:
        """Return the status, and if blocked what blocks and since when."""
        if walk.phase is Phase.DONE:
            return Status.DONE, "", None
        order = self.orders.get(key.order)
        if order is not None and order.cancelled_s is not None and walk.phase is not Phase.RUNNING:
            return Status.CANCELLED, order.reason, None
        if walk.phase is Phase.STOPPED:
            return Status.BLOCKED, f"stopped: {walk.pauses[-1].reason}", walk.since_s
        outage = machine.outage(walk.unit if walk.phase is Phase.RUNNING else 0)
        if outage is not None:
            return Status.BLOCKED, f"machine down: {outage.reason}", outage.start_s
        return Status.RUNNING if walk.phase is Phase.RUNNING else Status.WAITING, "", None


def _estimate(
    walk: Walk, sources: Sequence[tuple[Event, Piece]]
) -> tuple[int | None, tuple[int, int] | None]:
    """Return how long an operation was to take, and the last word on what is left of it, if there is one.

    What a plan or an order says before the operation starts is how long all of it takes. A plan issued
    while it is under way says what is left; an order changed then, how long all of it takes after all.
    """
    total: int | None = None
    report: tuple[int, int] | None = None
    reports = list(walk.reports)
    for event, piece in sources:
        if walk.start_s is None or event.at_s <= walk.start_s or total is None:
            total = piece.seconds
        elif walk.end_s is not None and event.at_s >= walk.end_s:
            break  # what is said of work already done changes nothing
        elif event.kind is not Kind.ISSUED:
            total, reports = piece.seconds, [one for one in reports if one[0] > event.at_s]
        elif piece.start_s is not None and piece.end_s is not None:
            reports.append((event.at_s, piece.end_s - max(piece.start_s, event.at_s)))
    if reports:
        report = sorted(reports, key=lambda one: one[0])[-1]  # of equal times the last said
    return total, report


def _order(known: OrderState | None, event: Event) -> OrderState:
    data = event.data
    before = known or OrderState(event.order)
    cancelled = event.kind is Kind.CANCELLED
    return OrderState(
        order=event.order,
        added_s=event.at_s if event.kind is Kind.ADDED else before.added_s,
        cancelled_s=event.at_s if cancelled else before.cancelled_s,
        release_s=data.get("release_s", before.release_s),
        due_s=data.get("due_s", before.due_s),
        priority=data.get("priority", before.priority),
        reason=str(data.get("reason", "")) if cancelled else before.reason,
    )
