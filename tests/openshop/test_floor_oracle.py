"""The audit and the brute force tell legal schedules of floors from illegal ones alike."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.schedule import audit
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.model.stated import state
from tests.floor_oracle import Hall, Visit, least_makespan, least_tardiness, plays
from tests.floor_shops import floors


@st.composite
def starts(draw: st.DrawFn) -> tuple[Shop, list[int], list[int], list[int]]:
    """A floor, and starts, ends and units of its operations: legal, or a little off."""
    shop = draw(floors())
    hall = Hall(shop)
    stack: list[Visit] = []
    for operation in sorted(draw(st.permutations(range(len(shop)))), key=lambda k: hall.columns["step"][k]):
        unit = draw(st.integers(1, shop.machines[hall.columns["machine"][operation]].count))
        late = draw(st.sampled_from([0, 0, 0, 1, 2]))
        begin = stack[-1].start if stack else 0
        spots = (hall.visit(operation, unit, start) for start in range(begin, begin + hall.horizon + 9))
        legal = (spot for spot in spots if spot is not None and hall.may_follow(stack, spot))
        stack.append([next(legal) for _ in range(late + 1)][-1])
    stack.sort(key=lambda visit: visit.operation)
    start, end, unit = ([getattr(v, name) for v in stack] for name in ("start", "end", "unit"))
    for _ in range(draw(st.integers(0, 2))):
        moved, by = draw(st.integers(0, len(shop) - 1)), draw(st.integers(-3, 2))
        start[moved] += by
        visit = hall.visit(moved, 1, start[moved]) if start[moved] >= 0 else None
        end[moved] = end[moved] + by if visit is None else visit.end
    return shop, start, end, unit


@given(starts())
@settings(max_examples=400, deadline=None)
def test_the_audit_is_clean_exactly_where_the_play_breaks_no_rule(
    case: tuple[Shop, list[int], list[int], list[int]],
) -> None:
    shop, start, end, unit = case
    schedule = Schedule(np.arange(len(shop)), start, end, unit=unit)
    found = audit(shop, state(Plan(shop, schedule, (), Choice("", "", {}))))
    assert (found == []) == (plays(shop, start, unit) == end)


@given(floors(max_operations=3, scarce=True))
@settings(max_examples=40, deadline=None)
def test_the_prunings_lose_nothing(shop: Shop) -> None:
    assert least_makespan(shop) == least_makespan(shop, every=True)
    assert least_tardiness(shop) == least_tardiness(shop, every=True)
