"""Plan files back into stated plans: what is written is read, and what is doubtful is refused."""

from __future__ import annotations

import io
import json
from collections.abc import Callable
from datetime import datetime
from itertools import pairwise
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import shopfloor.settings
from shopfloor.errors import InputError
from shopfloor.model.calendar import Clock
from shopfloor.model.results import Bound, Choice, Plan
from shopfloor.model.schedule import NO_ROUND, Schedule
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.model.stated import StatedPlan, state
from shopfloor.read.plan import load_plan
from shopfloor.read.rules import MAX_FAULTS
from shopfloor.render.tables import plan_csv, plan_json

START = datetime(2026, 3, 2, 6, 0)


def hall(clock: Clock | None = None, orders: tuple[str, ...] = ("TQ-101", "TQ-102")) -> Shop:
    size = len(orders)
    return Shop(
        (Machine("Wash"), Machine("Test", count=2)),
        Orders(orders),
        Operations(np.arange(size), np.arange(size) % 2, np.full(size, 1800)),
        clock=clock or Clock(START),
    )


def text(*rows: str, header: str = "order,machine,unit,start,end,round,part,parts,note") -> bytes:
    return "\n".join([header, *rows, ""]).encode()


def rows_of(plan: StatedPlan) -> list[tuple[Any, ...]]:
    names = ("unit", "start_s", "end_s", "round", "part", "parts")
    columns = [getattr(plan, name).tolist() for name in names]
    return list(zip(plan.order, plan.machine, *columns, strict=True))


def faults(source: bytes, shop: Shop | None = None) -> list[str]:
    with pytest.raises(InputError) as caught:
        load_plan(source, shop or hall(), name="plan")
    return [fault.text() for fault in caught.value.faults]


def made(shop: Shop) -> Plan:
    """A plan of `shop`, one operation after another, the second half in parts where it may be."""
    size = len(shop)
    ends = np.cumsum(shop.operations.seconds)
    bound = Bound("order", 1800, {"order": shop.orders.ids[0]}, "so it is")
    return Plan(
        shop,
        Schedule(np.arange(size), ends - shop.operations.seconds, ends, round=np.arange(1, size + 1)),
        (bound,),
        Choice("by hand", "for a test", {}),
        options={"seed": 0},
    )


# ---- tables -----------------------------------------------------------------------------------------


def test_a_row_is_read_with_its_number() -> None:
    plan = load_plan(text("TQ-101,Wash,1,2026-03-02T06:00:00,2026-03-02T06:30:00,1,1,1,careful"), hall())
    assert rows_of(plan) == [("TQ-101", "Wash", 1, 0, 1800, 1, 1, 1)]
    assert plan.row.tolist() == [2]
    assert (plan.makespan_s, plan.lower_bound_s, plan.proved_optimal, plan.fits_shift) == (None,) * 4
    assert plan.bounds == ()


def test_columns_may_stand_anywhere_and_be_spelled_loosely() -> None:
    source = text(
        "06:30;;x;2026-03-02 06:00;Wash;TQ-101",
        ";;;;;",
        "7:00;2;;06:30:00;Test;TQ-102",
        header="End;UNIT;Remark;Start_;  machine;ORDER",
    )
    plan = load_plan(source, hall())
    assert rows_of(plan) == [
        ("TQ-101", "Wash", 1, 0, 1800, NO_ROUND, 1, 1),
        ("TQ-102", "Test", 2, 1800, 3600, NO_ROUND, 1, 1),
    ]
    assert plan.row.tolist() == [2, 4]


def test_names_unknown_to_the_shop_are_left_for_the_audit() -> None:
    plan = load_plan(text("TQ-999,Oven,9,6:00,5:00,0,2,1,"), hall())
    assert rows_of(plan) == [("TQ-999", "Oven", 9, 0, 82800, 0, 2, 1)]


def test_elapsed_times() -> None:
    plan = load_plan(text("TQ-101,Wash,,0:00:00,0:30:00,,,,"), hall(Clock()))
    assert rows_of(plan) == [("TQ-101", "Wash", 1, 0, 1800, NO_ROUND, 1, 1)]


