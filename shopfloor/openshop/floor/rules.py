"""A shop with all its rules as plain lists, which loops read several times faster than arrays."""

from __future__ import annotations

from dataclasses import dataclass

from shopfloor.model.shop import NO_DUE, NO_FAMILY, NO_STEP, Crew, Shop
from shopfloor.openshop.floor.openings import Openings
from shopfloor.openshop.incumbent import weights

FAR = 2**52  # stands for a due time that an order does not have; exact as a float
NONE = -1  # no step, no crew, no family to begin in, no operation before

Table = list[list[int]]


@dataclass(frozen=True, slots=True)
class Rules:
    """Everything that says where an operation may stand. Times in seconds.

    Attributes
    ----------
    job, machine, seconds
        An entry an operation.
    step
        Rank of each operation inside its order, ``NONE`` for any time.
    family
        Place of each operation's family in its machine's changeover table; 0 where there is none.
    crew, heads, attended
        The crew each operation takes heads from (``NONE`` if it takes none), how many, and for how
        many seconds from its start. A machine's name for its crew counts only while heads are taken.
    release, due, weight, visits
        An entry an order; due ``FAR`` if none; weights in thousandths; how many operations.
    count
        Units of each machine.
    change
        For each machine the seconds from family to family, None where no change takes any time.
    begins
        For each machine the place of the family it starts the shift in, ``NONE`` if any.
    openings
        For each machine.
    transport
        Seconds from machine to machine, None where no way takes any time.
    crews
        When how many heads are there: for each crew the moments of change and the heads from then on.
    """

    job: list[int]
    machine: list[int]
    seconds: list[int]
    step: list[int]
    family: list[int]
    crew: list[int]
    heads: list[int]
    attended: list[int]
    release: list[int]
    due: list[int]
    weight: list[int]
    visits: list[int]
    count: list[int]
    change: list[Table | None]
    begins: list[int]
    openings: list[Openings]
    transport: Table | None
    crews: list[tuple[list[int], list[int]]]

    def __len__(self) -> int:
        return len(self.job)

    @classmethod
    def of(cls, shop: Shop) -> Rules:
        """Return `shop` as lists; linear in operations, and in families squared for each machine."""
        columns, orders = shop.operations, shop.orders
        machine = columns.machine.tolist()
        family, change, begins = _changeovers(shop, machine)
        crew, attended = _attended(shop, machine)
        visits = [0] * len(orders)
        for job in columns.job.tolist():
            visits[job] += 1
        return cls(
            job=columns.job.tolist(),
            machine=machine,
            seconds=columns.seconds.tolist(),
            step=[NONE if step == NO_STEP else step for step in columns.step.tolist()],
            family=family,
            crew=crew,
            heads=columns.heads.tolist(),
            attended=attended,
            release=orders.release_s.tolist(),
            due=[FAR if due == NO_DUE else due for due in orders.due_s.tolist()],
            weight=weights(shop),
            visits=visits,
            count=[each.count for each in shop.machines],
            change=change,
            begins=begins,
            openings=_openings(shop),
            transport=_transport(shop),
            crews=[heads_there(each) for each in shop.crews],
        )

    def stretches(self, operation: int, start: int) -> list[tuple[int, int]]:
        """Return when an operation that starts at `start` takes its heads; empty if it takes none."""
        if self.crew[operation] == NONE:
            return []
        openings = self.openings[self.machine[operation]]
        if openings.always or not openings.pauses:
            return [(start, start + self.attended[operation])]
        return openings.stretches(start, self.attended[operation])


def heads_there(crew: Crew) -> tuple[list[int], list[int]]:
    """Return the moments from zero on at which the heads of a crew change, and the heads from each on."""
    since, heads = [0], [crew.heads]
    for start, end, level in crew.levels:
        for moment, there in ((start, level), (end, crew.heads)):
            if moment <= since[-1]:
                since[-1], heads[-1] = max(0, since[-1]), there
            else:
                since.append(moment)
                heads.append(there)
    return since, heads


def _openings(shop: Shop) -> list[Openings]:
    made: dict[tuple[object, bool], Openings] = {}  # machines that keep the same hours share one
    for machine in shop.machines:
        key = (machine.closed, machine.pauses)
        if key not in made:
            spans = [(shut.start_s, shut.end_s) for shut in (*shop.breaks, *machine.closed)]
            made[key] = Openings(spans, pauses=machine.pauses)
    return [made[machine.closed, machine.pauses] for machine in shop.machines]


def _changeovers(shop: Shop, machine: list[int]) -> tuple[list[int], list[Table | None], list[int]]:
    """Return each operation's family, each machine's table, and the family each machine begins in."""
    family, names = [0] * len(machine), [*shop.families, ""]
    place: list[dict[str, int]] = [{} for _ in shop.machines]  # by machine: family to its line in the table
    rules = [shop.changeovers.get(each.id) for each in shop.machines]
    timed = [rule is not None and not rule.none for rule in rules]
    for operation, (index, which) in enumerate(zip(machine, shop.operations.family.tolist(), strict=True)):
        if timed[index]:
            name = "" if which == NO_FAMILY else names[which]
            family[operation] = place[index].setdefault(name, len(place[index]))
    change: list[Table | None] = []
    begins = []
    for index, rule in enumerate(rules):
        if rule is None or not timed[index]:
            change.append(None)
            begins.append(NONE)
            continue
        begin = shop.machines[index].family
        begins.append(NONE if begin is None else place[index].setdefault(begin, len(place[index])))
        change.append([[rule.seconds(before, after) for after in place[index]] for before in place[index]])
    return family, change, begins


def _attended(shop: Shop, machine: list[int]) -> tuple[list[int], list[int]]:
    """Return the crew of each operation that takes heads, and for how many seconds it does."""
    index = {crew.id: place for place, crew in enumerate(shop.crews)}
    of_machine = [NONE if each.crew is None else index[each.crew] for each in shop.machines]
    columns = shop.operations
    attended = [
        set_up if shop.machines[place].set_up_only else seconds
        for place, set_up, seconds in zip(
            machine, columns.setup_s.tolist(), columns.seconds.tolist(), strict=True
        )
    ]
    crew = [
        of_machine[place] if heads and length else NONE
        for place, heads, length in zip(machine, columns.heads.tolist(), attended, strict=True)
    ]
    return crew, attended


def _transport(shop: Shop) -> Table | None:
    if shop.transport.none:
        return None
    names = [machine.id for machine in shop.machines]
    return [[shop.transport.seconds(one, other) for other in names] for one in names]
