"""Floors with every mix of rules through the whole method: legal, and as short as brute force finds."""

from __future__ import annotations

from hypothesis import given, settings

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.calendar import MINUTE
from shopfloor.model.results import Choice, Plan
from shopfloor.model.shop import NO_DUE, Changeovers, Machine, Operations, Orders, Shop
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


def test_a_lead_is_told_when_due_times_first_would_leave_far_less_late() -> None:
    """Two red orders together end first; black between them is in time, and costs a change more."""
    shop = Shop(
        (Machine("COAT"),),
        Orders(("R1", "B", "R2"), due_s=[10 * MINUTE, 80 * MINUTE, NO_DUE]),
        Operations([0, 1, 2], [0, 0, 0], [10 * MINUTE] * 3, family=[0, 1, 0]),
        families=("red", "black"), changeovers={"COAT": Changeovers(60 * MINUTE)},
    )  # fmt: skip
    outcome = WholeFloor().solve(shop, Effort(bound_s=90 * MINUTE))
    assert outcome.schedule is not None
    assert outcome.schedule.makespan_s == 90 * MINUTE
    assert outcome.remarks == (
        "Weighted lateness is 10 min (priority × time late, summed); no plan as good in what comes first has "
        "less.",
        "With due times first (--objective tardiness,makespan) a plan was found that leaves nothing late and "
        "ends 1 h later.",
    )
    due_first = WholeFloor(("tardiness", "makespan")).solve(shop, Effort(bound_s=90 * MINUTE))
    assert due_first.remarks == ("Nothing is late.",)
