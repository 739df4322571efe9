"""What no plan can do, found before one is looked for: operations that fit no opening and no crew.

Necessary conditions only, each of one operation by itself: its machine's openings, the heads its crew ever
has, the earliest start its order allows. Linear in operations but for a logarithm of the closures.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from shopfloor.model.calendar import DAY, Ints, WorkClock, duration, united
from shopfloor.model.shop import Crew, Shop

FOR_GOOD_S = 366 * DAY  # a machine shut for so long is shut for good, as far as any plan goes
_NEVER = np.int64(2**61)  # later than any time a shop can name

Spans = list[tuple[int, int]]


@dataclass(frozen=True, slots=True)
class Impossible:
    """One operation that no plan can hold, and why.

    Attributes
    ----------
    operation
        Index into the shop's operations.
    rule
        ``too-few-heads``, ``never-open-again``, ``longer-than-any-opening`` or ``longer-than-heads-stay``.
    problem, advice
        What is wrong, as the end of a sentence that begins with the operation, and what to do.
    """

    operation: int
    rule: str
    problem: str
    advice: str


def impossible(shop: Shop) -> Iterator[Impossible]:
    """Yield the operations that no plan can hold, machine by machine and then in the order of the file."""
    crews = {crew.id: crew for crew in shop.crews}
    for machine, mine in _by_machine(shop):
        hall = shop.machines[machine]
        found = list(_beyond_openings(shop, machine, mine))
        yield from found
        if hall.crew is not None:
            fitting = np.setdiff1d(mine, [one.operation for one in found])
            yield from _beyond_crew(shop, machine, fitting, crews[hall.crew])


def beyond_shift(shop: Shop) -> Ints:
    """Return the operations that cannot end within the shift even by themselves, in file order."""
    found = np.zeros(len(shop), np.bool_)
    if shop.shift_end_s is None:
        return np.flatnonzero(found)
    for machine, mine in _by_machine(shop):
        shut = united([*_shut(shop, machine), (shop.shift_end_s, int(_NEVER))])
        head = shop.head_s[mine]
        room = _room(shut, [], head, pauses=shop.machines[machine].pauses)
        room = np.where(shop.operations.splittable[mine] > 0, _total(shut, head), room)
        found[mine] = room < shop.operations.seconds[mine]
    return np.flatnonzero(found)


def waits_for_good(shop: Shop, operation: Ints, end_s: Ints) -> bool:
    """Return whether anything ends after its machine is shut for good, or its crew another for good.

    Parameters
    ----------
    operation, end_s
        Rows of a schedule.
    """
    last = np.full(len(shop.machines), _NEVER, np.int64)
    for index, machine in enumerate(shop.machines):
        ends = [start for start, end in _shut(shop, index) if end >= int(_NEVER)]
        levels = [crew.levels for crew in shop.crews if crew.id == machine.crew]
        ends += [end - 1 for each in levels for start, end, _ in each if end - start >= FOR_GOOD_S]
        last[index] = min([int(_NEVER), *ends])
    return bool((end_s > last[shop.operations.machine[operation]]).any())


def _by_machine(shop: Shop) -> Iterator[tuple[int, Ints]]:
    """Yield each machine that has operations, with them in the order of the file."""
    order = np.argsort(shop.operations.machine, kind="stable")
    ends = np.searchsorted(shop.operations.machine[order], np.arange(len(shop.machines) + 1))
    for machine in range(len(shop.machines)):
        if ends[machine] < ends[machine + 1]:
            yield machine, order[ends[machine] : ends[machine + 1]]


def _beyond_openings(shop: Shop, machine: int, mine: Ints) -> Iterator[Impossible]:
    """Yield operations too long for every opening that is left once their order allows them to start.

    A machine that is never shut for good has an opening without end after its last closure: it holds
    anything.
    """
    shut = _shut(shop, machine)
    if not _ends_for_good(shut):
        return
    hall, clock = shop.machines[machine], shop.clock
    head, needs = shop.head_s[mine], shop.operations.seconds[mine]
    room = _room(shut, [], head, pauses=hall.pauses)
    total = _total(shut, head)
    room = np.where(shop.operations.splittable[mine] > 0, total, room)
    for place in np.flatnonzero(room < needs).tolist():
        begins = clock.say(int(head[place]))
        if not total[place]:
            yield Impossible(
                int(mine[place]),
                "never-open-again",
                f"is not open again from {begins} on, the earliest that this operation can start",
                f"open {hall.id} for longer, or send the order elsewhere",
            )
        else:
            what = "all the time it is open" if hall.pauses else "its longest opening"
            since = f" from {begins} on" if head[place] else ""
            yield Impossible(
                int(mine[place]),
                "longer-than-any-opening",
                f"takes {duration(int(needs[place]))} on {hall.id}, longer than {what}{since}, "
                f"{duration(int(room[place]))}",
                f"open {hall.id} for longer, let it pause, or split the operation"
                if not hall.pauses
                else f"open {hall.id} for longer, or divide the order",
            )


def _beyond_crew(shop: Shop, machine: int, mine: Ints, crew: Crew) -> Iterator[Impossible]:
    """Yield operations that need more heads than their crew has, ever or for long enough."""
    hall, operations = shop.machines[machine], shop.operations
    most = max([crew.heads, *(heads for _, _, heads in crew.levels)])
    attended = operations.setup_s[mine] if hall.set_up_only else operations.seconds[mine]
    heads = np.where(attended > 0, operations.heads[mine], 0)
    shut = _shut(shop, machine)
    for wanted in np.unique(heads).tolist():
        theirs = np.flatnonzero(heads == wanted)
        if wanted > most:
            for place in theirs.tolist():
                yield Impossible(
                    int(mine[place]),
                    "too-few-heads",
                    f"needs {_people(wanted)} of crew {crew.id}, which never has more than {most}",
                    "write fewer, or give the crew more",
                )
            continue
        away = [(start, end) for start, end, there in crew.levels if there < wanted]
        if crew.heads < wanted:
            away += _outside([(start, end) for start, end, there in crew.levels if there >= wanted])
        if not away or not wanted:
            continue
        rows = mine[theirs]
        needs = attended[theirs]
        head = shop.head_s[rows]
        room = _room(shut, united(away), head, pauses=hall.pauses)
        cut = operations.splittable[rows] > 0
        room = np.where(cut, _total(united([*shut, *away]), head), room)
        for place in np.flatnonzero(room < needs).tolist():
            yield Impossible(
                int(rows[place]),
                "longer-than-heads-stay",
                f"needs {_people(wanted)} of crew {crew.id} for {duration(int(needs[place]))}, but while "
                f"{hall.id} is open so many are there for at most {duration(int(room[place]))}",
                "write fewer, or give the crew more",
            )


def _people(heads: int) -> str:
    return "1 head" if heads == 1 else f"{heads:,} heads"


# ---- openings -------------------------------------------------------------------------------------


def _shut(shop: Shop, machine: int) -> Spans:
    """Return when a machine is shut, by a break or a closure of its own."""
    spans = united((c.start_s, c.end_s) for c in (*shop.breaks, *shop.machines[machine].closed))
    return [(start, int(_NEVER) if end - start >= FOR_GOOD_S else end) for start, end in spans if end > 0]


def _ends_for_good(shut: Spans) -> bool:
    return bool(shut) and shut[-1][1] >= int(_NEVER)


def _outside(spans: Spans) -> Spans:
    """Return the stretches from the shift's start on that `spans`, in order of time, leave out."""
    edges = united(spans)
    gaps = zip([0, *(end for _, end in edges)], [*(start for start, _ in edges), int(_NEVER)], strict=True)
    return [(start, end) for start, end in gaps if start < end]


