"""Choosing single operations: a flow, solved exactly.

Source → (crew) → orders → operations → machines → sink. An order and a machine carry at most as many
operations as the shift has rounds, a group that times its units; each operation is one arc of capacity
one, worth its order's priority. By König's theorem every such choice fits. The flow that is worth most
is one of least cost, and with whole capacities it is whole (G. Dantzig, D. Fulkerson, 1956).
"""

from __future__ import annotations

import numpy as np
from ortools.graph.python import min_cost_flow

from shopfloor.errors import NoPlanError
from shopfloor.fit.budget import Budget
from shopfloor.fit.value import ranked_worth
from shopfloor.model.shop import Bools, Shop


def choose_operations(shop: Shop, limits: Budget, *, must: Bools, never: Bools) -> Bools:
    """Return which operations to run: the most priority in all that the rounds of the shift can hold.

    Parameters
    ----------
    must, never
        Orders all of whose operations are pinned in or out.

    Raises
    ------
    NoPlanError
        If the pinned orders alone do not fit, or times are not equal rounds.
    """
    if limits.unit != "rounds":
        raise NoPlanError("single operations can only be chosen in equal rounds; use --by orders")
    job, machine = shop.operations.job, shop.operations.machine
    orders, machines, rounds = len(shop.orders), len(shop.machines), limits.room
    value = ranked_worth(shop)[job]
    pinned = must[job]
    # Pinned operations are worth more than all others together, so none is left out if all fit.
    gain = np.where(pinned, int(value[~pinned].sum()) + 1, value)
    source, crew, sink = orders + machines, orders + machines + 1, orders + machines + 2
    crew_room = min(
        (limit.room for limit in limits.limits if limit.name.startswith("crew ")), default=len(shop)
    )
    flow = min_cost_flow.SimpleMinCostFlow()
    flow.add_arc_with_capacity_and_unit_cost(source, crew, crew_room, 0)
    flow.add_arcs_with_capacity_and_unit_cost(
        np.full(orders, crew), np.arange(orders), limits.order_room, np.zeros(orders, np.int64)
    )
    arcs = flow.add_arcs_with_capacity_and_unit_cost(
        job, orders + machine, (~never[job]).astype(np.int64), -gain
    )
    rooms = np.array([rounds * m.count for m in shop.machines], np.int64)
    flow.add_arcs_with_capacity_and_unit_cost(
        orders + np.arange(machines), np.full(machines, sink), rooms, np.zeros(machines, np.int64)
    )
    flow.add_arc_with_capacity_and_unit_cost(source, sink, len(shop), 0)  # what is carried over
    flow.set_nodes_supplies(np.array([source, sink]), np.array([len(shop), -len(shop)]))
    if flow.solve() != flow.OPTIMAL:
        raise NoPlanError("the flow of operations has no solution, which should not happen")
    chosen: Bools = np.asarray(flow.flows(arcs)) > 0
    if not chosen[pinned].all():
        raise NoPlanError("the orders given with --must do not fit the shift together; take some out")
    return chosen
