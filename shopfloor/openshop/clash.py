"""The rules that can make a shop impossible, each with a name, and the shop without some of them.

A shop is only impossible where something ends for good: a machine that is shut for good, or a crew that at
last has fewer heads than an operation needs. All else can wait until nothing changes any more, and then
run one after another. So only *limited* operations matter: those that must be done before such an end, and
the lower steps of their orders. To give up a rule never makes a possible shop impossible.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from shopfloor.model.calendar import duration, united
from shopfloor.model.feasible import FOR_GOOD_S
from shopfloor.model.shop import NO_STEP, Bools, Closure, Crew, Shop, Transport

UNLIMITED = 10**6  # heads, more than any operations take together


@dataclass(frozen=True, slots=True, order=True)
class Rule:
    """One rule of a shop that a plan may clash with.

    Attributes
    ----------
    kind
        ``operation``, ``shut``, ``closed``, ``break``, ``units``, ``heads``, ``release``, ``steps``,
        ``way`` or ``changeovers``.
    of
        Index of the operation, machine, break, crew or order that it belongs to; for a way, of the machine
        it leads from.
    place
        Which closure, which stretch of a crew, or which machine a way leads to; else 0.
    """

    kind: str
    of: int
    place: int = 0


def limited(shop: Shop) -> Bools:
    """Return which operations cannot wait until nothing changes any more; parts are not looked at.

    Operations that may be split are left out: what is said of the others holds all the same.
    """
    columns = shop.operations
    found = np.zeros(len(shop), np.bool_)
    last = {crew.id: _stretches(crew)[-1][2] for crew in shop.crews}
    for index, machine in enumerate(shop.machines):
        mine = columns.machine == index
        if _end(shop, index) is not None:
            found |= mine
        elif machine.crew is not None:
            attended = columns.setup_s > 0 if machine.set_up_only else mine
            found |= mine & attended & (columns.heads > last[machine.crew])
    highest = np.full(len(shop.orders), NO_STEP)
    np.maximum.at(highest, columns.job[found], columns.step[found])
    found |= (columns.step != NO_STEP) & (columns.step < highest[columns.job])
    whole: Bools = found & (columns.splittable == 0)
    return whole


def rules_of(shop: Shop) -> tuple[Rule, ...]:
    """Return every rule of a shop of limited operations; those come first that a lead can change least."""
    columns, machines = shop.operations, shop.machines
    used = np.unique(columns.machine).tolist()
    found = [Rule("shut", index) for index in used if any(_last(shop, index))]
    found += [Rule("operation", row) for row in range(len(shop))]
    found += [Rule("units", index) for index in used]
    crews = {machines[index].crew for index in used}
    found += [
        Rule("heads", index, place)
        for index, crew in enumerate(shop.crews)
        if crew.id in crews
        for place in range(len(_stretches(crew)))
    ]
    found += [Rule("release", job) for job in np.flatnonzero(shop.orders.release_s).tolist()]
    found += [Rule("steps", job) for job in np.unique(columns.job[columns.step != NO_STEP]).tolist()]
    found += [Rule("way", a, b) for a, b in sorted(_ways(shop))]
    changing = [index for index in used if machines[index].id in shop.changeovers]
    found += [
        Rule("changeovers", index) for index in changing if not shop.changeovers[machines[index].id].none
    ]
    found += [
        Rule("closed", index, place)
        for index in used
        for place, last in enumerate(_last(shop, index))
        if not last
    ]
    return (*found, *(Rule("break", place) for place in range(len(shop.breaks))))


def circles(shop: Shop, rules: Sequence[Rule]) -> Iterator[list[Rule]]:
    """Yield for each machine and crew the rules that are about it alone: most clashes lie in one of these."""
    columns = shop.operations
    of_machine = {"shut", "closed", "units", "changeovers"}
    for index in np.unique(columns.machine).tolist():
        jobs = set(columns.job[columns.machine == index].tolist())
        yield [
            rule
            for rule in rules
            if (rule.kind in of_machine and rule.of == index)
            or (rule.kind == "operation" and columns.machine[rule.of] == index)
            or (rule.kind == "release" and rule.of in jobs)
            or rule.kind == "break"
        ]
    for index, crew in enumerate(shop.crews):
        theirs = {k for k, machine in enumerate(shop.machines) if machine.crew == crew.id}
        yield [
            rule
            for rule in rules
            if (rule.kind == "heads" and rule.of == index)
            or (rule.kind == "operation" and int(columns.machine[rule.of]) in theirs)
            or (rule.kind in of_machine and rule.of in theirs)
            or rule.kind in ("release", "break")
        ]


def without(shop: Shop, given_up: Collection[Rule]) -> Shop:
    """Return a shop of which some rules are given up."""
    gone = set(given_up)
    columns = shop.operations
    released = shop.orders.release_s.copy()
    released[[rule.of for rule in gone if rule.kind == "release"]] = 0
    free = np.isin(columns.job, [rule.of for rule in gone if rule.kind == "steps"])
    changing = {shop.machines[rule.of].id for rule in gone if rule.kind == "changeovers"}
    machines = tuple(
        replace(
            machine,
            count=max(machine.count, len(shop)) if Rule("units", index) in gone else machine.count,
            closed=tuple(
                shut
                for place, (shut, last) in enumerate(zip(machine.closed, _last(shop, index), strict=True))
                if (Rule("shut", index) if last else Rule("closed", index, place)) not in gone
            ),
        )
        for index, machine in enumerate(shop.machines)
    )
    relaxed = replace(
        shop,
        machines=machines,
        orders=replace(shop.orders, release_s=released),
        operations=replace(columns, step=np.where(free, NO_STEP, columns.step)),
        crews=tuple(_with_heads(crew, index, gone) for index, crew in enumerate(shop.crews)),
        breaks=tuple(each for place, each in enumerate(shop.breaks) if Rule("break", place) not in gone),
        changeovers={name: times for name, times in shop.changeovers.items() if name not in changing},
        transport=_transport(shop, gone),
    )
    kept = np.array([Rule("operation", row) not in gone for row in range(len(shop))], np.bool_)
    return relaxed.keep(kept)


def say(shop: Shop, rule: Rule) -> str:
    """Return a rule in words, with the row of an operation."""
    clock, machines, orders = shop.clock, shop.machines, shop.orders.ids
    match rule.kind:
        case "operation":
            return _operation(shop, rule.of)
        case "shut":
            last = zip(machines[rule.of].closed, _last(shop, rule.of), strict=True)
            first, *_ = (shut for shut, for_good in last if for_good)
            return f"{machines[rule.of].id} is {_shut(shop, first, for_good=True)}"
        case "closed":
            return f"{machines[rule.of].id} is {_shut(shop, machines[rule.of].closed[rule.place])}"
        case "break":
            return f"the hall is {_shut(shop, shop.breaks[rule.of])}"
        case "units":
            count, name = machines[rule.of].count, machines[rule.of].id
            return f"{name} serves one order at a time" if count == 1 else f"{name} has {count} units"
        case "heads":
            return _heads(shop, shop.crews[rule.of], rule.place)
        case "release":
            return f"{orders[rule.of]} comes at {clock.say(int(shop.orders.release_s[rule.of]))}"
        case "steps":
            return f"{orders[rule.of]} keeps the sequence of its steps"
        case "way":
            here, there = machines[rule.of].id, machines[rule.place].id
            return f"an order needs {duration(shop.transport.seconds(here, there))} from {here} to {there}"
        case _:
            return f"{machines[rule.of].id} takes time to change over between families"


# ---- parts of a shop -------------------------------------------------------------------------------


def _end(shop: Shop, machine: int) -> int | None:
    """Return from when on a machine, by closures and breaks that touch, is shut for good; None if never."""
    spans = united((shut.start_s, shut.end_s) for shut in (*shop.breaks, *shop.machines[machine].closed))
    return next((start for start, end in spans if end - start >= FOR_GOOD_S), None)


def _last(shop: Shop, machine: int) -> list[bool]:
    """Return for each closure of a machine whether it belongs to its being shut for good."""
    end = _end(shop, machine)
    return [end is not None and shut.start_s >= end for shut in shop.machines[machine].closed]


def _stretches(crew: Crew) -> list[tuple[int, int | None, int]]:
    """Return start, end and heads of each stretch of time, from zero on; the last one has no end."""
    edges = sorted({0, *(moment for level in crew.levels for moment in level[:2] if moment > 0)})
    found: list[tuple[int, int | None, int]] = []
    for start, end in zip(edges, [*edges[1:], None], strict=True):
        heads = [there for first, last, there in crew.levels if first <= start < last]
        found.append((start, end, heads[0] if heads else crew.heads))
        if end is None or end - start >= FOR_GOOD_S:
            found[-1] = (start, None, found[-1][2])
            break
    return found


def _with_heads(crew: Crew, index: int, gone: set[Rule]) -> Crew:
    """Return a crew that is as large as wanted in the stretches that are given up."""
    levels, heads = [], crew.heads
    stretches = _stretches(crew)
    for place, (start, end, there) in enumerate(stretches):
        level = UNLIMITED if Rule("heads", index, place) in gone else there
        if end is None:
            heads = level
        else:
            levels.append((start, end, level))
    return replace(crew, heads=heads, levels=tuple(levels))


def _ways(shop: Shop) -> set[tuple[int, int]]:
    """Return the pairs of machines that some order may have to go between, and that takes time."""
    found: set[tuple[int, int]] = set()
    if shop.transport.none:
        return found
    visits = np.unique(np.stack([shop.operations.job, shop.operations.machine]), axis=1)
    for job in np.unique(visits[0]).tolist():
        mine = visits[1][visits[0] == job].tolist()
        found |= {(a, b) for a in mine for b in mine if a != b}
    ids = [machine.id for machine in shop.machines]
    return {(a, b) for a, b in found if shop.transport.seconds(ids[a], ids[b])}


def _transport(shop: Shop, gone: set[Rule]) -> Transport:
    """Return the ways of which some take no time; what is then shorter by way of these is shorter too."""
    ids = [machine.id for machine in shop.machines]
    free = {(ids[rule.of], ids[rule.place]) for rule in gone if rule.kind == "way"}
    if not free:
        return shop.transport
    names = sorted({ids[index] for index in np.unique(shop.operations.machine).tolist()})
    times = {(a, b): 0 if (a, b) in free else shop.transport.seconds(a, b) for a, b in _pairs(names)}
    for by in names:
        for a, b in _pairs(names):
            if by not in (a, b):
                times[a, b] = min(times[a, b], times[a, by] + times[by, b])
    return Transport(max(shop.transport.between, 0, *shop.transport.pairs.values()), times)


def _pairs(names: list[str]) -> Iterator[tuple[str, str]]:
    return ((a, b) for a in names for b in names if a != b)


# ---- words -----------------------------------------------------------------------------------------


def _operation(shop: Shop, row: int) -> str:
    operation = shop.operation(row)
    machine = shop.machines[operation.machine]
    with_heads = ""
    if machine.crew is not None and operation.heads and (operation.setup_s or not machine.set_up_only):
        people = "1 head" if operation.heads == 1 else f"{operation.heads} heads"
        while_set_up = f" for {duration(operation.setup_s)} of set-up" if machine.set_up_only else ""
        with_heads = f" and {people} of crew {machine.crew}{while_set_up}"
    where = f" (row {operation.row})" if operation.row else ""
    return f"{operation.order} takes {duration(operation.seconds)} on {machine.id}{with_heads}{where}"


def _shut(shop: Shop, shut: Closure, *, for_good: bool = False) -> str:
    reason = f" ({shut.reason})" if shut.reason else ""
    since = shop.clock.say(max(0, shut.start_s))
    if for_good or shut.end_s - shut.start_s >= FOR_GOOD_S:
        return f"shut for good from {since}{reason}"
    return f"shut from {since} to {shop.clock.say(shut.end_s)}{reason}"


def _heads(shop: Shop, crew: Crew, place: int) -> str:
    start, end, there = _stretches(crew)[place]
    people = {0: "no heads", 1: "1 head"}.get(there, f"{there} heads")
    since = f" from {shop.clock.say(start)}" if start else ""
    until = " on" if end is None and start else "" if end is None else f" until {shop.clock.say(end)}"
    return f"crew {crew.id} has {people}{since}{until}"
