"""How long the audit takes: seconds for 10^4 to 10^6 rows, clean, cut into parts, and all wrong.

python tests/bench/audit.py [most rows]
"""

from __future__ import annotations

import sys
import time

import numpy as np

from shopfloor.audit.schedule import audit
from shopfloor.model.results import Bound
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.model.stated import StatedPlan

ROUND_S = 1_800


def rounds(rows: int, machines: int = 300) -> tuple[Shop, StatedPlan]:
    """A plan of full rounds: in round r, order k is on machine k + r; orders come back round after round."""
    index = np.arange(rows)
    slot, job = np.divmod(index, machines)
    machine = (job + slot) % machines
    names = [f"TQ-{k:06d}" for k in range(machines)]
    shop = Shop(
        machines=tuple(Machine(f"M{k}") for k in range(machines)),
        orders=Orders(tuple(names)),
        operations=Operations(job, machine, np.full(rows, ROUND_S)),
        unit_rounds=True,
    )
    return shop, _stated(shop, slot * ROUND_S, slot + 1, np.ones(rows, int), np.ones(rows, int), index)


def parts(rows: int, machines: int = 300) -> tuple[Shop, StatedPlan]:
    """The same plan, in which every operation is two neighbouring rounds of one order, cut in two."""
    shop, _ = rounds(rows, machines)
    size = max(1, rows // (2 * machines)) * 2 * machines
    index = np.arange(size)
    slot, job = np.divmod(index, machines)
    machine = (job + slot // 2) % machines
    whole = np.flatnonzero(slot % 2 == 0)
    shop = Shop(
        machines=shop.machines,
        orders=shop.orders,
        operations=Operations(
            job[whole], machine[whole], np.full(len(whole), 2 * ROUND_S), splittable=np.ones(len(whole), int)
        ),
    )
    operation = np.empty(size, int)
    operation[whole] = np.arange(len(whole))
    odd = np.flatnonzero(slot % 2 == 1)
    operation[odd] = operation[odd - machines]
    none = np.full(size, -1)
    return shop, _stated(shop, slot * ROUND_S, none, slot % 2 + 1, np.full(size, 2), operation)


def wrong(rows: int) -> tuple[Shop, StatedPlan]:
    """Every row at the same time, an hour long, on a unit that is not there, part 3 of 2."""
    shop, plan = rounds(rows)
    two = np.full(rows, 2)
    bad = StatedPlan(
        plan.row, plan.order, plan.machine, two, two * 0, two * ROUND_S, plan.round, two + 1, two,
        makespan_s=1, lower_bound_s=1, proved_optimal=True,
    )  # fmt: skip
    return shop, bad


def _stated(
    shop: Shop, start: np.ndarray, slot: np.ndarray, part: np.ndarray, of: np.ndarray, op: np.ndarray
) -> StatedPlan:
    orders, machines = shop.orders.ids, [machine.id for machine in shop.machines]
    size, end = len(start), int(start.max()) + ROUND_S
    bounds = tuple(
        Bound("order", int(shop.job_load_s[k]), {"order": shop.orders.ids[k]}, "") for k in range(len(orders))
    )
    return StatedPlan(
        row=np.arange(2, size + 2),
        order=[orders[k] for k in shop.operations.job[op]],
        machine=[machines[k] for k in shop.operations.machine[op]],
        unit=np.ones(size, int),
        start_s=start,
        end_s=start + ROUND_S,
        round=slot,
        part=part,
        parts=of,
        makespan_s=end,
        lower_bound_s=int(shop.job_load_s.max()),
        proved_optimal=bool(end == shop.job_load_s.max()),
        bounds=bounds,
    )


def main(most: int) -> None:
    """Print one line a plan: rows, seconds, violations."""
    print(f"{'plan':<8}{'rows':>10}{'seconds':>10}{'violations':>12}")
    size = 10_000
    while size <= most:
        for make in (rounds, parts, wrong):
            shop, plan = make(size)
            began = time.perf_counter()
            found = audit(shop, plan)
            print(f"{make.__name__:<8}{len(plan):>10,}{time.perf_counter() - began:>10.2f}{len(found):>12,}")
        size *= 10


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 1_000_000)
