"""How long each row takes: minutes, quantity × minutes_each, one round; and what is rounded, and said."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.read.reading import faults_of, patient, reading, shop_of, texts_of


def table(header: str, *rows: str) -> str:
    return "\n".join([f"order,machine,{header}", *(f"A{k},M,{row}" for k, row in enumerate(rows))]) + "\n"


def test_without_times_every_row_is_one_round() -> None:
    shop = shop_of("order,machine\nA,M\nB,M\n")
    assert shop.unit_rounds
    assert shop.operations.seconds.tolist() == [1800, 1800]
    assert shop_of("order,machine\nA,M\n", round_minutes=7.5).operations.seconds.tolist() == [450]


def test_a_column_of_times_that_is_empty_throughout_counts_as_none_and_is_mentioned() -> None:
    found = reading(table("minutes,quantity", ",", " ,"), round_minutes=20)
    assert found.shop.unit_rounds
    (notice,) = found.notices
    assert notice.rule == "one-round-each"
    assert notice.text() == (
        "orders.csv row 1, column minutes: 'minutes' has no times: every row is one round of 20 min; "
        "fill in the column if times are known"
    )


def test_times_make_a_shop_that_is_no_longer_one_of_rounds() -> None:
    assert not shop_of(table("minutes", "30", "30")).unit_rounds


@pytest.mark.parametrize("minutes", [0, -30, float("nan"), float("inf"), 0.001, 1 / 3, 10**9])
def test_a_round_is_a_positive_whole_number_of_seconds(minutes: float) -> None:
    (fault,) = faults_of("order,machine\nA,M\n", round_minutes=minutes)
    assert fault.rule == "round-unusable"
    assert fault.text() == (
        f"--round: {str(minutes)!r} is no length of a round; "
        "give whole seconds as minutes, such as 30 or 7.5, at most 525,600"
    )


def test_quantity_times_minutes_each_stands_for_minutes() -> None:
    shop = shop_of(table("quantity,minutes_each", "3,0:10", "100,0.333", "2.5,2"))
    assert shop.operations.seconds.tolist() == [1800, 1998, 300]


def test_the_product_is_rounded_and_not_its_factors() -> None:
    """0.333 min is 19.98 s: a hundred pieces take 1998 s, not 2000 s."""
    assert shop_of(table("quantity,minutes_each", "100,0.333")).operations.seconds.tolist() == [1998]


def test_all_three_may_be_given_where_they_agree() -> None:
    shop = shop_of(table("minutes,quantity,minutes_each", "30,3,10", "1:00,,", ",6,5"))
    assert shop.operations.seconds.tolist() == [1800, 3600, 1800]


def test_all_three_disagreeing_are_a_fault() -> None:
    (fault,) = faults_of(table("minutes,quantity,minutes_each", "30,3,11"))
    assert fault.rule == "minutes-disagree"
    assert fault.text() == (
        "orders.csv row 2, column minutes: '30' is not quantity × minutes_each, which is 33 min; "
        "correct one of the three, or leave minutes empty"
    )


def test_half_a_time_is_a_fault_where_minutes_are_blank() -> None:
    faults = faults_of(table("minutes,quantity,minutes_each", ",3,", ",,10", ",,", "5,,"))
    assert [(fault.rule, fault.row, fault.column) for fault in faults] == [
        ("quantity-alone", 2, "quantity"),
        ("quantity-alone", 3, "minutes_each"),
        ("minutes-missing", 4, "minutes"),
    ]
    assert [fault.rule for fault in faults_of(table("quantity", "3"))] == ["quantity-alone"]
    assert texts_of(table("minutes_each", "3")) == [
        "orders.csv row 2, column minutes_each: '3' has no quantity beside it; "
        "fill in quantity, or write minutes"
    ]


def test_a_quantity_beside_minutes_is_not_multiplied_and_that_is_said() -> None:
    found = reading(table("minutes,quantity", "30,5", "30,", "30,4"))
    assert found.shop.operations.seconds.tolist() == [1800] * 3
    (notice,) = found.notices
    assert notice.rule == "quantity-beside-minutes"
    assert notice.text() == (
        "orders.csv: 2 rows have minutes and only one of quantity and minutes_each (first: row 2); "
        "minutes is taken as the time of the whole lot; fill in both if minutes is the time of one piece"
    )


def test_a_faulty_factor_is_one_fault_and_no_more() -> None:
    assert [f.rule for f in faults_of(table("quantity,minutes_each", "ten,5", "3,x"))] == [
        "number-unreadable",
        "minutes-unreadable",
    ]


def test_a_product_may_be_too_long_or_too_short() -> None:
    faults = faults_of(table("quantity,minutes_each", "1000000,10", "0.01,0.1"))
    assert [(fault.rule, fault.column) for fault in faults] == [
        ("minutes-too-large", "quantity"),
        ("minutes-rounds-to-zero", "minutes_each"),
    ]


def test_what_is_no_whole_second_is_rounded_once_counted_and_shown() -> None:
    found = reading(table("minutes", "30", "0.51", "0.335", "0.51", "12.5"))
    assert found.shop.operations.seconds.tolist() == [1800, 31, 20, 31, 750]
    (notice,) = found.notices
    assert notice.rule == "seconds-rounded"
    assert notice.text() == (
        "orders.csv: 3 times are rounded to the nearest whole second; the first, in row 3, is 30.6 s, "
        "taken as 31 s; nothing to do unless a second matters"
    )


def test_times_of_whole_seconds_are_not_mentioned() -> None:
    assert reading(table("minutes", "0.1", "0.05", "0:00:07", "12.35")).notices == ()


@patient
@given(st.lists(st.tuples(st.integers(1, 999), st.integers(1, 9999)), min_size=1, max_size=6))
def test_products_are_exact(pairs: list[tuple[int, int]]) -> None:
    """Pieces times hundredths of a minute, rounded once: 0.6 s each."""
    rows = [f"{pieces},{each // 100}.{each % 100:02d}" for pieces, each in pairs]
    seconds = shop_of(table("quantity,minutes_each", *rows)).operations.seconds.tolist()
    assert seconds == [(2 * 6 * pieces * each + 10) // 20 for pieces, each in pairs]
