"""No lower bound is above the least makespan, whatever rules a floor has; each follows from its witness."""

from __future__ import annotations

from hypothesis import given, settings

from shopfloor.audit.witness import rederive
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.shop import Closure, Crew, Machine, Operations, Orders, Shop
from tests.floor_oracle import least_makespan
from tests.floor_shops import floors


@given(floors(parallel=True))
@settings(max_examples=200, deadline=None)
def test_no_bound_is_above_the_least_makespan(shop: Shop) -> None:
    least = least_makespan(shop)
    assert least is not None
    for bound in lower_bounds(shop):
        assert bound.value_s <= least, bound
        assert rederive(shop, bound) == bound.value_s


def test_a_crew_that_goes_on_while_a_machine_pauses_has_no_rounds() -> None:
    """Two heads, three operations of two seconds: A works in seconds 0 and 2, B in 0 and 1, C in 1 and 2."""
    shop = Shop(
        (
            Machine("A", pauses=True, closed=(Closure(1, 2),), crew="Blue"),
            Machine("B", crew="Blue"), Machine("C", crew="Blue"),
        ),
        Orders(("J", "K", "L")), Operations([0, 1, 2], [0, 1, 2], [2, 2, 2]), crews=(Crew("Blue", 2),),
    )  # fmt: skip
    assert least_makespan(shop) == 3
    values = [(bound.kind, bound.value_s) for bound in lower_bounds(shop)]
    assert values[0] == ("machine", 3)
    assert ("crew", 3) in values


def test_a_crew_s_heads_count_while_they_are_there() -> None:
    """Two heads, one of them away for the first three seconds: four seconds of work take four, not two."""
    machines = tuple(Machine(name, crew="Blue") for name in "ABCD")
    shop = Shop(
        machines, Orders(("J", "K", "L", "N")), Operations([0, 1, 2, 3], [0, 1, 2, 3], [1, 1, 1, 1]),
        crews=(Crew("Blue", 2, ((0, 3, 1),)),),
    )  # fmt: skip
    best = lower_bounds(shop)[0]
    assert (best.kind, best.value_s) == ("crew", 4)
    assert best.sentence == (
        "The 1 to 2 heads of crew Blue have 4 s of one head's work, so nothing can end before 0:00:04."
    )
    assert least_makespan(shop) == 4
