"""What is minimised: one function a goal, in whole numbers."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import gcd

import numpy as np
from ortools.sat.python import cp_model

from shopfloor.model.shop import NO_DUE
from shopfloor.openshop.cpsat.variables import Model
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, weights

MOST_COST = 2**52  # inside the solver's 64-bit sums, and exact as the double in which it reports bounds


@dataclass(frozen=True, slots=True)
class Goal:
    """An expression to minimise, and what one of it is worth.

    Units are seconds for the makespan, seconds × thousandths of priority for tardiness. Where `exact`
    is false, weights had to be made coarser to fit the solver's numbers, and nothing is proved.
    """

    expression: cp_model.LinearExprT
    unit: int
    exact: bool = True

    def at_most(self, value: int) -> int:
        """Return the largest value of the expression that is worth no more than `value`."""
        return value // self.unit

    def worth(self, bound: int) -> int:
        """Return what a value of the expression is worth."""
        return self.unit * bound


def makespan(model: Model, least_s: int) -> Goal:
    """Return the finish of the last operation, known to be `least_s` or more."""
    least = min(model.grid.up(least_s), model.latest)
    finish = model.cp.new_int_var(least, model.latest, "")
    for operation in model.rows:
        model.cp.add(finish >= model.end(operation))
    return Goal(finish, model.grid.unit_s)


def tardiness(model: Model, least: int = 0) -> Goal:
    """Return the weighted tardiness of the orders that have rows, known to be `least` or more.

    An order due at no multiple of the grid, say at d, is late by the multiple of the grid above d plus a
    constant once it is late at all; so its lateness is counted from the grid point below d, less that
    constant where it is late.
    """
    due, unit = model.shop.orders.due_s, model.grid.unit_s
    weight = weights(model.shop)
    rows: dict[int, list[int]] = {}
    for operation in model.rows:
        job = int(model.shop.operations.job[operation])
        if due[job] != NO_DUE:
            rows.setdefault(job, []).append(operation)
    terms: list[tuple[int, cp_model.LinearExprT]] = []
    for job, operations in rows.items():
        below, over = divmod(int(due[job]), unit)
        late = model.cp.new_int_var(0, max(0, model.latest - below), "")
        for operation in operations:
            model.cp.add(late >= model.end(operation) - below)
        terms.append((weight[job] * unit, late))
        if over:
            is_late = model.cp.new_bool_var("")
            model.cp.add(late == 0).only_enforce_if(~is_late)
            model.cp.add(late >= 1).only_enforce_if(is_late)
            terms.append((-weight[job] * over, is_late))
    most = sum(abs(value) for value, _ in terms) * max(model.latest, 1)
    common = gcd(0, *(value for value, _ in terms)) or 1
    exact = most // common <= MOST_COST
    if not exact:
        common *= -(-most // common // MOST_COST)
    cost = sum(int(np.sign(value)) * max(1, abs(value) // common) * term for value, term in terms)
    if exact and terms:
        model.cp.add(cost >= -(-least // common))
    return Goal(cost if terms else 0, common, exact=exact)


GOAL_BUILDERS: dict[str, Callable[[Model, int], Goal]] = {MAKESPAN: makespan, TARDINESS: tardiness}
