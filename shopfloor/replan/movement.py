"""How much a new plan moves of an old one, weighted by how near it is. Pure."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple

from shopfloor.model.calendar import HOUR, MINUTE
from shopfloor.replan.compare import longest_in_order

MOVED_S = 5 * MINUTE
NEAR_S = HOUR  # a move so far ahead weighs half of one now
_UNIT = 1_000


class Place(NamedTuple):
    """Where an operation was to run: first start, last end, unit."""

    start_s: int
    end_s: int
    unit: int


@dataclass(frozen=True, slots=True)
class Moves:
    """What a plan moves: operations moved or resequenced, those resequenced, and their weight.

    The weight counts a move and a changed place in a machine's sequence as one each, of an operation that
    was to start now; of one an hour ahead as a half, two hours ahead as a third, and so on.
    """

    moved: int
    resequenced: int
    weight: int


@dataclass(frozen=True)
class Reference:
    """Where operations were to run.

    Parameters
    ----------
    was
        Operation to its place in the old plan; new work is left out.
    machine
        An entry an operation.
    now_s
        The moment, on the clock of the places.
    moved_s
        Who starts and ends at most so much earlier or later, on the same unit, has not been moved.
    """

    was: Mapping[int, Place]
    machine: Sequence[int]
    now_s: int
    moved_s: int = MOVED_S

    @cached_property
    def lines(self) -> tuple[tuple[int, ...], ...]:
        """The operations of each machine by old start."""
        found: dict[int, list[int]] = {}
        for operation in sorted(self.was, key=lambda k: (self.was[k].start_s, k)):
            found.setdefault(self.machine[operation], []).append(operation)
        return tuple(tuple(line) for _, line in sorted(found.items()))

    @cached_property
    def weight(self) -> Mapping[int, int]:
        """How much a move of each operation weighs."""
        return {
            k: _UNIT * NEAR_S // (NEAR_S + max(0, place.start_s - self.now_s))
            for k, place in self.was.items()
        }

    def moves(self, places: Sequence[Place]) -> Moves:
        """Return what a new plan, an entry an operation, moves; O(n log n)."""
        each = [self.moves_of(line, places) for line in self.lines]
        return Moves(*(sum(column) for column in zip(*each, strict=True))) if each else Moves(0, 0, 0)

    def moves_of(self, line: Sequence[int], places: Sequence[Place]) -> tuple[int, int, int]:
        """Return what it moves on one machine: how many moved, how many resequenced, their weight."""
        count = resequenced = weight = 0
        ties = sorted(line, key=lambda k: (self.was[k].start_s, places[k].start_s, k))
        kept = longest_in_order([places[k].start_s for k in ties])
        for k, stays in zip(ties, kept, strict=True):
            moved = self.moved(k, places[k])
            if moved or not stays:
                count += 1
                resequenced += not stays
                weight += self.weight[k] * (moved + (not stays))
        return count, resequenced, weight

    def moved(self, k: int, new: Place) -> bool:
        """Whether an operation that was planned starts or ends clearly off, or on another unit."""
        old = self.was[k]
        shift = max(abs(new.start_s - old.start_s), abs(new.end_s - old.end_s))
        return shift > self.moved_s or new.unit != old.unit
