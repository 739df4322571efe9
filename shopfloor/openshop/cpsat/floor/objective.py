"""What is minimised: one function a goal, in whole numbers."""

from __future__ import annotations

from collections.abc import Callable
from itertools import permutations
from math import gcd

from ortools.sat.python import cp_model

from shopfloor.model.shop import NO_DUE
from shopfloor.openshop.cpsat.floor.best import CHANGEOVERS, family_name
from shopfloor.openshop.cpsat.floor.variables import Model, Visit
from shopfloor.openshop.cpsat.objective import MOST_COST, Goal
from shopfloor.openshop.incumbent import MAKESPAN, TARDINESS, weights


def makespan(model: Model, least: int) -> Goal:
    """Return the end of the last operation that is placed, known to be `least` seconds or more."""
    free = [visit for visit in model.visits if model.is_free(visit)]
    low = min(model.grid.up(least), model.latest)
    finish = model.int_var(low, model.latest, max(visit.end_was for visit in free))
    for visit in free:
        model.cp.add(finish >= visit.end)
    return Goal(finish, model.grid.unit_s)


def tardiness(model: Model, least: int) -> Goal:
    """Return the weighted tardiness of the orders with operations to be placed; due times are on the grid."""
    due, weight, unit_s = model.shop.orders.due_s, weights(model.shop), model.grid.unit_s
    placed = {visit.job for visit in model.visits if model.is_free(visit)}
    jobs: dict[int, list[Visit]] = {}
    for visit in model.visits:
        if due[visit.job] != NO_DUE and visit.job in placed:
            jobs.setdefault(visit.job, []).append(visit)
    last = max([model.latest, *(visit.end_was for visit in model.visits)])
    terms: list[tuple[int, cp_model.IntVar]] = []
    most = 0
    for job, visits in jobs.items():
        by = int(due[job]) // unit_s
        late = model.int_var(0, max(0, last - by), max(visit.end_was for visit in visits) - by)
        for visit in visits:
            model.cp.add(late >= visit.end - by)
        terms.append((weight[job] * unit_s, late))
        most += weight[job] * unit_s * max(0, last - by)
    common = gcd(0, *(worth for worth, _ in terms)) or 1
    exact = most // common <= MOST_COST
    if not exact:
        common *= -(-most // common // MOST_COST)
    cost = sum(max(1, worth // common) * late for worth, late in terms)
    if exact and terms and least:
        model.cp.add(cost >= -(-least // common))
    return Goal(cost, common, exact=exact)


def changeover_time(model: Model, least: int) -> Goal:
    """Return the open time that goes into changeovers: who follows whom on each unit, as a circuit."""
    terms: list[cp_model.LinearExprT] = []
    for visits in model.by_machine():
        times = model.shop.changeovers.get(model.shop.machines[visits[0].machine].id)
        if times is not None and not times.none:
            for unit in range(max(1, len(visits[0].on_unit))):
                terms += _circuit(model, visits, unit)
    cost = sum(terms)
    if terms and least:
        model.cp.add(cost >= model.grid.up(least))
    return Goal(cost, model.grid.unit_s)


def _circuit(model: Model, visits: list[Visit], unit: int) -> list[cp_model.LinearExprT]:
    """Let the visits of one unit follow each other, node 0 before the first and after the last of them."""
    machine = model.shop.machines[visits[0].machine]
    times, unit_s = model.shop.changeovers[machine.id], model.grid.unit_s
    family = [family_name(model.shop, visit.operation) for visit in visits]
    mine = [not visit.on_unit or int(model.places.unit[visit.operation]) == unit + 1 for visit in visits]
    was = sorted((k for k in range(len(visits)) if mine[k]), key=lambda k: visits[k].was)
    follows = set(zip([-1, *was], [*was, -1], strict=True))
    arcs: list[tuple[int, int, cp_model.LiteralT]] = []
    terms: list[cp_model.LinearExprT] = []
    for k, visit in enumerate(visits):
        first, last = model.bool_var((-1, k) in follows), model.bool_var((k, -1) in follows)
        arcs += [(0, k + 1, first), (k + 1, 0, last)]
        if visit.on_unit:
            arcs.append((k + 1, k + 1, ~visit.on_unit[unit]))
        if machine.family is not None:
            terms.append(times.seconds(machine.family, family[k]) // unit_s * first)
    if visits[0].on_unit:
        arcs.append((0, 0, model.bool_var(not was)))
    for a, b in permutations(range(len(visits)), 2):
        one, two = visits[a], visits[b]
        change = times.seconds(family[a], family[b]) // unit_s
        if one.low + one.work + change > two.high:
            continue
        next_one = model.bool_var((a, b) in follows)
        model.cp.add(one.at + one.work + change <= two.at).only_enforce_if(next_one)
        arcs.append((a + 1, b + 1, next_one))
        terms.append(change * next_one)
    model.cp.add_circuit(arcs)
    return terms


GOAL_BUILDERS: dict[str, Callable[[Model, int], Goal]] = {
    MAKESPAN: makespan,
    TARDINESS: tardiness,
    CHANGEOVERS: changeover_time,
}
