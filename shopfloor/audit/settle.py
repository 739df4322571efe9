"""Tells visits alike apart: one order on one machine, equally long, where only some have a step or may split.

Rank against rank, as :mod:`shopfloor.audit.match` has it, is right while all operations alike have a step
or none has. Otherwise it takes a choice: a visit in the middle of the route may be a step or not, and a
visit in parts must go to an operation that may be split.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from shopfloor.audit.columns import run_starts
from shopfloor.audit.pieces import Search
from shopfloor.model.shop import NO_STEP, Bools, Ints, Shop
from shopfloor.model.stated import StatedPlan

MOST_LOOKS = 2_000_000  # at visits, over all orders; what is left then stays as it was matched


@dataclass(frozen=True, slots=True)
class _Visit:
    begin_s: int
    end_s: int
    cut: bool


@dataclass(frozen=True, slots=True)
class _Need:
    """One operation; `kind` is shared by those alike, `fixed` says that its visit is not up for choice."""

    index: int
    kind: int
    step: int
    may_split: bool
    fixed: bool


def settle(shop: Shop, stated: StatedPlan, seconds: Ints, operation: Ints) -> Ints:
    """Return `operation` with visits alike given out so that steps and splits are kept, if they can be.

    Near-linear where visits alike are few; a bounded search otherwise, after which the rest stays as it was.
    """
    columns = shop.operations
    matched = np.flatnonzero(operation >= 0)
    rows = np.bincount(operation[matched], minlength=len(shop))
    kind = _kinds(shop)
    concerned = np.zeros(len(shop.orders), bool)
    concerned[columns.job[_doubtful(shop, kind, rows > 1)]] = True
    if not concerned.any():
        return operation
    begin = np.full(len(shop), np.iinfo(np.int64).max)
    end = np.full(len(shop), np.iinfo(np.int64).min)
    done = np.zeros(len(shop), np.int64)
    np.minimum.at(begin, operation[matched], stated.start_s[matched])
    np.maximum.at(end, operation[matched], stated.end_s[matched])
    np.add.at(done, operation[matched], seconds[matched])

    needs = np.flatnonzero(concerned[columns.job] & (rows > 0))
    needs = needs[
        np.lexsort((needs, columns.step[needs], columns.step[needs] == NO_STEP, columns.job[needs]))
    ]
    given, search = np.arange(len(shop)), Search(MOST_LOOKS)
    for of_order in np.split(needs, np.flatnonzero(run_starts(columns.job[needs]))[1:]):
        route = [
            _Need(
                index,
                int(kind[index]),
                int(columns.step[index]),
                bool(columns.splittable[index]),
                bool(done[index] != columns.seconds[index]),
            )
            for index in of_order.tolist()
        ]
        visits = {
            need.index: _Visit(int(begin[need.index]), int(end[need.index]), bool(rows[need.index] > 1))
            for need in route
        }
        for visit, index in _give_out(route, visits, search).items():
            given[visit] = index
    settled = operation.copy()
    settled[matched] = given[operation[matched]]
    return settled


def _kinds(shop: Shop) -> Ints:
    """Number the operations so that those alike in order, machine and time share a number."""
    columns = shop.operations
    order = np.lexsort((columns.seconds, columns.machine, columns.job))
    kind = np.empty(len(order), np.int64)
    first = run_starts(columns.job[order], columns.machine[order], columns.seconds[order])
    kind[order] = np.cumsum(first) - 1
    return kind


def _doubtful(shop: Shop, kind: Ints, cut: Bools) -> Bools:
    """Return the operations that some alike differ from in having a step, or in what may be split."""
    columns = shop.operations

    def both(flag: Bools) -> Bools:
        some = np.bincount(kind[flag], minlength=len(shop)) > 0
        rest = np.bincount(kind[~flag], minlength=len(shop)) > 0
        mixed: Bools = some & rest
        return mixed

    split = both(columns.splittable == 1) & (np.bincount(kind[cut], minlength=len(shop)) > 0)
    doubtful: Bools = (both(columns.step != NO_STEP) | split)[kind]
    return doubtful


def _give_out(route: list[_Need], visits: dict[int, _Visit], search: Search) -> dict[int, int]:
    """Return an operation for each visit, both by index; empty when none is found that keeps the rules.

    Going up the steps, every operation takes a visit that starts once the lower steps are done. Of whole
    visits the earliest will do: it ends first, and one passed over starts too early for any higher step.
    """
    pool: dict[int, list[int]] = {}
    for need in sorted(route, key=lambda need: visits[need.index].begin_s):
        if not need.fixed:
            pool.setdefault(need.kind, []).append(need.index)
    stepped = [need for need in route if need.step != NO_STEP]
    taken: list[int] = []  # by place in `stepped`
    used: set[int] = set()
    ready, latest = [0], [0]  # by place: when the step may begin, and the latest end so far
    tries: list[Iterator[int]] = []
    while True:
        if len(taken) == len(stepped):
            rest = _rest(route, visits, pool, used)
            if rest is not None:
                return {**{visit: need.index for visit, need in zip(taken, stepped, strict=True)}, **rest}
        else:
            place = len(taken)
            if place and stepped[place].step != stepped[place - 1].step:
                ready[place] = latest[place]
            tries.append(_choices(stepped[place], visits, pool, used, ready[place], search))
        while tries:
            if len(taken) == len(tries):  # the last one led nowhere: take it back
                used.discard(taken.pop())
                ready.pop()
                latest.pop()
            visit = next(tries[-1], None)
            if visit is not None:
                taken.append(visit)
                used.add(visit)
                ready.append(ready[-1])
                latest.append(max(latest[-1], visits[visit].end_s))
                break
            tries.pop()
        if not tries:
            return {}


def _choices(
    need: _Need,
    visits: dict[int, _Visit],
    pool: dict[int, list[int]],
    used: set[int],
    ready_s: int,
    search: Search,
) -> Iterator[int]:
    """Yield the visits worth trying: the earliest whole one in time, and each one in parts."""
    if need.fixed:
        yield need.index
        return
    whole = False
    for visit in pool[need.kind]:
        search.trials -= 1
        if search.trials < 0:
            return
        free = visit not in used and visits[visit].begin_s >= ready_s
        if free and (need.may_split if visits[visit].cut else not whole):
            whole = whole or not visits[visit].cut
            yield visit


def _rest(
    route: list[_Need], visits: dict[int, _Visit], pool: dict[int, list[int]], used: set[int]
) -> dict[int, int] | None:
    """Give the visits left to the operations without a step; None if one in parts finds no taker."""
    needs: dict[int, list[_Need]] = {}
    for need in route:
        if need.step == NO_STEP and not need.fixed:
            needs.setdefault(need.kind, []).append(need)
    given = {need.index: need.index for need in route if need.fixed}
    for kind, takers in needs.items():
        left = [visit for visit in pool[kind] if visit not in used]
        left.sort(key=lambda visit: not visits[visit].cut)
        takers.sort(key=lambda need: not need.may_split)
        for visit, need in zip(left, takers, strict=True):
            if visits[visit].cut and not need.may_split:
                return None
            given[visit] = need.index
    return given
