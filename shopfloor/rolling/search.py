"""Candidates between the old plan and a fresh one, and the choice among them.

Serial generation (:mod:`shopfloor.openshop.floor.timetable`) turns a sequence into the timetable in which
each operation stands as early as it may beside those before. So a candidate is a sequence: the old one, a
fresh one, or one that follows the fresh plan in places and the old one elsewhere. From a good candidate the
search goes back towards the old plan, machine by machine, then stretch by stretch, then operation by
operation, and keeps each step that ends in time and moves less.

Every timetable made goes into an archive of those that nothing beats in every goal and movement at once; so
the trade between them is known without asking for it. How many are made depends on the size of the shop, not
on the clock, so that they repeat.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from shopfloor.replan.movement import Moves, Reference
from shopfloor.rolling.bench import Bench, Timed

PLACED = 200_000  # operations placed in all timetables of one search together
FEWEST, MOST = 60, 1_500  # timetables
WINDOWS = (8, 4, 2, 1)  # how many operations of a machine are taken back at once, in this order
BLENDS = (0.25, 0.5, 0.75)
CUTS = 6  # moments at which a candidate changes from one sequence to the other

Keys = dict[int, float]
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

    def chosen(self, limits: Limits) -> Candidate:
        """The one that moves least, by weight, among those within limits; of equals the better one."""
        fine = [one for one in self.front if within(one.timed, limits)]
        return min(fine, key=lambda one: (one.moves.weight, one.key))


class Search:
    """One search for the least movement.

    Parameters
    ----------
    bench
        Times sequences.
    reference
        The old plan, on the bench's clock.
    over
        Asked between timetables; true ends the search with what it has.
    """

    def __init__(self, bench: Bench, reference: Reference, over: Callable[[], bool]) -> None:
        self.bench, self.reference, self._over = bench, reference, over
        self.archive = Archive()
        size = max(1, len(bench.movable))
        self._left = max(FEWEST, min(MOST, PLACED // size))
        self.complete, self._timed = True, False
        self._old = _old_keys(bench, reference)

    # ---- single timetables ---------------------------------------------------------------------------

    def offer(self, timed: Timed | None, origin: str) -> Candidate | None:
        """Take a timetable into the archive."""
        if timed is None:
            return None
        found = Candidate(timed, self.reference.moves(timed.places), origin)
        self.archive.offer(found)
        return found

    def _time(self, keys: Keys, origin: str) -> Candidate | None:
        """Time operations by their keys; None where that cannot be, or where the search is at its end.

        The first timetable, that of the old sequence, is made even if time is up: it is always a candidate.
        """
        if self._left <= 0:
            return None
        if self._timed and self._over():
            self.complete, self._left = False, 0
            return None
        self._timed = True
        self._left -= 1
        sequence = sorted(self.bench.movable, key=lambda k: (keys[k], k))
        units = {k: was.unit for k, was in self.bench.was.items()}
        return self.offer(self.bench.time(sequence, units), origin)

    # ---- the search ----------------------------------------------------------------------------------

    def kept(self) -> None:
        """Time the old sequence; what is new comes where its order's time runs out, or first, or last."""
        for keys in self._with_new():
            self._time(keys, "kept")

    def between(self, fresh: Timed) -> None:
        """Time a fresh plan's own sequence and mixtures of it with the old one."""
        new = _keys(fresh)
        self._time(new, "fresh")
        old = self._old
        last = max([*old.values(), *new.values()], default=0)
        for cut in range(1, CUTS):
            turn = last * cut / CUTS
            self._time({k: new[k] if new[k] < turn else last + 1 + old[k] for k in new}, "repaired")
            self._time({k: old[k] if old[k] < turn else last + 1 + new[k] for k in new}, "repaired")
        for share in BLENDS:
            self._time({k: share * old[k] + (1 - share) * new[k] for k in new}, "repaired")

    def settle(self, limits: Limits) -> None:
        """From the best candidate so far go back towards the old plan, within limits."""
        while self._left > 0:
            before = self.archive.chosen(limits)
            self._descend(before, limits)
            if self.archive.chosen(limits) is before:
                return

    def _descend(self, start: Candidate, limits: Limits) -> None:
        best, keys = start, _keys(start.timed)
        for window in (None, *WINDOWS):
            for some in self._stretches(keys, window):
                tried = {**keys, **self._back(keys, some)}
                if tried == keys:
                    continue
                found = self._time(tried, "repaired")
                if found is None:
                    if self._left <= 0:
                        return
                    continue
                if within(found.timed, limits) and found.moves.weight < best.moves.weight:
                    best, keys = found, _keys(found.timed)

    def _stretches(self, keys: Keys, window: int | None) -> Iterator[Sequence[int]]:
        """Yield the operations that are taken back together: those of a machine, or stretches of them."""
        weight = self.reference.weight
        lines = [line for line in self._lines() if len(line) > 1 or window == 1]
        for line in sorted(lines, key=lambda line: (-sum(weight.get(k, 0) for k in line), line)):
            if window is None:
                yield line
                continue
            step = max(1, window // 2)
            for first in range(0, max(1, len(line) - window + 1), step):
                yield line[first : first + window]

    def _lines(self) -> Iterable[tuple[int, ...]]:
        movable = set(self.bench.movable)
        for line in self.reference.lines:
            mine = tuple(k for k in line if k in movable)
            if mine:
                yield mine

    def _back(self, keys: Keys, some: Sequence[int]) -> Keys:
        """Return keys that put some operations of a machine in their old order; of one, its old start."""
        if len(some) == 1:
            return {some[0]: self._old[some[0]]}
        slots = sorted(keys[k] for k in some)
        return dict(zip(sorted(some, key=lambda k: (self._old[k], k)), slots, strict=True))

    def _with_new(self) -> Iterator[Keys]:
        """Yield the old keys with those of new work: by how soon it must start, before all, after all."""
        old = self._old
        new = [k for k in self.bench.movable if k not in self.reference.was]
        yield old
        if new:
            yield {**old, **dict.fromkeys(new, -1.0)}
            yield {**old, **dict.fromkeys(new, max(old.values()) + 1)}


def _keys(timed: Timed) -> Keys:
    return {k: float(place.start_s) for k, place in enumerate(timed.places)}


def _old_keys(bench: Bench, reference: Reference) -> Keys:
    """Return the old start of each operation; of new work the latest start that its due time allows.

    Without a due time it comes after everything.
    """
    shop = bench.rest.solve
    known: Mapping[int, int] = {k: place.start_s for k, place in reference.was.items()}
    last = max(known.values(), default=0)
    keys: Keys = {}
    for k in range(len(shop)):
        job = int(shop.operations.job[k])
        due = shop.orders[job].due_s
        latest = last + 1 if due is None else min(last + 1, due - int(shop.job_load_s[job]))
        keys[k] = float(known.get(k, latest))
    return keys
