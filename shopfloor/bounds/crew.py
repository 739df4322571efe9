"""Crew bounds: so many heads can attend only so much work at once.

Heads times seconds is the energy of an operation, and a crew gives no more of it than its heads that are
there (energetic reasoning: J. Erschler, P. Lopez, C. Thuriot, Revue d'intelligence artificielle 5 (1991)
7-32; cited from memory). What cannot start before h and leaves its order at least q to do must be attended
between; h and q are thresholds, as in :mod:`shopfloor.bounds.window`.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from shopfloor.bounds.window import spread
from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound
from shopfloor.model.shop import Crew, Ints, Shop

HEADS_TRIED = 64  # evenly spread over the distinct earliest starts of a crew's work that has more


def crew_bounds(shop: Shop) -> list[Bound]:
    """Return a bound for each crew with work: head-seconds over heads, in whole rounds where times are equal.

    Whole rounds: with equal times p and h heads each, at most ⌊heads/h⌋ run in any one round, and an
    operation that overlaps no round boundary of the others costs a whole round's worth of heads. That
    needs the same heads all the time. Running time O(n log n) and O(n) for each distinct earliest start, at
    most ``HEADS_TRIED`` of them.
    """
    bounds = []
    for crew in shop.crews:
        theirs = np.array([machine.crew == crew.id for machine in shop.machines], bool)
        attended = np.flatnonzero(theirs[shop.operations.machine])
        if len(attended) and crew.heads:
            bounds.append(_crew_bound(shop, crew, attended))
    return [bound for bound in bounds if bound.witness.get("head_seconds") != 0]  # nobody is needed there


def _crew_bound(shop: Shop, crew: Crew, attended: Ints) -> Bound:
    only_setup = np.array([machine.set_up_only for machine in shop.machines], bool)[shop.operations.machine]
    seconds = np.where(only_setup, shop.operations.setup_s, shop.operations.seconds)[attended]
    heads = shop.operations.heads[attended]
    release = int(shop.head_s[attended].min())
    stays = not only_setup[attended].any() and not crew.levels
    equal = stays and int(seconds.min()) == int(seconds.max()) and int(heads.min()) == int(heads.max())
    if equal and heads[0] > 0 and not shop.has_splits and not _lends_heads(shop, attended):
        length, at_once = int(seconds[0]), max(1, crew.heads // int(heads[0]))
        rounds = -(-len(attended) // at_once)
        value = shop.work_clock.finish(release, rounds * length)
        return Bound(
            kind="crew rounds",
            value_s=value,
            witness={
                "crew": crew.id,
                "from_s": release,
                "operations": len(attended),
                "at_once": at_once,
                "round_s": length,
            },
            sentence=f"Crew {crew.id} can attend {at_once} of its {len(attended)} operations at once, "
            f"each {duration(length)}, so nothing can end before {shop.clock.say(value)}.",
        )
    afterwards = shop.tail_s[attended] + (shop.operations.seconds[attended] - seconds)
    return _energy_bound(shop, crew, shop.head_s[attended], seconds * heads, afterwards)


def _energy_bound(shop: Shop, crew: Crew, head: Ints, energy: Ints, tail: Ints) -> Bound:
    """Return the best bound over all thresholds of head and tail."""
    clock = CrewClock(shop, crew)
    longest_first = np.argsort(-tail, kind="stable")
    head, energy, tail = head[longest_first], energy[longest_first], tail[longest_first]
    best = -1
    witness: dict[str, Any] = {}
    for begin in spread(head, HEADS_TRIED).tolist():
        inside = head >= begin
        left, work = tail[inside], np.cumsum(energy[inside])
        done = np.where(work > 0, clock.finish(begin, work), begin)
        values = np.where(left > 0, shop.work_clock.end(shop.work_clock.worked(done) + left), done)
        values = np.where(np.r_[left[1:] != left[:-1], True], values, -1)  # all of one tail, or none of it
        place = int(values.argmax())
        if int(values[place]) > best:
            best = int(values[place])
            witness = {
                "crew": crew.id,
                "from_s": begin,
                "tail_s": int(left[place]),
                "head_seconds": int(work[place]),
            }
    return Bound("crew", best, witness, _energy_sentence(shop, crew, best, witness))


def _energy_sentence(shop: Shop, crew: Crew, value_s: int, witness: dict[str, Any]) -> str:
    counts = {crew.heads, *(heads for _, _, heads in crew.levels)}
    there = f"{min(counts)} to {max(counts)}" if len(counts) > 1 else f"{crew.heads}"
    noun = "head" if counts == {1} else "heads"
    begin, tail = witness["from_s"], witness["tail_s"]
    limits = [f"cannot start before {shop.clock.say(begin)}"] if begin else []
    limits += [f"leaves at least {duration(tail)} to do without them"] if tail else []
    which = f" that {' and '.join(limits)}" if limits else ""
    return (
        f"The {there} {noun} of crew {crew.id} have {duration(witness['head_seconds'])} of one head's "
        f"work{which}, so nothing can end before {shop.clock.say(value_s)}."
    )


class CrewClock:
    """How much a crew can have worked, in head-seconds, by any moment; nobody works in the hall's breaks."""

    def __init__(self, shop: Shop, crew: Crew) -> None:
        spans = [*crew.levels, *((each.start_s, each.end_s, 0) for each in shop.breaks)]
        moments = {0, *(moment for start, end, _ in spans for moment in (start, end))}
        self._moments = np.array(sorted(moment for moment in moments if moment >= 0), np.int64)
        heads = np.full(len(self._moments), crew.heads, np.int64)
        for start, end, there in spans:
            heads[(self._moments >= start) & (self._moments < end)] = there
        self._heads = heads
        self._worked = np.r_[0, np.cumsum(np.diff(self._moments) * heads[:-1])]

    def by(self, moments: Ints) -> Ints:
        """Return the head-seconds there are before each moment."""
        place = np.searchsorted(self._moments, moments, side="right") - 1
        done: Ints = self._worked[place] + (moments - self._moments[place]) * self._heads[place]
        return done

    def finish(self, begin: int, work: Ints) -> Ints:
        """Return when `work` head-seconds, above zero, are done that nobody can begin before `begin`."""
        place = int(np.searchsorted(self._moments, begin, side="right")) - 1
        total = work + self._worked[place] + (begin - self._moments[place]) * self._heads[place]
        segment = np.searchsorted(self._worked, total, side="left") - 1
        done: Ints = self._moments[segment] - (self._worked[segment] - total) // self._heads[segment]
        return done


def _lends_heads(shop: Shop, attended: Ints) -> bool:
    """Whether work may pause on one machine while the crew goes on elsewhere: then rounds do not count.

    Two heads can share three operations of two seconds in three seconds, if one of them pauses for a
    second. A break of the whole hall is no such time: nobody works then.
    """
    machines = [shop.machines[machine] for machine in np.unique(shop.operations.machine[attended]).tolist()]
    return any(machine.pauses and machine.closed for machine in machines)
