"""No lower bound is above the least makespan, whatever rules a floor has; each follows from its witness."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import replace

import numpy as np
from hypothesis import Phase, given, settings
from hypothesis import strategies as st

from shopfloor.audit.witness import rederive
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.shop import (
    NO_STEP,
    Changeovers,
    Closure,
    Crew,
    Machine,
    Operations,
    Orders,
    Shop,
)
from tests.floor_oracle import least_makespan
from tests.floor_shops import FAMILIES, floors


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


KINDS = ("machine", "runs", "window", "rounds", "crew", "crew rounds", "order")
RULES: dict[str, Callable[[Shop], bool]] = {
    "breaks": lambda shop: bool(shop.breaks),
    "closures": lambda shop: any(machine.closed for machine in shop.machines),
    "pauses": lambda shop: any(m.pauses and (m.closed or shop.breaks) for m in shop.machines),
    "groups": lambda shop: any(machine.count > 1 for machine in shop.machines),
    "families": lambda shop: any(not each.none for each in shop.changeovers.values()),
    "transport": lambda shop: not shop.transport.none,
    "releases": lambda shop: bool(shop.orders.release_s.any()),
    "steps": lambda shop: shop.has_steps,
    "crew": lambda shop: bool(shop.crews),
    "set-ups": lambda shop: any(machine.crew and machine.set_up_only for machine in shop.machines),
    "levels": lambda shop: any(crew.levels for crew in shop.crews),
}


def test_a_crew_that_nobody_needs_has_no_bound() -> None:
    """It attends set-ups only, and there are none."""
    machines = (Machine("A", crew="Blue", set_up_only=True),)
    shop = Shop(machines, Orders(("J",)), Operations([0], [0], [5]), crews=(Crew("Blue", 2),))
    assert {bound.kind for bound in lower_bounds(shop)} == {"machine", "order"}


@st.composite
def even_crews(draw: st.DrawFn) -> Shop:
    """Floors on which one crew attends equal operations all the time, so that it works in rounds."""
    shop = draw(floors(parallel=True, max_operations=4))
    length, size = draw(st.integers(1, 3)), len(shop)
    columns = replace(
        shop.operations, seconds=np.full(size, length), heads=np.ones(size, np.int64), setup_s=np.zeros(size)
    )
    machines = tuple(replace(machine, crew="Blue", set_up_only=False) for machine in shop.machines)
    return replace(
        shop, operations=columns, machines=machines, crews=(Crew("Blue", draw(st.integers(1, 2))),)
    )


@st.composite
def late_families(draw: st.DrawFn) -> Shop:
    """Floors whose first machine gets red and black work early and red again later, and changes over."""
    hall = draw(floors(parallel=True, max_operations=1))
    release = [draw(st.integers(0, 1)), draw(st.integers(0, 1)), draw(st.integers(3, 6))]
    last = len(hall.machines) - 1
    step = [1, 2] if draw(st.booleans()) else [NO_STEP, NO_STEP]
    return replace(
        hall,
        machines=(replace(hall.machines[0], count=1), *hall.machines[1:]),
        orders=Orders(("J", "K", "L"), release_s=release),
        operations=Operations(
            [0, 1, 2, 2],
            [0, 0, 0, last],
            draw(st.lists(st.integers(1, 3), min_size=4, max_size=4)),
            step=[NO_STEP, NO_STEP, *step],
            heads=draw(st.lists(st.integers(0, 1), min_size=4, max_size=4)),
            setup_s=draw(st.lists(st.integers(0, 1), min_size=4, max_size=4)),
            family=[0, 1, 0, 1],
        ),
        families=FAMILIES,
        changeovers={hall.machines[0].id: Changeovers(draw(st.integers(1, 3)))},
    )


NEVER = {("crew rounds", "set-ups"), ("crew rounds", "levels")}  # there the heads' own time counts instead


def test_every_kind_of_bound_is_held_against_every_rule() -> None:
    """Each kind meets each rule, is the best bound somewhere, and is met by a plan somewhere."""
    together: Counter[tuple[str, str]] = Counter()
    best: set[str] = set()
    met: set[str] = set()

    @given(st.one_of(floors(parallel=True, max_operations=4), even_crews(), late_families()))
    @settings(max_examples=2_000, deadline=None, database=None, derandomize=True, phases=[Phase.generate])
    def meet(shop: Shop) -> None:
        least = least_makespan(shop)
        assert least is not None
        bounds = lower_bounds(shop)
        for bound in bounds:
            assert bound.value_s <= least, bound
            together.update((bound.kind, rule) for rule, has in RULES.items() if has(shop))
            if bound.value_s == bounds[0].value_s:
                best.add(bound.kind)
            if bound.value_s == least:
                met.add(bound.kind)

    meet()
    assert best == met == set(KINDS)
    missing = {(kind, rule) for kind in KINDS for rule in RULES} - set(together) - NEVER
    assert not missing
