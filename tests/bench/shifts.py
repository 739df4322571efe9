"""Fifteen made-up shifts with the rules of the floor: first plan, makespan, lateness. Prints markdown.

    python -m tests.bench.shifts                               all of it, some 20 minutes
    python -m tests.bench.shifts --sizes S M --seeds 1 2 --peer 1
    python -m tests.bench.shifts --late-seconds 20 --peer      no peer: makespans only

Sizes: S 40 orders on 12 machines, M 120 on 15, L 300 on 20; about 250, 700 and 2,000 operations with
releases, weighted due times, closures and breaks, machines that pause and that do not, five families with
changeovers on three machines, groups of two and three units, some steps, one crew.

Each shop has a process of its own. It is planned by the whole pipeline, audit included: for the makespan
alone, and, where its seed is one of `--peer`, for lateness alone, which is the sum of priority × minutes
late. The peer gets the same time for lateness: CP-SAT alone on our own exact model of the whole floor, begun
at the first list schedule, two workers, no windows and no improvement of lists. The memory is the peak of
the process before the peer runs in it.
"""

from __future__ import annotations

import argparse
import multiprocessing
import resource
import time
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass

import numpy as np

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.calendar import HOUR, MINUTE
from shopfloor.model.results import Bound, Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import (
    NO_DUE,
    NO_FAMILY,
    NO_STEP,
    Changeovers,
    Closure,
    Crew,
    Machine,
    Operations,
    Orders,
    Shop,
)
from shopfloor.model.stated import state
from shopfloor.openshop.floor.plan import first_schedule
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, least_tardiness
from shopfloor.openshop.method import Effort, Progress
from shopfloor.pipeline import Options, plan

SHIFT = 8 * HOUR
BREAKS = (
    Closure(3 * HOUR, 3 * HOUR + 15 * MINUTE, "tea"),
    Closure(6 * HOUR, 6 * HOUR + 30 * MINUTE, "lunch"),
)
FAMILIES = ("red", "black", "grey", "steel", "brass")
SEEDS = (1, 2, 3, 4, 5)
USED = 0.72  # of the open time of an average machine; the fullest has some 8 hours


@dataclass(frozen=True, slots=True)
class Size:
    """How large a shop is; `visits` is the mean number of operations an order has."""

    orders: int
    machines: int
    visits: float
    crew: int


SIZES = {"S": Size(40, 12, 6.25, 6), "M": Size(120, 15, 5.85, 7), "L": Size(300, 20, 6.65, 9)}
AND_LARGER = SIZES | {"X": Size(1_500, 60, 6.65, 27)}  # some 10,000 operations, for tests.bench.scale


def shift(size: str, seed: int) -> Shop:
    """One made-up shift: every random choice comes from `size` and `seed`."""
    what = AND_LARGER[size]
    rng = np.random.default_rng([ord(size), seed])
    machines, rules = _machines(what, rng)
    units = np.array([machine.count for machine in machines])
    job, machine = _visits(what, units, rng)
    length = rng.gamma(3.0, 1.0, len(job)).clip(0.5, 9.0)
    open_minutes = (SHIFT - 45 * MINUTE) / MINUTE
    share = np.bincount(machine, weights=length, minlength=what.machines) / units
    minutes = np.maximum(2, np.rint(length * USED * open_minutes / share[share > 0].mean())).astype(np.int64)
    set_up = np.where(rng.random(len(job)) < 0.5, np.minimum(minutes, rng.integers(1, 6, len(job))), 0)
    family = rng.integers(0, len(FAMILIES), what.orders)
    changes = np.array([each.id in rules for each in machines])
    return Shop(
        machines=machines,
        orders=_orders(what, job, minutes, rng),
        operations=Operations(
            job,
            machine,
            minutes * MINUTE,
            step=_steps(what, job, rng),
            heads=rng.choice([1, 1, 1, 2], len(job)),
            family=np.where(changes[machine], family[job], NO_FAMILY),
            setup_s=set_up * MINUTE,
        ),
        crews=(Crew("fitters", what.crew, ((6 * HOUR, 8 * HOUR, what.crew - 1),)),),
        breaks=BREAKS,
        families=FAMILIES,
        changeovers=rules,
        shift_end_s=SHIFT,
    )


