"""Timetables repaired: operations go back to where they were to run, as far as limits allow.

In a shift most machines have time to spare. There a delay need not push everything behind it: one operation
gives up its place and goes into a gap, and the rest stays. So a timetable is first built around the old one:
whatever can stand in its old place does, and only then the rest finds gaps. What ends too late in its gap is
placed before everything else in the next attempt, and pushes others out (after D. E. Joslin, D. P. Clements,
J. of Artificial Intelligence Research 10 (1999) 353-373). Then small parts of a timetable are taken out and
put in again, home first, and that is kept where it is better (after P. Shaw, CP 1998, LNCS 1520, 417-431).

Everything is counted in places looked for and not in seconds, so that it repeats.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from random import Random

from shopfloor.openshop.floor.rules import FAR, NONE
from shopfloor.replan.movement import Reference
from shopfloor.rolling.archive import Limits
from shopfloor.rolling.bench import Bench, Timed
from shopfloor.rolling.standing import Part, Standing

BUILDS = 30  # timetables built around the old one, at most
WIDTHS_S = (0, 1_800, 3_600, 7_200)  # so much before and after a moment is taken out when shaking


class Repair:
    """Repairs of timetables within limits.

    Parameters
    ----------
    bench, reference, rank, limits, strict
        As for :class:`~shopfloor.rolling.standing.Standing`.
    bound_s
        A lower bound of the makespan: what meets it is not hurried.
    most
        How many places may be looked for in all.
    over
        Asked between attempts; true ends the work.
    """

    def __init__(
        self,
        bench: Bench,
        reference: Reference,
        rank: Mapping[int, float],
        limits: Limits,
        *,
        strict: bool,
        bound_s: int,
        most: int,
        over: Callable[[], bool],
    ) -> None:
        self.bench, self.reference = bench, reference
        self.complete = True
        self._bound_s, self._most, self._over = bound_s, most, over
        self._now = Standing(bench, reference, rank, limits, strict=strict)
        rules = bench.rules
        ways = [0] * len(rules.count)
        if rules.transport is not None:
            ways = [max(row[machine] for row in rules.transport) for machine in range(len(ways))]
        self._pad = [
            max([way, *(max(row) for row in change or ())])
            for way, change in zip(ways, rules.change, strict=True)
        ]

    @property
    def placed(self) -> int:
        """How many places have been looked for so far."""
        return self._now.placed

    def _ended(self) -> bool:
        if self.complete and self._over():
            self.complete = False
        return not self.complete or self.placed >= self._most

    # ---- building around the old plan ------------------------------------------------------------------

    def build(self, first: Iterable[int] = ()) -> Iterator[Timed]:
        """Yield timetables around the old one, until one is within limits.

        Parameters
        ----------
        first
            What is placed before everything else, as early as it can be.
        """
        now, machine = self._now, self.bench.rules.machine
        front: set[int] = set(first)
        closed: set[int] = set()  # machines that have closed up
        for _ in range(BUILDS):
            if self._ended() or not now.build(front):
                return
            yield now.timed()
            late = self._too_late()
            more = late - front
            if late and not more:  # those in front come too late themselves: their machines close up
                slow = {machine[k] for k in late} - closed
                more = {k for k in now.movable if machine[k] in slow} - front
                closed |= slow
            if not more:
                return
            front |= more

    def _too_late(self) -> set[int]:
        """Return what ends after the limit, or after the due time of its order where that counts too much."""
        rules, now, found = self.bench.rules, self._now, set()
        for goal, value, limit in zip(self.bench.goals, now.value, now.limits, strict=True):
            if value > limit and goal != "changeovers":
                for k in now.movable:
                    due = limit if goal == "makespan" else rules.due[rules.job[k]]
                    if due != FAR and now.places[k].end_s > due:
                        found.add(k)
        return found

    # ---- mending ---------------------------------------------------------------------------------------

    def mended(self, timed: Timed, shakes: int = 0, seed: int = 0) -> Timed | None:
        """Return a timetable mended as far as it goes; None if it cannot be, as its work is cut.

        Parameters
        ----------
        shakes
            So many parts drawn at random are put in anew before a second mending.
        """
        if not self._now.load(timed):
            return None
        self._mend()
        if shakes:
            random = Random(seed)
            for _ in range(shakes):
                if self._ended():
                    break
                self._now.attempt(self._any_part(random), even=True)
            self._mend()
        return self._now.timed()

    def _mend(self) -> None:
        """Try part after part, as long as that makes it better."""
        while not self._ended():
            before = self._now.key
            for part in self._parts():
                if self._ended():
                    return
                self._now.attempt(part)
            if self._now.key == before:
                return

    def _parts(self) -> Iterator[Part]:
        """Yield what is tried: what is late hurried; what is away brought home; delays taken by one."""
        now, machine = self._now, self.bench.rules.machine
        if now.strict or not now.fine:
            for some in self._hurried():
                where = {machine[k] for k in some}
                others = [k for k in now.movable if machine[k] in where and k not in some]
                yield Part(first=some, some=others)
                yield Part(first=some, some=others, push=True)
                yield Part(first=some, last=others)
        away, weight = now.away(now.movable), self.reference.weight
        yield Part(away)
        yield Part(away, push=True)
        for k in sorted(away, key=lambda k: (-weight.get(k, 0), k)):
            if k in weight and not now.at_home(k):
                some = [k, *self._in_the_way(k)]
                yield Part(some)
                yield Part(some, push=True)
        for place in sorted(now.weights, key=lambda place: (-now.weights[place], place)):
            for k in now.line(place):
                since = now.places[k].start_s
                some = [j for j in now.away(now.line(place)) if j != k and now.places[j].start_s >= since]
                if some:
                    yield Part(some, last=[k], push=True)

    def _hurried(self) -> Iterator[list[int]]:
        """Yield what might lessen a goal if it ended earlier: what ends last, what makes an order late."""
        rules, now = self.bench.rules, self._now
        finish = max(now.done, default=0)
        if finish > self._bound_s:
            yield [k for k in now.movable if now.places[k].end_s == finish]
        late = [
            (-rules.weight[job] * (done - rules.due[job]), job)
            for job, done in enumerate(now.done)
            if done > rules.due[job]
        ]
        for _, job in sorted(late):
            mine = [k for k in now.visits[job] if k not in self.bench.rest.pinned]
            mine.sort(key=lambda k: (rules.step[k], now.places[k].start_s, k))
            yield mine
            yield [k for k in mine if now.places[k].end_s > rules.due[job]]

    def _in_the_way(self, k: int) -> list[int]:
        """Return what stands where an operation was to run: on its machine, of its order, with its crew."""
        rules, now, was = self.bench.rules, self._now, self.reference.was[k]
        machine, crew, job = rules.machine[k], rules.crew[k], rules.job[k]
        start, end = was.start_s - self._pad[machine], was.end_s + self._pad[machine]
        return [
            j
            for j in now.movable
            if j != k
            and now.places[j].start_s < end
            and start < now.places[j].end_s
            and (
                rules.machine[j] == machine
                or rules.job[j] == job
                or (crew != NONE and rules.crew[j] == crew and not now.at_home(j))
            )
        ]

    def _any_part(self, random: Random) -> Part:
        """Return something that is away, with what runs about then where its order goes, in any manner."""
        rules, now = self.bench.rules, self._now
        away = now.away(now.movable)
        if not away:
            return Part()
        k = random.choice(away)
        moment = random.choice((now.places[k], self.reference.was.get(k, now.places[k]))).start_s
        width = random.choice(WIDTHS_S)
        machines = {rules.machine[j] for j in now.visits[rules.job[k]]} | {random.randrange(len(rules.count))}
        some = [
            j
            for j in now.movable
            if j != k
            and rules.machine[j] in machines
            and now.places[j].start_s < moment + width
            and moment - width < now.places[j].end_s
        ]
        manners = (
            Part(some, first=[k]),
            Part(some, first=[k], push=True),
            Part([k, *some]),
            Part([k, *some], push=True),
            Part(first=[k], last=some),
            Part(some, last=[k], push=True),
        )
        return random.choice(manners)