def _room(shut: Spans, away: Spans, head: Ints, *, pauses: bool) -> Ints:
    """Return the most working time that one visit can have, begun at each moment of `head` or later.

    Work that pauses goes on after a closure, but not over a time when the crew is away and the machine open.
    """
    if not pauses:
        return _longest(_outside([*shut, *away]), head, WorkClock([]))
    # Away while the machine is shut is no matter: nothing is worked then.
    hindering = _without(away, shut)
    return _longest(_outside(hindering), head, WorkClock(shut))


def _without(spans: Spans, others: Spans) -> Spans:
    """Return what of `spans` lies in none of `others`; both in order of time and apart."""
    found: Spans = []
    kept = _outside(others)
    here = 0
    for start, end in spans:
        while here < len(kept) and kept[here][1] <= start:
            here += 1
        place = here
        while place < len(kept) and kept[place][0] < end:
            found.append((max(start, kept[place][0]), min(end, kept[place][1])))
            place += 1
    return found


def _longest(openings: Spans, head: Ints, clock: WorkClock) -> Ints:
    """Return the most working time in one of the openings, from each moment of `head` on."""
    if not openings:
        return np.zeros(len(head), np.int64)
    start, end = (np.array(edge, np.int64) for edge in zip(*openings, strict=True))
    whole = np.asarray(clock.worked(end) - clock.worked(start))
    later = np.r_[np.maximum.accumulate(whole[::-1])[::-1], 0]  # the longest of an opening and those after it
    place = np.searchsorted(end, head, side="right")
    here = np.minimum(place, len(end) - 1)
    left = np.asarray(clock.worked(end[here]) - clock.worked(np.maximum(head, start[here])))
    found: Ints = np.maximum(np.where(place < len(end), left, 0), later[np.minimum(place + 1, len(end))])
    return found


def _total(shut: Spans, head: Ints) -> Ints:
    """Return all working time from each moment of `head` on."""
    clock = WorkClock(shut)
    return np.asarray(clock.worked(np.full(len(head), _NEVER)) - clock.worked(head))