def _machines(what: Size, rng: np.random.Generator) -> tuple[tuple[Machine, ...], dict[str, Changeovers]]:
    """Every second machine pauses, every fourth has a closure, every fifth units; three change over."""
    machines, rules = [], {}
    for place in range(what.machines):
        closed = ()
        if place % 4 == 1:
            begin = int(rng.integers(60, 360)) * MINUTE
            closed = (Closure(begin, begin + int(rng.integers(30, 60)) * MINUTE, "calibration"),)
        name, changes = f"M{place:02d}", place in (2, 5, 8)
        if changes:
            even = int(rng.integers(6, 13))
            quick = {(a, b): MINUTE * int(rng.integers(even // 2 + 1, even)) for a, b in _pairs(rng)}
            rules[name] = Changeovers(even * MINUTE, quick)
        machines.append(
            Machine(
                name,
                count=1 if place % 5 != 4 else int(rng.integers(2, 4)),
                pauses=place % 2 == 0,
                closed=closed,
                crew="fitters" if place % 3 == 0 else None,
                set_up_only=place % 6 == 0,
                family=FAMILIES[int(rng.integers(len(FAMILIES)))] if changes else None,
            )
        )
    return tuple(machines), rules


def _pairs(rng: np.random.Generator) -> list[tuple[str, str]]:
    pairs = [(a, b) for a in FAMILIES for b in FAMILIES if a != b]
    return [pairs[k] for k in rng.choice(len(pairs), 6, replace=False)]


def _visits(what: Size, units: np.ndarray, rng: np.random.Generator) -> tuple[np.ndarray, np.ndarray]:
    """Each order on several different machines, groups more often."""
    chance = units / units.sum()
    count = np.clip(np.rint(rng.normal(what.visits, 1.5, what.orders)), 2, what.machines).astype(np.int64)
    picked = [np.sort(rng.choice(what.machines, size, replace=False, p=chance)) for size in count]
    return np.repeat(np.arange(what.orders), count), np.concatenate(picked)


def _steps(what: Size, job: np.ndarray, rng: np.random.Generator) -> np.ndarray:
    """A quarter of the orders fix the first and the last of their visits."""
    step = np.full(len(job), NO_STEP)
    for order in np.flatnonzero(rng.random(what.orders) < 0.25).tolist():
        mine = rng.permutation(np.flatnonzero(job == order))
        step[mine[0]] = 1
        step[mine[1:]] = 2 if rng.random() < 0.5 else NO_STEP
        step[mine[-1]] = 3
    return step


def _orders(what: Size, job: np.ndarray, minutes: np.ndarray, rng: np.random.Generator) -> Orders:
    """Half are there from the start; nine in ten are due, at some time from their work to the shift's end."""
    work = np.bincount(job, weights=minutes, minlength=what.orders) * MINUTE
    late = rng.random(what.orders) < 0.5
    release = np.where(late, rng.integers(0, 240, what.orders) * MINUTE, 0)
    slack = rng.uniform(0.15, 1.0, what.orders) * np.maximum(0, SHIFT - release - work)
    due = release + work + slack
    due = (due // MINUTE).astype(np.int64) * MINUTE
    return Orders(
        tuple(f"TQ-{k:03d}" for k in range(what.orders)),
        release_s=release,
        due_s=np.where(rng.random(what.orders) < 0.9, np.maximum(due, release), NO_DUE),
        priority=rng.choice([1.0, 1.0, 2.0, 5.0], what.orders),
    )


# ---- measuring -------------------------------------------------------------------------------------

WORKERS = 2  # solver threads of the peer; ours takes what it takes by itself, on two cores
FIRST_S = {"S": 0.05, "M": 0.1, "L": 0.5}  # aims: seconds to the first audited plan
LATE_SHARE = {"S": 1.0, "M": 1.0, "L": 0.96}  # aims: lateness as a share of the peer's
MEETING, OVER, MEMORY_MB = 9, 0.04, 600  # aims: shops that meet a bound; the worst gap; peak memory


@dataclass(frozen=True, slots=True)
class Measured:
    """What one shop came to; `late` and `peer_late` are None where there was no peer."""

    size: str
    seed: int
    operations: int
    first_s: float
    over: float
    shortening_s: float
    memory_mb: float
    bound_holds: bool
    late: float | None = None
    peer_late: float | None = None

    @property
    def share(self) -> float | None:
        """Our lateness as a share of the peer's; 1 where neither is late."""
        if self.late is None or self.peer_late is None:
            return None
        if not self.peer_late:
            return 1.0 if not self.late else float("inf")
        return self.late / self.peer_late

    def row(self) -> str:
        """Return the line of the table."""
        cells = [
            f"{self.size} {self.seed}",
            f"{self.operations:,}",
            f"{self.first_s:.3f}",
            f"{self.over:.2%}",
            f"{self.shortening_s:.1f}",
            *(["–"] * 3 if self.share is None else [f"{self.late:,.0f}", f"{self.peer_late:,.0f}"]),
            *([] if self.share is None else [f"{self.share:.2f}"]),
            f"{self.memory_mb:,.0f}",
        ]
        return f"| {' | '.join(cells)} |"


COLUMNS = (
    "shop", "operations", "first plan, s", "makespan over bound", "found in, s", "late", "peer late", "ratio",
    "MB",
)  # fmt: skip


def lateness(shop: Shop, schedule: Schedule) -> float:
    """Priority × minutes late, summed over the orders."""
    finish = schedule.completion_s(shop.operations.job, len(shop.orders))
    late = np.maximum(0, finish - np.where(shop.orders.due_s == NO_DUE, finish, shop.orders.due_s))
    return float((late * shop.orders.priority).sum()) / MINUTE


def clean(shop: Shop, schedule: Schedule, bounds: tuple[Bound, ...]) -> None:
    """Stop at a plan that breaks a rule."""
    violations = audit(shop, state(Plan(shop, schedule, bounds, Choice("", "", {}))))
    assert not violations, violations[:3]


def first_plan(shop: Shop, bounds: tuple[Bound, ...]) -> tuple[Schedule, float]:
    """The first plan for lateness, audited, and the seconds it took."""
    began = time.perf_counter()
    schedule = first_schedule(shop, TARDINESS, bounds[0].value_s)
    assert schedule is not None
    clean(shop, schedule, bounds)
    return schedule, time.perf_counter() - began


def by_model_alone(shop: Shop, schedule: Schedule, seconds: float) -> Schedule:
    """The peer: the exact model of the whole floor, hinted, and nothing else."""
    from shopfloor.openshop.cpsat.floor.best import Best, Places
    from shopfloor.openshop.cpsat.floor.solve import improve

    best = Best(shop, Places.of(schedule), (TARDINESS,))
    improve(
        shop, best, TARDINESS, (), least_tardiness(shop), Effort(time_limit_s=seconds, workers=WORKERS),
        lambda stage: Progress(stage, None, 0, 0.0), workers=WORKERS,
    )  # fmt: skip
    return best.places.schedule()


def measure(size: str, seed: int, seconds: float, late_seconds: float, *, peer: bool) -> Measured:
    """Plan one shop; in a process that has done nothing before."""
    shop = shift(size, seed)
    bounds = lower_bounds(shop)
    first_schedule(shift("S", seed))  # what is imported and warmed up once a process is no part of a plan
    first, first_s = first_plan(shop, bounds)
    began = time.perf_counter()
    made = plan(shop, Options(time_limit_s=seconds, objective=(MAKESPAN,)))
    took = time.perf_counter() - began
    plans = [first, made.schedule]
    late = peer_late = None
    if peer:
        for_late = plan(shop, Options(time_limit_s=late_seconds, objective=(TARDINESS,)))
        plans.append(for_late.schedule)
        late = lateness(shop, for_late.schedule)
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    if peer:
        plans.append(by_model_alone(shop, first, late_seconds))
        clean(shop, plans[-1], bounds)
        peer_late = lateness(shop, plans[-1])
    return Measured(
        size, seed, len(shop), first_s, made.makespan_s / made.lower_bound_s - 1, took, peak,
        made.lower_bound_s <= min(each.makespan_s for each in plans), late, peer_late,
    )  # fmt: skip


def verdicts(shops: list[Measured]) -> list[tuple[str, bool]]:
    """Each aim in words with what it came to, and whether it is met by these shops."""
    met = sum(not each.over for each in shops)
    wanted = min(MEETING, -(-MEETING * len(shops) // 15))
    worst = max(each.over for each in shops)
    found = [
        (
            f"first audited plan in {limit:g} s at {size}: {max(one.first_s for one in mine):.3f} s at most",
            all(one.first_s <= limit for one in mine),
        )
        for size, limit in FIRST_S.items()
        if (mine := [one for one in shops if one.size == size])
    ]
    found += [
        (f"makespan meets a bound on {wanted} of {len(shops)}: on {met}", met >= wanted),
        (f"and is at most {OVER:.0%} above it elsewhere: {worst:.2%}", worst <= OVER),
    ]
    for size, limit in LATE_SHARE.items():
        shares = [one.share for one in shops if one.size == size and one.share is not None]
        if shares:
            said = ", ".join(f"{share:.2f}" for share in shares)
            found.append(
                (f"lateness at {size} at most {limit:g} of the peer's: {said}", max(shares) <= limit)
            )
    peak = max(one.memory_mb for one in shops)
    found.append((f"at most {MEMORY_MB} MB: {peak:,.0f} MB", peak <= MEMORY_MB))
    holds = all(one.bound_holds for one in shops)
    return [*found, ("no printed bound above any plan that was found", holds)]


def main() -> None:
    """Print one row a shop, then the aims."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawTextHelpFormatter)
    parser.add_argument("--seconds", type=float, default=5.0, help="time for the makespan")
    parser.add_argument(
        "--late-seconds", type=float, default=60.0, help="time for lateness, ours and the peer's"
    )
    parser.add_argument("--sizes", nargs="*", default=list(SIZES), choices=list(SIZES))
    parser.add_argument("--seeds", nargs="*", type=int, default=list(SEEDS))
    parser.add_argument(
        "--peer", nargs="*", type=int, default=list(SEEDS[:3]), help="seeds planned for lateness"
    )
    arguments = parser.parse_args()
    print(f"| {' | '.join(COLUMNS)} |")
    print("|" + " --- |" * len(COLUMNS))
    shops = []
    for size in arguments.sizes:
        for seed in arguments.seeds:
            with ProcessPoolExecutor(1, multiprocessing.get_context("spawn")) as own:
                done = own.submit(
                    measure,
                    size,
                    seed,
                    arguments.seconds,
                    arguments.late_seconds,
                    peer=seed in arguments.peer,
                ).result()
            print(done.row(), flush=True)
            shops.append(done)
    print("\n| aim | met |\n| --- | --- |")
    for said, met in verdicts(shops):
        print(f"| {said} | {'yes' if met else 'no'} |")


if __name__ == "__main__":
    main()
