"""Floors with every mix of rules through the whole method: legal, and as short as brute force finds."""

from __future__ import annotations

from hypothesis import given, settings

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.results import Choice, Plan
from shopfloor.model.shop import Shop
from shopfloor.model.stated import state
from shopfloor.openshop.method import Effort
from shopfloor.openshop.whole_floor import WholeFloor
from tests.floor_oracle import least_makespan
from tests.floor_shops import floors


@given(floors(max_operations=5))
@settings(max_examples=60, deadline=None)
def test_every_mix_of_rules_ends_at_the_least_makespan(shop: Shop) -> None:
    bounds = lower_bounds(shop)
    least = least_makespan(shop)
    bound = bounds[0].value_s if bounds else 0
    outcome = WholeFloor().solve(shop, Effort(bound_s=bound, time_limit_s=20))
    if least is None:  # a crew that is never large enough
        assert outcome.schedule is None
        return
    assert outcome.schedule is not None
    assert outcome.schedule.makespan_s == least
    assert max(bound, outcome.proven_s) <= least
    assert audit(shop, state(Plan(shop, outcome.schedule, bounds, Choice("", "", {})))) == []
