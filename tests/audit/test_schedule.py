"""Each rule by a plan that breaks it and nothing else, and the whole audit by its shape."""

from __future__ import annotations

import ast
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

import shopfloor.audit
from shopfloor.audit.schedule import MOST_LISTED, RULES, audit
from shopfloor.model.results import Bound, Violation
from shopfloor.model.shop import Closure, Shop, Transport
from shopfloor.model.stated import StatedPlan
from tests.audit.plans import (
    AROUND_TEA,
    BY_CREW,
    CREW,
    CUT,
    HALL,
    IN_PARTS,
    IN_ROUNDS,
    ON_ROUTE,
    PAINT,
    PAINTED,
    PLAN,
    ROUNDS,
    ROUTE,
    TEA,
    Row,
    changed,
    shop,
    stated,
)

TWO_HOURS = 7200
ORDER_BOUND = Bound("order", 5400, {"order": "TQ-101"}, "")

# rule, shop, plan, sentence, rows
CASES: list[tuple[str, Shop, StatedPlan, str, tuple[int, ...]]] = [
    (
        "order-unknown",
        HALL,
        stated([*PLAN, Row("TQ-1011", "CMM", "08:00", "08:30")]),
        "TQ-1011 on CMM from 08:00 to 08:30: the orders file has no order 'TQ-1011'; the nearest is TQ-101.",
        (7,),
    ),
    (
        "machine-unknown",
        HALL,
        stated([*PLAN, Row("TQ-101", "Paint", "08:00", "08:30")]),
        "TQ-101 on Paint from 08:00 to 08:30: the shop has no machine 'Paint'.",
        (7,),
    ),
    (
        "operation-missing",
        HALL,
        stated(PLAN[:3] + PLAN[4:]),
        "TQ-102 on Test (1 h) is missing from the plan.",
        (),
    ),
    (
        "operation-extra",
        HALL,
        stated([*PLAN, Row("TQ-101", "Wash", "08:00", "08:30")]),
        "TQ-101 on Wash from 06:00 to 06:30, and again from 08:00 to 08:30: the orders ask for this visit "
        "once.",
        (2, 7),
    ),
    (
        "operation-extra",
        HALL,
        stated([*PLAN, Row("TQ-103", "Wash", "08:00", "08:30")]),
        "TQ-103 on Wash from 08:00 to 08:30: the orders do not ask for this visit.",
        (7,),
    ),
    (
        "length",
        HALL,
        stated(changed(PLAN, 6, end="06:00")),
        "TQ-103 on Test unit 2 from 06:00 to 06:00 ends as it starts: a visit must take time.",
        (6,),
    ),
    (
        "length",
        HALL,
        stated(changed(PLAN, 6, start="07:30")),
        "TQ-103 on Test unit 2 from 07:30 to 07:00 ends before it starts.",
        (6,),
    ),
    (
        "duration",
        HALL,
        stated(changed(PLAN, 6, end="06:45")),
        "TQ-103 on Test (1 h) is planned from 06:00 to 06:45: 45 min.",
        (6,),
    ),
    (
        "duration",
        CUT,
        stated(changed(IN_PARTS, 4, end="07:15")),
        "TQ-101 on Wash (1 h) is planned from 06:00 to 07:15: 55 min in all its parts.",
        (2, 4),
    ),
    (
        "start",
        HALL,
        stated(changed(PLAN, 6, start="05:30", end="06:30")),
        "TQ-103 on Test unit 2 starts at 05:30, before the shift does at 06:00.",
        (6,),
    ),
    (
        "unit",
        HALL,
        stated(changed(PLAN, 6, unit=3)),
        "TQ-103 on Test unit 3 from 06:00 to 07:00: Test has the units 1 to 2.",
        (6,),
    ),
    (
        "unit",
        HALL,
        stated(changed(PLAN, 3, unit=0)),
        "TQ-101 on CMM unit 0 from 06:30 to 07:30: CMM is a single unit.",
        (3,),
    ),
    (
        "order-overlap",
        HALL,
        stated(changed(PLAN, 3, start="06:20", end="07:20")),
        "TQ-101 is on Wash from 06:00 to 06:30 and on CMM from 06:20 to 07:20: in two places for 10 min.",
        (2, 3),
    ),
    (
        "machine-overlap",
        HALL,
        stated(changed(PLAN, 6, unit=1, start="06:45", end="07:45")),
        "Test unit 1 runs TQ-103 from 06:45 to 07:45 and TQ-102 from 07:00 to 08:00: two at once for 45 min.",
        (6, 5),
    ),
    (
        "release",
        shop({"Wash": 1}, [("TQ-102", "Wash", 30)], release={"TQ-102": "06:30"}),
        stated([Row("TQ-102", "Wash", "06:15", "06:45")]),
        "TQ-102 on Wash starts at 06:15, before its release at 06:30.",
        (2,),
    ),
    (
        "steps",
        ROUTE,
        stated(
            [
                Row("TQ-101", "Wash", "07:30", "08:00"),
                Row("TQ-102", "Wash", "06:30", "07:00"),
                Row("TQ-101", "Test", "07:00", "07:30"),
                Row("TQ-101", "CMM", "06:00", "07:00"),
            ]
        ),
        "TQ-101 on CMM (step 2) starts at 06:00, before step 1 on Wash ends at 08:00.",
        (2, 5),
    ),
    (
        "closure",
        TEA,
        stated(changed(AROUND_TEA, 2, start="06:15", end="06:45")),
        "TQ-101 on Press from 06:15 to 06:45 ends while Press is shut from 06:30 to 06:45 (tea).",
        (2,),
    ),
    (
        "closure",
        shop({"Press": 1}, [("TQ-101", "Press", 60)], breaks=(Closure(1800, 2700),)),
        stated([Row("TQ-101", "Press", "06:00", "07:00")]),
        "TQ-101 on Press from 06:00 to 07:00 runs on while Press is shut from 06:30 to 06:45, and it "
        "does not pause.",
        (2,),
    ),
    (
        "closure",
        TEA,
        stated(changed(changed(AROUND_TEA, 3, start="06:40", end="07:15"), 4, start="07:15", end="07:45")),
        "TQ-102 on Oven from 06:40 to 07:15 starts while Oven is shut from 06:30 to 06:45 (tea).",
        (3,),
    ),
    (
        "duration",
        TEA,
        stated(changed(AROUND_TEA, 3, end="06:50")),
        "TQ-102 on Oven (30 min) is planned from 06:10 to 06:50: 25 min.",
        (3,),
    ),
    (
        "crew",
        CREW,
        stated(changed(BY_CREW, 4, start="06:20", end="06:50")),
        "Crew Blue has 2 heads at 06:20, but 3 are taken, by TQ-103 on Test beside TQ-102 on CMM.",
        (3, 4),
    ),
    (
        "crew",
        replace(CREW, operations=replace(CREW.operations, heads=[1, 3, 0])),
        stated(changed(BY_CREW, 3, start="06:30", end="07:00")),
        "Crew Blue has 2 heads at 06:30, but 3 are taken, by TQ-102 on CMM.",
        (3,),
    ),
    (
        "crew",
        replace(CREW, crews=(replace(CREW.crews[0], levels=((2100, 3600, 1), (3600, 4000, 0))),)),
        stated(BY_CREW),
        "Crew Blue has 1 head at 06:35, but 2 are taken, by TQ-103 on Test beside TQ-102 on CMM.",
        (3, 4),
    ),
    (
        "transport",
        replace(HALL, transport=Transport(300, {("Wash", "CMM"): 600})),
        stated(changed(changed(PLAN, 3, start="06:35", end="07:35"), 5, start="07:05", end="08:05")),
        "TQ-101 needs 10 min to get from Wash to CMM, but leaves at 06:30 and starts at 06:35.",
        (2, 3),
    ),
    (
        "changeover",
        PAINT,
        stated(changed(PAINTED, 4, start="07:45", end="08:15")),
        "Booth needs 20 min to change from white to grey between TQ-102, to 07:30, and TQ-103, from 07:45, "
        "but has 15 min.",
        (3, 4),
    ),
    (
        "changeover",
        PAINT,
        stated(changed(PAINTED, 3, start="06:55", end="07:25")),
        "Booth needs 20 min to change from grey to white between TQ-101, to 06:30, and TQ-102, from 06:55, "
        "but has 15 min.",
        (2, 3),
    ),
    (
        "changeover",
        replace(PAINT, machines=(replace(PAINT.machines[0], family="red"),)),
        stated(PAINTED),
        "Booth needs 20 min to change from red to grey before TQ-101 starts at 06:00, but has 0 s.",
        (2,),
    ),
    (
        "split",
        HALL,
        stated(
            [
                *PLAN[:4],
                Row("TQ-103", "Test", "06:00", "06:20", unit=2, part=1, parts=2),
                Row("TQ-103", "Test", "06:30", "07:10", unit=2, part=2, parts=2),
            ]
        ),
        "TQ-103 on Test (1 h) is cut into 2 parts, but it may not be split.",
        (6, 7),
    ),
    (
        "parts",
        HALL,
        stated(changed(PLAN, 6, part=1, parts=2)),
        "TQ-103 on Test unit 2 from 06:00 to 07:00 is part 1 of 1 by time, but numbered part 1 of 2.",
        (6,),
    ),
    (
        "round-number",
        ROUNDS,
        stated(changed(IN_ROUNDS, 7, round=-1)),
        "TQ-103 on CMM from 07:00 to 07:30 is in no round, though the rest of the plan runs in rounds.",
        (7,),
    ),
    (
        "round-number",
        shop({"Wash": 1}, [("TQ-101", "Wash", 30)]),
        stated([Row("TQ-101", "Wash", "06:00", "06:30", round=0)]),
        "TQ-101 on Wash from 06:00 to 06:30 is in round 0, but rounds count from 1.",
        (2,),
    ),
    (
        "round-start",
        ROUNDS,
        stated(changed(changed(IN_ROUNDS, 5, start="07:00", end="07:30"), 7, start="08:00", end="08:30")),
        "TQ-102 on Wash from 07:00 to 07:30 is in round 2, which starts at 06:30 (TQ-101 on CMM).",
        (6, 5),
    ),
    (
        "round-order",
        ROUNDS,
        stated([replace(row, round={1: 2, 2: 1, 3: 3}[row.round]) for row in IN_ROUNDS]),
        "Round 2 starts at 06:00 (TQ-101 on Wash), but round 1 ends at 07:00 (TQ-101 on CMM).",
        (6, 2),
    ),
    (
        "makespan",
        HALL,
        stated(PLAN, makespan_s=TWO_HOURS - 60),
        "The plan states that everything ends at 07:59, but the last to end is TQ-102 on Test unit 1 from "
        "07:00 to 08:00.",
        (5,),
    ),
    (
        "bound-unknown",
        HALL,
        stated(PLAN, bounds=(Bound("guess", 7200, {}, ""),)),
        "A bound of the kind 'guess' is unknown, so nothing can be derived from it.",
        (),
    ),
    (
        "bound-witness",
        HALL,
        stated(PLAN, bounds=(Bound("order", 7200, {"order": "TQ-999"}, ""),)),
        "The witness of the order bound names order 'TQ-999', which the shop does not have.",
        (),
    ),
    (
        "bound-value",
        HALL,
        stated(PLAN, bounds=(replace(ORDER_BOUND, value_s=7200),)),
        "The order bound states 08:00, but its witness proves 07:30 (7200 s against 5400 s).",
        (),
    ),
    (
        "lower-bound",
        HALL,
        stated(PLAN, lower_bound_s=7200, bounds=(ORDER_BOUND,)),
        "The plan states the lower bound 08:00, but of the bounds in it the best that holds is 07:30.",
        (),
    ),
    (
        "lower-bound",
        HALL,
        stated(PLAN, lower_bound_s=7200),
        "The plan states the lower bound 08:00, but of the bounds in it none holds.",
        (),
    ),
    (
        "bound-above",
        HALL,
        stated(PLAN, bounds=(Bound("solver", 7260, {"solver": "CP-SAT"}, ""),)),
        "A bound says that nothing can end before 08:01, but the plan ends at 08:00: the plan leaves work "
        "out, or the bound is false.",
        (),
    ),
    (
        "optimal",
        HALL,
        stated(PLAN, proved_optimal=True, bounds=(ORDER_BOUND,)),
        "The plan claims that nothing can end earlier than 08:00, but the best bound that holds is 07:30, "
        "30 min away.",
        (),
    ),
    (
        "shift",
        HALL,
        stated(PLAN, fits_shift=False),
        "The plan states that it does not fit the shift, but its last row ends at 08:00 and the shift at "
        "14:00.",
        (),
    ),
    (
        "shift",
        ROUNDS,
        stated(IN_ROUNDS, fits_shift=True),
        "The plan states whether it fits the shift, but the shift's end is not known.",
        (),
    ),
]

