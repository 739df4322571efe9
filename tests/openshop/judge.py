"""One judge for every exact method: its schedule passes the audit and ends at the best bound."""

from __future__ import annotations

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.model.stated import state
from shopfloor.openshop.method import Effort, Method


def solved(method: Method, shop: Shop, effort: Effort | None = None) -> Schedule:
    """Solve, audit, and return the schedule."""
    assert method.accepts(shop) is None
    schedule = method.solve(shop, effort or Effort()).schedule
    assert schedule is not None
    bounds = lower_bounds(shop)
    assert audit(shop, state(Plan(shop, schedule, bounds, Choice("", "", {})))) == []
    assert schedule.makespan_s == (bounds[0].value_s if bounds else 0)
    return schedule


def least_rounds_by_model(shop: Shop, at_once: int | None = None) -> int:
    """Return the fewest rounds of a unit shop by a CP-SAT model that shares nothing with the methods."""
    size = len(shop)
    for rounds in range(1, size + 1):
        model = cp_model.CpModel()
        runs = [[model.new_bool_var(f"{o},{r}") for r in range(rounds)] for o in range(size)]
        for operation in runs:
            model.add_exactly_one(operation)
        for r in range(rounds):
            for j in range(len(shop.orders)):
                model.add(sum(runs[o][r] for o in np.flatnonzero(shop.operations.job == j)) <= 1)
            for m, machine in enumerate(shop.machines):
                model.add(
                    sum(runs[o][r] for o in np.flatnonzero(shop.operations.machine == m)) <= machine.count
                )
            if at_once is not None:
                model.add(sum(operation[r] for operation in runs) <= at_once)
        solver = cp_model.CpSolver()
        solver.parameters.num_workers = 1
        if solver.solve(model) == cp_model.OPTIMAL:
            return rounds
    return 0
