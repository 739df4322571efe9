"""Rows that no plan can hold are refused where they stand; those that outlast the shift are mentioned."""

from __future__ import annotations

import pytest

from shopfloor.errors import InputError
from shopfloor.read.orders import load
from tests.read.reading import faults_of, notices_of, reading, rules_of, texts_of

SHIFT = '[shift]\nstart = "2026-03-02T06:00"\nend = "14:00"\n'
HALL = f"""{SHIFT}breaks = [{{ from = "09:00", to = "09:15" }}]
[[machine]]
id = "CMM"
open = [{{ from = "06:00", to = "10:00" }}]
[[machine]]
id = "RIG"
crew = "fitters"
heads = 2
[[machine]]
id = "WASH"
[[crew]]
id = "fitters"
heads = 2
levels = [{{ from = "07:00", to = "08:00", heads = 3 }}]
"""


def test_each_is_told_at_the_cell_that_says_most() -> None:
    text = (
        "order,machine,minutes,heads,release\n"
        "A,CMM,3:00,,\n"
        "B,CMM,3:01,,\n"
        "C,CMM,5,,10:00\n"
        "D,RIG,5,4,\n"
        "E,RIG,61,3,\n"
        "F,RIG,600,,\n"
        "G,WASH,600,9,\n"
    )
    found = faults_of(text, shop=HALL)
    assert [fault.text() for fault in found] == [
        "orders.csv row 3, column minutes: '3:01' takes 3 h 01 on CMM, longer than its longest opening, 3 h; "
        "open CMM for longer, let it pause, or split the operation",
        "orders.csv row 4, column machine: 'CMM' is not open again from 10:00 on, the earliest that this "
        "operation can start; open CMM for longer, or send the order elsewhere",
        "orders.csv row 5, column heads: '4' needs 4 heads of crew fitters, which never has more than 3; "
        "write fewer, or give the crew more",
        "orders.csv row 6, column heads: '3' needs 3 heads of crew fitters for 1 h 01, but while RIG is open "
        "so many are there for at most 1 h; write fewer, or give the crew more",
    ]
    assert [fault.rule for fault in found] == [
        "longer-than-any-opening",
        "never-open-again",
        "too-few-heads",
        "longer-than-heads-stay",
    ]


def test_a_default_of_the_machine_is_told_at_the_machine() -> None:
    text = HALL.replace("heads = 2\n[[machine]]", "heads = 5\n[[machine]]")
    assert texts_of("order,machine,minutes\nA,RIG,5\n", shop=text) == [
        "orders.csv row 2, column machine: 'RIG' needs 5 heads of crew fitters, which never has more than 3; "
        "write fewer, or give the crew more"
    ]


def test_a_time_that_is_a_product_is_told_at_its_quantity() -> None:
    text = "order,machine,quantity,minutes_each\nA,CMM,100,2\n"
    (fault,) = faults_of(text, shop=HALL)
    assert (fault.rule, fault.column, fault.value) == ("longer-than-any-opening", "quantity", "100")


def test_set_up_counts_as_time_on_the_machine() -> None:
    text = "order,machine,minutes,setup_minutes\nA,CMM,170,10\nB,CMM,170,11\n"
    assert [(fault.row, fault.rule) for fault in faults_of(text, shop=HALL)] == [
        (3, "longer-than-any-opening")
    ]


def test_they_come_in_one_go_with_the_other_faults_of_other_rows() -> None:
    text = (
        "order,machine,minutes,heads\nA,CMM,x,\nB,CMM,400,\nC,RIG,5,four\nD,RIG,5,4\n,RIG,5,4\nE,LATHE,900,\n"
    )
    assert rules_of(text, shop=HALL) == [
        "minutes-unreadable",
        "longer-than-any-opening",
        "heads-unreadable",
        "too-few-heads",
        "order-missing",
        "machine-unknown",
    ]


