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
    return _breaks_kept(shop, plan) and any(_fits(shop, plan, rows) for rows in _ways(shop, plan))


def _seconds(plan: StatedPlan, k: int) -> range:
    return range(int(plan.start_s[k]), int(plan.end_s[k]))


def _closed(shop: Shop) -> set[int]:
    return {second for pause in shop.breaks for second in range(pause.start_s, pause.end_s)}


def _breaks_kept(shop: Shop, plan: StatedPlan) -> bool:
    closed = _closed(shop)
    pausing = {machine.id for machine in shop.machines if machine.pauses}
    for k in range(len(plan)):
        seconds = _seconds(plan, k)
        if closed & {seconds[0], seconds[-1]}:
            return False
        if plan.machine[k] not in pausing and closed & set(seconds):
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
    closed = _closed(shop)
    rows = {index: [k for k, of in enumerate(of_row) if of == index] for index in range(len(shop))}
    for operation in shop:
        mine = sorted(rows[operation.index], key=lambda k: int(plan.start_s[k]))
        if sum(len(set(_seconds(plan, k)) - closed) for k in mine) != operation.seconds:
            return False
        if len(mine) > 1 and not operation.splittable:
            return False
        if [(int(plan.part[k]), int(plan.parts[k])) for k in mine] != [
            (place, len(mine)) for place in range(1, len(mine) + 1)
        ]:
            return False
    return _steps_kept(shop, plan, rows) and _nobody_twice(shop, plan, of_row)


def _steps_kept(shop: Shop, plan: StatedPlan, rows: dict[int, list[int]]) -> bool:
    for lower in shop:
        for higher in shop:
            if lower.job != higher.job or lower.step is None or higher.step is None:
                continue
            last = max(int(plan.end_s[k]) for k in rows[lower.index])
            if lower.step < higher.step and any(plan.start_s[k] < last for k in rows[higher.index]):
                return False
    return True


def _nobody_twice(shop: Shop, plan: StatedPlan, of_row: tuple[int, ...]) -> bool:
    crew_of = {machine.id: machine.crew for machine in shop.machines}
    heads = {crew.id: crew.heads for crew in shop.crews}
    for second in range(int(max(plan.end_s, default=0))):
        running = [k for k in range(len(plan)) if second in _seconds(plan, k)]
        orders = Counter(plan.order[k] for k in running)
        units = Counter((plan.machine[k], int(plan.unit[k])) for k in running)
        taken: Counter[str | None] = Counter()
        for k in running:
            taken[crew_of[plan.machine[k]]] += int(shop.operations.heads[of_row[k]])
        if max([*orders.values(), *units.values()], default=0) > 1:
            return False
        if any(taken[crew] > count for crew, count in heads.items()):
            return False
    return True
