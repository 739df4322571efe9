"""The rules of a plan told once more, as slowly and plainly as possible: second by second, by trying all.

Shares nothing with the audit, not even an idea: it plays the plan through and looks at every second.
"""

from __future__ import annotations

from collections import Counter
from itertools import product

from shopfloor.model.shop import Shop
from shopfloor.model.stated import StatedPlan


def legal(shop: Shop, plan: StatedPlan) -> bool:
    """Whether the rows of a small plan, whose times are small, keep every rule of the shop."""
    machines = {machine.id: machine for machine in shop.machines}
    for k in range(len(plan)):
        known = plan.order[k] in shop.orders.ids and plan.machine[k] in machines
        if not known or not 0 <= plan.start_s[k] < plan.end_s[k]:
            return False
        if not 1 <= plan.unit[k] <= machines[plan.machine[k]].count:
            return False
        if plan.start_s[k] < shop.orders.release_s[shop.orders.ids.index(plan.order[k])]:
            return False
    if not (_closures_kept(shop, plan) and _transport_kept(shop, plan)):
        return False
    return any(_fits(shop, plan, rows) for rows in _ways(shop, plan))


def _seconds(plan: StatedPlan, k: int) -> range:
    return range(int(plan.start_s[k]), int(plan.end_s[k]))


def _closed(shop: Shop, machine: str) -> set[int]:
    own = next(entry.closed for entry in shop.machines if entry.id == machine)
    return {second for shut in (*shop.breaks, *own) for second in range(shut.start_s, shut.end_s)}


def _closures_kept(shop: Shop, plan: StatedPlan) -> bool:
    pausing = {machine.id for machine in shop.machines if machine.pauses}
    for k in range(len(plan)):
        seconds, closed = _seconds(plan, k), _closed(shop, plan.machine[k])
        if closed & {seconds[0], seconds[-1]}:
            return False
        if plan.machine[k] not in pausing and closed & set(seconds):
            return False
    return True


def _transport_kept(shop: Shop, plan: StatedPlan) -> bool:
    for one in range(len(plan)):
        for two in range(len(plan)):
            if one != two and plan.order[one] == plan.order[two] and plan.start_s[one] <= plan.start_s[two]:
                way = shop.transport.seconds(plan.machine[one], plan.machine[two])
                if plan.start_s[two] - plan.end_s[one] < way:
                    return False
    return True


def _ways(shop: Shop, plan: StatedPlan) -> product[tuple[int, ...]]:
    """Every way to say which operation each row runs."""
    return product(
        *(
            [
                operation.index
                for operation in shop
                if (operation.order, operation.machine_id) == (plan.order[k], plan.machine[k])
            ]
            for k in range(len(plan))
        )
    )


def _fits(shop: Shop, plan: StatedPlan, of_row: tuple[int, ...]) -> bool:
    rows = {index: [k for k, of in enumerate(of_row) if of == index] for index in range(len(shop))}
    for operation in shop:
        mine = sorted(rows[operation.index], key=lambda k: int(plan.start_s[k]))
        if len(_worked(shop, plan, mine)) != operation.seconds:
            return False
        if len(mine) > 1 and not operation.splittable:
            return False
        if [(int(plan.part[k]), int(plan.parts[k])) for k in mine] != [
            (place, len(mine)) for place in range(1, len(mine) + 1)
        ]:
            return False
    kept = _steps_kept(shop, plan, rows) and _changeovers_kept(shop, plan, of_row)
    return kept and _nobody_twice(shop, plan, rows)


def _worked(shop: Shop, plan: StatedPlan, rows: list[int]) -> list[int]:
    """The seconds in which the rows of one operation are worked, in order."""
    return sorted(second for k in rows for second in set(_seconds(plan, k)) - _closed(shop, plan.machine[k]))


def _changeovers_kept(shop: Shop, plan: StatedPlan, of_row: tuple[int, ...]) -> bool:
    for machine in shop.machines:
        times = shop.changeovers.get(machine.id)
        for unit in range(1, machine.count + 1):
            before, free = machine.family, 0
            rows = [k for k in range(len(plan)) if (plan.machine[k], plan.unit[k]) == (machine.id, unit)]
            for k in sorted(rows, key=lambda k: int(plan.start_s[k])):
                family = shop.operation(of_row[k]).family
                gap = set(range(free, int(plan.start_s[k]))) - _closed(shop, machine.id)
                if times is not None and before is not None and len(gap) < times.seconds(before, family):
                    return False
                before, free = family, int(plan.end_s[k])
    return True


def _steps_kept(shop: Shop, plan: StatedPlan, rows: dict[int, list[int]]) -> bool:
    for lower in shop:
        for higher in shop:
            if lower.job != higher.job or lower.step is None or higher.step is None:
                continue
            last = max(int(plan.end_s[k]) for k in rows[lower.index])
            if lower.step < higher.step and any(plan.start_s[k] < last for k in rows[higher.index]):
                return False
    return True


def _nobody_twice(shop: Shop, plan: StatedPlan, rows: dict[int, list[int]]) -> bool:
    attended: dict[int, set[int]] = {}
    for operation in shop:
        worked = _worked(shop, plan, rows[operation.index])
        only = shop.machines[operation.machine].set_up_only
        attended[operation.index] = set(worked[: operation.setup_s] if only else worked)
    for second in range(int(max(plan.end_s, default=0))):
        running = [k for k in range(len(plan)) if second in _seconds(plan, k)]
        orders = Counter(plan.order[k] for k in running)
        units = Counter((plan.machine[k], int(plan.unit[k])) for k in running)
        if max([*orders.values(), *units.values()], default=0) > 1:
            return False
        taken: Counter[str | None] = Counter()
        for operation in shop:
            if second in attended[operation.index]:
                taken[shop.machines[operation.machine].crew] += operation.heads
        for crew in shop.crews:
            there = [heads for start, end, heads in crew.levels if start <= second < end]
            if taken[crew.id] > (there[0] if there else crew.heads):
                return False
    return True