def test_the_apostrophe_before_a_formula_is_taken_off_again() -> None:
    plan = load_plan(text("'=1+1,'@home,1,6:00,6:30,,,,", "'quoted,''-5,1,6:30,7:00,,,,"), hall())
    assert list(plan.order) == ["=1+1", "'quoted"]
    assert list(plan.machine) == ["@home", "'-5"]


TIMES = [
    (
        "02/03/2026 06:30",
        "is a date in a local form, which does not mean the same everywhere; write it as "
        "2026-03-02T06:00:00, "
        "or save the column as text",
    ),
    (
        "3/2/26 6:30 AM",
        "is a date in a local form, which does not mean the same everywhere; write it as "
        "2026-03-02T06:00:00, "
        "or save the column as text",
    ),
    (
        "02.03.2026 06:30",
        "is a date in a local form, which does not mean the same everywhere; write it as "
        "2026-03-02T06:00:00, "
        "or save the column as text",
    ),
    (
        "6:30 PM",
        "is a time on a 12-hour clock; write it as 2026-03-02T06:00:00, or save the column as text",
    ),
    (
        "46083.2708333333",
        "is a spreadsheet's number for a time; write it as 2026-03-02T06:00:00, or save the "
        "column as date and "
        "time",
    ),
    ("2026-03-02", "is a date without a time; write it as 2026-03-02T06:00:00"),
    ("2026-02-30T06:00", "is no date; write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"),
    ("later", "is no time this tool reads; write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"),
    ("2096-03-02T06:30:00", "is more than 10 years from the shift; check the year"),
    ("#REF!", "is a spreadsheet's error value; correct the formula there, and save again"),
]


@pytest.mark.parametrize(("given", "problem"), TIMES)
def test_a_time_that_may_mean_several_is_refused(given: str, problem: str) -> None:
    assert faults(text(f"TQ-101,Wash,1,{given},2026-03-03T06:30,,,,")) == [
        f"plan row 2, column start: {given!r} {problem}"
    ]


def test_every_fault_is_listed_in_the_order_of_the_file() -> None:
    source = text(
        "TQ-101,Wash,1,2026-03-02T06:00,,1,1,1,",
        ",,one,3/2/26 6:30,2026-03-02T07:00,,,,",
        "TQ-102,Te\u200bst,1,06:00,06:30,-1,x,2,",
    )
    assert faults(source) == [
        "plan row 2, column end: '' is empty; fill in the end, or delete the row",
        "plan row 3, column order: '' is empty; fill in the order, or delete the row",
        "plan row 3, column machine: '' is empty; fill in the machine, or delete the row",
        "plan row 3, column unit: 'one' is no whole number; write digits such as 1, or leave it empty",
        "plan row 3, column start: '3/2/26 6:30' is a date in a local form, which does not mean the same "
        "everywhere; write it as 2026-03-02T06:00:00, or save the column as text",
        "plan row 4, column machine: 'Te\\u200bst' holds a line break or an invisible character (U+200B); "
        "delete it",
        "plan row 4, column round: '-1' is no whole number; write digits such as 1, or leave it empty",
        "plan row 4, column part: 'x' is no whole number; write digits such as 1, or leave it empty",
    ]


def test_a_header_without_a_needed_column() -> None:
    assert faults(text("TQ-101,6:00", header="order,start")) == [
        "plan row 1: has no column machine; name the columns order, machine, start, end in the header",
        "plan row 1: has no column end; name the columns order, machine, start, end in the header",
    ]


def test_a_header_with_a_column_twice() -> None:
    assert faults(text("TQ-101,Wash,6:00,6:30,6:40", header="order,machine,start,end,End")) == [
        "plan row 1, column End: 'end' stands in the header twice; delete or rename one"
    ]


def test_a_header_without_rows() -> None:
    assert faults(text()) == ["plan row 1: has a header but no rows; export it again with its rows"]


def test_many_faults_are_counted_and_not_searched_for_one_by_one() -> None:
    """Fifty thousand different unreadable times: a list of the first, and the number of the rest."""
    rows = [f"TQ-101,Wash,1,x{k},6:30,,,," for k in range(50_000)]
    found = faults(text(*rows))
    assert len(found) == MAX_FAULTS + 1
    assert found[-1].startswith("plan: 48,000 more faults are not listed")


