"""Published open shops: the general method beside a plain CP-SAT model, in one run. Prints markdown.

    python -m tests.bench.published                                    all 104, up to an hour
    python -m tests.bench.published --groups gp10 j6 --cap 20          some groups
    python -m tests.bench.published --sets taillard --plain-cap 0      without the plain model

The method knows only the combinatorial bounds that every plan begins with; taking them is part of its
time. The plain model is what one writes first: an interval an operation, no-overlap for each order and
machine, minimise the makespan, with as many workers. An instance that is not proved counts with its cap.
"""

from __future__ import annotations

import argparse
import sys
import time
from collections.abc import Iterable
from dataclasses import dataclass
from statistics import fmean

from ortools.sat.python import cp_model

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.shop import Shop
from shopfloor.openshop.general import General
from shopfloor.openshop.method import Effort
from tests.bench.instances import MINUTE, SETS, Instance, instances

SOON_S = 20.0


@dataclass(frozen=True)
class Run:
    """What came out for one shop; times of the shop in minutes or whatever its unit is."""

    makespan: float
    bound: float
    seconds: float

    @property
    def proved(self) -> bool:
        return self.bound >= self.makespan

    def proved_by(self, seconds: float) -> bool:
        return self.proved and self.seconds <= seconds


def by_method(shop: Shop, cap: float, workers: int, unit_s: int = MINUTE) -> Run:
    """Run the general method with its bounds."""
    began = time.monotonic()
    bound_s = lower_bounds(shop)[0].value_s
    outcome = General().solve(shop, Effort(bound_s=bound_s, time_limit_s=cap, workers=workers))
    seconds = time.monotonic() - began
    makespan_s = outcome.schedule.makespan_s if outcome.schedule else sys.maxsize
    return Run(makespan_s / unit_s, max(bound_s, outcome.proven_s) / unit_s, seconds)


def by_plain_model(shop: Shop, cap: float, workers: int, unit_s: int = MINUTE) -> Run:
    """Run the plain model, in the shop's own unit of time so that its numbers are small too."""
    began = time.monotonic()
    model = cp_model.CpModel()
    times = (shop.operations.seconds // unit_s).tolist()
    horizon = sum(times)
    makespan = model.new_int_var(0, horizon, "makespan")
    lines: dict[tuple[str, int], list[cp_model.IntervalVar]] = {}
    for row in shop:
        start = model.new_int_var(0, horizon, "")
        interval = model.new_fixed_size_interval_var(start, times[row.index], "")
        lines.setdefault(("order", row.job), []).append(interval)
        lines.setdefault(("machine", row.machine), []).append(interval)
        model.add(makespan >= start + times[row.index])
    for intervals in lines.values():
        model.add_no_overlap(intervals)
    model.minimize(makespan)
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = workers
    solver.parameters.max_time_in_seconds = cap
    status = solver.solve(model)
    found = status in (cp_model.OPTIMAL, cp_model.FEASIBLE)
    best = solver.objective_value if found else float("inf")
    return Run(best, solver.best_objective_bound, time.monotonic() - began)


def row(group: str, ours: list[Run], plain: list[Run], cap: float, plain_cap: float) -> str:
    """Return a line of the table."""
    cells = [group, str(len(ours)), *_figures(ours, cap)]
    return "| " + " | ".join(cells + (_figures(plain, plain_cap) if plain else [])) + " |"


def _figures(runs: list[Run], cap: float) -> list[str]:
    seconds = [run.seconds if run.proved else cap for run in runs]
    return [str(sum(run.proved for run in runs)), f"{fmean(seconds):.2f} / {max(seconds):.2f}"]


def table(results: dict[str, list[tuple[Instance, Run, Run | None]]], cap: float, plain_cap: float) -> str:
    """Return the table of all groups."""
    heads = ["group", "instances", f"proved in {cap:g} s", "mean / max s"]
    heads += [f"plain: proved in {plain_cap:g} s", "mean / max s"] if plain_cap else []
    lines = ["| " + " | ".join(heads) + " |", "|" + "---|" * len(heads)]
    for group, runs in results.items():
        plain = [run for _, _, run in runs if run is not None]
        lines.append(row(group, [ours for _, ours, _ in runs], plain, cap, plain_cap))
    return "\n".join(lines)


def verdicts(results: dict[str, list[tuple[Instance, Run, Run | None]]], cap: float) -> Iterable[str]:
    """Yield what the run shows, in sentences."""
    every = [item for runs in results.values() for item in runs]
    unproved = [instance.name for instance, ours, _ in every if not ours.proved]
    soon = sum(ours.proved_by(SOON_S) for _, ours, _ in every)
    yield f"Proved: {len(every) - len(unproved)} of {len(every)} in {cap:g} s, {soon} in {SOON_S:g} s."
    if unproved:
        yield f"Not proved: {', '.join(unproved)}."
    wrong = [
        instance.name
        for instance, ours, _ in every
        if instance.proved and (ours.makespan < instance.best_known or ours.bound > instance.best_known)
    ]
    yield f"Below a proven optimum, or a bound above one: {', '.join(wrong) or 'none'}."
    beside = [(i, ours, plain) for i, ours, plain in every if plain is not None]
    hard = [(ours, plain) for i, ours, plain in beside if i.group in ("j6", "j7", "j8")]
    if hard:
        ours_soon, plain_soon = (sum(pair[k].proved_by(SOON_S) for pair in hard) for k in (0, 1))
        yield f"j6 to j8 in {SOON_S:g} s: {ours_soon} of {len(hard)}; the plain model {plain_soon}."
    tens = [(ours, plain) for i, ours, plain in beside if i.group == "gp10"]
    if tens:
        mean, plain_mean = (fmean(pair[k].seconds for pair in tens) for k in (0, 1))
        yield f"gp10: mean {mean:.2f} s; the plain model {plain_mean:.2f} s."


def main() -> None:
    """Run what was asked for and print the table."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n", 1)[0])
    parser.add_argument("--sets", nargs="+", choices=SETS, default=list(SETS))
    parser.add_argument("--groups", nargs="+", help="such as tai10 j7 gp09; all unless said")
    parser.add_argument("--cap", type=float, default=60.0, help="seconds an instance")
    parser.add_argument(
        "--plain-cap", type=float, default=20.0, help="seconds for the plain model; 0 skips it"
    )
    parser.add_argument("--workers", type=int, default=2)
    options = parser.parse_args()
    results: dict[str, list[tuple[Instance, Run, Run | None]]] = {}
    for instance in instances(*options.sets):
        if options.groups and instance.group not in options.groups:
            continue
        shop = instance.shop()
        ours = by_method(shop, options.cap, options.workers)
        plain = by_plain_model(shop, options.plain_cap, options.workers) if options.plain_cap else None
        results.setdefault(instance.group, []).append((instance, ours, plain))
        beside = f", plain {plain.makespan:g} in {plain.seconds:.2f} s" if plain else ""
        state = "proved" if ours.proved else f"bound {ours.bound:g}"
        print(f"{instance.name}: {ours.makespan:g} {state} in {ours.seconds:.2f} s{beside}", file=sys.stderr)
    print(table(results, options.cap, options.plain_cap))
    print()
    for sentence in verdicts(results, options.cap):
        print(f"- {sentence}")


if __name__ == "__main__":
    main()
