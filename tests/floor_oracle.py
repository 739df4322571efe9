"""Tiny floors solved by trying everything: the least makespan and the least weighted tardiness.

Shares nothing with the methods, the bounds or the audit: it reads the plain fields of a shop, knows
seconds as sets, and plays every schedule through. A schedule is built in order of time: whatever starts
next starts no earlier than what stands already, so each schedule is met exactly once, and a unit, an
order and a crew only ever have a past. Two prunings, both switched off by ``every=True`` so that they can
be tested against nothing but counting:

- of the seconds at which an operation may start next on a unit only the first is tried: whatever starts
  after it is hindered no more by that than by a later one, so makespan and tardiness have a best schedule
  without the others;
- a beginning is left when what it has to do still makes it no better than the best known.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import cached_property

from shopfloor.model.shop import NO_DUE, NO_FAMILY, NO_STEP, Shop


@dataclass(frozen=True)
class Visit:
    """One operation played: on which unit, and in which seconds it is worked and attended."""

    operation: int
    unit: int
    start: int
    end: int
    attended: tuple[int, ...]


@dataclass
class Hall:
    """The plain fields of a shop, by operation."""

    shop: Shop
    shut: list[set[int]] = field(init=False)
    known: dict[tuple[int, int, int], Visit | None] = field(default_factory=dict)

    def __post_init__(self) -> None:
        self.shut = [
            {
                second
                for closure in (*self.shop.breaks, *machine.closed)
                for second in range(closure.start_s, closure.end_s)
            }
            for machine in self.shop.machines
        ]

    def __len__(self) -> int:
        return len(self.shop.operations.job)

    @cached_property
    def columns(self) -> dict[str, list[int]]:
        operations = self.shop.operations
        names = ("job", "machine", "seconds", "step", "heads", "family", "setup_s")
        return {name: getattr(operations, name).tolist() for name in names}

    @cached_property
    def horizon(self) -> int:
        """A time by which some best schedule has ended: from the last change on, one after another."""
        shop = self.shop
        between = [changeover.between for changeover in shop.changeovers.values()]
        between += [s for changeover in shop.changeovers.values() for s in changeover.pairs.values()]
        way = [shop.transport.between, *shop.transport.pairs.values()]
        quiet = [0, *shop.orders.release_s.tolist(), *(max(shut, default=-1) + 1 for shut in self.shut)]
        quiet += [end for crew in shop.crews for _, end, _ in crew.levels]
        pause = max([0, *between]) + max(way)
        return int(max(quiet)) + sum(self.columns["seconds"]) + pause * (len(self) + 1)

    def family(self, operation: int) -> str:
        index = self.columns["family"][operation]
        return "" if index == NO_FAMILY else self.shop.families[index]

    def visit(self, operation: int, unit: int, start: int) -> Visit | None:
        """The visit that starts at a second, or None if the machine is shut when it must not be."""
        key = (operation, unit, start)
        if key not in self.known:
            self.known[key] = self._visit(*key)
        return self.known[key]

    def _visit(self, operation: int, unit: int, start: int) -> Visit | None:
        place, length = self.columns["machine"][operation], self.columns["seconds"][operation]
        machine, shut = self.shop.machines[place], self.shut[place]
        worked: list[int] = []
        second = start
        while len(worked) < length:
            if second not in shut:
                worked.append(second)
            elif not machine.pauses or not worked:
                return None
            second += 1
        attended = worked if machine.crew is not None else []
        if machine.set_up_only:
            attended = attended[: self.columns["setup_s"][operation]]
        return Visit(operation, unit, start, second, tuple(attended))

    # ---- the rules, for a visit after all that started before it ----------------------------------

    def may_follow(self, before: list[Visit], visit: Visit) -> bool:
        """Whether `visit` keeps every rule beside visits that start no later."""
        return (
            visit.start >= self.shop.orders.release_s[self.columns["job"][visit.operation]]
            and self._order_is_here(before, visit)
            and self._steps_are_done(before, visit)
            and self._unit_is_ready(before, visit)
            and self._heads_are_there(before, visit)
        )

    def _order_is_here(self, before: list[Visit], visit: Visit) -> bool:
        job, machine = self.columns["job"], self.columns["machine"]
        ids = [each.id for each in self.shop.machines]
        transport = self.shop.transport
        for past in before:
            if job[past.operation] == job[visit.operation]:
                here, there = ids[machine[past.operation]], ids[machine[visit.operation]]
                way = 0 if here == there else transport.pairs.get((here, there), transport.between)
                if visit.start < past.end + (way if past is self._last(before, job, visit) else 0):
                    return False
        return True

    @staticmethod
    def _last(before: list[Visit], key: list[int], visit: Visit) -> Visit:
        """The visit of the same order that ended last."""
        return max((p for p in before if key[p.operation] == key[visit.operation]), key=lambda p: p.end)

    def _steps_are_done(self, before: list[Visit], visit: Visit) -> bool:
        job, step = self.columns["job"], self.columns["step"]
        mine = visit.operation
        if step[mine] == NO_STEP:
            return True
        ended = {past.operation for past in before if past.end <= visit.start}
        return all(
            other in ended
            for other in range(len(self))
            if job[other] == job[mine] and NO_STEP != step[other] < step[mine]
        )

    def _unit_is_ready(self, before: list[Visit], visit: Visit) -> bool:
        machine = self.columns["machine"][visit.operation]
        same = [
            past
            for past in before
            if self.columns["machine"][past.operation] == machine and past.unit == visit.unit
        ]
        if any(past.end > visit.start for past in same):
            return False
        changeover = self.shop.changeovers.get(self.shop.machines[machine].id)
        if changeover is None:
            return True
        if same:
            last = max(same, key=lambda past: past.end)
            old, free = self.family(last.operation), last.end
        else:
            begins = self.shop.machines[machine].family
            if begins is None:
                return True
            old, free = begins, 0
        new = self.family(visit.operation)
        needed = 0 if old == new else changeover.pairs.get((old, new), changeover.between)
        return sum(second not in self.shut[machine] for second in range(free, visit.start)) >= needed

    def _heads_are_there(self, before: list[Visit], visit: Visit) -> bool:
        heads, machine = self.columns["heads"], self.columns["machine"]
        name = self.shop.machines[machine[visit.operation]].crew
        for crew in self.shop.crews:
            if crew.id != name:
                continue
            for second in visit.attended:
                there = crew.heads
                for start, end, level in crew.levels:
                    if start <= second < end:
                        there = level
                taken = heads[visit.operation] + sum(
                    heads[past.operation]
                    for past in before
                    if self.shop.machines[machine[past.operation]].crew == name and second in past.attended
                )
                if taken > there:
                    return False
        return True

    # ---- whole schedules ----------------------------------------------------------------------------

    def late(self, job: int, end: int) -> int:
        """Weighted tardiness of one order that ends then, in thousandths of priority × seconds."""
        due = int(self.shop.orders.due_s[job])
        weight = round(float(self.shop.orders.priority[job]) * 1000)
        return 0 if due == NO_DUE else weight * max(0, end - due)

    def tardiness(self, visits: list[Visit]) -> int:
        ends: dict[int, int] = {}
        for visit in visits:
            job = self.columns["job"][visit.operation]
            ends[job] = max(ends.get(job, 0), visit.end)
        return sum(self.late(job, end) for job, end in ends.items())


def plays(shop: Shop, start: list[int], unit: list[int]) -> list[int] | None:
    """The end of each operation when they start so, on units counted from 1; None if a rule is broken."""
    hall = Hall(shop)
    before: list[Visit] = []
    for operation in sorted(range(len(start)), key=lambda k: start[k]):
        count = shop.machines[hall.columns["machine"][operation]].count
        visit = hall.visit(operation, unit[operation], start[operation]) if start[operation] >= 0 else None
        if visit is None or not 1 <= visit.unit <= count or not hall.may_follow(before, visit):
            return None
        before.append(visit)
    return [visit.end for visit in sorted(before, key=lambda visit: visit.operation)]


def makespan(hall: Hall, visits: list[Visit]) -> int:
    """The end of the last visit."""
    return max((visit.end for visit in visits), default=0)


def least_makespan(shop: Shop, *, every: bool = False) -> int | None:
    """The least makespan there is; None if the shop has no schedule."""
    return _least(Hall(shop), makespan, every)


def least_tardiness(shop: Shop, *, every: bool = False) -> int | None:
    """The least weighted tardiness there is, in thousandths of priority × seconds."""
    return _least(Hall(shop), Hall.tardiness, every)


def _least(hall: Hall, worth: Callable[[Hall, list[Visit]], int], every: bool) -> int | None:
    best: int | None = None
    stack: list[Visit] = []

    def hopeless() -> bool:
        """Whether what stands, and each order worked to its end at once, is no better than the best."""
        if best is None or every:
            return False
        now = stack[-1].start if stack else 0
        placed = {visit.operation for visit in stack}
        done = list(stack)
        for job in set(hall.columns["job"]):
            left = [k for k in range(len(hall)) if hall.columns["job"][k] == job and k not in placed]
            free = max([now, *(v.end for v in stack if hall.columns["job"][v.operation] == job)])
            if left:
                end = free + sum(hall.columns["seconds"][k] for k in left)
                done.append(Visit(left[0], 0, free, end, ()))
        return worth(hall, done) >= best

    def search() -> None:
        nonlocal best
        if hopeless():
            return
        if len(stack) == len(hall):
            value = worth(hall, stack)
            best = value if best is None else min(best, value)
            return
        for visit in _next_visits(hall, stack, every):
            stack.append(visit)
            search()
            stack.pop()

    search()
    return best


def _next_visits(hall: Hall, stack: list[Visit], every: bool) -> Iterator[Visit]:
    """Every visit that may start next: no earlier than the last, and at the same second only in one order."""
    placed = {visit.operation for visit in stack}
    first, last = (stack[-1].start, stack[-1].operation) if stack else (0, -1)
    for operation in range(len(hall)):
        if operation in placed:
            continue
        machine = hall.shop.machines[hall.columns["machine"][operation]]
        for unit in range(1, machine.count + 1):
            for start in range(first + (every and operation < last), hall.horizon):
                visit = hall.visit(operation, unit, start)
                if visit is not None and hall.may_follow(stack, visit):
                    yield visit
                    if not every:
                        break
