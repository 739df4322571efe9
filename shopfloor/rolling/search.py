"""The search for little movement: the old sequence kept, a fresh one, what lies between; then repairs.

Between the plan that moves least and the one that ends earliest lie sequences that take after the old one
for some while and after the fresh one then, or after both. They, and timetables built around the old plan,
are repaired until nothing brings more of them back home within the limits. Every timetable made goes into an
archive of those that nothing beats in every goal and movement at once; so the trade between them is known
without asking for it. How many are made depends on the size of the shop, not on the clock, so that they
repeat.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping

from shopfloor.openshop.method import Progress
from shopfloor.replan.movement import Reference
from shopfloor.rolling.archive import Archive, Candidate, Limits, limits_of
from shopfloor.rolling.bench import Bench, Timed
from shopfloor.rolling.repair import Repair
from shopfloor.rolling.sharpen import sharpened

PLACED = 400_000  # places looked for in all repairs of one search together
SHAKES, SHAKES_EACH = 1_500, 30  # parts drawn at random in the last repair, at most; for each operation
TELL_EVERY = 100  # times asked whether time is up
BLENDS = (0.25, 0.5, 0.75)
CUTS = 6  # moments at which a candidate changes from one sequence to the other

Keys = dict[int, float]


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
    report
        Told now and then how things stand, times on the bench's clock; of the time left it knows nothing.
    seed
        Of the parts drawn in repairs.

    Attributes
    ----------
    archive
        What was found.
    complete
        Whether nothing was cut short by `over`.
    bound_s
        A lower bound of the makespan, as far as known.
    """

    def __init__(
        self,
        bench: Bench,
        reference: Reference,
        over: Callable[[], bool],
        report: Callable[[Progress], None] = lambda progress: None,
        *,
        seed: int = 0,
    ) -> None:
        self.bench, self.reference, self._seed = bench, reference, seed
        self._is_over, self._report, self._asked = over, report, 0
        self.archive = Archive()
        self.complete, self.bound_s = True, 0
        self._timed, self._left = False, PLACED
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
        """Time operations by their keys; None where that cannot be, or where time is up.

        The first timetable, that of the old sequence, is made even then: it is always a candidate.
        """
        if self._timed and self._ended():
            return None
        self._timed = True
        sequence = sorted(self.bench.movable, key=lambda k: (keys[k], k))
        units = {k: was.unit for k, was in self.bench.was.items()}
        return self.offer(self.bench.time(sequence, units), origin)

    def _over(self) -> bool:
        self._asked += 1
        if self._asked % TELL_EVERY == 0 and self.archive.front:
            self._report(Progress("moves", self.archive.best().timed.makespan_s, self.bound_s, 0.0))
        return self._is_over()

    def _ended(self) -> bool:
        if self.complete and self._over():
            self.complete = False
        return not self.complete

    # ---- between the old plan and a fresh one ----------------------------------------------------------

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

    def sharpen(self, bound_s: int) -> None:
        """Improve what moves least so far and what is best, unless nothing can be better."""
        self.bound_s = bound_s
        best = self.archive.best()
        met = best.timed.makespan_s <= bound_s and not best.timed.tardiness
        if met and "changeovers" not in self.bench.goals:
            return
        for one in dict.fromkeys((self.archive.nearest(), best)):
            if not self._ended():
                timed, ended = sharpened(self.bench, one.timed, bound_s, self._over, seed=self._seed)
                self.offer(timed, "repaired")
                self.complete &= ended

    # ---- repairs ---------------------------------------------------------------------------------------

    def settled(self, stability_s: int) -> tuple[Candidate, Candidate]:
        """Return the best candidate, and the one that moves least among those near enough to it.

        On the way back towards the old plan a better one than the best may turn up; then that one counts.
        What moves least without any loss is looked for first, so that stability has that to choose from, too.
        """
        goals = self.bench.goals
        for allowed_s in sorted({0, stability_s}):
            while True:
                best = self.archive.best().timed.value
                self._settle(limits_of(self.archive.best(), goals, allowed_s), strict=not allowed_s)
                if self.archive.best().timed.value == best:
                    break
        best_one = self.archive.best()
        return best_one, self.archive.chosen(limits_of(best_one, goals, stability_s))

    def _settle(self, limits: Limits, *, strict: bool) -> None:
        """Look for what moves less within limits: built around the old plan, or mended."""
        new = [k for k in self.bench.movable if k not in self.reference.was]
        starts = [self.archive.nearest().timed]
        for first in ([], new) if new else ([],):
            repair = self._repair(limits, strict)
            built = list(repair.build(first))
            for timed in built:
                self.offer(timed, "repaired")
            starts += built[-1:]
            self._count(repair)
        for timed in starts:
            self._mend(timed, limits, strict)
        shakes = min(SHAKES, SHAKES_EACH * len(self.bench.movable))
        self._mend(self.archive.chosen(limits).timed, limits, strict, shakes)

    def _mend(self, timed: Timed, limits: Limits, strict: bool, shakes: int = 0) -> None:
        if not self._ended():
            repair = self._repair(limits, strict)
            self.offer(repair.mended(timed, shakes, self._seed), "repaired")
            self._count(repair)

    def _repair(self, limits: Limits, strict: bool) -> Repair:
        return Repair(
            self.bench,
            self.reference,
            self._old,
            limits,
            strict=strict,
            bound_s=self.bound_s,
            most=self._left,
            over=self._over,
        )

    def _count(self, repair: Repair) -> None:
        self._left = max(0, self._left - repair.placed)
        self.complete &= repair.complete

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