ACCOMPANIED = {"round-visit"}  # two visits of a round start together, so they overlap as well


@pytest.mark.parametrize(
    ("rule", "hall", "plan", "sentence", "rows"), CASES, ids=lambda x: x if isinstance(x, str) else ""
)
def test_each_rule_says_which_rows_clash(
    rule: str, hall: Shop, plan: StatedPlan, sentence: str, rows: tuple[int, ...]
) -> None:
    """A plan that breaks one rule gets one violation: the rule's code, a plain sentence, the two rows."""
    assert audit(hall, plan) == [Violation(rule, sentence, rows)]


def test_every_rule_has_a_case() -> None:
    assert {case[0] for case in CASES} | ACCOMPANIED == set(RULES)


@pytest.mark.parametrize(
    ("hall", "rows"),
    [
        (HALL, PLAN),
        (ROUNDS, IN_ROUNDS),
        (CUT, IN_PARTS),
        (ROUTE, ON_ROUTE),
        (TEA, AROUND_TEA),
        (CREW, BY_CREW),
        (PAINT, PAINTED),
    ],
)
def test_a_clean_plan_breaks_no_rule(hall: Shop, rows: list[Row]) -> None:
    assert audit(hall, stated(rows)) == []


def test_true_claims_are_clean() -> None:
    """Makespan, bound, proof and fit, as a plan that meets its bound states them."""
    hall = shop({"Wash": 1, "CMM": 1}, [("TQ-101", "Wash", 30), ("TQ-101", "CMM", 60)], end="07:30")
    bound = Bound("order", 5400, {"order": "TQ-101"}, "")
    plan = stated(
        PLAN[:2], makespan_s=5400, lower_bound_s=5400, proved_optimal=True, fits_shift=True, bounds=(bound,)
    )
    assert audit(hall, plan) == []


