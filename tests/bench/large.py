"""Large open shops: how near the load bound the general method comes, and when. Prints markdown.

    python -m tests.bench.large                           the whole of it, some minutes
    python -m tests.bench.large --cases uniform square    some cases
    python -m tests.bench.large --plain-cap 0             without the plain model

All times are drawn from the seeds named, on 1 to 99 but for orders made long. The seconds are those of the
method alone, from the shop and its lower bound to the schedule. One shop of some cases is also given to the
plain CP-SAT model of ``tests.bench.published``.
"""

from __future__ import annotations

import argparse
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.shop import Shop, shop_of
from shopfloor.openshop.general import General
from shopfloor.openshop.method import Effort
from tests.bench.published import by_plain_model

Table = np.ndarray
LEAST, MOST = 1, 99


def uniform(orders: int, machines: int, seed: int) -> Table:
    """Every time on its own, uniform on 1 to 99, as Taillard (1993) draws them."""
    return np.random.default_rng(seed).integers(LEAST, MOST + 1, (orders, machines))


def near_bound(orders: int, machines: int, seed: int, *, long_orders: int = 1) -> Table:
    """Some orders nearly as long as the machine loads; slack of these and of every machine at most 0.5 %."""
    rng = np.random.default_rng(seed)
    times = uniform(orders, machines, seed)
    target = int(times[long_orders:].sum() / (machines - long_orders))
    for order in range(long_orders):
        length = int(target * (1 - 0.005 * rng.random()))
        share = rng.uniform(0.5, 1.5, machines)
        times[order] = np.maximum(1, share / share.sum() * length)
        times[order, 0] += length - times[order].sum()
    load = (target * (1 - 0.005 * rng.random(machines))).astype(int)
    load[rng.integers(machines)] = target
    return _with_loads(times, load, long_orders, rng)


def even_machines(orders: int, machines: int, seed: int) -> Table:
    """Every machine has exactly the same load: none has any slack."""
    times = uniform(orders, machines, seed)
    load = np.full(machines, times.sum() // machines)
    return _with_loads(times, load, 0, np.random.default_rng(seed))


def even_lines(orders: int, machines: int, seed: int) -> Table:
    """A square in which every order and every machine has exactly the same load."""
    assert orders == machines, "only a square can have every line as long as every other"
    rng = np.random.default_rng(seed)
    times = np.full((orders, machines), (LEAST + MOST) // 2)
    for _ in range(10 * orders * machines):
        (i, k), (j, l) = rng.integers(orders, size=2), rng.integers(machines, size=2)  # noqa: E741
        if i != k and j != l:
            up = min(MOST - times[i, j], MOST - times[k, l], times[i, l] - LEAST, times[k, j] - LEAST)
            down = min(times[i, j] - LEAST, times[k, l] - LEAST, MOST - times[i, l], MOST - times[k, j])
            by = rng.integers(-down, up + 1)
            times[[i, k], [j, l]] += by
            times[[i, k], [l, j]] -= by
    return times


def _with_loads(times: Table, load: Table, first: int, rng: np.random.Generator) -> Table:
    """Change single times of the orders from `first` on until the machines have these loads."""
    for machine in range(times.shape[1]):
        while short := int(load[machine] - times[:, machine].sum()):
            order, by = int(rng.integers(first, len(times))), int(np.sign(short))
            if LEAST <= times[order, machine] + by <= MOST:
                times[order, machine] += by
    return times


@dataclass(frozen=True)
class Case:
    """Some shops of one kind; `plain_s` is how long the plain model gets on the first, 0 for not at all."""

    name: str
    draw: Callable[[int, int, int], Table]
    sizes: tuple[tuple[int, int], ...]
    seeds: int
    limit_s: float
    plain_s: float = 0.0


def _several(orders: int, machines: int, seed: int) -> Table:
    return near_bound(orders, machines, seed, long_orders=2 + seed % 2)


CASES = (
    Case("uniform", uniform, ((50, 10), (100, 10), (100, 20), (200, 20)), 4, 12.0),
    Case("uniform", uniform, ((500, 20),), 4, 12.0, 60.0),
    Case("near-bound", near_bound, ((100, 10),), 4, 12.0),
    Case("near-bound", near_bound, ((200, 20),), 4, 12.0, 60.0),
    Case("near-bound", near_bound, ((500, 20),), 4, 12.0),
    Case("two-near-bound", _several, ((100, 10), (200, 20), (500, 20)), 4, 12.0),
    Case("square", uniform, ((20, 20), (30, 30)), 4, 12.0),
    Case("square", uniform, ((50, 50),), 4, 15.0, 30.0),
    Case("square", uniform, ((100, 100),), 4, 12.0),
    Case("even-machines", even_machines, ((50, 10), (200, 20), (500, 20)), 4, 12.0),
    Case("even-lines", even_lines, ((20, 20), (50, 50), (100, 100)), 2, 12.0),
)
SAYS = {
    "uniform": "times uniform on 1 to 99",
    "near-bound": "one order nearly as long as the bound, machine slack at most 0.5 %",
    "two-near-bound": "two or three such orders",
    "square": "as many orders as machines, uniform",
    "even-machines": "no slack on any machine",
    "even-lines": "no slack on any line: a square, mixed at random",
}


def measure(case: Case, size: tuple[int, int], plain_cap: float) -> str:
    """Return a line of the table."""
    over: list[float] = []
    seconds: list[float] = []
    for seed in range(case.seeds):
        shop = shop_of(case.draw(*size, seed))
        bound_s = lower_bounds(shop)[0].value_s
        began = time.monotonic()
        outcome = General().solve(shop, Effort(bound_s=bound_s, time_limit_s=case.limit_s))
        seconds.append(time.monotonic() - began)
        assert outcome.schedule is not None
        over.append(outcome.schedule.makespan_s / max(bound_s, outcome.proven_s) - 1)
        print(f"{case.name} {size} {seed}: {over[-1]:.3%} in {seconds[-1]:.2f} s", file=sys.stderr)
    plain = _plain(shop_of(case.draw(*size, 0)), min(case.plain_s, plain_cap))
    met = sum(share == 0 for share in over)
    cells = (
        f"{SAYS[case.name]}",
        f"{size[0]} × {size[1]}",
        f"{met} of {len(over)}",
        f"{max(over):.3%}",
        f"{sum(seconds) / len(seconds):.2f} / {max(seconds):.2f}",
        plain,
    )
    return "| " + " | ".join(cells) + " |"


def _plain(shop: Shop, cap: float) -> str:
    if not cap:
        return ""
    bound = lower_bounds(shop)[0].value_s
    run = by_plain_model(shop, cap, 2, unit_s=1)
    if run.makespan == float("inf"):
        return f"nothing in {cap:g} s"
    return f"{run.makespan / bound - 1:.3%} in {run.seconds:.1f} s"


def main() -> None:
    """Run what was asked for and print the table."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n", 1)[0])
    parser.add_argument("--cases", nargs="+", choices=list(SAYS), default=list(SAYS))
    parser.add_argument("--plain-cap", type=float, default=60.0, help="most seconds for the plain model")
    options = parser.parse_args()
    print("| shops | size | bound met | worst above it | mean / max s | plain model, first shop |")
    print("|---|---|---|---|---|---|")
    for case in CASES:
        if case.name in options.cases:
            for size in case.sizes:
                print(measure(case, size, options.plain_cap), flush=True)


if __name__ == "__main__":
    main()
