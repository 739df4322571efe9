"""When a machine that changes over can be done, alone in the hall: as a witness of a run bound claims it."""

from __future__ import annotations

import heapq
from collections.abc import Mapping, Sequence

from shopfloor.model.shop import Changeovers

STATES_MOST = 200_000  # a witness that needs more of them is not looked at further


def earliest_done(
    arrivals: Mapping[str, Sequence[tuple[int, int]]], rule: Changeovers, start: str | None
) -> int | None:
    """Return the open time at which one unit has done all work at the earliest; None if that takes too long.

    States (what is done of each family, the last family) are visited by the least time at which all might be
    done from there, as in a shortest way with an estimate (P. E. Hart, N. J. Nilsson, B. Raphael, IEEE
    Transactions SSC 4 (1968) 100-107): the work left, and for each other family the quickest way to it.

    Parameters
    ----------
    arrivals
        For each family pairs (when it arrives, seconds of work), the earliest first.
    start
        The family the unit begins in, None for any.
    """
    names = list(arrivals)
    near = {
        name: min((rule.seconds(other, name) for other in names if other != name), default=0)
        for name in names
    }

    def estimate(moment: int, done: Sequence[int], last: str | None) -> int:
        for name, count in zip(names, done, strict=True):
            if count < len(arrivals[name]):
                moment += left[name][count] + (near[name] if last not in (None, name) else 0)
        return moment

    left = {name: _from_each_on([work for _, work in arrivals[name]]) for name in names}
    nothing = (0,) * len(names)
    waiting: list[tuple[int, int, tuple[int, ...], str]] = []
    visited: set[tuple[tuple[int, ...], str]] = set()

    def go(moment: int, done: tuple[int, ...], place: int) -> None:
        """Take the next arrival of a family, and all of it that is there by then.

        To do such work at once delays what would have come before it by no more than it would have later.
        """
        name, count = names[place], done[place]
        while count == done[place] or (count < len(arrivals[name]) and arrivals[name][count][0] <= moment):
            moment = max(moment, arrivals[name][count][0]) + arrivals[name][count][1]
            count += 1
        after = (*done[:place], count, *done[place + 1 :])
        heapq.heappush(waiting, (estimate(moment, after, name), moment, after, name))

    for place, name in enumerate(names):
        go(0 if start is None else rule.seconds(start, name), nothing, place)
    while waiting and len(visited) < STATES_MOST:
        _, moment, done, last = heapq.heappop(waiting)
        if (done, last) in visited:
            continue
        visited.add((done, last))
        open_ends = [place for place, name in enumerate(names) if done[place] < len(arrivals[name])]
        if not open_ends:
            return moment
        for place in open_ends:
            go(moment + rule.seconds(last, names[place]), done, place)
    return None


def _from_each_on(work: Sequence[int]) -> list[int]:
    """Return the sum from each place to the end."""
    total, sums = 0, []
    for each in reversed(work):
        total += each
        sums.append(total)
    return sums[::-1]
