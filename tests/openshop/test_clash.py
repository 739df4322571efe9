"""Rules that clash are named, all of them needed, judged by trying everything on tiny shops.

A machine is shut for good for more than a year, which is longer than brute force can wait; here for good is
shorter, and a plan that ends after it is none.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.errors import NoPlanError
from shopfloor.model import feasible
from shopfloor.model.shop import (
    NO_STEP,
    Changeovers,
    Closure,
    Crew,
    Machine,
    Operations,
    Orders,
    Shop,
    Transport,
)
from shopfloor.openshop import clash
from shopfloor.openshop.clash import Rule, limited, rules_of, without
from shopfloor.openshop.cpsat import clash as cpsat_clash
from shopfloor.openshop.cpsat.clash import Clash, judge
from shopfloor.openshop.cpsat.floor import solve
from shopfloor.pipeline import Options, plan, why_none
from tests.floor_oracle import least_makespan
from tests.floor_shops import floors

GOOD = 400  # seconds that are for good here


@pytest.fixture(autouse=True)
def _soon_for_good(monkeypatch: pytest.MonkeyPatch) -> None:
    for module in (feasible, clash, solve):
        monkeypatch.setattr(module, "FOR_GOOD_S", GOOD)


def shut(moment: int) -> Closure:
    """Shut for good from then on."""
    return Closure(moment, moment + GOOD)


def possible(shop: Shop) -> bool:
    """Whether a plan ends before anything that is shut for good opens again, by trying everything."""
    least = least_makespan(shop)
    return least is not None and least < GOOD


def hall(
    machines: list[Machine],
    visits: list[tuple[int, int, int]],
    release: list[int] | None = None,
    **more: object,
) -> Shop:
    """Visits are order, machine, seconds; what else a shop or its operations have goes by name."""
    columns = {name: more.pop(name) for name in ("step", "heads", "family", "setup_s") if name in more}
    job, machine, seconds = (list(column) for column in zip(*visits, strict=True))
    ids = tuple(f"TQ-{k + 1}" for k in range(max(job) + 1))
    row = list(range(2, len(visits) + 2))
    return Shop(
        tuple(machines), Orders(ids, release_s=release or [0] * len(ids)),
        Operations(job, machine, seconds, row=row, **columns), **more,  # type: ignore[arg-type]
    )  # fmt: skip


SAW = Machine("SAW", closed=(shut(10),))
SHUT, ONE = "SAW is shut for good from 0:00:10", "SAW serves one order at a time"
CASES = {
    "several operations and the end of their machine": (
        hall([SAW, Machine("CMM")], [(0, 0, 6), (1, 0, 5), (2, 1, 50)]),
        [SHUT, "TQ-1 takes 6 s on SAW (row 2)", "TQ-2 takes 5 s on SAW (row 3)",
         ONE],
    ),
    "units of a group": (
        hall([replace(SAW, count=2)], [(0, 0, 6), (1, 0, 5), (2, 0, 7)]),
        [SHUT, "TQ-1 takes 6 s on SAW (row 2)", "TQ-2 takes 5 s on SAW (row 3)",
         "TQ-3 takes 7 s on SAW (row 4)", "SAW has 2 units"],
    ),
    "a crew that leaves": (
        hall([Machine("SAW", crew="fitters"), Machine("CMM", crew="fitters")], [(0, 0, 6), (1, 1, 5)],
             heads=[2, 2], crews=(Crew("fitters", 1, ((0, 10, 3),)),)),
        ["TQ-1 takes 6 s on SAW and 2 heads of crew fitters (row 2)",
         "TQ-2 takes 5 s on CMM and 2 heads of crew fitters (row 3)",
         "crew fitters has 3 heads until 0:00:10", "crew fitters has 1 head from 0:00:10 on"],
    ),
    "a crew for set-ups": (
        hall([Machine("SAW", crew="fitters", set_up_only=True), Machine("CMM", crew="fitters")],
             [(0, 0, 9), (1, 1, 6)], heads=[2, 2], setup_s=[5, 0],
             crews=(Crew("fitters", 0, ((0, 10, 2),)),)),
        ["TQ-1 takes 9 s on SAW and 2 heads of crew fitters for 5 s of set-up (row 2)",
         "TQ-2 takes 6 s on CMM and 2 heads of crew fitters (row 3)",
         "crew fitters has 2 heads until 0:00:10", "crew fitters has no heads from 0:00:10 on"],
    ),
    "releases": (
        hall([SAW], [(0, 0, 3), (1, 0, 4)], [5, 4]),
        [SHUT, "TQ-1 takes 3 s on SAW (row 2)", "TQ-2 takes 4 s on SAW (row 3)",
         ONE, "TQ-1 comes at 0:00:05", "TQ-2 comes at 0:00:04"],
    ),
    "steps": (
        hall([SAW, Machine("CMM", closed=(Closure(0, 6),))], [(0, 0, 4), (0, 1, 3)], step=[2, 1]),
        [SHUT, "TQ-1 takes 4 s on SAW (row 2)", "TQ-1 takes 3 s on CMM (row 3)",
         "TQ-1 keeps the sequence of its steps", "CMM is shut from 0:00 to 0:00:06"],
    ),
    "the way between two machines": (
        hall([SAW, Machine("CMM", closed=(shut(10),))], [(0, 0, 4), (0, 1, 5)],
             transport=Transport(3, {("SAW", "CMM"): 2, ("CMM", "SAW"): 3})),
        [SHUT, "CMM is shut for good from 0:00:10",
         "TQ-1 takes 4 s on SAW (row 2)", "TQ-1 takes 5 s on CMM (row 3)",
         "an order needs 2 s from SAW to CMM", "an order needs 3 s from CMM to SAW"],
    ),
    "changeovers": (
        hall([SAW], [(0, 0, 4), (1, 0, 5)], family=[0, 1], families=("red", "black"),
             changeovers={"SAW": Changeovers(2)}),
        [SHUT, "TQ-1 takes 4 s on SAW (row 2)", "TQ-2 takes 5 s on SAW (row 3)",
         ONE, "SAW takes time to change over between families"],
    ),
    "closures and breaks": (
        hall([Machine("SAW", pauses=True, closed=(Closure(2, 3, "check"), shut(10)))], [(0, 0, 4), (1, 0, 5)],
             breaks=(Closure(6, 7, "tea"),)),
        [SHUT, "TQ-1 takes 4 s on SAW (row 2)", "TQ-2 takes 5 s on SAW (row 3)",
         ONE, "SAW is shut from 0:00:02 to 0:00:03 (check)",
         "the hall is shut from 0:00:06 to 0:00:07 (tea)"],
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_the_rules_that_clash_are_named_with_their_rows(name: str) -> None:
    shop, wanted = CASES[name]
    found = judge(shop)
    assert isinstance(found, Clash)
    assert [clash.say(found.shop, rule) for rule in found.rules] == wanted
    assert found.least


@pytest.mark.parametrize("name", CASES)
def test_each_named_rule_is_needed(name: str) -> None:
    """By trying everything: no plan keeps them all, and some plan keeps all but any one."""
    shop, _ = CASES[name]
    found = judge(shop)
    assert isinstance(found, Clash)
    others = set(rules_of(found.shop)) - set(found.rules)
    assert not possible(without(found.shop, others))
    for rule in found.rules:
        assert possible(without(found.shop, others | {rule})), clash.say(found.shop, rule)


@pytest.mark.parametrize("name", CASES)
def test_what_is_said_to_be_enough_is_enough(name: str) -> None:
    shop, _ = CASES[name]
    found = judge(shop)
    assert isinstance(found, Clash)
    for rule in found.rules:
        assert possible(without(found.shop, [rule])) == (rule in found.enough)


# ---- any floor -------------------------------------------------------------------------------------


@st.composite
def ending(draw: st.DrawFn) -> Shop:
    """Floors on which machines may be shut for good, and crews go home."""
    shop = draw(floors(max_operations=4, scarce=True, dues=False))
    machines = []
    for machine in shop.machines:
        last = max([0, *(each.end_s for each in machine.closed)])
        end = draw(st.one_of(st.none(), st.integers(last + 1, last + 12)))
        machines.append(machine if end is None else replace(machine, closed=(*machine.closed, shut(end))))
    return replace(shop, machines=tuple(machines))


@given(ending())
@settings(max_examples=60, deadline=None)
def test_a_clash_is_found_just_where_there_is_no_plan(shop: Shop) -> None:
    with pytest.MonkeyPatch.context() as patch:
        for module in (feasible, clash, solve):
            patch.setattr(module, "FOR_GOOD_S", GOOD)
        found = judge(shop)
        part = shop.keep(limited(shop))
        assert (found is True) == (not len(part) or possible(part))
        if found is True:
            return
        assert isinstance(found, Clash)
        assert found.least
        others = set(rules_of(part)) - set(found.rules)
        assert not possible(without(part, others))
        assert all(possible(without(part, others | {rule})) for rule in found.rules)


# ---- shops without some rules ----------------------------------------------------------------------


def test_each_rule_is_given_up_alone() -> None:
    shop = hall(
        [Machine("SAW", closed=(Closure(1, 2), shut(10)), crew="fitters"), Machine("CMM")],
        [(0, 0, 1), (0, 1, 2)], [3], step=[1, 2], heads=[1, 0], family=[0, -1], families=("red",),
        changeovers={"SAW": Changeovers(2)}, crews=(Crew("fitters", 1, ((4, 6, 0),)),),
        breaks=(Closure(8, 9),), transport=Transport(5),
    )  # fmt: skip
    assert [c.start_s for c in without(shop, [Rule("shut", 0)]).machines[0].closed] == [1]
    assert [c.start_s for c in without(shop, [Rule("closed", 0, 0)]).machines[0].closed] == [10]
    assert without(shop, [Rule("break", 0)]).breaks == ()
    assert without(shop, [Rule("units", 0)]).machines[0].count == 2
    assert without(shop, [Rule("release", 0)]).orders.release_s.tolist() == [0]
    assert without(shop, [Rule("steps", 0)]).operations.step.tolist() == [NO_STEP, NO_STEP]
    assert without(shop, [Rule("changeovers", 0)]).changeovers == {}
    assert without(shop, [Rule("way", 0, 1)]).transport.pairs == {("SAW", "CMM"): 0, ("CMM", "SAW"): 5}
    assert without(shop, [Rule("heads", 0, 1)]).crews[0].levels == ((0, 4, 1), (4, 6, clash.UNLIMITED))
    assert without(shop, [Rule("heads", 0, 2)]).crews[0].heads == clash.UNLIMITED
    assert without(shop, [Rule("operation", 0)]).operations.machine.tolist() == [1]


def test_closures_that_touch_may_be_for_good_together() -> None:
    """As a machine has it that is not open, with a closure of its own in that time."""
    closed = (Closure(10, 12, "not open"), Closure(12, 15, "move"), Closure(15, 10 + GOOD, "not open"))
    shop = hall([Machine("SAW", closed=closed)], [(0, 0, 6), (1, 0, 5)])
    found = judge(shop)
    assert isinstance(found, Clash)
    assert clash.say(shop, found.rules[0]) == "SAW is shut for good from 0:00:10 (not open)"
    assert without(shop, [Rule("shut", 0)]).machines[0].closed == ()


def test_a_way_given_up_shortens_what_is_then_shorter_by_it() -> None:
    shop = hall(
        [Machine(name) for name in "ABC"], [(0, 0, 1), (0, 1, 1), (0, 2, 1)],
        transport=Transport(4, {("A", "C"): 7}),
    )  # fmt: skip
    assert without(shop, [Rule("way", 0, 1)]).transport.seconds("A", "C") == 4


def test_only_what_cannot_wait_is_limited() -> None:
    """Steps before something limited are; what comes after it, and what is split, is not."""
    shop = hall(
        [SAW, Machine("CMM")], [(0, 1, 1), (0, 0, 2), (0, 1, 3), (1, 1, 4), (1, 0, 5)], step=[1, 2, 3, -1, -1]
    )
    assert limited(shop).tolist() == [True, True, False, False, True]
    cut = replace(shop.operations, splittable=np.array([0, 0, 0, 0, 1]))
    assert limited(replace(shop, operations=cut)).tolist() == [True, True, False, False, False]


# ---- the message -----------------------------------------------------------------------------------


def test_plan_says_what_clashes() -> None:
    shop, _ = CASES["several operations and the end of their machine"]
    with pytest.raises(NoPlanError) as caught:
        plan(shop, Options(time_limit_s=0))
    assert str(caught.value) == (
        "no plan can keep all of this together:\n"
        "  - SAW is shut for good from 0:00:10\n"
        "  - TQ-1 takes 6 s on SAW (row 2)\n"
        "  - TQ-2 takes 5 s on SAW (row 3)\n"
        "  - SAW serves one order at a time\n"
        "With any one of them eased far enough there is a plan."
    )


def test_two_clashes_are_told_apart_from_one() -> None:
    machines = [SAW, replace(SAW, id="CMM")]
    shop = hall(machines, [(0, 0, 6), (1, 0, 5), (2, 1, 7), (3, 1, 8)])
    assert why_none(shop, 1).endswith(
        "To ease one of them is not enough, as far as is known: more clashes behind them."
    )


def test_some_of_the_rules_may_be_enough() -> None:
    shop = hall([SAW], [(0, 0, 9), (1, 0, 2), (2, 0, 3)])
    found = judge(shop)
    assert isinstance(found, Clash)
    assert [clash.say(found.shop, rule) for rule in found.enough] == [
        "SAW is shut for good from 0:00:10", "TQ-1 takes 9 s on SAW (row 2)", "SAW serves one order at a time"
    ]  # fmt: skip
    assert "  * TQ-1 takes 9 s on SAW (row 2)\n" in found.text()
    assert found.text().endswith(
        "With one marked * eased far enough there is a plan; behind the others more clashes."
    )


def test_of_many_operations_the_longest_are_named() -> None:
    shop = hall([SAW, Machine("CMM")], [*((k, 0, 1) for k in range(12)), (0, 1, 1)])
    found = judge(shop)
    assert isinstance(found, Clash)
    lines = found.text().splitlines()
    assert lines[2] == "  - TQ-1 takes 1 s on SAW (row 2)"
    assert sum("takes 1 s on SAW" in line for line in lines) == 10
    assert "  - 1 more operation on SAW, 1 s in all" in lines


def test_a_clash_of_one_machine_is_found_where_the_whole_is_too_much(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """What is not known of all operations may be known of those of one machine."""
    shop, wanted = CASES["units of a group"]
    known = cpsat_clash.has_plan
    monkeypatch.setattr(cpsat_clash, "has_plan", lambda part: None if len(part) > 3 else known(part))
    more = replace(
        shop,
        machines=(*shop.machines, replace(SAW, id="CMM")),
        operations=Operations([0, 1, 2, 0], [0, 0, 0, 1], [6, 5, 7, 1], row=[2, 3, 4, 5]),
    )
    found = judge(more)
    assert isinstance(found, Clash)
    assert [clash.say(found.shop, rule) for rule in found.rules] == wanted


def test_a_single_operation_that_does_not_fit_is_named_first() -> None:
    assert why_none(hall([SAW], [(0, 0, 11)]), 1).startswith(
        "no plan can hold TQ-1 on SAW: it takes 11 s on SAW"
    )


def test_where_there_is_a_plan_or_nothing_is_proved_that_is_said() -> None:
    assert why_none(hall([SAW], [(0, 0, 9)]), 2) == (
        "no plan was found in 2 s, though there is one; allow more with --time-limit"
    )
    shop, _ = CASES["releases"]
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr("shopfloor.openshop.cpsat.clash.OPERATIONS_MOST", 1)
        assert why_none(shop, 2) == (
            "neither a plan nor a proof that there is none was found in 2 s; allow more with --time-limit"
        )


def test_a_search_that_runs_out_of_time_says_what_it_does_not_know() -> None:
    shop, _ = CASES["releases"]
    found = judge(shop, lambda: True)
    assert isinstance(found, Clash)
    assert not found.least
    assert found.enough == ()
    assert found.text().endswith(
        "Some of them may have nothing to do with it: time ran out before all were tried."
    )
