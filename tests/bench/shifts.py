"""Fifteen made-up shifts with the rules of the floor: first plan, makespan, lateness. Prints markdown.

    python tests/bench/shifts.py                           lists and improvement alone, 5 s a plan
    python tests/bench/shifts.py --seconds 10 --sizes S M
    python tests/bench/shifts.py --whole --seconds 20      the whole pipeline, solver and audit included

Sizes: S 40 orders on 12 machines, M 120 on 15, L 300 on 20; about 250, 700 and 2,000 operations with
releases, weighted due times, closures and breaks, machines that pause and that do not, five families with
changeovers on three machines, groups of two and three units, some steps, one crew. Each shop is planned
three times: for the makespan alone, for lateness alone, and for lateness once the makespan is served.
Lateness is the sum of priority × minutes late. Every plan is audited. Times are those of one process.
"""

from __future__ import annotations

import argparse
import resource
import time
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
from shopfloor.openshop.floor.plan import first_schedule, floor_plan
from shopfloor.openshop.method import Effort
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


def shift(size: str, seed: int) -> Shop:
    """One made-up shift: every random choice comes from `size` and `seed`."""
    what = SIZES[size]
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

GOALS = (("makespan",), ("tardiness",), ("makespan", "tardiness"))


def lateness(shop: Shop, schedule: Schedule) -> float:
    """Priority × minutes late, summed over the orders."""
    finish = schedule.completion_s(shop.operations.job, len(shop.orders))
    late = np.maximum(0, finish - np.where(shop.orders.due_s == NO_DUE, finish, shop.orders.due_s))
    return float((late * shop.orders.priority).sum()) / MINUTE


def clean(shop: Shop, schedule: Schedule, bounds: tuple[Bound, ...]) -> None:
    """Stop at a plan that breaks a rule."""
    violations = audit(shop, state(Plan(shop, schedule, bounds, Choice("", "", {}))))
    assert not violations, violations[:3]


def first_plan_s(shop: Shop, bounds: tuple[Bound, ...]) -> float:
    """Seconds to the first plan, audited."""
    began = time.perf_counter()
    schedule = first_schedule(shop, "tardiness", bounds[0].value_s)
    assert schedule is not None
    clean(shop, schedule, bounds)
    return time.perf_counter() - began


def planned(
    shop: Shop, bounds: tuple[Bound, ...], goals: tuple[str, ...], seconds: float, *, whole: bool
) -> tuple[Schedule, float, float]:
    """The plan, audited, the seconds it took, and the proved bound over the best combinatorial one."""
    best = bounds[0].value_s
    began = time.perf_counter()
    if whole:
        made = plan(shop, Options(time_limit_s=seconds, objective=goals))
        return made.schedule, time.perf_counter() - began, made.lower_bound_s / best
    outcome = floor_plan(shop, goals, Effort(bound_s=best, time_limit_s=seconds))
    took = time.perf_counter() - began
    assert outcome.schedule is not None
    clean(shop, outcome.schedule, bounds)
    return outcome.schedule, took, 1.0


def row(size: str, seed: int, seconds: float, *, whole: bool) -> list[str]:
    """One shop, planned for each goal."""
    shop = shift(size, seed)
    bounds = lower_bounds(shop)
    cells = [f"{size} {seed}", f"{len(shop):,}", f"{first_plan_s(shop, bounds):.3f}"]
    for goals in GOALS:
        schedule, took, proved = planned(shop, bounds, goals, seconds, whole=whole)
        over = schedule.makespan_s / bounds[0].value_s / proved - 1
        cells += [f"{over:.2%}", f"{lateness(shop, schedule):,.0f}", f"{took:.1f}"]
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    return [*cells, f"{peak:,.0f}"]


def main() -> None:
    """Print one row a shop; the memory is the most the process has had so far."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawTextHelpFormatter)
    parser.add_argument("--seconds", type=float, default=5.0, help="time for each plan")
    parser.add_argument("--sizes", nargs="*", default=list(SIZES), choices=list(SIZES))
    parser.add_argument("--seeds", nargs="*", type=int, default=list(SEEDS))
    parser.add_argument("--whole", action="store_true", help="the whole pipeline, solver included")
    arguments = parser.parse_args()
    names = ("makespan alone", "lateness alone", "makespan, then lateness")
    heads = [f"{name}: {what}" for name in names for what in ("over bound", "late", "s")]
    columns = ["shop", "operations", "first plan, s", *heads, "MB"]
    print(f"| {' | '.join(columns)} |")
    print("|" + " --- |" * len(columns))
    for size in arguments.sizes:
        for seed in arguments.seeds:
            cells = row(size, seed, arguments.seconds, whole=arguments.whole)
            print(f"| {' | '.join(cells)} |", flush=True)


if __name__ == "__main__":
    main()
