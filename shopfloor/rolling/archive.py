"""Timetables to choose from: those that nothing beats in every goal and movement at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from shopfloor.openshop.incumbent import TARDINESS
from shopfloor.openshop.round_order import PRIORITY_UNIT
from shopfloor.replan.movement import Moves
from shopfloor.rolling.bench import Timed

Limits = tuple[int, ...]  # the most of each goal, in the order of the goals


@dataclass(frozen=True)
class Candidate:
    """A timetable, what it moves, and which kind of sequence it came from."""

    timed: Timed
    moves: Moves
    origin: str

    @property
    def key(self) -> tuple[int, ...]:
        """What counts, in its order, and movement last."""
        return (*self.timed.value, self.moves.weight)


def within(timed: Timed, limits: Limits) -> bool:
    """Whether a timetable is no worse in any goal than allowed."""
    return all(value <= limit for value, limit in zip(timed.value, limits, strict=True))


def allowed(goal: str, seconds: int) -> int:
    """Return what a goal's value may grow by for so many seconds: lateness is weighed in thousandths."""
    return seconds * (PRIORITY_UNIT if goal == TARDINESS else 1)


def limits_of(best: Candidate, goals: Sequence[str], stability_s: int) -> Limits:
    """Return how much of each goal a plan may have, to be no more than `stability_s` worse than the best."""
    return tuple(
        value + allowed(goal, stability_s) for goal, value in zip(goals, best.timed.value, strict=True)
    )


def worse_than(one: Candidate, other: Candidate, goals: Sequence[str]) -> tuple[tuple[str, int], ...]:
    """Return by how many (weighted) seconds a plan is worse than another, by goal; rounded up."""
    return tuple(
        (goal, -(-(value - least) // allowed(goal, 1)))
        for goal, value, least in zip(goals, one.timed.value, other.timed.value, strict=True)
    )


@dataclass
class Archive:
    """The candidates that nothing beats in every goal and movement at once."""

    front: list[Candidate] = field(default_factory=list)

    def offer(self, one: Candidate) -> bool:
        """Keep a candidate unless one kept is as good in everything; tell whether it was kept."""
        key = one.key
        if any(all(a <= b for a, b in zip(kept.key, key, strict=True)) for kept in self.front):
            return False
        self.front = [
            kept for kept in self.front if not all(a <= b for a, b in zip(key, kept.key, strict=True))
        ]
        self.front.append(one)
        return True

    def best(self) -> Candidate:
        """The best by what counts, one after the other; then the one that moves least."""
        return min(self.front, key=lambda one: one.key)

    def nearest(self) -> Candidate:
        """The one that moves least by weight, whatever it costs; of equals the better one."""
        return min(self.front, key=lambda one: (one.moves.weight, one.key))

    def chosen(self, limits: Limits) -> Candidate:
        """The one that moves least, by weight, among those within limits; of equals the better one."""
        fine = [one for one in self.front if within(one.timed, limits)]
        return min(fine, key=lambda one: (one.moves.weight, one.key))
