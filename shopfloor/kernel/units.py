"""Splittable work on groups of identical units, and under a crew that serves so many operations at once.

With operations that may be cut, the least time is still what plain totals say:

    T = max(largest order, ⌈group / its units⌉ over the groups, ⌈all work / crew⌉)

in whole seconds. None of the four can be beaten; that T is reached follows by making rows and columns such
that the largest total is T, and leaving the rest to `decompose`.

Units. Spread a group's work over its k units, T each at most, cutting an operation where a unit is full and
going on with the rest of it on another (McNaughton 1959). There is room, for the group's work is at most
k·T, and fewer than k cuts are made, for each fills a unit. The parts of an operation are loads of one order
on different units, so the order's own row keeps them from running at the same time.

Crew. Say there are C units and that at most c < C operations may run at once. Idle time of the units adds
up to C·T less all work, which is at least (C - c)·T because all work is at most c·T. So C - c dummy orders,
of T seconds each, can be made out of idle time. The totals still do not pass T, and each dummy is critical
from the first moment to the last, so that at all times C - c units are taken by dummies and at most c by
work. (With fewer orders than units, dummy machines do the same for the orders.)

The crew is counted in operations. Were heads counted, the bounds would not be enough: three operations of a
second, of three orders on three machines, at two heads each, and three heads in all. The work is 6
head-seconds, so the bound says 2 seconds; but no two of them can run at once, and 3 are needed.

References
----------
- R. McNaughton, "Scheduling with deadlines and loss functions", Management Science 6 (1959) 1-12.
- The sources of `decompose`.
"""

from __future__ import annotations

from collections.abc import Mapping
from heapq import heapify, heapreplace
from operator import index
from typing import NamedTuple

from numpy.typing import ArrayLike

from shopfloor.kernel.decompose import numbered, pairs_of, pour
from shopfloor.kernel.spells import Load, Spell, fewest_cuts

__all__ = ["UnitPiece", "split_units"]

Pair = tuple[int, int]


class UnitPiece(NamedTuple):
    """A piece of an operation on one of its machine's units, numbered from 0."""

    edge: int
    unit: int
    start: int
    end: int


def split_units(
    left: ArrayLike,
    right: ArrayLike,
    seconds: ArrayLike,
    *,
    units: Mapping[int, int] | None = None,
    crew: int | None = None,
) -> list[UnitPiece]:
    """Schedule splittable operations in the least time that orders, machine groups and the crew allow.

    Parameters
    ----------
    left, right, seconds : array_like of integers, one entry an operation
        As for `shopfloor.kernel.decompose.split_loads`; right nodes are machine groups.
    units : mapping of right node to int, optional
        How many identical units a group has; 1 where a node is missing.
    crew : int, optional
        The most pieces that may run at once; no limit if left out.

    Returns
    -------
    list of UnitPiece
        In order of start, then edge. The pieces of an operation add up to its seconds and do not overlap,
        nor do pieces of one order, or on one unit of a group; never more than ``crew`` run at once. The
        last end is the T of the module's docstring.

    Raises
    ------
    TypeError, ValueError
        As `split_loads`; and ValueError if a number of units, or the crew, is below 1.
    """
    units = {int(node): index(count) for node, count in (units or {}).items()}
    for node, count in units.items():
        if count < 1:
            raise ValueError(f"units must be at least 1, got {count} at right node {node}")
    if crew is not None and index(crew) < 1:
        raise ValueError(f"crew must be at least 1, got {crew}")
    pairs = pairs_of(left, right, seconds)
    if not pairs:
        return []
    work = {pair: sum(amount for _, amount in edges) for pair, edges in pairs.items()}
    span = _span(work, units, crew)
    parts = _onto_units(work, units, span)

    rows = numbered(order for (order, _), _, _ in parts)
    columns = numbered((group, unit) for (_, group), unit, _ in parts)
    loads = [Load(rows[order], columns[group, unit], part) for (order, group), unit, part in parts]
    if crew is not None:
        loads += _dummies(loads, len(rows), len(columns), span, crew)

    spells: dict[Pair, list[tuple[Spell, int]]] = {pair: [] for pair in pairs}
    for (pair, unit, _), mine in zip(parts, fewest_cuts(loads), strict=False):
        spells[pair] += [(spell, unit) for spell in mine]
    pieces = []
    for pair, edges in pairs.items():
        for edge, (start, end), unit in pour(edges, sorted(spells[pair])):
            pieces.append(UnitPiece(edge, unit, start, end))
    return sorted(pieces, key=lambda piece: (piece.start, piece.edge))


def _span(work: Mapping[Pair, int], units: Mapping[int, int], crew: int | None) -> int:
    """Return T, the least time."""
    orders: dict[int, int] = {}
    groups: dict[int, int] = {}
    for (order, group), amount in work.items():
        orders[order] = orders.get(order, 0) + amount
        groups[group] = groups.get(group, 0) + amount
    bounds = [*orders.values(), *(-(-load // units.get(group, 1)) for group, load in groups.items())]
    if crew is not None:
        bounds.append(-(-sum(orders.values()) // crew))
    return max(bounds)


def _onto_units(work: Mapping[Pair, int], units: Mapping[int, int], span: int) -> list[tuple[Pair, int, int]]:
    """Return (pair, unit, seconds): each pair on a unit of its group, or cut to fit on several.

    Longest first onto the emptiest unit, and what does not fit whole fills what room there is.
    """
    by_group: dict[int, list[tuple[int, Pair]]] = {}
    for pair, amount in work.items():
        by_group.setdefault(pair[1], []).append((amount, pair))
    parts = []
    for group, waiting in by_group.items():
        # One entry a unit that will be used: what it holds, and its number.
        held = [(0, unit) for unit in range(min(units.get(group, 1), len(waiting)))]
        heapify(held)
        too_long = []
        for amount, pair in sorted(waiting, key=lambda each: (-each[0], each[1])):
            load, unit = held[0]
            if load + amount > span:
                too_long.append((amount, pair))
            else:
                heapreplace(held, (load + amount, unit))
                parts.append((pair, unit, amount))
        room = [(span - load, unit) for load, unit in sorted(held) if load < span]
        for amount, pair in too_long:
            while amount:
                free, unit = room[0]
                part = min(amount, free)
                parts.append((pair, unit, part))
                amount -= part
                if part == free:
                    room.pop(0)
                else:
                    room[0] = (free - part, unit)
    return parts


def _dummies(loads: list[Load], rows: int, columns: int, span: int, crew: int) -> list[Load]:
    """Return loads that keep all but ``crew`` of the lines on the shorter side idle at every moment."""
    by_row = rows <= columns
    lines = rows if by_row else columns
    if crew >= lines:
        return []
    idle = [span] * lines
    for load in loads:
        idle[load.row if by_row else load.column] -= load.seconds
    # Every line gives up the same share of its idle time, so that none becomes critical before it must.
    total, need = sum(idle), (lines - crew) * span
    shares = [each * need // total for each in idle]
    short = need - sum(shares)
    for line, each in enumerate(idle):
        if short and shares[line] < each:
            shares[line] += 1
            short -= 1
    dummies = []
    number, room = 0, span
    for line, share in enumerate(shares):
        while share:
            part = min(share, room)
            place = (line, columns + number) if by_row else (rows + number, line)
            dummies.append(Load(*place, part, idle=True))
            share -= part
            room -= part
            if not room:
                number, room = number + 1, span
    return dummies