def test_a_workbook_with_true_dates(tmp_path: Path) -> None:
    openpyxl = pytest.importorskip("openpyxl")
    book = openpyxl.Workbook()
    book.active.title = "Summary"
    book.active.append(["order", "note"])
    sheet = book.create_sheet("Plan")
    sheet.append(["order", "machine", "unit", "start", "end", "round", "part", "parts", "note"])
    sheet.append(["TQ-101", "Wash", 1, datetime(2026, 3, 2, 6, 0), "2026-03-02T06:30:00", None, 1, 1, ""])
    sheet.append(["TQ-102", "Test", 2, datetime(2026, 3, 2, 6, 30), datetime(2026, 3, 2, 7, 0), 2, 1, 1, ""])
    path = tmp_path / "plan.xlsx"
    book.save(path)
    assert rows_of(load_plan(path, hall())) == [
        ("TQ-101", "Wash", 1, 0, 1800, NO_ROUND, 1, 1),
        ("TQ-102", "Test", 2, 1800, 3600, 2, 1, 1),
    ]


@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16", "cp1252"])
def test_encodings(encoding: str) -> None:
    shop = hall(orders=("TQ-é", "TQ-102"))
    source = text("TQ-é,Wash,1,6:00,6:30,,,,").decode().encode(encoding)
    assert list(load_plan(source, shop).order) == ["TQ-é"]


# ---- a clock set back, and one set forward -----------------------------------------------------------

BACK = Clock(datetime(2026, 10, 24, 22, 0), ZoneInfo("Europe/London"))  # 02:00 BST becomes 01:00 GMT
HOUR = 3600


@pytest.mark.parametrize(
    ("start", "end", "begin_h", "end_h"),
    [
        ("00:45", "01:15", 2.75, 3.25),  # half an hour only if it ends in the first pass
        ("01:45", "02:15", 4.75, 5.25),  # … only if it starts in the second
        ("01:45", "01:15", 3.75, 4.25),  # … only if it starts in the first and ends in the second
        ("01:00", "01:30", 3, 3.5),  # in either pass: the first is taken
        ("01:30", "03:00", 3.5, 6),  # in neither: the first is taken
        ("01:30", "01:00", 3.5, 4),  # the wall clock seems to run backwards
    ],
)
def test_the_hour_that_occurs_twice(start: str, end: str, begin_h: float, end_h: float) -> None:
    source = text(f"TQ-101,Wash,1,2026-10-25T{start},2026-10-25T{end},,,,")
    [row] = rows_of(load_plan(source, hall(BACK)))
    assert (row[3] / HOUR, row[4] / HOUR) == (begin_h, end_h)


def test_rounds_through_the_hour_that_occurs_twice() -> None:
    """Half-hour rounds from 00:30 BST to 02:00 GMT: six of them, of which two pairs read the same."""
    walls = ["00:30", "01:00", "01:30", "01:00", "01:30", "02:00", "02:30"]
    rows = [
        f"TQ-10{k % 2 + 1},Wash,1,2026-10-25T{start},2026-10-25T{end},{k + 1},,,"
        for k, (start, end) in enumerate(pairwise(walls))
    ]
    shop = hall(BACK)
    shop = Shop(
        shop.machines, shop.orders, Operations([0, 1] * 3, [0] * 6, np.full(6, 1800)), clock=shop.clock
    )
    read = load_plan(text(*rows), shop)
    assert (read.start_s / HOUR).tolist() == [2.5, 3, 3.5, 4, 4.5, 5]
    assert (read.end_s / HOUR).tolist() == [3, 3.5, 4, 4.5, 5, 5.5]


def test_an_hour_that_is_skipped_is_a_fault() -> None:
    forward = Clock(datetime(2026, 3, 28, 22, 0), ZoneInfo("Europe/London"))
    assert faults(text("TQ-101,Wash,1,2026-03-29T01:15,2026-03-29T02:15,,,,"), hall(forward)) == [
        "plan row 2, column start: '2026-03-29T01:15' does not exist, the clocks go forward "
        "over it; write the "
        "time after the change"
    ]


# ---- plan.json --------------------------------------------------------------------------------------


