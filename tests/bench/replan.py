"""Fifty disruptions each of the demo shift `mixed` and of a hall of 300 orders, replanned and audited.

Run: python -m tests.bench.replan [disruptions] [seconds a replan]

Each shift is played to a random moment, its operations up to 15 % longer or shorter than planned; then one
thing goes wrong. Every replan is audited against what is left and against the journal: one that breaks a rule
ends the run with an error. The gap is to the best bound of what is left, as a share of the time until then;
moves are operations that start or end more than five minutes off, on another unit or in another sequence,
beside those that planning from scratch moves. A replan that is worse than the best of what it chooses from,
planning from scratch among it, ends the run with an error, too.
"""

from __future__ import annotations

import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from random import Random
from statistics import mean, median

import numpy as np

from shopfloor.journal.entries import Entry
from shopfloor.journal.events import Journal
from shopfloor.model.actuals import Kind, Status
from shopfloor.model.calendar import MINUTE
from shopfloor.model.results import Plan
from shopfloor.model.shop import NO_DUE, Closure, Crew, Machine, Operations, Orders, Shop
from shopfloor.pipeline import Options, plan
from shopfloor.read.orders import load
from shopfloor.rolling.plan import Replan, replan
from tests.rolling.shifts import CLOCK, opened, play, put

MIXED = Path(__file__).parents[2] / "data" / "mixed"
HEAD = (
    "| shop | what went wrong | replans | left | proved | gap, median | gap, most | s, median | s, most "
    "| moved, median | mean | resequenced | from scratch, median | mean |"
)
AIM = 1 / 3  # of the moves of planning from scratch, in the median


