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


# ---- set-up -----------------------------------------------------------------------------------------

BENCH = "[[machine]]\nid = 'BALANCE'\nsetup_minutes = 10\n[[machine]]\nid = 'WASH'\n"


def test_set_up_comes_on_top_of_the_run_time() -> None:
    shop = shop_of("order,machine,minutes,setup_minutes\nA,M,30,5\nB,M,30,0:07:30\nC,M,30,\nD,M,30,0\n")
    assert shop.operations.seconds.tolist() == [2100, 2250, 1800, 1800]
    assert shop.operations.setup_s.tolist() == [300, 450, 0, 0]


def test_a_blank_set_up_takes_that_of_its_machine_and_zero_is_none() -> None:
    rows = "A,BALANCE,30,\nB,BALANCE,30,0\nC,BALANCE,30,20\nD,WASH,30,\n"
    shop = shop_of("order,machine,minutes,setup_minutes\n" + rows, shop=BENCH)
    assert shop.operations.setup_s.tolist() == [600, 0, 1200, 0]
    assert shop.operations.seconds.tolist() == [2400, 1800, 3000, 1800]
    without = shop_of("order,machine,minutes\nA,BALANCE,30\nB,WASH,30\n", shop=BENCH)
    assert without.operations.setup_s.tolist() == [600, 0]


def test_set_up_comes_on_top_of_a_product_too() -> None:
    shop = shop_of("order,machine,quantity,minutes_each,setup_minutes\nA,M,4,5,10\n")
    assert (shop.operations.seconds.tolist(), shop.operations.setup_s.tolist()) == ([1800], [600])


def test_rounds_with_a_set_up_are_no_longer_all_one_round() -> None:
    assert shop_of("order,machine,setup_minutes\nA,M,\nB,M,0\n").unit_rounds
    shop = shop_of("order,machine\nA,BALANCE\nB,WASH\n", shop=BENCH)
    assert not shop.unit_rounds
    assert shop.operations.seconds.tolist() == [2400, 1800]


def test_a_set_up_is_not_below_zero_and_is_rounded_aloud() -> None:
    assert texts_of("order,machine,minutes,setup_minutes\nA,M,30,-5\nB,M,30,soon\nC,M,30,600000\n") == [
        "orders.csv row 2, column setup_minutes: '-5' is below zero; write 0, or minutes such as 10, or h:mm "
        "such as 0:10",
        "orders.csv row 3, column setup_minutes: 'soon' is no time; "
        "write minutes such as 30 or 12.5, or h:mm such as 0:30",
        "orders.csv row 4, column setup_minutes: '600000' is longer than 525,600 minutes; "
        "correct it, or divide the order",
    ]
    found = reading("order,machine,minutes,setup_minutes\nA,M,30,0.51\nB,M,30,0.004\n")
    assert found.shop.operations.setup_s.tolist() == [31, 0]
    assert [(notice.rule, notice.text()) for notice in found.notices] == [
        (
            "setup-rounded",
            "orders.csv: 2 set-ups are rounded to the nearest whole second; the first, in row 2, is 30.6 s, "
            "taken as 31 s; nothing to do unless a second matters",
        )
    ]
