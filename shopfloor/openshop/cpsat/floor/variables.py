"""The variables of the model: when operations start and end, on the clock and in open time.

In open time (working time of the machine, its closures squeezed out) every operation is as long as its
work, whether it pauses or not, and changeovers are plain distances; so machines are modelled there. On the
clock an operation starts at its open time plus the closures passed by then: "open time is at least v" is
one Boolean for each closure that matters. Orders and crews are modelled on the clock.

Measured on fifteen made-up shifts, this and pairwise changeovers did better than circuits, and than optional
intervals for the units of a group.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field
from itertools import chain
from math import gcd

from ortools.sat.python import cp_model

from shopfloor.model.calendar import WorkClock, united
from shopfloor.model.shop import NO_DUE, Crew, Shop
from shopfloor.openshop.cpsat.floor.best import Places
from shopfloor.openshop.cpsat.variables import Grid

Spans = list[tuple[int, int]]


def grid_of(shop: Shop, places: Places) -> Grid:
    """Return the greatest common divisor of every time in the shop and of a legal plan.

    Pushed to the left, a plan starts its operations at multiples of it, so none better is lost.
    """
    shut = chain(shop.breaks, *(machine.closed for machine in shop.machines))
    times: Iterable[int] = chain(
        shop.operations.seconds.tolist(),
        shop.operations.setup_s.tolist(),
        shop.orders.release_s.tolist(),
        (due for due in shop.orders.due_s.tolist() if due != NO_DUE),
        *((each.start_s, each.end_s) for each in shut),
        *((start, end) for crew in shop.crews for start, end, _ in crew.levels),
        *((between.between, *between.pairs.values()) for between in shop.changeovers.values()),
        (shop.transport.between, *shop.transport.pairs.values()),
        places.start.tolist(),
        places.end.tolist(),
    )
    return Grid(gcd(0, *times) or 1)


class Hours:
    """When one machine is shut, on the grid."""

    def __init__(self, shut: Spans, unit_s: int) -> None:
        self.spans = [(max(start, 0) // unit_s, end // unit_s) for start, end in united(shut) if end > 0]
        self.clock = WorkClock(self.spans)
        self.jumps = [int(self.clock.worked(start)) for start, _ in self.spans]

    def worked(self, moment: int) -> int:
        """Return the open time before a moment."""
        return int(self.clock.worked(moment))


@dataclass(slots=True)
class Visit:
    """One operation in the model, all times on the grid.

    Attributes
    ----------
    work
        How long it is worked on.
    at, start, end
        Its start in open time, and start and end on the clock.
    was, start_was, end_was
        The same in the plan the search begins at.
    lasts
        Interval in the machine's open time.
    stays
        Interval on the clock, pauses included.
    on_unit
        For machines of several units with changeovers: whether it runs on each of them.
    """

    operation: int
    machine: int
    job: int
    work: int
    hours: Hours
    pauses: bool
    at: cp_model.IntVar
    low: int
    high: int
    was: int
    start_was: int
    end_was: int
    start: cp_model.LinearExprT
    end: cp_model.LinearExprT
    lasts: cp_model.IntervalVar
    stays: cp_model.IntervalVar
    on_unit: list[cp_model.IntVar] = field(default_factory=list)
    reached: dict[int, cp_model.IntVar] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Part:
    """What of a plan is placed again.

    Attributes
    ----------
    free
        The operations to be placed.
    beside
        Operations that stay where they are and might be in the way.
    begin_s, end_s
        The time in which the free ones must lie.
    """

    free: frozenset[int]
    beside: frozenset[int]
    begin_s: int
    end_s: int


class Model:
    """A model being built: variables first, then what the rules constrain.

    Parameters
    ----------
    places
        A legal plan, given to the solver as a hint.
    latest_s
        No operation that is placed ends later.
    part
        The operations to be placed; all if left out.
    """

    def __init__(self, shop: Shop, places: Places, latest_s: int, part: Part | None = None) -> None:
        self.shop, self.places, self.part = shop, places, part
        self.cp = cp_model.CpModel()
        self.grid = grid_of(shop, places)
        self.latest = self.grid.down(latest_s)
        self.yes, self.no = self.cp.new_constant(1), self.cp.new_constant(0)
        breaks = [(pause.start_s, pause.end_s) for pause in shop.breaks]
        self._hours = [
            Hours(breaks + [(shut.start_s, shut.end_s) for shut in machine.closed], self.grid.unit_s)
            for machine in shop.machines
        ]
        rows = range(len(shop)) if part is None else sorted(part.free | part.beside)
        self.visits = [self._visit(row) for row in rows]

    # ---- for the rules ---------------------------------------------------------------------------

    def bool_var(self, hint: bool) -> cp_model.IntVar:
        """Return a new Boolean that begins at `hint`."""
        variable = self.cp.new_bool_var("")
        self.cp.add_hint(variable, int(hint))
        return variable

    def int_var(self, low: int, high: int, hint: int) -> cp_model.IntVar:
        """Return a new variable that begins at `hint`."""
        variable = self.cp.new_int_var(low, max(low, high), "")
        self.cp.add_hint(variable, min(max(hint, low), max(low, high)))
        return variable

    def reaches(self, visit: Visit, value: int) -> cp_model.IntVar:
        """Return whether a visit starts when its machine has been open for `value` or longer."""
        if value <= visit.low:
            return self.yes
        if value > visit.high:
            return self.no
        if value not in visit.reached:
            literal = self.bool_var(visit.was >= value)
            self.cp.add(visit.at >= value).only_enforce_if(literal)
            self.cp.add(visit.at < value).only_enforce_if(~literal)
            visit.reached[value] = literal
        return visit.reached[value]

    def after(self, visit: Visit, work: int) -> cp_model.LinearExprT:
        """Return the moment at which `work`, at least 1, has been done of a visit that pauses."""
        done = [self.reaches(visit, jump - work + 1) for jump in visit.hours.jumps]
        return self._on_clock(visit, work, done)

    def is_free(self, visit: Visit) -> bool:
        """Whether a visit is to be placed, not only in the way."""
        return self.part is None or visit.operation in self.part.free

    def has_units(self, machine: int) -> bool:
        """Whether the units of a machine differ by what they are set up for."""
        times = self.shop.changeovers.get(self.shop.machines[machine].id)
        return self.shop.machines[machine].count > 1 and times is not None and not times.none

    def by_job(self) -> list[list[Visit]]:
        """Return the visits of each order that has several."""
        return [visits for visits in grouped(self.visits, lambda visit: visit.job) if len(visits) > 1]

    def by_machine(self) -> list[list[Visit]]:
        """Return the visits of each machine."""
        return grouped(self.visits, lambda visit: visit.machine)

    # ---- building --------------------------------------------------------------------------------

    def _visit(self, row: int) -> Visit:
        shop, columns, unit_s = self.shop, self.shop.operations, self.grid.unit_s
        machine, work = int(columns.machine[row]), int(columns.seconds[row]) // unit_s
        hours, pauses = self._hours[machine], shop.machines[machine].pauses
        start_was, end_was = (int(times[row]) // unit_s for times in (self.places.start, self.places.end))
        was = hours.worked(start_was)
        domain = self._domain(row, was, work)
        at = self.cp.new_int_var_from_domain(domain, "")
        self.cp.add_hint(at, was)
        bounds = domain.flattened_intervals()
        lasts = self.cp.new_fixed_size_interval_var(at, work, "")
        visit = Visit(
            row, machine, int(columns.job[row]), work, hours, pauses, at, bounds[0], bounds[-1],
            was, start_was, end_was, at, at, lasts, lasts,
        )  # fmt: skip
        visit.start = self._on_clock(visit, 0, [self.reaches(visit, jump) for jump in hours.jumps])
        visit.end = self.after(visit, work) if pauses else visit.start + work
        if not pauses or not self._may_pause(visit):
            visit.end = visit.start + work
            visit.stays = self.cp.new_fixed_size_interval_var(visit.start, work, "")
        else:
            shut = sum(end - start for start, end in hours.spans if start < self.latest)
            size = self.int_var(work, work + shut, end_was - start_was)
            visit.stays = self.cp.new_interval_var(visit.start, size, visit.end, "")
        if self.has_units(machine):
            unit = int(self.places.unit[row])
            count = range(1, shop.machines[machine].count + 1)
            fixed = self.part is not None and row in self.part.beside
            if fixed:
                visit.on_unit = [self.yes if each == unit else self.no for each in count]
            else:
                visit.on_unit = [self.bool_var(each == unit) for each in count]
                self.cp.add_exactly_one(visit.on_unit)
        return visit

    def _domain(self, row: int, was: int, work: int) -> cp_model.Domain:
        """Return when a visit may start in its machine's open time."""
        if self.part is not None and row in self.part.beside:
            return cp_model.Domain(was, was)
        machine = int(self.shop.operations.machine[row])
        hours, head = self._hours[machine], self.grid.up(int(self.shop.head_s[row]))
        latest = self.latest - self.grid.down(int(self.shop.tail_s[row]))
        if self.part is not None:
            head = max(head, self.grid.up(self.part.begin_s))
            latest = min(latest, self.grid.down(self.part.end_s))
        low, high = hours.worked(head), hours.worked(latest) - work
        spans = [low]
        if not self.shop.machines[machine].pauses:  # no closure may begin while it is worked on
            for jump in hours.jumps:
                if jump > low and jump - work < high:
                    spans += [jump - work, jump]
        spans.append(high)
        pairs = [(a, b) for a, b in zip(spans[::2], spans[1::2], strict=True) if a <= b]
        if not pairs:
            self.cp.add_bool_or([])  # no place left: the model has no solution
            return cp_model.Domain(was, was)
        return cp_model.Domain.from_intervals(pairs)

    def _may_pause(self, visit: Visit) -> bool:
        return any(visit.low < jump < visit.high + visit.work for jump in visit.hours.jumps)

    def _on_clock(self, visit: Visit, work: int, passed: list[cp_model.IntVar]) -> cp_model.LinearExprT:
        """Return open time `at + work` plus the closures passed."""
        known, terms = work, []
        low, high = visit.low + work, visit.high + work
        for (start, end), literal in zip(visit.hours.spans, passed, strict=True):
            if literal is self.yes:
                known += end - start
            elif literal is not self.no:
                terms.append((end - start) * literal)
        if not terms:
            return visit.at + known
        clock = visit.hours.clock
        first = int(clock.end(low) if work else clock.start(low))
        last = int(clock.end(high) if work else clock.start(high))
        was = int(clock.end(visit.was + work) if work else clock.start(visit.was))
        moment = self.int_var(first, last, was)
        self.cp.add(moment == visit.at + known + sum(terms))
        return moment


def grouped(visits: Iterable[Visit], key: Callable[[Visit], int]) -> list[list[Visit]]:
    """Return visits by equal key, in order of the key."""
    groups: dict[int, list[Visit]] = {}
    for visit in visits:
        groups.setdefault(key(visit), []).append(visit)
    return [groups[each] for each in sorted(groups)]


def heads_by_time(crew: Crew, latest: int, unit_s: int) -> list[tuple[int, int, int]]:
    """Return the heads of a crew as stretches (start, end, heads) from 0 to `latest`, on the grid."""
    out, moment = [], 0
    for start, end, heads in crew.levels:
        first, last = max(start, 0) // unit_s, min(end // unit_s, latest)
        if first >= last:
            continue
        if moment < first:
            out.append((moment, first, crew.heads))
        out.append((first, last, heads))
        moment = last
    if moment < latest:
        out.append((moment, latest, crew.heads))
    return out
