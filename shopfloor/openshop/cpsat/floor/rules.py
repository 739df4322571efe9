"""The rules of the floor as constraints: one function a rule, one table of rules.

To add a rule: one function from a :class:`Model`, and a line in ``RULES``.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import combinations, pairwise

from ortools.sat.python import cp_model

from shopfloor.model.calendar import united
from shopfloor.model.hall import Changeovers
from shopfloor.model.shop import NO_STEP, Crew
from shopfloor.openshop.cpsat.floor.best import family_name
from shopfloor.openshop.cpsat.floor.variables import Model, Spans, Visit, grouped, heads_by_time

Rule = Callable[[Model], None]


def one_at_a_time_on_a_unit(model: Model) -> None:
    """A machine works on no more operations at once than it has units; which unit takes which comes later.

    Where units differ by what they are set up for, each is kept apart too.
    """
    for visits in model.by_machine():
        count = model.shop.machines[visits[0].machine].count
        intervals = [visit.lasts for visit in visits]
        if count == 1:
            model.cp.add_no_overlap(intervals)
        elif len(visits) > count:
            model.cp.add_cumulative(intervals, [1] * len(visits), count)
        for unit in range(len(visits[0].on_unit)):
            model.cp.add_no_overlap(
                [
                    model.cp.new_optional_fixed_size_interval_var(
                        visit.at, visit.work, visit.on_unit[unit], ""
                    )
                    for visit in visits
                ]
            )


def changeovers(model: Model) -> None:
    """Between two families a unit has the open time to change, and before the first one too.

    No way round is shorter, so every pair on a unit may be held apart, not only neighbours.
    """
    for visits in model.by_machine():
        machine = model.shop.machines[visits[0].machine]
        times = model.shop.changeovers.get(machine.id)
        if times is None or times.none:
            continue
        family = {visit.operation: family_name(model.shop, visit.operation) for visit in visits}
        if machine.family is not None:
            for visit in visits:
                ready = times.seconds(machine.family, family[visit.operation]) // model.grid.unit_s
                model.cp.add(visit.at >= ready)
        for one, two in combinations(visits, 2):
            _keep_apart(model, times, one, two, family[one.operation], family[two.operation])


def _keep_apart(model: Model, times: Changeovers, one: Visit, two: Visit, here: str, there: str) -> None:
    unit_s = model.grid.unit_s
    to, back = times.seconds(here, there) // unit_s, times.seconds(there, here) // unit_s
    if not to and not back:
        return
    if one.high + one.work + to <= two.low or two.high + two.work + back <= one.low:
        return
    first = model.bool_var(one.was < two.was)
    together = [list(units) for units in zip(one.on_unit, two.on_unit, strict=True)] or [[]]
    for same in together:
        model.cp.add(one.at + one.work + to <= two.at).only_enforce_if(first, *same)
        model.cp.add(two.at + two.work + back <= one.at).only_enforce_if(~first, *same)


def one_place_at_a_time(model: Model) -> None:
    """An order is on one machine at a time, pauses included, and has the time to get to the next."""
    transport, ids = model.shop.transport, [machine.id for machine in model.shop.machines]
    step = model.shop.operations.step
    for visits in model.by_job():
        model.cp.add_no_overlap([visit.stays for visit in visits])
        for one, two in combinations(visits, 2) if not transport.none else ():
            ranks = int(step[one.operation]), int(step[two.operation])
            if NO_STEP not in ranks and ranks[0] != ranks[1]:
                continue  # the steps say which comes first
            here, there = ids[one.machine], ids[two.machine]
            to = transport.seconds(here, there) // model.grid.unit_s
            back = transport.seconds(there, here) // model.grid.unit_s
            if to or back:
                first = model.bool_var(one.start_was < two.start_was)
                model.cp.add(one.end + to <= two.start).only_enforce_if(first)
                model.cp.add(two.end + back <= one.start).only_enforce_if(~first)


def lower_steps_first(model: Model) -> None:
    """Lower steps of an order finish before higher ones start, and the order gets there."""
    transport, ids = model.shop.transport, [machine.id for machine in model.shop.machines]
    step = model.shop.operations.step
    for visits in model.by_job():
        stepped = [visit for visit in visits if step[visit.operation] != NO_STEP]
        ranks = grouped(stepped, lambda visit: int(step[visit.operation]))
        near = pairwise(ranks) if transport.none else combinations(ranks, 2)
        for before, after in near:
            for first in before:
                for second in after:
                    way = transport.seconds(ids[first.machine], ids[second.machine]) // model.grid.unit_s
                    model.cp.add(first.end + way <= second.start)


def heads_of_crews(model: Model) -> None:
    """At no moment are more heads taken from a crew than it has then.

    A pausing operation takes none while its machine is shut. Where every machine of the crew is shut, it
    does no harm to count them all the same, so operations are cut only at closures that others work in.
    """
    shop, unit_s = model.shop, model.grid.unit_s
    for crew in shop.crews:
        takers = [
            (visit, attended)
            for visit in model.visits
            if shop.machines[visit.machine].crew == crew.id
            and shop.operations.heads[visit.operation]
            and (attended := _attended(model, visit))
        ]
        if not takers:
            continue
        quiet = _common([visit.hours.spans for visit, _ in takers])
        intervals: list[cp_model.IntervalVar] = []
        heads: list[int] = []
        for visit, attended in takers:
            pieces = _pieces(model, visit, attended, quiet)
            intervals += pieces
            heads += [int(shop.operations.heads[visit.operation])] * len(pieces)
        end = max(model.latest, *(visit.end_was for visit, _ in takers))
        levels = heads_by_time(crew, end, unit_s)
        most = max((level for _, _, level in levels), default=crew.heads)
        _add_levels(model, crew, levels, most, quiet, intervals, heads)
        model.cp.add_cumulative(intervals, heads, most)


def _add_levels(
    model: Model,
    crew: Crew,
    levels: list[tuple[int, int, int]],
    most: int,
    quiet: Spans,
    intervals: list[cp_model.IntervalVar],
    heads: list[int],
) -> None:
    """Where the crew is smaller than at most, take what is missing, but nothing while nobody works."""
    for start, end, level in levels:
        for first, last in _without((start, end), quiet) if level < most else ():
            intervals.append(model.cp.new_fixed_size_interval_var(first, last - first, ""))
            heads.append(most - level)


def _attended(model: Model, visit: Visit) -> int:
    if not model.shop.machines[visit.machine].set_up_only:
        return visit.work
    return int(model.shop.operations.setup_s[visit.operation]) // model.grid.unit_s


def _pieces(model: Model, visit: Visit, attended: int, quiet: Spans) -> list[cp_model.IntervalVar]:
    """Return intervals on the clock in which a visit is attended, one for each opening it might lie in."""
    if not visit.pauses:
        return [model.cp.new_fixed_size_interval_var(visit.start, attended, "")]
    end = visit.end if attended == visit.work else model.after(visit, attended)
    hours = visit.hours
    cuts = [
        k
        for k, span in enumerate(hours.spans)
        if visit.low < hours.jumps[k] < visit.high + attended and not _within(span, quiet)
    ]
    if not cuts and attended == visit.work:
        return [visit.stays]
    openings = pairwise([None, *cuts, None])
    return [_piece(model, visit, attended, end, *opening) for opening in openings]


def _piece(
    model: Model,
    visit: Visit,
    attended: int,
    end: cp_model.LinearExprT,
    after: int | None,
    before: int | None,
) -> cp_model.IntervalVar:
    """Return what of the attended time lies between two closures: from its start or the end of the closure
    before, to its end or the start of the closure behind; an optional interval if it may not lie there.
    """
    spans, jumps = visit.hours.spans, visit.hours.jumps
    clock = visit.hours.clock
    # begun: it starts in this opening or later; done: it is attended until this opening's end or longer
    begun = model.yes if after is None else model.reaches(visit, jumps[after])
    there = model.yes if after is None else model.reaches(visit, jumps[after] - attended + 1)
    gone = model.no if before is None else model.reaches(visit, jumps[before])
    on = model.no if before is None else model.reaches(visit, jumps[before] - attended + 1)
    low = 0 if after is None else spans[after][1]
    high = max(model.latest, visit.end_was) if before is None else spans[before][0]
    start_was, end_was = visit.start_was, int(clock.end(visit.was + attended))
    first = model.int_var(low, high, max(low, start_was))
    last = model.int_var(low, high, min(high, end_was))
    size = model.int_var(0, high - low, max(0, min(high, end_was) - max(low, start_was)))
    present = model.bool_var(start_was < high and end_was > low)
    model.cp.add_bool_and(present).only_enforce_if(there, ~gone)
    model.cp.add_implication(present, there)
    model.cp.add_implication(present, ~gone)
    model.cp.add(first == visit.start).only_enforce_if(present, begun)
    model.cp.add(first == low).only_enforce_if(present, ~begun)
    model.cp.add(last == end).only_enforce_if(present, ~on)
    model.cp.add(last == high).only_enforce_if(present, on)
    return model.cp.new_optional_interval_var(first, size, last, present, "")


def _within(span: tuple[int, int], spans: Spans) -> bool:
    return any(start <= span[0] and span[1] <= end for start, end in spans)


def _common(calendars: list[Spans]) -> Spans:
    """Return when all of some machines are shut."""
    common = calendars[0]
    for other in calendars[1:]:
        if other is not common:
            common = [(max(a, c), min(b, d)) for a, b in common for c, d in other if max(a, c) < min(b, d)]
    return united(common)


def _without(span: tuple[int, int], spans: Spans) -> Spans:
    """Return what of a span lies in none of `spans`, which are in order of time and apart."""
    out, moment = [], span[0]
    for start, end in spans:
        if start > moment and moment < span[1]:
            out.append((moment, min(start, span[1])))
        moment = max(moment, end)
    if moment < span[1]:
        out.append((moment, span[1]))
    return out


RULES: tuple[Rule, ...] = (
    one_at_a_time_on_a_unit,
    changeovers,
    one_place_at_a_time,
    lower_steps_first,
    heads_of_crews,
)


def add_rules(model: Model) -> None:
    """Add every rule."""
    for rule in RULES:
        rule(model)
