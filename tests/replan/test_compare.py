"""What moved between two plans: pairing of rows, moves, sequences, and what a mid-shift plan leaves out."""

from __future__ import annotations

from itertools import combinations
from random import Random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.model.results import Lateness
from shopfloor.replan.compare import Comparison, Row, Side, compare, longest_in_order


def side(*rows: tuple[str, str, int, int], name: str = "plan.json", **more: object) -> Side:
    """A plan of rows (order, machine, start, end) on unit 1."""
    listed = [Row(order, machine, 1, start, end) for order, machine, start, end in rows]
    return Side(name, "0" * 64, listed, max((row.end_s for row in listed), default=0), **more)  # type: ignore[arg-type]


def kinds(found: Comparison) -> dict[tuple[str, str], str]:
    return {(change.row.order, change.row.machine): change.kind for change in found.changes}


BEFORE = side(("A", "M", 0, 10), ("B", "M", 10, 20), ("C", "M", 20, 30), ("A", "N", 10, 30))


def test_equal_plans_are_the_same_whatever_the_order_of_their_rows() -> None:
    found = compare(BEFORE, side(*[row[:2] + row[3:5] for row in reversed(BEFORE.rows)]))  # type: ignore[arg-type]
    assert found.identical
    assert found.counts == {"same": 4}
    assert found.orders == ()


def test_moved_added_and_dropped_are_told_apart() -> None:
    after = side(("A", "M", 0, 10), ("B", "M", 15, 25), ("D", "M", 25, 30), ("A", "N", 10, 30))
    found = compare(BEFORE, after)
    assert kinds(found) == {
        ("A", "M"): "same",
        ("A", "N"): "same",
        ("B", "M"): "moved",
        ("C", "M"): "dropped",
        ("D", "M"): "added",
    }
    machine = found.machines[0]
    assert (machine.machine, machine.same, machine.moved, machine.added, machine.dropped) == ("M", 1, 1, 1, 1)
    assert (machine.end_before_s, machine.end_after_s) == (30, 30)
    assert [(row.order, row.end_before_s, row.end_after_s) for row in found.orders] == [
        ("B", 20, 25),
        ("C", 30, None),
        ("D", None, 30),
    ]


def test_one_operation_pulled_forward_is_resequenced_and_those_it_pushes_only_move() -> None:
    found = compare(
        BEFORE, side(("C", "M", 0, 10), ("A", "M", 10, 20), ("B", "M", 20, 30), ("A", "N", 20, 40))
    )
    assert [change.row.order for change in found.changes if change.resequenced] == ["C"]
    assert found.counts == {"moved": 4}


def test_operations_that_start_together_on_two_units_may_do_so_in_either_order() -> None:
    rows = [Row("A", "M", 1, 0, 10), Row("B", "M", 2, 0, 10)]
    after = [Row("A", "M", 2, 5, 15), Row("B", "M", 1, 0, 10)]
    found = compare(Side("a", "", rows), Side("b", "", after))
    assert found.resequenced == 0
    assert found.counts == {"moved": 2}


def test_a_small_shift_counts_as_none_within_the_tolerance() -> None:
    after = side(("A", "M", 1, 11), ("B", "M", 11, 21), ("C", "M", 23, 33), ("A", "N", 11, 31))
    assert compare(BEFORE, after, tolerance_s=1).counts == {"moved": 1, "same": 3}


def test_another_length_and_another_unit_are_moves() -> None:
    after = Side("b", "", [Row("A", "M", 2, 0, 10), Row("B", "M", 1, 10, 21)])
    before = Side("a", "", [Row("A", "M", 1, 0, 10), Row("B", "M", 1, 10, 20)])
    assert compare(before, after).counts == {"moved": 2}


def test_several_visits_are_paired_by_what_did_not_change_then_by_length() -> None:
    before = side(("A", "M", 0, 10), ("A", "M", 10, 25), ("A", "M", 40, 50))
    after = side(("A", "M", 0, 15), ("A", "M", 20, 30), ("A", "M", 40, 50))
    pairs = {
        (c.before.start_s, c.after.start_s) for c in compare(before, after).changes if c.before and c.after
    }
    assert pairs == {(40, 40), (0, 20), (10, 0)}


def test_what_began_before_a_plan_of_mid_shift_is_neither_dropped_nor_moved() -> None:
    after = side(("B", "M", 11, 21), ("C", "M", 21, 31), ("A", "N", 12, 32), from_s=15)
    found = compare(BEFORE, after)
    assert kinds(found) == {
        ("A", "M"): "passed",
        ("A", "N"): "passed",
        ("B", "M"): "passed",
        ("C", "M"): "moved",
    }


def test_lateness_of_both_plans_is_told_by_order() -> None:
    late = side(("A", "M", 0, 10), ("B", "M", 10, 20), late=(Lateness("A", 5, 10), Lateness("B", 5, 20)))
    better = side(("A", "M", 0, 10), ("B", "M", 10, 20), late=(Lateness("A", 5, 10),))
    found = compare(late, better)
    assert (found.a.late_s, found.b.late_s) == (20, 5)
    assert [(row.order, row.late_before_s, row.late_after_s) for row in found.orders] == [("B", 15, 0)]


@given(st.lists(st.integers(0, 6), max_size=8))
def test_the_longest_sequence_that_keeps_its_order_is_found(values: list[int]) -> None:
    kept = [value for value, stays in zip(values, longest_in_order(values), strict=True) if stays]
    best = max(
        (
            size
            for size in range(len(values) + 1)
            for some in combinations(values, size)
            if list(some) == sorted(some)
        ),
        default=0,
    )
    assert kept == sorted(kept)
    assert len(kept) == best


@given(st.integers(0, 10**6))
def test_every_row_of_both_plans_appears_once(seed: int) -> None:
    random = Random(seed)

    def rows(size: int) -> list[Row]:
        return [
            Row(
                random.choice("AB"),
                random.choice("MN"),
                1,
                start := random.randrange(9),
                start + random.randrange(1, 4),
            )
            for _ in range(size)
        ]

    one, two = rows(random.randrange(8)), rows(random.randrange(8))
    found = compare(Side("a", "", one), Side("b", "", two))
    assert sorted(c.before for c in found.changes if c.before) == sorted(one)
    assert sorted(c.after for c in found.changes if c.after) == sorted(two)
    back = compare(Side("b", "", two), Side("a", "", one))
    assert back.counts.get("added", 0) == found.counts.get("dropped", 0)
    assert back.counts.get("same", 0) == found.counts.get("same", 0)
    assert back.resequenced == found.resequenced


def test_a_change_without_any_row_cannot_be_asked_for_one() -> None:
    from shopfloor.replan.compare import Change

    with pytest.raises(AssertionError):
        _ = Change(None, None).row
