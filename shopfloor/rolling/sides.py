"""The plan in force and a replan as the two sides of a comparison."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from shopfloor.model.results import Lateness, Plan
from shopfloor.replan.compare import Row, Side
from shopfloor.replan.told import Told


def before_side(said: Told) -> Side:
    """Return the plan in force as one side of a comparison."""
    if not said.plans:
        return Side("no plan", "", ())
    event = said.plans[-1]
    head: Mapping[str, Any] = event.data.get("head", {})
    rows = [
        Row(row.key.order, row.key.machine, row.unit, row.start_s or 0, row.end_s or 0, row.round)
        for row in event.pieces
    ]
    late = tuple(
        Lateness(str(one["order"]), int(one["due_s"]), int(one["finish_s"])) for one in head.get("late", ())
    )
    return Side(
        name=str(event.data.get("name", "")),
        sha256=str(event.data.get("sha256", "")),
        rows=rows,
        makespan_s=int(head.get("makespan_s") or max((row.end_s for row in rows), default=0)),
        bound_s=int(head.get("lower_bound_s") or 0),
        proved=bool(head.get("proved_optimal")),
        fits=head.get("fits_shift"),
        late=late,
        method=str(head.get("method", {}).get("name", "")),
    )


def after_side(made: Plan, now_s: int) -> Side:
    """Return a replan as one side of a comparison."""
    shop, schedule = made.shop, made.schedule
    rows = [
        Row(
            shop.orders.ids[int(shop.operations.job[one.operation])],
            shop.machines[int(shop.operations.machine[one.operation])].id,
            one.unit,
            one.start_s,
            one.end_s,
            one.round,
        )
        for one in schedule
    ]
    return Side(
        name="replan",
        sha256="",
        rows=rows,
        makespan_s=made.makespan_s,
        bound_s=made.lower_bound_s,
        proved=made.proved_optimal,
        fits=made.fits_shift,
        late=tuple(made.late_orders()),
        method=made.choice.name,
        from_s=now_s,
        begun=frozenset((order, machine, start) for order, machine, start in made.options["begun"]),
    )