def document(**changes: Any) -> dict[str, Any]:
    row = {"order": "TQ-101", "machine": "Wash", "unit": 1, "start_s": 0, "end_s": 1800, "round": None,
           "part": 1, "parts": 1}  # fmt: skip
    whole = {
        "schema": 1,
        "shift_start": "2026-03-02T06:00:00",
        "makespan_s": 1800,
        "lower_bound_s": 1800,
        "proved_optimal": True,
        "fits_shift": None,
        "bounds": [{"kind": "order", "value_s": 1800, "witness": {"order": "TQ-101"}, "sentence": "so"}],
        "assignments": [row],
    }
    return {**whole, **changes}


def as_json(**changes: Any) -> bytes:
    return json.dumps(document(**changes)).encode()


def test_plan_json_is_read_with_its_claims() -> None:
    plan = load_plan(as_json(), hall())
    assert rows_of(plan) == [("TQ-101", "Wash", 1, 0, 1800, NO_ROUND, 1, 1)]
    assert plan.row.tolist() == [1]
    assert (plan.makespan_s, plan.lower_bound_s, plan.proved_optimal, plan.fits_shift) == (
        1800,
        1800,
        True,
        None,
    )
    assert plan.bounds == (Bound("order", 1800, {"order": "TQ-101"}, "so"),)


def test_what_plan_json_leaves_out_is_no_claim() -> None:
    row = {"order": "TQ-101", "machine": "Wash", "start_s": 0, "end_s": 1800}
    plan = load_plan(json.dumps({"schema": 1, "assignments": [row]}).encode("utf-16"), hall())
    assert rows_of(plan) == [("TQ-101", "Wash", 1, 0, 1800, NO_ROUND, 1, 1)]
    assert (plan.makespan_s, plan.bounds) == (None, ())


ROW = document()["assignments"][0]
BOUND = document()["bounds"][0]
AGAIN = "save the plan again, or audit its plan.csv"
WRONG: list[tuple[bytes, list[str]]] = [
    (b"[]", ["plan: '[]' is a list, not an object; write an object"]),
    (
        b"{",
        [f"plan: is not valid JSON (expecting property name enclosed in double quotes, line 1); {AGAIN}"],
    ),
    (
        b'{"schema": 1, "schema": 1}',
        [f"plan: is not valid JSON (the key 'schema' stands in one object twice); {AGAIN}"],
    ),
    (b'{"schema": NaN}', [f"plan: is not valid JSON (nan is no number); {AGAIN}"]),
    (
        b'{"schema": ' + b"9" * 5000 + b"}",
        [
            "plan: is not valid JSON (exceeds the limit (4300 digits) for integer string "
            "conversion: value has "
            f"5000 digits); {AGAIN}"
        ],
    ),
    (b"[" * 100_000, [f"plan: is not valid JSON (it is nested too deeply); {AGAIN}"]),
    (b'{"a": "\xff"}', [f"plan: is not valid JSON (byte 8 is not UTF-8); {AGAIN}"]),
    (
        as_json(schema=2),
        [
            "plan, column schema: '2' is not a version this release reads; use 1, or the "
            "release that wrote the "
            "plan"
        ],
    ),
    (
        as_json(schema=True),
        ["plan, column schema: 'true' is true or false, not a whole number; write a whole number"],
    ),
    (b'{"schema": 1}', ["plan, column assignments: '' is missing; add it; every plan has one"]),
    (
        as_json(makespan_s="1800", fits_shift=1),
        [
            "plan, column makespan_s: '1800' is a text, not a whole number or null; write a "
            "whole number or null",
            "plan, column fits_shift: '1' is a whole number, not true or false or null; write "
            "true or false or "
            "null",
        ],
    ),
    (
        as_json(lower_bound_s=10**12),
        [
            "plan, column lower_bound_s: '1000000000000' is beyond 316,224,000 s from the "
            "shift's start; correct "
            "it"
        ],
    ),
    (
        as_json(shift_start="2026-03-02T07:00:00"),
        [
            "plan, column shift_start: '2026-03-02T07:00:00' is not the start of this shift, "
            "2026-03-02T06:00:00; give the start that the plan was made for, or audit its plan.csv"
        ],
    ),
    (
        as_json(assignments=[ROW, 7]),
        ["plan row 2, column assignments: '7' is a whole number, not an object; write an object"],
    ),
    (
        as_json(assignments=[{**ROW, "start_s": 0.0}, {**ROW, "end_s": True}]),
        [
            "plan row 1, column start_s: '0.0' is a decimal number, not a whole number; write a whole number",
            "plan row 2, column end_s: 'true' is true or false, not a whole number; write a whole number",
        ],
    ),
    (
        as_json(assignments=[{key: value for key, value in ROW.items() if key != "end_s"}]),
        ["plan row 1, column end_s: '' is missing; add it; every assignment has one"],
    ),
    (
        as_json(assignments=[{**ROW, "order": ""}, {**ROW, "machine": "a\nb"}]),
        [
            "plan row 1, column order: '' is empty; fill in the order, or delete the row",
            "plan row 2, column machine: 'a\\nb' holds a line break or an invisible character (U+000A); "
            "delete it",
        ],
    ),
    (
        as_json(assignments=[{**ROW, "unit": 10**10}]),
        ["plan row 1, column unit: '10000000000' is more than 1,000,000,000; correct it"],
    ),
    (
        as_json(bounds=[BOUND, {**BOUND, "witness": "TQ-101"}]),
        ["plan, column bounds[2].witness: 'TQ-101' is a text, not an object; write an object"],
    ),
    (
        as_json(bounds=[3]),
        ["plan, column bounds[1]: '3' is a whole number, not an object; write an object"],
    ),
]


