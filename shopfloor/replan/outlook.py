"""What is known at a moment of the time that follows: outages, running work, people, families. Pure.

Nothing here is planned yet. Where the journal says nothing, an assumption is made and said in a remark.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass

from shopfloor.model.actuals import ShiftState, Stretch
from shopfloor.model.calendar import WorkClock, united
from shopfloor.model.shop import Closure, Crew, Shop
from shopfloor.replan.current import Current
from shopfloor.replan.families import Changing, Unit, families
from shopfloor.replan.people import present
from shopfloor.replan.remaining import Left
from shopfloor.replan.told import Told

OUTAGE_S = 30 * 60  # a machine that is down is taken to be back after so long, unless somebody says when


@dataclass(frozen=True, slots=True)
class Out:
    """A machine that is down, or one `unit` of it (0 for all of it), until `until_s`."""

    machine: int
    unit: int
    until_s: int
    reason: str


@dataclass(frozen=True, slots=True)
class Running:
    """Work under way, which may not be moved.

    Attributes
    ----------
    place
        Which of the list of what is left.
    machine, unit
        Where it runs; `unit` from 1.
    since_s, ends_s
        When it began, and when it is expected to be done.
    resumes_s
        When it goes on: now, or when its machine is back and open.
    """

    place: int
    machine: int
    unit: int
    since_s: int
    resumes_s: int
    ends_s: int


@dataclass(frozen=True)
class Outlook:
    """What is known of the time from `now_s` on.

    Attributes
    ----------
    outs
        What is down.
    running
        What runs, in order of its place.
    families, changing
        The family of each unit (machine, unit) that can be changed over, and the units being changed.
    ready, even
        For each order, when it can be on another machine, where that is later than now: by the longest of
        the ways it may take. Whether these are all equally long.
    crews
        The shop's, as many as are said to be there.
    remarks
        What was assumed.
    """

    now_s: int
    outs: tuple[Out, ...]
    running: tuple[Running, ...]
    families: Mapping[Unit, str]
    changing: tuple[Changing, ...]
    ready: Mapping[int, int]
    even: bool
    crews: tuple[Crew, ...]
    remarks: tuple[str, ...]


def outlook(
    now: Current,
    left: Sequence[Left],
    state: ShiftState,
    told: Told,
    *,
    back: Mapping[tuple[str, int], int] | None = None,
    outage_s: int = OUTAGE_S,
) -> Outlook:
    """Return what is known at `state.at_s` of the time that follows.

    Parameters
    ----------
    left
        What is left, as :func:`shopfloor.replan.remaining.remaining` returns it.
    back
        (machine, unit) to when it is expected back; unit 0 is all of the machine.
    outage_s
        How long an outage is taken to last still where `back` does not say.
    """
    remarks: list[str] = []
    outs = tuple(_outs(now.shop, state, back or {}, outage_s, remarks))
    running = tuple(_running(now.shop, left, outs, state.at_s))
    crews, said = present(now.shop, told, state.at_s)
    ready, even = _ready(now, left, running, state.at_s)
    known, changing = families(now, left, state, told)
    for one in changing:
        name, say = now.shop.machines[one.machine].id, now.shop.clock.say
        remarks.append(
            f"{name} is taken to be changing over to {one.family or 'no family'} until {say(one.until_s)}, "
            "as planned."
        )
    return Outlook(
        now_s=state.at_s,
        outs=outs,
        running=running,
        families=known,
        changing=changing,
        ready=ready,
        even=even,
        crews=crews,
        remarks=(*remarks, *said),
    )


# ---- machines --------------------------------------------------------------------------------------


def _outs(
    shop: Shop,
    state: ShiftState,
    back: Mapping[tuple[str, int], int],
    outage_s: int,
    remarks: list[str],
) -> Iterator[Out]:
    say = shop.clock.say
    for place, machine in enumerate(shop.machines):
        known = state.machines.get(machine.id)
        open_ = [outage for outage in known.outages if outage.end_s is None] if known is not None else []
        for outage in open_:
            until = back.get((machine.id, outage.unit), back.get((machine.id, 0)))
            named = machine.id + (f" unit {outage.unit}" if outage.unit else "")
            if until is None:
                until = state.at_s + outage_s
                remarks.append(
                    f"{named} is down since {say(outage.start_s)}; nobody said until when, so it is taken "
                    f"to be back at {say(until)}."
                )
            unit = outage.unit if machine.count > 1 else 0
            yield Out(place, unit, max(until, state.at_s + 1), _reason(outage))


def _reason(outage: Stretch) -> str:
    return f"down: {outage.reason}" if outage.reason else "down"


def future(closures: Iterable[Closure], from_s: int) -> tuple[Closure, ...]:
    """Return what is left of closures after a moment."""
    return tuple(
        Closure(max(one.start_s, from_s), one.end_s, one.reason) for one in closures if one.end_s > from_s
    )


def _running(shop: Shop, left: Sequence[Left], outs: Sequence[Out], now_s: int) -> Iterator[Running]:
    for place, one in enumerate(left):
        if not one.running:
            continue
        machine = int(shop.operations.machine[one.operation])
        hall = shop.machines[machine]
        down = [out.until_s for out in outs if out.machine == machine and out.unit in (0, one.unit)]
        resumes = max([now_s, *down])
        ends = resumes + one.seconds
        if hall.pauses:
            shut = future((*shop.breaks, *hall.closed), now_s)
            spans = [(closure.start_s, closure.end_s) for closure in shut]
            clock = WorkClock(united([*spans, *((now_s, until) for until in down)]))
            resumes = int(clock.start(clock.worked(now_s)))
            ends = clock.finish(now_s, one.seconds)
        since = one.since_s if one.since_s is not None else now_s
        yield Running(place, machine, one.unit, min(since, now_s), resumes, ends)


# ---- orders ----------------------------------------------------------------------------------------


def _ready(
    now: Current, left: Sequence[Left], running: Sequence[Running], now_s: int
) -> tuple[dict[int, int], bool]:
    """Return when orders that have just been worked on can be elsewhere, by the longest way they may take.

    Also tell whether the ways of each are equally long.
    """
    shop = now.shop
    if shop.transport.none:
        return {}, True
    columns = shop.operations
    runs = {one.place for one in running}
    waiting: dict[int, set[int]] = {}
    for place, one in enumerate(left):
        if place not in runs:
            waiting.setdefault(int(columns.job[one.operation]), set()).add(
                int(columns.machine[one.operation])
            )
    ended: dict[int, tuple[int, int]] = {}
    for index, pieces in enumerate(now.pieces):
        job = int(columns.job[index])
        for end in (piece.runs[-1].end_s for piece in pieces if piece.runs):
            if end is not None and (job not in ended or ended[job][0] < end):
                ended[job] = end, int(columns.machine[index])
    found = {}
    even = True
    for job, (end, machine) in ended.items():
        ways = {
            shop.transport.seconds(shop.machines[machine].id, shop.machines[other].id)
            for other in waiting.get(job, ())
        }
        there = end + max(ways, default=0)
        if there > now_s:
            found[job] = there
            even &= len(ways) < 2
    return found, even
