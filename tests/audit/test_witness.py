"""Every kind of bound derived again from its witness, by hand; and every way a witness can lie."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.audit.witness import CLAIMS, KINDS, audit_bounds, judge, rederive
from shopfloor.model.results import Bound
from shopfloor.model.shop import Closure, Shop
from tests.audit.plans import PAINT, PLAN, Row, shop, stated
from tests.audit.simple import legal
from tests.audit.test_properties import legal_plans

MINUTE = 60

# Wash: 30 + 20 min; CMM, two units: 40 min behind the wash and 25 min from 07:00; Test: 15 min after all.
HALL = shop(
    {"Wash": 1, "CMM": 2, "Test": 1},
    [
        ("TQ-101", "Wash", 30, 1),
        ("TQ-101", "CMM", 40, 2),
        ("TQ-101", "Test", 15, 3),
        ("TQ-102", "Wash", 20),
        ("TQ-103", "CMM", 25),
    ],
    release={"TQ-103": "07:00"},
)
ROUNDS = shop(
    {"Wash": 1, "Test": 2},
    [("TQ-101", "Wash", 30), ("TQ-101", "Test", 30), ("TQ-102", "Test", 30), ("TQ-103", "Test", 30)],
)
CREW = shop(
    {"Wash": 1, "CMM": 1},
    [("TQ-101", "Wash", 30, 1), ("TQ-101", "CMM", 20, 2), ("TQ-102", "CMM", 45)],
    crew={"Blue": 2},
)
SHORT_CREW = replace(CREW, crews=(replace(CREW.crews[0], levels=((30 * MINUTE, 60 * MINUTE, 1),)),))
EQUAL_CREW = shop(
    {"Wash": 1, "CMM": 1, "Test": 1},
    [("TQ-101", "Wash", 30), ("TQ-102", "CMM", 30), ("TQ-103", "Test", 30)],
    crew={"Blue": 2},
)
SET_UP_CREW = replace(
    CREW,
    machines=tuple(replace(machine, set_up_only=True) for machine in CREW.machines),
    operations=replace(CREW.operations, setup_s=[600, 600, 600]),
)
RED = replace(PAINT, machines=(replace(PAINT.machines[0], family="red"),))
BOOTH = {"machine": "Booth", "from_s": 0, "load_s": 5400, "tail_s": 0}
RUNS = {"machine": "Booth", "load_s": 5400}
LATE = replace(PAINT, orders=replace(PAINT.orders, release_s=[0, 0, 7200]))
BREAK = (Closure(45 * MINUTE, 60 * MINUTE, "tea"),)


def with_break(hall: Shop, *, pausing: bool) -> Shop:
    machines = tuple(replace(machine, pauses=pausing) for machine in hall.machines)
    return replace(hall, breaks=BREAK, machines=machines)


BY_HAND: list[tuple[str, Shop, dict[str, Any], int]] = [
    # TQ-101: 30 + 40 + 15
    ("order", HALL, {"order": "TQ-101"}, 85),
    # TQ-103: an hour of waiting, then 25
    ("order", HALL, {"order": "TQ-103"}, 60 + 25),
    # a quarter of an hour of tea in it, over which the machines pause
    ("order", with_break(HALL, pausing=True), {"order": "TQ-101"}, 85 + 15),
    # Wash: 50 of work, and no operation must follow both
    ("machine", HALL, {"machine": "Wash", "from_s": 0, "load_s": 3000, "tail_s": 0}, 50),
    # CMM from 06:30: (40 + 25) / 2 = 32.5 behind the half hour, and nothing must follow TQ-103
    ("machine", HALL, {"machine": "CMM", "from_s": 1800, "load_s": 3900, "tail_s": 0}, 62.5),
    # Test from 07:10: only TQ-101, after 30 + 40
    ("machine", HALL, {"machine": "Test", "from_s": 4200, "load_s": 900, "tail_s": 0}, 85),
    # Wash of TQ-101 alone would leave 55, but from 06:00 on TQ-102 counts too
    (
        "machine",
        with_break(HALL, pausing=True),
        {"machine": "Wash", "from_s": 0, "load_s": 3000, "tail_s": 0},
        65,
    ),
    # grey, white, grey again: one change of 20, and ten minutes of the booth's own closure
    (
        "machine",
        PAINT,
        {"machine": "Booth", "from_s": 0, "load_s": 5400, "tail_s": 0, "changeover_s": 1200},
        120,
    ),
    # … and another, if the booth begins the shift in red
    (
        "machine",
        RED,
        {"machine": "Booth", "from_s": 0, "load_s": 5400, "tail_s": 0, "changeover_s": 2400},
        140,
    ),
    # less than is forced is true as well
    ("machine", RED, {**BOOTH, "changeover_s": 60}, 101),
    # from red to grey or white, one change between them, and ten minutes of closure
    ("runs", RED, {**RUNS, "grid_s": 1}, 140),
    # white, grey, then the last grey when it is there at 08:00
    ("runs", LATE, {**RUNS, "grid_s": 1}, 120 + 30),
    # on a grid of an hour it counts as there after one open hour, not after 110 min
    ("runs", LATE, {**RUNS, "grid_s": 3600}, 120),
    # TQ-101 alone leaves 55 min after the wash
    ("window", HALL, {"machine": "Wash", "from_s": 0, "load_s": 1800, "tail_s": 3300}, 30 + 55),
    # the tea falls into what follows the wash
    (
        "window",
        with_break(HALL, pausing=True),
        {"machine": "Wash", "from_s": 0, "load_s": 1800, "tail_s": 60},
        31,
    ),
    # three operations on two units: two rounds
    ("rounds", ROUNDS, {"node": "machine", "id": "Test", "operations": 3, "round_s": 1800}, 60),
    ("rounds", ROUNDS, {"node": "order", "id": "TQ-101", "operations": 2, "round_s": 1800}, 60),
    # the second round does not fit before tea at 06:45, or pauses over it
    (
        "rounds",
        with_break(ROUNDS, pausing=False),
        {"node": "order", "id": "TQ-101", "operations": 2, "round_s": 1800},
        90,
    ),
    (
        "rounds",
        with_break(ROUNDS, pausing=True),
        {"node": "machine", "id": "Test", "operations": 3, "round_s": 1800},
        75,
    ),
    ("longest", HALL, {"order": "TQ-103", "machine": "CMM"}, 60 + 25),
    # 30 + 20 + 45 for two heads
    ("crew", CREW, {"crew": "Blue", "from_s": 0, "head_seconds": 5700}, 47.5),
    # only what must wait for the wash
    ("crew", CREW, {"crew": "Blue", "from_s": 1800, "head_seconds": 1200}, 40),
    # only 10 min of each are set-up, and only that is attended
    ("crew", SET_UP_CREW, {"crew": "Blue", "from_s": 0, "head_seconds": 1800}, 15),
    # the two longest: 20 of set-up for two heads, and at least 35 to run without them
    ("crew", SET_UP_CREW, {"crew": "Blue", "from_s": 0, "tail_s": 2100, "head_seconds": 1200}, 10 + 35),
    # two heads, one from 06:30 to 07:00: 60 + 30 of the 95, then 5 for two
    ("crew", SHORT_CREW, {"crew": "Blue", "from_s": 0, "head_seconds": 5700}, 62.5),
    # the same with tea from 06:45: 60 + 15, then 20 for two from 07:00 on
    (
        "crew",
        with_break(SHORT_CREW, pausing=True),
        {"crew": "Blue", "from_s": 0, "head_seconds": 5700},
        70,
    ),
    # two at once, so three take two rounds
    (
        "crew rounds",
        EQUAL_CREW,
        {"crew": "Blue", "from_s": 0, "operations": 3, "at_once": 2, "round_s": 1800},
        60,
    ),
]


@pytest.mark.parametrize(("kind", "hall", "witness", "minutes"), BY_HAND)
def test_each_kind_derives_what_was_worked_out_by_hand(
    kind: str, hall: Shop, witness: dict[str, Any], minutes: float
) -> None:
    value = int(minutes * MINUTE)
    assert rederive(hall, Bound(kind, 0, witness, "")) == value
    [verdict] = judge(hall, [Bound(kind, value, witness, "")])
    assert verdict.holds
    assert verdict.value_s == value


def test_every_kind_is_worked_out_by_hand() -> None:
    assert {kind for kind, *_ in BY_HAND} == set(KINDS)
    assert not set(KINDS) & set(CLAIMS)


TAMPERED: list[tuple[str, Shop, dict[str, Any], str]] = [
    ("order", HALL, {}, "lacks order"),
    ("order", HALL, {"order": 101}, "has order 101, which is no name"),
    ("order", HALL, {"order": "TQ-199"}, "names order 'TQ-199', which the shop does not have"),
    ("machine", HALL, {"machine": "Oven"}, "names machine 'Oven', which the shop does not have"),
    (
        "machine",
        HALL,
        {"machine": "Wash", "from_s": 0, "load_s": 3060, "tail_s": 0},
        "states load_s 3060, but the load is 3000",
    ),
    (
        "machine",
        HALL,
        {"machine": "Wash", "from_s": 0, "load_s": 3000, "tail_s": 60},
        "states tail_s 60, but the least work afterwards is 0",
    ),
    (
        "machine",
        HALL,
        {"machine": "Wash", "from_s": 1, "load_s": 3000, "tail_s": 0},
        "counts no operation: none must wait until 1 s",
    ),
    (
        "machine",
        HALL,
        {"machine": "Wash", "from_s": -60, "load_s": 3000, "tail_s": 0},
        "has from_s -60, which is no whole number from 0",
    ),
    (
        "machine",
        HALL,
        {"machine": "Wash", "from_s": True, "load_s": 3000, "tail_s": 0},
        "has from_s True, which is no whole number from 0",
    ),
    (
        "machine",
        HALL,
        {"machine": "Wash", "from_s": 0, "load_s": 3000.0, "tail_s": 0},
        "has load_s 3000.0, which is no whole number from 0",
    ),
    (
        "machine",
        PAINT,
        {**BOOTH, "changeover_s": 1260},
        "states changeover_s 1260, but the families force 1200",
    ),
    (
        "machine",
        replace(RED, orders=replace(RED.orders, release_s=[1200] * 3)),
        {**BOOTH, "from_s": 1200, "changeover_s": 2400},
        "states changeover_s 2400, but the families force 1200",
    ),
    (
        "runs",
        PAINT,
        {**RUNS, "grid_s": 0},
        "counts on Booth changing over as one unit, on a grid of a second or more",
    ),
    (
        "runs",
        HALL,
        {"machine": "Wash", "load_s": 3000, "grid_s": 1},
        "counts on Wash changing over as one unit, on a grid of a second or more",
    ),
    ("runs", PAINT, {**RUNS, "grid_s": 1, "load_s": 1}, "states load_s 1, but the load is 5400"),
    (
        "window",
        HALL,
        {"machine": "Wash", "from_s": 0, "load_s": 3000, "tail_s": 3301},
        "counts no operation: none leaves 3301 s to do",
    ),
    (
        "rounds",
        ROUNDS,
        {"node": "machine", "id": "Test", "operations": 4, "round_s": 1800},
        "states operations 4, but the visits of Test are 3",
    ),
    (
        "rounds",
        ROUNDS,
        {"node": "machine", "id": "Test", "operations": 3, "round_s": 3600},
        "counts rounds of 1 h, but Test has a visit of 30 min",
    ),
    (
        "rounds",
        ROUNDS,
        {"node": "crew", "id": "Test", "operations": 3, "round_s": 1800},
        "has the node 'crew', which is neither order nor machine",
    ),
    (
        "rounds",
        shop({"Test": 2}, [("TQ-101", "Test", 30, None, True)] * 3),
        {"node": "machine", "id": "Test", "operations": 3, "round_s": 1800},
        "counts whole rounds, but visits of Test may be split",
    ),
    (
        "rounds",
        replace(ROUNDS, machines=(*ROUNDS.machines, replace(ROUNDS.machines[0], id="Spare"))),
        {"node": "machine", "id": "Spare", "operations": 0, "round_s": 0},
        "counts the visits of Spare, which has none",
    ),
    (
        "longest",
        HALL,
        {"order": "TQ-103", "machine": "Wash"},
        "names a visit that order TQ-103 does not make",
    ),
    ("crew", CREW, {"crew": "Red", "from_s": 0}, "names crew 'Red', which the shop does not have"),
    (
        "crew",
        CREW,
        {"crew": "Blue", "from_s": 0, "head_seconds": 5701},
        "states head_seconds 5701, but the crew's work is 5700",
    ),
    (
        "crew",
        replace(CREW, crews=(replace(CREW.crews[0], heads=0),)),
        {"crew": "Blue", "from_s": 0, "head_seconds": 5700},
        "counts on the heads of crew Blue, which has none",
    ),
    (
        "crew",
        CREW,
        {"crew": "Blue", "from_s": 0, "tail_s": 1201, "head_seconds": 5700},
        "counts no operation: none leaves 1201 s to do",
    ),
    (
        "crew rounds",
        replace(EQUAL_CREW, crews=(replace(EQUAL_CREW.crews[0], levels=((0, 60, 3),)),)),
        {"crew": "Blue", "from_s": 0, "operations": 3, "at_once": 2, "round_s": 1800},
        "counts on the heads of crew Blue, which are not always there",
    ),
    (
        "crew rounds",
        replace(
            EQUAL_CREW, machines=tuple(replace(machine, set_up_only=True) for machine in EQUAL_CREW.machines)
        ),
        {"crew": "Blue", "from_s": 0, "operations": 3, "at_once": 2, "round_s": 1800},
        "counts whole rounds, but some are attended only while they are set up",
    ),
    (
        "crew rounds",
        EQUAL_CREW,
        {"crew": "Blue", "from_s": 0, "operations": 3, "at_once": 1, "round_s": 1800},
        "states at_once 1, but the operations at once are 2",
    ),
    (
        "crew rounds",
        replace(EQUAL_CREW, operations=replace(EQUAL_CREW.operations, heads=[0, 1, 2])),
        {"crew": "Blue", "from_s": 0, "operations": 3, "at_once": 1, "round_s": 1800},
        "counts rounds, but its operations take 0 to 2 heads",
    ),
]


@pytest.mark.parametrize(("kind", "hall", "witness", "why"), TAMPERED)
def test_a_tampered_witness_proves_nothing(kind: str, hall: Shop, witness: dict[str, Any], why: str) -> None:
    sentence = f"The witness of the {kind} bound {why}."
    assert rederive(hall, Bound(kind, 60, witness, "")) == sentence
    violations, notes = audit_bounds(hall, stated([], bounds=(Bound(kind, 60, witness, ""),)))
    assert [(v.rule, v.sentence) for v in violations] == [("bound-witness", sentence)]
    assert notes == []


def test_a_solver_s_bound_is_a_claim_and_no_violation() -> None:
    bound = Bound("solver", 7200, {"solver": "CP-SAT"}, "")
    assert audit_bounds(HALL, stated(PLAN, bounds=(bound,))) == (
        [],
        [
            "That nothing can end before 08:00 was proved by a solver's search and cannot be derived again "
            "by arithmetic; it is accepted as a claim."
        ],
    )
    assert rederive(HALL, bound) == (
        "The solver bound was proved by a solver's search and cannot be derived again by arithmetic."
    )


@settings(max_examples=150, deadline=None)
@given(legal_plans(), st.data())
def test_no_bound_that_a_witness_proves_lies_above_a_legal_plan(
    case: tuple[Shop, Any], data: st.DataObject
) -> None:
    """Whatever a true witness derives, no legal plan ends before it: the derivations are sound."""
    hall, plan = case
    assert legal(hall, plan)
    end = int(plan.end_s.max())
    operation = data.draw(st.sampled_from(list(hall)))
    machine = hall.machines[operation.machine]
    begin, tail = data.draw(st.integers(0, 12)), data.draw(st.integers(0, 4))
    # The figures of a machine or crew witness are found as the audit corrects them.
    kinds: list[tuple[str, dict[str, Any]]] = [
        ("order", {"order": operation.order}),
        ("longest", {"order": operation.order, "machine": operation.machine_id}),
        ("machine", {"machine": machine.id, "from_s": begin, "load_s": 0, "tail_s": 0}),
        (
            "machine",
            {"machine": machine.id, "from_s": begin, "load_s": 0, "tail_s": 0, "changeover_s": 10**6},
        ),
        (
            "window",
            {"machine": machine.id, "from_s": begin, "load_s": 0, "tail_s": tail},
        ),
        ("runs", {"machine": machine.id, "load_s": 0, "grid_s": begin + 1}),
        ("rounds", {"node": "machine", "id": machine.id, "operations": 0, "round_s": operation.seconds}),
        ("rounds", {"node": "order", "id": operation.order, "operations": 0, "round_s": operation.seconds}),
        ("crew", {"crew": "Blue", "from_s": begin, "head_seconds": 0}),
        (
            "crew rounds",
            {"crew": "Blue", "from_s": begin, "operations": 0, "at_once": 0, "round_s": operation.seconds},
        ),
    ]
    kind, witness = data.draw(st.sampled_from(kinds))
    value = rederive(hall, Bound(kind, 0, witness, ""))
    for _ in range(4):
        if isinstance(value, str) and " states " in value:
            key = value.split(" states ")[1].split()[0]
            witness[key] = int(value.rstrip(".").split()[-1])
            value = rederive(hall, Bound(kind, 0, witness, ""))
    assert isinstance(value, str) or value <= end


def test_many_bounds_are_judged_from_one_reading_of_the_shop() -> None:
    bounds = [Bound("order", 85 * MINUTE, {"order": "TQ-101"}, "")] * 1_000
    assert all(verdict.holds for verdict in judge(HALL, bounds))


def test_a_plan_may_state_a_weaker_bound_that_holds() -> None:
    """An order's bound below the best is true, so it is no violation."""
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30), ("TQ-102", "Wash", 30)])
    plan = stated(
        [Row("TQ-101", "Wash", "06:00", "06:30")], bounds=(Bound("order", 1800, {"order": "TQ-101"}, ""),)
    )
    assert audit_bounds(hall, plan) == ([], [])
