"""Brute force for tiny shops, sharing nothing with the package but the shop it reads.

A schedule whose operations all start as early as their sequence allows is *semi-active*. For every goal
that never gains from ending something later, one of these is best. So the oracle runs through all of
them: it appends the operations in every order of starts, each at the earliest moment its order, its
steps and the units of its machine allow, and looks at what comes out.
"""

from __future__ import annotations

from dataclasses import dataclass

from shopfloor.model.shop import NO_DUE, NO_STEP, Shop

MOST_OPERATIONS = 9


@dataclass(frozen=True)
class Optimum:
    """The least there can be, in seconds and in seconds × thousandths of priority."""

    makespan_s: int
    tardiness_at_makespan: int
    tardiness: int


def optimum(shop: Shop) -> Optimum:
    """Return what no schedule of `shop` can beat, by trying all."""
    assert 1 <= len(shop) <= MOST_OPERATIONS, "brute force is for tiny shops"
    ends = _all_order_ends(shop)
    worked_on = {int(job) for job in shop.operations.job}

    def tardiness(end: tuple[int, ...]) -> int:
        return sum(
            round(float(shop.orders.priority[job]) * 1000) * max(0, end[job] - int(shop.orders.due_s[job]))
            for job in worked_on
            if int(shop.orders.due_s[job]) != NO_DUE
        )

    def makespan(end: tuple[int, ...]) -> int:
        return max(end[job] for job in worked_on)

    shortest = min(makespan(end) for end in ends)
    return Optimum(
        shortest,
        min(tardiness(end) for end in ends if makespan(end) == shortest),
        min(tardiness(end) for end in ends),
    )


def _all_order_ends(shop: Shop) -> set[tuple[int, ...]]:
    """Return, for every semi-active schedule, when each order ends."""
    rows = [(row.index, row.job, row.machine, row.seconds, row.step) for row in shop]
    lower = {
        index: {
            other
            for other, other_job, _, _, other_step in rows
            if job == other_job and None not in (step, other_step) and other_step < step
        }
        for index, job, _, _, step in rows
    }
    assert NO_STEP not in {step for *_, step in rows}  # views say None
    found: set[tuple[int, ...]] = set()
    seen: set[object] = set()

    def extend(
        done: frozenset[int], ready: tuple[int, ...], free: tuple[tuple[int, ...], ...], last: int
    ) -> None:
        if (done, ready, free, last) in seen:
            return
        seen.add((done, ready, free, last))
        if len(done) == len(rows):
            found.add(ready)
            return
        for index, job, machine, seconds, _ in rows:
            if index in done or not lower[index] <= done:
                continue
            start = max(ready[job], free[machine][0])
            if start < last:
                continue  # the same schedule comes up with this operation earlier in the order
            end = start + seconds
            units = tuple(sorted((*free[machine][1:], end)))
            extend(
                done | {index},
                (*ready[:job], end, *ready[job + 1 :]),
                (*free[:machine], units, *free[machine + 1 :]),
                start,
            )

    extend(
        frozenset(),
        tuple(int(release) for release in shop.orders.release_s),
        tuple((0,) * machine.count for machine in shop.machines),
        0,
    )
    return found
