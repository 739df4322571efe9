"""Every family of lower bounds that applies to a shop, best bound first."""

from __future__ import annotations

from collections.abc import Callable

from shopfloor.bounds.arrivals import run_bounds
from shopfloor.bounds.crew import crew_bounds
from shopfloor.bounds.load import machine_bounds, order_bounds, round_bounds
from shopfloor.bounds.window import window_bounds
from shopfloor.model.results import Bound
from shopfloor.model.shop import Shop

# Ties are shown in this order: a lead can do more about a machine than about an order.
FAMILIES: tuple[Callable[[Shop], list[Bound]], ...] = (
    machine_bounds,
    run_bounds,
    window_bounds,
    round_bounds,
    crew_bounds,
    order_bounds,
)


def lower_bounds(shop: Shop) -> tuple[Bound, ...]:
    """Return the bounds of all families, best first; empty for a shop without operations."""
    found = [bound for family in FAMILIES for bound in family(shop)]
    return tuple(sorted(found, key=lambda bound: -bound.value_s))