def test_a_modest_claim_is_no_violation() -> None:
    """A plan may say less of itself than is true: not proved optimal, though the bound is met."""
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30)])
    bound = Bound("order", 1800, {"order": "TQ-101"}, "")
    plan = stated([Row("TQ-101", "Wash", "06:00", "06:30")], proved_optimal=False, bounds=(bound,))
    assert audit(hall, plan) == []


def test_two_visits_of_an_order_or_a_unit_in_one_round() -> None:
    order_twice = changed(IN_ROUNDS, 6, start="06:00", end="06:30", round=1)
    assert audit(ROUNDS, stated(order_twice)) == [
        Violation(
            "order-overlap",
            "TQ-101 is on Wash from 06:00 to 06:30 and on CMM from 06:00 to 06:30: in two places for 30 min.",
            (2, 6),
        ),
        Violation("round-visit", "TQ-101 is on Wash and on CMM in round 1.", (2, 6)),
    ]
    unit_twice = changed(IN_ROUNDS, 4, unit=1)
    assert [(v.rule, v.sentence, v.rows) for v in audit(ROUNDS, stated(unit_twice))][1:] == [
        ("round-visit", "Test unit 1 serves TQ-102 and TQ-103 in round 1.", (3, 4))
    ]


def test_one_start_in_two_rounds() -> None:
    plan = stated(changed(changed(IN_ROUNDS, 6, round=3), 7, round=4))
    assert audit(ROUNDS, plan) == [
        Violation(
            "round-start",
            "TQ-101 on CMM from 06:30 to 07:00 is in round 3, but TQ-102 on Wash starts with it in round 2.",
            (5, 6),
        ),
        Violation(
            "round-order",
            "Round 3 starts at 06:30 (TQ-101 on CMM), but round 2 ends at 07:00 (TQ-102 on Wash).",
            (5, 6),
        ),
    ]


