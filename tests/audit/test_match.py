"""Which operation a row runs, where an order comes to a machine more than once."""

from __future__ import annotations

import numpy as np
import pytest

from shopfloor.audit.pieces import Piece, Search, assemble
from shopfloor.audit.reading import Reading
from shopfloor.audit.schedule import audit
from shopfloor.model.results import Violation
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.model.stated import StatedPlan
from tests.audit.plans import Row, shop, stated


def operations(hall: Shop, rows: list[Row]) -> list[int]:
    return Reading(hall, stated(rows)).operation.tolist()


def test_visits_are_told_apart_by_their_length() -> None:
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30), ("TQ-101", "Wash", 10), ("TQ-101", "Wash", 20)])
    rows = [
        Row("TQ-101", "Wash", "06:00", "06:20"),
        Row("TQ-101", "Wash", "06:20", "06:50"),
        Row("TQ-101", "Wash", "06:50", "07:00"),
    ]
    assert operations(hall, rows) == [2, 0, 1]


def test_of_equally_long_visits_the_earlier_is_the_lower_step() -> None:
    hall = shop(
        {"Wash": 1, "CMM": 1},
        [("TQ-101", "Wash", 30, 3), ("TQ-101", "CMM", 30, 2), ("TQ-101", "Wash", 30, 1)],
    )
    rows = [
        Row("TQ-101", "Wash", "07:00", "07:30"),
        Row("TQ-101", "CMM", "06:30", "07:00"),
        Row("TQ-101", "Wash", "06:00", "06:30"),
    ]
    assert operations(hall, rows) == [0, 1, 2]
    assert audit(hall, stated(rows)) == []


def test_a_visit_without_a_step_may_lie_anywhere_in_the_route() -> None:
    """The first of two washes is too early for the step after the CMM, so it must be the one without."""
    hall = shop(
        {"Wash": 1, "CMM": 1}, [("TQ-101", "Wash", 30, 2), ("TQ-101", "CMM", 30, 1), ("TQ-101", "Wash", 30)]
    )
    rows = [
        Row("TQ-101", "Wash", "06:00", "06:30"),
        Row("TQ-101", "CMM", "06:30", "07:00"),
        Row("TQ-101", "Wash", "07:00", "07:30"),
    ]
    assert operations(hall, rows) == [2, 1, 0]
    assert audit(hall, stated(rows)) == []


def test_parts_go_to_the_operation_that_may_be_split() -> None:
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30), ("TQ-101", "Wash", 30, None, True)])
    rows = [
        Row("TQ-101", "Wash", "06:00", "06:10", part=1, parts=2),
        Row("TQ-101", "Wash", "06:10", "06:30", part=2, parts=2),
        Row("TQ-101", "Wash", "06:30", "07:00"),
    ]
    assert operations(hall, rows) == [1, 1, 0]
    assert audit(hall, stated(rows)) == []


def test_interleaved_parts_of_two_visits_are_put_together_by_their_times() -> None:
    """20 + 40 and 30 + 20: in time order the second parts belong the other way round."""
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 60, None, True), ("TQ-101", "Wash", 50, None, True)])
    rows = [
        Row("TQ-101", "Wash", "06:00", "06:20", part=1, parts=2),
        Row("TQ-101", "Wash", "06:20", "06:50", part=1, parts=2),
        Row("TQ-101", "Wash", "06:50", "07:10", part=2, parts=2),
        Row("TQ-101", "Wash", "07:10", "07:50", part=2, parts=2),
    ]
    assert operations(hall, rows) == [0, 1, 1, 0]
    assert audit(hall, stated(rows)) == []


def test_a_wrong_length_is_one_violation_and_not_one_too_many_and_one_missing() -> None:
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30), ("TQ-101", "Wash", 10)])
    rows = [Row("TQ-101", "Wash", "06:00", "06:10"), Row("TQ-101", "Wash", "06:10", "06:50")]
    assert audit(hall, stated(rows)) == [
        Violation("duration", "TQ-101 on Wash (30 min) is planned from 06:10 to 06:50: 40 min.", (3,))
    ]