def test_other_faults_of_shop_toml_make_none_of_them_up() -> None:
    text = HALL.replace('crew = "fitters"', 'crew = "fiters"')
    orders = "order,machine,minutes,heads,due,release\nA,RIG,5,4,07:00,08:00\n"
    assert rules_of(orders, shop=text) == ["crew-unknown", "due-before-release"]
    doubtful = text.replace('"14:00"', '"late"')
    assert rules_of("order,machine,minutes\nA,CMM,900\n", shop=doubtful) == ["end-unreadable", "crew-unknown"]


def test_cutting_makes_room_and_a_crew_from_the_command_line_is_asked_too() -> None:
    orders = b"order,machine,minutes,heads\nA,CMM,200,1\n"
    shop = HALL.encode()
    assert len(load(orders, shop=shop, split=True).shop) == 1
    with pytest.raises(InputError) as caught:
        load(orders, shop=shop)
    assert [fault.rule for fault in caught.value.faults] == ["longer-than-any-opening"]
    with pytest.raises(InputError) as caught:
        load(b"order,machine,heads\nA,WASH,3\n", crew=2)
    assert [fault.text() for fault in caught.value.faults] == [
        "<input> row 2, column heads: '3' needs 3 heads of crew crew, which never has more than 2; "
        "write fewer, or give the crew more"
    ]
    shop_of_three = load(b"order,machine,heads\nA,WASH,3\n", crew=3)
    assert [crew.heads for crew in shop_of_three.shop.crews] == [3]
    assert shop_of_three.notices == ()


@pytest.mark.parametrize("crew", [-1, 10_001, True, 2.5])
def test_a_crew_from_the_command_line_that_is_none(crew: object) -> None:
    (fault,) = faults_of("order,machine\nA,WASH\n", crew=crew)
    assert (fault.rule, fault.text()) == (
        "crew-option-unusable",
        f"--crew: {str(crew)!r} is no number of people; give a whole number from 0 to 10,000",
    )


def test_a_crew_from_the_command_line_needs_a_name_of_its_own() -> None:
    shop = "[[machine]]\nid = 'WASH'\ncrew = 'crew'\n[[crew]]\nid = 'crew'\nheads = 1\n"
    (fault,) = faults_of("order,machine\nA,WASH\n", shop=shop, crew=2)
    assert (fault.rule, fault.text()) == (
        "crew-option-taken",
        "--crew: '2' would make a crew of the name 'crew', which shop.toml has already; "
        "rename the crew there",
    )


def test_orders_released_after_the_shift_are_worth_saying() -> None:
    text = (
        "order,machine,minutes,release\nA,WASH,5,13:00\nB,WASH,5,14:00\nB,RIG,5,\nC,WASH,5,2026-03-03T06:00\n"
    )
    found = reading(text, shop=SHIFT)
    assert [(notice.rule, notice.text()) for notice in found.notices] == [
        (
            "released-after-shift",
            "orders.csv: 2 orders are released at 14:00, when the shift ends, or later; the first is 'B' in "
            "row 3; carry them over to the next shift",
        )
    ]


def test_an_operation_that_outlasts_the_shift_by_itself_is_worth_saying() -> None:
    text = "order,machine,minutes,release\nA,WASH,480,\nB,WASH,60,13:01\nC,WASH,481,\n"
    found = reading(text, shop=SHIFT)
    assert [(notice.rule, notice.text()) for notice in found.notices] == [
        (
            "beyond-shift",
            "orders.csv: 2 operations cannot end within the shift even if nothing else is planned; the first "
            "is 'B' on 'WASH' in row 3; check its time and the opening hours, or carry it over to the next "
            "shift",
        )
    ]
    assert notices_of(text, start="2026-03-02T06:00") == []


def test_a_million_rows_beyond_a_machine_are_cut_to_a_list_that_can_be_read() -> None:
    rows = "".join(f"A{k},CMM,400\n" for k in range(3000))
    faults = faults_of("order,machine,minutes\n" + rows, shop=HALL)
    assert len(faults) == 2001
    assert faults[-1].text().startswith("orders.csv: 1,000 more faults are not listed")