def test_claims_are_held_against_the_rows_and_not_against_each_other() -> None:
    """Makespan, bound and proof that agree with one another, in a plan that ends later."""
    plan = stated(PLAN, makespan_s=5400, lower_bound_s=5400, proved_optimal=True, bounds=(ORDER_BOUND,))
    assert [violation.rule for violation in audit(HALL, plan)] == ["makespan", "optimal"]


def test_an_empty_plan_lacks_every_operation() -> None:
    plan = stated([], makespan_s=0, lower_bound_s=0)
    assert [violation.rule for violation in audit(HALL, plan)] == ["operation-missing"] * len(HALL)


def test_an_empty_shop_is_served_by_an_empty_plan() -> None:
    hall = Shop((), HALL.orders.__class__(()), HALL.operations.__class__([], [], []))
    assert audit(hall, stated([], makespan_s=0, lower_bound_s=0, proved_optimal=True)) == []
    assert [v.rule for v in audit(hall, stated(PLAN[:1]))] == ["order-unknown", "machine-unknown"]


def test_the_list_is_capped_and_shows_every_broken_rule() -> None:
    """Two thousand rows, all early, one of which also is on a unit that is not there."""
    rows = 2_000
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 1)] * rows)
    start = -120 * np.arange(1, rows + 1)
    one = np.ones(rows, int)
    plan = StatedPlan(
        np.arange(2, rows + 2), ["TQ-101"] * rows, ["Wash"] * rows, np.r_[2, one[1:]], start, start + 60,
        -one, one, one,
    )  # fmt: skip
    found = audit(hall, plan)
    assert len(found) == MOST_LISTED + 1
    assert [violation.rule for violation in found[-3:]] == ["start", "unit", "more"]
    assert found[-1] == Violation("more", "Not listed: 1,001 more (1,001 × start).")