def test_an_operation_cut_by_hand_without_part_numbers_is_recognised() -> None:
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30)])
    rows = [Row("TQ-101", "Wash", "06:00", "06:10"), Row("TQ-101", "Wash", "06:20", "06:40")]
    assert [(v.rule, v.rows) for v in audit(hall, stated(rows))] == [
        ("split", (2, 3)),
        ("parts", (2,)),
        ("parts", (3,)),
    ]


def test_a_repeated_part_is_extra() -> None:
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30, None, True)])
    rows = [
        Row("TQ-101", "Wash", "06:00", "06:10", part=1, parts=2),
        Row("TQ-101", "Wash", "06:10", "06:30", part=2, parts=2),
        Row("TQ-101", "Wash", "06:30", "06:50", part=2, parts=2),
    ]
    assert [(v.rule, v.rows) for v in audit(hall, stated(rows))] == [("operation-extra", (2, 4))]


def test_a_third_visit_is_too_many_for_two() -> None:
    hall = shop({"Wash": 1}, [("TQ-101", "Wash", 30), ("TQ-101", "Wash", 30)])
    rows = [Row("TQ-101", "Wash", f"0{hour}:00", f"0{hour}:30") for hour in (6, 7, 8)]
    assert audit(hall, stated(rows)) == [
        Violation(
            "operation-extra",
            "TQ-101 on Wash from 06:00 to 06:30, and again from 08:00 to 08:30: the orders ask for this "
            "visit 2 times.",
            (2, 4),
        )
    ]


def pieces(*columns: tuple[int, int, int, int]) -> list[Piece]:
    """Pieces from parts, part, start and end."""
    return [Piece(*column, column[3] - column[2]) for column in columns]


def test_assemble_deals_every_piece_out_once() -> None:
    found = assemble(
        pieces(
            (2, 1, 0, 2),
            (3, 1, 2, 3),
            (2, 1, 3, 6),
            (2, 2, 6, 8),
            (3, 2, 8, 9),
            (2, 2, 9, 13),
            (3, 3, 13, 14),
        ),
        [6, 3, 5],
        Search(),
    )
    assert found == [[0, 5], [1, 4, 6], [2, 3]]


@pytest.mark.parametrize(
    ("given", "seconds"),
    [
        (pieces((2, 1, 0, 2), (2, 2, 1, 3)), [4]),  # the parts overlap
        (pieces((2, 1, 0, 2), (2, 2, 2, 3)), [4]),  # the sum is wrong
        (pieces((2, 2, 0, 2), (2, 2, 2, 4)), [4]),  # there is no first part
        (pieces((2, 1, 0, 2), (2, 2, 2, 4), (2, 2, 4, 6)), [4]),  # one is left over
    ],
)
def test_assemble_finds_nothing_where_there_is_nothing(given: list[Piece], seconds: list[int]) -> None:
    assert assemble(given, seconds, Search()) is None


def test_assemble_gives_up_when_its_trials_are_spent() -> None:
    """Forty parts that never add up: without the bound the search would outlive the shift."""
    many = pieces(*((2, 1, k, k + 1) for k in range(20)), *((2, 2, 20 + k, 21 + k) for k in range(20)))
    search = Search(trials=5_000)
    assert assemble(many, [2] * 19 + [3], search) is None
    assert search.trials < 0


def test_a_hall_of_one_order_and_one_machine_is_matched_quickly() -> None:
    """Twenty thousand visits alike, half with a step: the bounded search leaves the rest as it was."""
    size = 20_000
    hall = Shop(
        (Machine("Wash"),),
        Orders(("TQ-101",)),
        Operations(np.zeros(size), np.zeros(size), np.ones(size), step=np.where(np.arange(size) % 2, 7, -1)),
    )
    one = np.ones(size, int)
    plan = StatedPlan(
        one, ["TQ-101"] * size, ["Wash"] * size, one, np.arange(size), np.arange(1, size + 1), -one, one, one
    )
    assert audit(hall, plan) == []