def large(orders: int = 300, machines: int = 20, seed: int = 1) -> Shop:
    """Return a hall of many orders: two groups, breaks, a closure, a crew of ten on half of the machines."""
    rng = np.random.default_rng(seed)
    visits = [rng.choice(machines, rng.integers(2, 5), replace=False) for _ in range(orders)]
    job = np.repeat(np.arange(orders), [len(each) for each in visits])
    machine = np.concatenate(visits)
    seconds = rng.integers(1, 7, len(job)) * 300
    counts = [2 if place < 2 else 1 for place in range(machines)]
    load_s = np.bincount(machine, weights=seconds, minlength=machines) / np.array(counts)
    due = rng.integers(int(load_s.max() // 2), int(1.3 * load_s.max()), orders)
    return Shop(
        machines=tuple(
            Machine(
                f"M{place:02d}",
                count=counts[place],
                pauses=place % 2 == 0,
                crew="fitters" if place >= machines // 2 else None,
                closed=(Closure(12_000, 14_400, "gauge"),) if place == 5 else (),
            )
            for place in range(machines)
        ),
        orders=Orders(
            tuple(f"TQ-{number:03d}" for number in range(orders)),
            due_s=np.where(rng.random(orders) < 0.5, due, NO_DUE),
            priority=rng.choice([1.0, 2.0, 5.0], orders),
        ),
        operations=Operations(job, machine, seconds),
        crews=(Crew("fitters", machines // 2),),
        breaks=(Closure(10_800, 11_700, "tea"), Closure(21_600, 23_400, "lunch")),
        clock=CLOCK,
    )


# ---- what goes wrong -----------------------------------------------------------------------------------


def _down(book: Journal, shop: Shop, at_s: int, random: Random) -> None:
    machine = random.choice(shop.machines)
    put(book, [Entry(Kind.DOWN, at_s, machine=machine.id, data={"reason": "drive"})])


def _hot(book: Journal, shop: Shop, at_s: int, random: Random) -> None:
    visits = [(machine.id, random.randrange(2, 7) * 300) for machine in random.sample(shop.machines, 3)]
    data = {"operations": visits, "due_s": at_s + 2 * 3600, "priority": 5.0}
    put(book, [Entry(Kind.ADDED, at_s, order="HOT", data=data)])


def _scrap(book: Journal, shop: Shop, at_s: int, random: Random) -> None:
    one = random.choice(book.state(at_s).of(Status.RUNNING))
    named = {"order": one.key.order, "machine": one.key.machine, "piece": one.key.piece}
    put(book, [Entry(Kind.FINISHED, at_s, data={"good": 0, "scrap": 5}, **named)])


def _longer(book: Journal, shop: Shop, at_s: int, random: Random) -> None:
    one = random.choice(book.state(at_s).of(Status.RUNNING))
    named = {"order": one.key.order, "machine": one.key.machine, "piece": one.key.piece}
    put(book, [Entry(Kind.LEFT, at_s, data={"left_s": random.randrange(20, 60) * MINUTE}, **named)])


def _fewer(book: Journal, shop: Shop, at_s: int, random: Random) -> None:
    crew = shop.crews[0]
    put(book, [Entry(Kind.CREW, at_s, data={"heads": crew.heads - 1, "pool": crew.id})])


KINDS: dict[str, Callable[[Journal, Shop, int, Random], None]] = {
    "a machine is down": _down,
    "a hot order comes": _hot,
    "an operation is scrapped": _scrap,
    "an operation takes longer": _longer,
    "one of the crew goes home": _fewer,
}


@dataclass(frozen=True)
class Row:
    """One replan."""

    found: Replan
    seconds: float

    @property
    def gap(self) -> float:
        """Finish above the bound, as a share of the time from now to the bound."""
        made = self.found.plan
        ahead = made.lower_bound_s - self.found.rest.now_s
        return made.gap_s / ahead if ahead > 0 else 0.0


def run(shop: Shop, made: Plan, kind: str, seed: int, limit_s: float) -> Row:
    """Play a shift to a random moment, let one thing go wrong, and replan."""
    random = Random(seed)
    at_s = int(made.makespan_s * random.uniform(0.05, 0.7)) // MINUTE * MINUTE
    book = opened(made)
    play(book, made, 0, at_s, seed, wobble=0.15)
    KINDS[kind](book, shop, at_s, random)
    events = book.events()
    began = time.perf_counter()
    found = replan(shop, events, at_s, options=Options(time_limit_s=limit_s))
    took = time.perf_counter() - began
    if any(seconds for _, seconds in found.worse_s):
        raise AssertionError(f"{kind}, seed {seed}: worse than the best found by {found.worse_s}")
    return Row(found, took)


def line(name: str, kind: str, rows: list[Row]) -> str:
    """Return one line of the table."""
    gaps, seconds = [row.gap for row in rows], [row.seconds for row in rows]
    moved, scratch = moves(rows)
    figures = (
        f"{len(rows)}",
        f"{median(len(row.found.plan.shop) for row in rows):g}",
        f"{sum(row.found.plan.proved_optimal for row in rows)}",
        f"{median(gaps):.2%}",
        f"{max(gaps):.2%}",
        f"{median(seconds):.1f}",
        f"{max(seconds):.1f}",
        f"{median(moved):g}",
        f"{mean(moved):.1f}",
        f"{median(row.found.moves.resequenced for row in rows):g}",
        f"{median(scratch):g}",
        f"{mean(scratch):.1f}",
    )
    return f"| {name} | {kind} | {' | '.join(figures)} |"


def moves(rows: list[Row]) -> tuple[list[int], list[int]]:
    """Return what each replan moves, and what planning from scratch would, where that found a plan."""
    scratch = [row.found.scratch.moved for row in rows if row.found.scratch is not None]
    return [row.found.moves.moved for row in rows], scratch


def verdict(name: str, rows: list[Row]) -> str:
    """Say how many of the moves of planning from scratch are left, beside the aim."""
    moved, scratch = moves(rows)
    share = median(moved) / median(scratch)
    met = "met" if share <= AIM else "not met"
    return f"{name}: {share:.2f} in the median, {mean(moved) / mean(scratch):.2f} in the mean, {met}"


def main() -> None:
    """Print one row a kind of disruption and shop."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 50
    limit_s = float(sys.argv[2]) if len(sys.argv) > 2 else 10.0
    shops = {
        "mixed": load(MIXED / "orders.csv", shop=MIXED / "shop.toml").shop,
        "300 orders": large(),
    }
    print(HEAD)
    print("|" + " --- |" * HEAD.count(" |"))
    said = []
    for name, shop in shops.items():
        made = plan(shop, Options(time_limit_s=2 * limit_s))
        everything = []
        for place, kind in enumerate(KINDS):
            rows = [run(shop, made, kind, 100 * place + n, limit_s) for n in range(count // len(KINDS))]
            everything += rows
            print(line(name, kind, rows), flush=True)
        print(line(name, "**all**", everything), flush=True)
        said.append(verdict(name, everything))
    print(
        "\nEvery replan was audited three times, and none is worse than planning from scratch. Aim: at most "
        f"a third of the moves of planning from scratch; {'; '.join(said)}."
    )


if __name__ == "__main__":
    main()
