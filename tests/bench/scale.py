"""What happens as shops grow: 250, 700, 2,000 and 10,000 operations, time and memory. Prints markdown.

    python -m tests.bench.scale                      some three minutes
    python -m tests.bench.scale --seconds 5 --sizes S M

Two kinds of shop at each size. *Plain*: releases and weighted due times, any order of visits, nothing else.
*Floor*: the shifts of ``tests.bench.shifts``, with every rule. Each is planned for the makespan and then for
lateness, in the time given, by the command's own pipeline; beside it stands the exact CP-SAT model of the
same shop, alone, begun at the first list schedule and given the same time for the makespan. Every run has a
process of its own, so that memory is that run's peak, interpreter and libraries included.
"""

from __future__ import annotations

import argparse
import multiprocessing
import resource
import time
from collections.abc import Callable
from concurrent.futures import ProcessPoolExecutor
from functools import partial
from typing import NamedTuple, TypeVar

import numpy as np

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.calendar import HOUR, MINUTE
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.openshop.incumbent import MAKESPAN
from shopfloor.openshop.method import Effort, Progress
from shopfloor.pipeline import Options, plan
from tests.bench.shifts import AND_LARGER, WORKERS, clean, first_plan, lateness, shift

Result = TypeVar("Result")
SEED = 1
SHIFT = 8 * HOUR
USED = 0.8  # of the shift, by an average machine of a plain shop


def plain(size: str, seed: int) -> Shop:
    """A shop of the floors' size without their rules: half of the orders come later, all are due."""
    what = AND_LARGER[size]
    rng = np.random.default_rng([ord(size), seed, 0])
    count = np.clip(np.rint(rng.normal(what.visits, 1.5, what.orders)), 2, what.machines).astype(np.int64)
    job = np.repeat(np.arange(what.orders), count)
    machine = np.concatenate([np.sort(rng.choice(what.machines, size, replace=False)) for size in count])
    length = rng.gamma(3.0, 1.0, len(job)).clip(0.5, 9.0)
    mean = np.bincount(machine, weights=length, minlength=what.machines).mean()
    seconds = np.maximum(2, np.rint(length * USED * SHIFT / MINUTE / mean)).astype(np.int64) * MINUTE
    work = np.bincount(job, weights=seconds, minlength=what.orders).astype(np.int64)
    release = np.where(rng.random(what.orders) < 0.5, rng.integers(0, 240, what.orders) * MINUTE, 0)
    slack = rng.uniform(0.15, 1.0, what.orders) * np.maximum(0, SHIFT - release - work)
    return Shop(
        machines=tuple(Machine(f"M{place:02d}") for place in range(what.machines)),
        orders=Orders(
            tuple(f"TQ-{place:04d}" for place in range(what.orders)),
            release_s=release,
            due_s=(release + work + slack).astype(np.int64) // MINUTE * MINUTE,
            priority=rng.choice([1.0, 1.0, 2.0, 5.0], what.orders),
        ),
        operations=Operations(job, machine, seconds),
        shift_end_s=SHIFT,
    )


KINDS: dict[str, Callable[[str, int], Shop]] = {"plain": plain, "floor": shift}


class Ours(NamedTuple):
    """What the pipeline came to."""

    operations: int
    first_s: float
    seconds: float
    over: float
    late: float
    memory_mb: float


class Peer(NamedTuple):
    """What the exact model alone came to."""

    over: float
    seconds: float
    memory_mb: float


def ours(kind: str, size: str, seconds: float) -> Ours:
    """Plan one shop; in a process that has done nothing before."""
    shop = KINDS[kind](size, SEED)
    _, first_s = first_plan(shop, lower_bounds(shop))
    began = time.perf_counter()
    made = plan(shop, Options(time_limit_s=seconds))
    took = time.perf_counter() - began
    over = made.makespan_s / made.lower_bound_s - 1
    return Ours(len(shop), first_s, took, over, lateness(shop, made.schedule), _peak_mb())


def peer(kind: str, size: str, seconds: float) -> Peer:
    """Give the exact model of one shop as long, from the first list schedule on."""
    from shopfloor.openshop.cpsat.floor.best import Best, Places
    from shopfloor.openshop.cpsat.floor.solve import improve

    shop = KINDS[kind](size, SEED)
    bounds = lower_bounds(shop)
    best = Best(shop, Places.of(first_plan(shop, bounds)[0]), (MAKESPAN,))
    began = time.perf_counter()
    improve(
        shop, best, MAKESPAN, (), bounds[0].value_s, Effort(time_limit_s=seconds),
        lambda stage: Progress(stage, None, 0, 0.0), workers=WORKERS,
    )  # fmt: skip
    took = time.perf_counter() - began
    clean(shop, best.places.schedule(), bounds)
    return Peer(best.value(MAKESPAN) / bounds[0].value_s - 1, took, _peak_mb())


def _peak_mb() -> float:
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def _alone(run: Callable[[], Result]) -> Result:
    with ProcessPoolExecutor(1, multiprocessing.get_context("spawn")) as own:
        return own.submit(run).result()


def row(kind: str, size: str, seconds: float) -> str:
    """Return a line of the table."""
    mine = _alone(partial(ours, kind, size, seconds))
    theirs = _alone(partial(peer, kind, size, seconds))
    cells = (
        kind,
        f"{mine.operations:,}",
        f"{mine.first_s:.2f}",
        f"{mine.seconds:.1f}",
        f"{mine.over:.2%}",
        f"{mine.late:,.0f}",
        f"{mine.memory_mb:,.0f}",
        f"{theirs.over:.2%} in {theirs.seconds:.1f}",
        f"{theirs.memory_mb:,.0f}",
    )
    return f"| {' | '.join(cells)} |"


def main() -> None:
    """Print one row a shop."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawTextHelpFormatter)
    parser.add_argument("--seconds", type=float, default=10.0, help="time for each run")
    parser.add_argument("--sizes", nargs="*", default=list(AND_LARGER), choices=list(AND_LARGER))
    arguments = parser.parse_args()
    print(
        "| shop | operations | first plan, s | whole, s | over bound | late, min | MB "
        "| model alone: over bound, s | MB |\n|" + " --- |" * 9
    )
    for kind in KINDS:
        for size in arguments.sizes:
            print(row(kind, size, arguments.seconds), flush=True)


if __name__ == "__main__":
    main()
