"""Choosing whole orders: a knapsack with a limit for every machine and crew, solved by CP-SAT.

Stages, each held while the next runs: most priority among the orders already late; most priority in
all; then the most work. The linear relaxation (GLOP) gives the bound that is printed beside it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from ortools.linear_solver import pywraplp
from ortools.sat.python import cp_model

from shopfloor.errors import NoPlanError
from shopfloor.fit.budget import Budget
from shopfloor.fit.value import already_late, worth
from shopfloor.model.shop import Bools, Ints, Shop


@dataclass(frozen=True, slots=True)
class Selection:
    """Which orders run; the most that any choice could be worth; whether this one is proved best.

    `value` and `value_bound` are priority in thousandths; `relaxed` is what the linear relaxation allows.
    """

    orders: Bools
    value: int
    value_bound: int
    relaxed: float
    proved: bool


@dataclass(frozen=True, slots=True)
class _Row:
    name: str
    orders: Ints
    weight: Ints
    room: int


def choose_orders(
    shop: Shop,
    limits: Budget,
    *,
    must: Bools,
    never: Bools,
    time_limit_s: float,
    seed: int,
    forbidden: Sequence[Bools] = (),
) -> Selection:
    """Return the best set of whole orders within the limits.

    Parameters
    ----------
    must, never
        Orders pinned in and out.
    forbidden
        Sets that were tried and did not fit: at least one of their orders has to go.

    Raises
    ------
    NoPlanError
        If the pinned orders alone break a limit, which is named, or time ran out with no choice.
    """
    rows, alone = _rows(shop, limits)
    _check_pins(shop, limits, rows, alone, must)
    model = cp_model.CpModel()
    take = [model.new_bool_var(name) for name in shop.orders.ids]
    for index in range(len(take)):
        if must[index] or never[index] or not alone[index]:
            model.add(take[index] == int(must[index]))
    for row in rows:
        weights = row.weight.tolist()
        model.add(sum(w * take[j] for j, w in zip(row.orders.tolist(), weights, strict=True)) <= row.room)
    for attempt in forbidden:
        model.add_bool_or([take[j].negated() for j in np.flatnonzero(attempt & ~must).tolist()])
    return _solve(shop, limits, model, take, rows, (must, never | ~alone), time_limit_s, seed)


def _solve(
    shop: Shop,
    limits: Budget,
    model: cp_model.CpModel,
    take: list[cp_model.IntVar],
    rows: list[_Row],
    pins: tuple[Bools, Bools],
    time_limit_s: float,
    seed: int,
) -> Selection:
    value, late = worth(shop), already_late(shop)
    work = np.bincount(shop.operations.job, limits.cost, len(shop.orders)).astype(np.int64)
    stages = [value * late, value, work] if late.any() else [value, work]
    solver = cp_model.CpSolver()
    solver.parameters.num_workers = 1  # one worker and one seed: the same choice every time
    solver.parameters.random_seed = seed
    solver.parameters.max_time_in_seconds = time_limit_s / len(stages)
    best, proved, value_bound = None, True, 0
    for gain in stages:
        total = sum(int(g) * take[j] for j, g in enumerate(gain.tolist()) if g)
        model.maximize(total)
        status = solver.solve(model)
        if status not in (cp_model.OPTIMAL, cp_model.FEASIBLE):
            if best is None:
                raise NoPlanError(
                    "no choice of orders was found in the time given; allow more with --time-limit"
                )
            break
        best = np.array([solver.boolean_value(t) for t in take], bool)
        reached = int(gain[best].sum())
        if gain is value:
            value_bound = int(solver.best_objective_bound)
        if gain is not work:
            proved = proved and status == cp_model.OPTIMAL
        model.add(total >= reached)
        model.clear_hints()  # type: ignore[no-untyped-call]  # untyped in ortools
        for t, chosen in zip(take, best.tolist(), strict=True):
            model.add_hint(t, chosen)
    assert best is not None
    return Selection(best, int(value[best].sum()), value_bound, _relaxed(value, rows, pins), proved)


def _relaxed(value: Ints, rows: list[_Row], pins: tuple[Bools, Bools]) -> float:
    """Return the most that fractions of orders could be worth: the linear relaxation."""
    solver = pywraplp.Solver.CreateSolver("GLOP")
    must, never = pins
    part = [
        solver.NumVar(1.0 if m else 0.0, 0.0 if n and not m else 1.0, "")
        for m, n in zip(must, never, strict=True)
    ]
    for row in rows:
        solver.Add(
            solver.Sum([int(w) * part[j] for j, w in zip(row.orders, row.weight, strict=True)]) <= row.room
        )
    solver.Maximize(solver.Sum([int(v) * p for v, p in zip(value, part, strict=True)]))
    solver.Solve()
    return float(solver.Objective().Value())


def _rows(shop: Shop, limits: Budget) -> tuple[list[_Row], Bools]:
    """Sum the limits by order; and tell which orders fit the shift by themselves."""
    job, size = shop.operations.job, len(shop.orders)
    own = np.bincount(job, limits.cost, size).astype(np.int64)
    alone: Bools = own <= limits.order_room
    rows = []
    for limit in limits.limits:
        need = np.bincount(job[limit.operations], limit.weight[limit.operations], size).astype(np.int64)
        alone &= need <= limit.room
        if int(need.sum()) > limit.room:
            users = np.flatnonzero(need)
            rows.append(_Row(limit.name, users, need[users], limit.room))
    return rows, alone


def _check_pins(shop: Shop, limits: Budget, rows: list[_Row], alone: Bools, must: Bools) -> None:
    for index in np.flatnonzero(must & ~alone).tolist():
        raise NoPlanError(f"order {shop.orders.ids[index]} (--must) needs more than the shift has by itself")
    for row in rows:
        pinned = int(row.weight[must[row.orders]].sum())
        if pinned > row.room:
            raise NoPlanError(
                f"the orders given with --must need more of {row.name} than the shift has; take some out"
            )