def test_times_no_clock_can_hold_do_not_stop_the_audit() -> None:
    """A start and an end near the limits of 64 bits are judged like any others."""
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30), ("TQ-102", "Wash", 30)])
    far = 10**12
    plan = stated([Row("TQ-101", "Wash", "06:00", "06:30"), Row("TQ-102", "Wash", "06:30", "07:00")])
    late = replace(plan, start_s=[0, far], end_s=[1800, far + 1800])
    with pytest.raises(OverflowError):
        hall.clock.say(far)
    assert audit(hall, late) == []
    assert audit(hall, replace(late, end_s=[1800, far + 60])) == [
        Violation(
            "duration",
            "TQ-102 on Wash (30 min) is planned from 277777777:46:40 to 277777777:47:40: 1 min.",
            (3,),
        )
    ]


def test_the_audit_shares_nothing_with_the_methods() -> None:
    """Its modules import the model, the errors, the settings, NumPy and the standard library."""
    allowed = ("shopfloor.audit", "shopfloor.model", "shopfloor.errors", "shopfloor.settings")
    for path in Path(shopfloor.audit.__file__).parent.glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ImportFrom) and (node.module or "").startswith("shopfloor"):
                assert node.module.startswith(allowed), f"{path.name} imports {node.module}"
        text = path.read_text(encoding="utf-8")
        for derived in ("head_s", "tail_s", "job_load_s", "machine_load_s", "has_steps", "_stepped"):
            assert f".{derived}" not in text, f"{path.name} leans on Shop.{derived}"
