"""What running work holds, and whether a row of a plan can tell of it. Pure."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence

from shopfloor.model.calendar import WorkClock, united
from shopfloor.model.shop import Closure, Shop
from shopfloor.replan.outlook import Outlook, Running, future
from shopfloor.replan.people import Held, Steps, change, steps
from shopfloor.replan.remaining import Left


def merged(closures: Iterable[Closure]) -> tuple[Closure, ...]:
    """Return closures in order of time and apart; where two overlap the earlier one's reason stays."""
    found: list[Closure] = []
    for one in sorted(closures, key=lambda one: (one.start_s, one.end_s)):
        start = max(one.start_s, found[-1].end_s) if found else one.start_s
        if start < one.end_s:
            found.append(Closure(start, one.end_s, one.reason))
    return tuple(found)


def outside(closures: Iterable[Closure], start_s: int, end_s: int) -> Iterator[Closure]:
    """Yield what of closures lies before `start_s` or after `end_s`."""
    for one in closures:
        for start, end in ((one.start_s, min(one.end_s, start_s)), (max(one.start_s, end_s), one.end_s)):
            if start < end:
                yield Closure(start, end, one.reason)


def in_one_row(shop: Shop, look: Outlook, one: Running) -> bool:
    """Whether the row of running work counts an outage of its unit as work, for want of a closure to tell."""
    if not shop.machines[one.machine].pauses:
        return True
    return any(out.machine == one.machine and out.unit == one.unit for out in look.outs)


def kept_out(shop: Shop, look: Outlook, one: Running) -> bool:
    """Whether no row can tell of running work: it runs on into a closure although its machine does not pause.

    On a machine of one unit its own closures give way, since the work holds the machine all the same; breaks
    belong to the whole hall, and those of a group to its other units too.
    """
    hall = shop.machines[one.machine]
    if hall.pauses:
        return False
    shut = list(shop.breaks)
    if hall.count > 1:
        shut += hall.closed
        shut += [
            Closure(look.now_s, out.until_s)
            for out in look.outs
            if out.machine == one.machine and not out.unit
        ]
    return any(closure.start_s < one.ends_s for closure in future(shut, look.now_s))


def row_seconds(shop: Shop, look: Outlook, one: Running) -> int:
    """Return the working time of the row that tells of running work: from its true start to its end."""
    hall = shop.machines[one.machine]
    if not hall.pauses:
        return one.ends_s - one.since_s
    clock = WorkClock(_ahead(shop, look, one))
    return (look.now_s - one.since_s) + int(clock.worked(one.ends_s)) - int(clock.worked(look.now_s))


def _ahead(shop: Shop, look: Outlook, one: Running) -> list[tuple[int, int]]:
    """Return when the machine of running work is shut from now on; an outage of one unit shuts no machine."""
    hall = shop.machines[one.machine]
    spans = [(each.start_s, each.end_s) for each in future((*shop.breaks, *hall.closed), look.now_s)]
    spans += [(look.now_s, out.until_s) for out in look.outs if out.machine == one.machine and not out.unit]
    return united(spans)


def holdings(
    shop: Shop, look: Outlook, running: Iterable[Running], left: Sequence[Left]
) -> Mapping[str, list[Held]]:
    """Return when running work holds how many heads of each crew, from now on."""
    found: dict[str, list[Held]] = {}
    for one in running:
        hall, job = shop.machines[one.machine], left[one.place]
        heads = int(shop.operations.heads[job.operation])
        work = job.setup_s if hall.set_up_only else job.seconds
        if hall.crew is None or not heads or not work:
            continue
        spans = [(one.resumes_s, one.resumes_s + work)]
        if hall.pauses:
            spans = list(_worked(_ahead(shop, look, one), one.resumes_s, work))
        found.setdefault(hall.crew, []).extend((start, end, heads) for start, end in spans)
    return found


def heads_ahead(
    shop: Shop, look: Outlook, held: Sequence[Running], left: Sequence[Left]
) -> tuple[dict[str, Steps], list[str]]:
    """Return each crew's heads from now on, and what had to be assumed.

    What running work holds is there, whatever was said; running work that is no operation of the rest
    (`held`) takes its heads away from it.
    """
    running = holdings(shop, look, look.running, left)
    away = holdings(shop, look, held, left)
    found: dict[str, Steps] = {}
    remarks = []
    for crew in look.crews:
        before = steps(crew, look.now_s)
        raised = change(before, running.get(crew.id, ()), max)
        if raised != before:
            remarks.append(
                f"Work that runs holds more of crew {crew.id} than are said to be there; it is taken to "
                "run on."
            )
        found[crew.id] = change(raised, away.get(crew.id, ()), lambda level, taken: level - taken)
    return found, remarks


def heads_in_rows(
    shop: Shop, look: Outlook, name: str, heads: Steps, rows: Iterable[tuple[Running, int]]
) -> Steps:
    """Return a crew's heads where rows (work, heads) tell of running work from its start on, of no outage.

    Until now it had the people it had; and while its machine is down, its people are free for others.
    """
    mine = [(one, count) for one, count in rows if shop.machines[one.machine].crew == name]
    free = [
        (look.now_s, one.resumes_s, count)
        for one, count in mine
        if one.resumes_s > look.now_s and in_one_row(shop, look, one)
    ]
    heads = change(heads, free, lambda level, taken: level + taken)
    whole = sum(count for _, count in mine)
    return [(0, max(heads[0][1], whole)), *heads] if look.now_s else heads


def _worked(shut: Sequence[tuple[int, int]], start: int, work: int) -> Iterator[tuple[int, int]]:
    """Yield the stretches in which `work` seconds are worked from `start` on."""
    end = WorkClock(shut).finish(start, work)
    moment = start
    for begin, until in shut:
        if until <= moment or begin >= end:
            continue
        if begin > moment:
            yield moment, begin
        moment = until
    if moment < end:
        yield moment, end