@pytest.mark.parametrize(("source", "expected"), WRONG)
def test_what_is_wrong_in_plan_json(source: bytes, expected: list[str]) -> None:
    assert faults(source) == expected


def test_a_plan_that_counts_from_zero_is_not_taken_for_one_on_the_clock() -> None:
    assert faults(as_json(), hall(Clock())) == [
        "plan, column shift_start: '2026-03-02T06:00:00' is not the start of this shift, which is not known; "
        "give the start that the plan was made for, or audit its plan.csv"
    ]
    assert load_plan(as_json(shift_start=None), hall(Clock())).start_s.tolist() == [0]


# ---- all sources --------------------------------------------------------------------------------------


def test_limits(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(shopfloor.settings, "MAX_ROWS", 2)
    three = [f"TQ-101,Wash,1,{k}:00,{k}:30,,,," for k in (6, 7, 8)]
    assert faults(text(*three)) == ["plan row 4: is beyond the 2 rows this tool reads; split the file"]
    assert faults(as_json(assignments=[ROW] * 3)) == [
        "plan, column assignments: '' has 3 entries, more than 2; check that this is the right file"
    ]


@pytest.mark.parametrize(("source", "start"), [(b"", "plan: is empty"), (b"%PDF-1.7", "plan: is a PDF")])
def test_files_that_are_no_plan(source: bytes, start: str) -> None:
    assert faults(source)[0].startswith(start)


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"^gone\.csv: there is no such file"):
        load_plan(tmp_path / "gone.csv", hall())


names = st.text(
    st.characters(codec="utf-8", exclude_categories=["Cc", "Cf", "Cs", "Zl", "Zp"]), min_size=1, max_size=12
).filter(lambda name: name == name.strip())
clocks = st.sampled_from([Clock(), Clock(START), Clock(START, ZoneInfo("America/New_York")), BACK])


@settings(max_examples=100, deadline=None)
@given(
    st.lists(names, min_size=1, max_size=4, unique=True),
    names,
    clocks,
    st.sampled_from([plan_csv, plan_json]),
)
def test_what_our_writers_write_is_read_back(
    orders: list[str], machine: str, clock: Clock, write: Callable[[Plan], str]
) -> None:
    """A plan with any names on any clock, around the hour that occurs twice too, comes back as it was."""
    size = len(orders)
    shop = Shop(
        (Machine(machine),),
        Orders(tuple(orders)),
        Operations(np.arange(size), np.zeros(size), np.arange(5401, 5401 + size)),
        clock=clock,
    )
    plan = made(shop)
    read = load_plan(io.BytesIO(write(plan).encode("utf-8")), shop)
    assert rows_of(read) == rows_of(state(plan))
    if write is plan_json:
        assert read.bounds == plan.bounds
        assert (read.makespan_s, read.lower_bound_s) == (plan.makespan_s, plan.lower_bound_s)
        assert (read.proved_optimal, read.fits_shift) == (plan.proved_optimal, plan.fits_shift)
