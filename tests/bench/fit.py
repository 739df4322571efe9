"""Times `fit` on 2,000 orders and 40 machines: seconds to a proved choice, and how far from the flow bound.

Run: python -m tests.bench.fit
"""

from __future__ import annotations

import time

import numpy as np

from shopfloor.fit.budget import budget
from shopfloor.fit.flow import choose_operations
from shopfloor.fit.knapsack import choose_orders
from shopfloor.model.shop import Machine, Operations, Orders, Shop


def shop_of_size(orders: int, machines: int, load: float, seed: int) -> Shop:
    """Return a unit shop whose machines hold about 1/load of the work in 16 rounds of half an hour each."""
    rng = np.random.default_rng(seed)
    visits = rng.integers(1, 6, orders)
    job = np.repeat(np.arange(orders), visits)
    machine = np.concatenate([rng.choice(machines, size, replace=False) for size in visits])
    rounds = round(len(job) / machines / load)
    return Shop(
        tuple(Machine(f"M{m}") for m in range(machines)),
        Orders(tuple(f"J{j}" for j in range(orders)), priority=rng.choice([1.0, 2.0, 5.0], orders)),
        Operations(job, machine, np.full(len(job), 1800)),
        shift_end_s=rounds * 1800,
    )


def main() -> None:
    """Print one row a shop."""
    print(
        "| orders | machines | work / room | orders chosen | priority | linear bound | gap | proved | s "
        "| flow, s |"
    )
    print("| --- | --- | --- | --- | --- | --- | --- | --- | --- | --- |")
    for load in (1.1, 1.3, 1.6):
        shop = shop_of_size(2000, 40, load, seed=1)
        limits = budget(shop)
        nothing = np.zeros(len(shop.orders), bool)
        began = time.perf_counter()
        found = choose_orders(shop, limits, must=nothing, never=nothing, time_limit_s=60, seed=0)
        knapsack_s = time.perf_counter() - began
        began = time.perf_counter()
        choose_operations(shop, limits, must=nothing, never=nothing)
        flow_s = time.perf_counter() - began
        gap = found.relaxed - found.value
        cells = [
            "2,000",
            "40",
            load,
            f"{int(found.orders.sum()):,}",
            f"{found.value / 1000:g}",
            f"{found.relaxed / 1000:.2f}",
            f"{gap / found.relaxed:.3%}",
            "yes" if found.proved else "no",
            f"{knapsack_s:.1f}",
            f"{flow_s:.3f}",
        ]
        print(f"| {' | '.join(map(str, cells))} |")


if __name__ == "__main__":
    main()
