"""What the entries of a journal say beyond the state: plans, new times, reports, remarks. Pure."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import cached_property

from shopfloor.model.actuals import Event, Key, Kind, Piece

_REPORTS = frozenset({Kind.STARTED, Kind.STOPPED, Kind.RESUMED, Kind.LEFT})


@dataclass(frozen=True)
class Told:
    """What was said up to a moment.

    Attributes
    ----------
    seconds
        How long all of an operation takes, as an order added or changed says.
    further
        Of those, the operations that no plan before had: more work, not other work.
    left
        (time, seconds left): the last report on an operation under way, unless its order changed since.
    plans
        The plans issued, in the order in which they took force.
    remarks
        The remarks, in order of time.
    crew
        (time, heads): how many of a pool are there, as last said; the pool without a name is the hall's.
    """

    seconds: Mapping[Key, int] = field(default_factory=dict)
    further: tuple[Key, ...] = ()
    left: Mapping[Key, tuple[int, int]] = field(default_factory=dict)
    plans: tuple[Event, ...] = ()
    remarks: tuple[Event, ...] = ()
    crew: Mapping[str, tuple[int, int]] = field(default_factory=dict)

    def planned(self, key: Key, at_s: int | None = None) -> Piece | None:
        """Return the row an operation had in the last plan that had it, in force by `at_s` if given.

        What began before any plan with it was in force has the row of the first that had it.
        """
        rows = [(plan.at_s, row) for plan in self.plans if (row := self._rows[plan.seq].get(key)) is not None]
        if not rows:
            return None
        known = [row for force, row in rows if at_s is None or force <= at_s]
        return known[-1] if known else rows[0][1]

    def promised(self, key: Key) -> Piece | None:
        """Return the row an operation had in the first plan that had it."""
        rows = (self._rows[plan.seq].get(key) for plan in self.plans)
        return next((row for row in rows if row is not None), None)

    @cached_property
    def _rows(self) -> Mapping[int, Mapping[Key, Piece]]:
        return {plan.seq: {piece.key: piece for piece in plan.pieces} for plan in self.plans}


def told(events: Iterable[Event], at_s: int) -> Told:
    """Return what `events` say; those that count, in order of time and place. Later ones than `at_s` do not.

    O(n) for n events and operations together.
    """
    seconds: dict[Key, int] = {}
    further: dict[Key, None] = {}
    left: dict[Key, tuple[int, int]] = {}
    plans: list[Event] = []
    remarks: list[Event] = []
    crew: dict[str, tuple[int, int]] = {}
    known: set[Key] = set()
    for event in events:
        if event.at_s > at_s:
            continue
        if event.kind is Kind.ISSUED:
            plans.append(event)
            known.update(piece.key for piece in event.pieces)
        elif event.kind in (Kind.ADDED, Kind.CHANGED):
            for piece in event.pieces:
                seconds[piece.key] = piece.seconds
                left.pop(piece.key, None)
                if piece.key not in known:
                    further[piece.key] = None
        elif event.kind in _REPORTS and "left_s" in event.data:
            left[event.key] = event.at_s, int(event.data["left_s"])
        elif event.kind is Kind.CREW:
            crew[str(event.data.get("pool", ""))] = event.at_s, int(event.data["heads"])
        elif event.kind is Kind.REMARK:
            remarks.append(event)
    return Told(seconds, tuple(further), left, tuple(plans), tuple(remarks), crew)
