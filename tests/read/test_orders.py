"""Orders as a whole: what rows share and inherit, what is noticed, and reading back what was written."""

from __future__ import annotations

import csv
import io
import subprocess
import sys
from datetime import datetime, timedelta
from pathlib import Path

import numpy as np
import openpyxl
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

import shopfloor
from shopfloor.errors import InputError
from shopfloor.model.calendar import Clock, elapsed
from shopfloor.model.shop import NO_DUE, NO_FAMILY, NO_STEP, Machine, Operations, Orders, Shop
from shopfloor.read.orders import load, read_orders
from shopfloor.render.tables import harmless
from tests.read.reading import START, faults_of, patient, reading, shop_of, texts_of
from tests.strategies import shops

LISTED = '[[machine]]\nid = "WASH"\n[[machine]]\nid = "CMM"\ncount = 2\n[[machine]]\nid = "COAT"\n'


# ---- orders, machines, rows -------------------------------------------------------------------------


def test_orders_and_machines_come_in_order_of_first_appearance() -> None:
    shop = shop_of("order,machine,minutes\nB,Y,1\nA,X,2\nB,X,3\n 0A ,Y,4\n")
    assert shop.orders.ids == ("B", "A", "0A")
    assert [machine.id for machine in shop.machines] == ["Y", "X"]
    assert shop.operations.job.tolist() == [0, 1, 0, 2]
    assert shop.operations.machine.tolist() == [0, 1, 1, 0]
    assert shop.operations.seconds.tolist() == [60, 120, 180, 240]


def test_outer_blanks_do_not_make_another_name() -> None:
    shop = shop_of("order,machine\nA,M\n A\u00a0, M\nA ,\tM\n")
    assert (shop.orders.ids, len(shop.machines)) == (("A",), 1)


def test_a_blank_cell_takes_the_blank_of_its_column() -> None:
    shop = shop_of(
        "order,machine,minutes,release,due,priority,step,splittable,heads,family,note\nA,M,5,,,,,,,,\n"
    )
    operation = shop.operation(0)
    assert (operation.step, operation.splittable, operation.heads, operation.note) == (None, False, 1, "")
    assert (shop.orders[0].release_s, shop.orders[0].due_s, shop.orders[0].priority) == (0, None, 1.0)
    assert shop.operations.family.tolist() == [NO_FAMILY]


def test_every_column_arrives_in_the_shop() -> None:
    text = (
        "order,machine,minutes,release,due,priority,step,splittable,heads,family,note\n"
        "A,M,5,1:00,9:00,2.5,7,yes,0,red,hot\n"
    )
    found = reading(text)
    shop = found.shop
    operation = shop.operation(0)
    assert (operation.step, operation.splittable, operation.heads, operation.note) == (7, True, 0, "hot")
    assert (shop.orders[0].release_s, shop.orders[0].due_s, shop.orders[0].priority) == (3600, 32_400, 2.5)
    assert (shop.families, shop.operations.family.tolist()) == (("red",), [0])
    assert [(notice.rule, notice.column) for notice in found.notices] == [
        ("column-idle", "heads"),
        ("column-idle", "family"),
    ]
    assert found.notices[0].text() == (
        "orders.csv row 1, column heads: 'heads' counts for nothing while shop.toml has no [[crew]]; "
        "the plan does not depend on it"
    )


def test_machines_of_the_floor_stay_in_its_order_also_when_nothing_visits_them() -> None:
    shop = shop_of("order,machine\nA,COAT\nA,WASH\n", shop=LISTED)
    assert shop.machines == (Machine("WASH"), Machine("CMM", count=2), Machine("COAT"))
    assert shop.operations.machine.tolist() == [2, 0]


def test_an_unknown_machine_is_named_with_the_nearest_known_one() -> None:
    assert texts_of("order,machine\nA,cmm\nA,LATHE\n", shop=LISTED) == [
        "orders.csv row 2, column machine: 'cmm' is not among the machines of shop.toml; "
        "write 'CMM' if that is meant, add a [[machine]] with this id there, or correct the name",
        "orders.csv row 3, column machine: 'LATHE' is not among the machines of shop.toml; "
        "add a [[machine]] with this id there, or correct the name",
    ]


def test_machines_are_not_called_unknown_while_the_list_itself_is_in_doubt() -> None:
    rules = [
        fault.rule for fault in faults_of("order,machine\nA,LATHE\n", shop=LISTED + "[[machine]]\nid = 7\n")
    ]
    assert rules == ["wrong-kind"]


# ---- what belongs to the order ------------------------------------------------------------------------


def test_release_due_and_priority_are_inherited_by_the_other_rows_of_an_order() -> None:
    text = (
        "order,machine,release,due,priority\nA,M,,,\nB,M,,,\n"
        "A,N,07:00,09:00,2\nA,O,7:00,2026-03-02T09:00,2.0\n"
    )
    shop = shop_of(text, start=START)
    assert shop.orders.release_s.tolist() == [3600, 0]
    assert shop.orders.due_s.tolist() == [10_800, NO_DUE]
    assert shop.orders.priority.tolist() == [2.0, 1.0]


@pytest.mark.parametrize(
    ("column", "one", "two"), [("release", "1:00", "2:00"), ("due", "1:00", "2:00"), ("priority", "1", "2")]
)
def test_an_order_has_one_of_each_and_both_rows_are_named(column: str, one: str, two: str) -> None:
    text = f"order,machine,{column}\nA,M,\nA,N,{one}\nB,M,{two}\nA,O,{two}\nA,P,{one}\nA,Q,{two}\n"
    faults = faults_of(text)
    assert [(fault.rule, fault.row) for fault in faults] == [
        (f"{column}-differs", 5),
        (f"{column}-differs", 7),
    ]
    assert faults[0].problem == f"differs from {one!r} in row 3 of the same order"


def test_an_order_released_before_the_shift_is_there_when_it_starts() -> None:
    shop = shop_of("order,machine,release\nA,M,2026-03-01T12:00\n", start=START)
    assert shop.orders.release_s.tolist() == [0]


def test_an_order_may_be_late_before_the_shift_starts() -> None:
    shop = shop_of("order,machine,due\nA,M,2026-03-01T12:00\n", start=START)
    assert shop.orders.due_s.tolist() == [-18 * 3600]


def test_a_due_time_before_the_release_is_a_fault_even_if_both_are_past() -> None:
    text = "order,machine,release,due\nA,M,2026-03-01T12:00,\nA,N,,2026-03-01T11:00\nA,O,,2026-03-01T11:00\n"
    (fault,) = faults_of(text, start=START)
    assert (fault.rule, fault.row) == ("due-before-release", 3)
    assert fault.text() == (
        "orders.csv row 3, column due: '2026-03-01T11:00' is before the release of order 'A', "
        "'2026-03-01T12:00'; "
        "correct the one or the other"
    )
    assert len(shop_of(text.replace("T11:00", "T12:00"), start=START)) == 3


def test_a_time_of_day_before_the_start_is_past_midnight() -> None:
    shop = shop_of("order,machine,release,due\nA,M,23:00,05:30\n", start="2026-03-02T22:00")
    assert (shop.orders[0].release_s, shop.orders[0].due_s) == (3600, 27_000)


# ---- notices --------------------------------------------------------------------------------------------


def test_an_order_sent_to_one_machine_twice_is_legal_and_mentioned() -> None:
    found = reading("order,machine\nA,M\nB,M\nA,N\nB,M\nA,M\nA,M\n")
    assert len(found.shop) == 6
    (notice,) = found.notices
    assert notice.rule == "visit-repeated"
    assert notice.text() == (
        "orders.csv: 3 rows send an order to a machine it already visits (first: rows 3 and 5, 'B' on 'M'); "
        "each is planned as a visit of its own; delete what stands there twice by mistake"
    )


def test_machines_that_read_alike_are_mentioned_where_none_are_listed() -> None:
    found = reading("order,machine\nA,WASH\nB,CMM\nC,C-M-M\nD, cmm \nE,Wash\nF,---\nG,...\n")
    assert [notice.rule for notice in found.notices] == ["machines-alike"] * 3
    assert [notice.text() for notice in found.notices][:2] == [
        "orders.csv row 4, column machine: 'C-M-M' reads like 'CMM' in row 3 but is taken as another "
        "machine; "
        "write one spelling if they are the same",
        "orders.csv row 5, column machine: 'cmm' reads like 'CMM' in row 3 but is taken as another machine; "
        "write one spelling if they are the same",
    ]


# ---- faults ---------------------------------------------------------------------------------------------


def test_every_fault_of_every_row_comes_in_one_go_in_the_order_of_the_file() -> None:
    text = "due,order,machine,minutes,priority\nnoon,,,0,-1\n,A,M,5,\nnoon,B,M,x,\n"
    found = [(fault.row, fault.rule) for fault in faults_of(text)]
    assert found == [
        (2, "due-unreadable"),
        (2, "order-missing"),
        (2, "machine-missing"),
        (2, "minutes-not-positive"),
        (2, "number-not-positive"),
        (4, "due-unreadable"),
        (4, "minutes-unreadable"),
    ]


def test_a_file_that_is_wrong_all_over_is_cut_to_a_list_that_can_be_read() -> None:
    rows = "".join(f"A{k},,x{k}\n" for k in range(3000))
    faults = faults_of("order,machine,minutes\n" + rows)
    assert len(faults) == 2001
    assert [(fault.row, fault.rule) for fault in faults[:3]] == [
        (2, "machine-missing"),
        (2, "minutes-unreadable"),
        (3, "machine-missing"),
    ]
    assert faults[-1].text().startswith("orders.csv: 4,000 more faults are not listed")


def test_no_file_is_half_accepted() -> None:
    with pytest.raises(InputError) as caught:
        load(b"order,machine,minutes\nA,M,5\nA,M,x\n")
    assert [notice.rule for notice in caught.value.notices] == ["visit-repeated"]


def test_an_input_error_loads_nothing_heavy() -> None:
    code = (
        "import sys\n"
        "from shopfloor.errors import InputError\n"
        "from shopfloor.read.orders import load\n"
        "try:\n    load(sys.argv[1])\nexcept InputError:\n    pass\n"
        "print(*{'pandas', 'openpyxl', 'networkx', 'plotly', 'ortools'} & set(sys.modules))"
    )
    path = Path(__file__).parents[2] / "data" / "faulty" / "orders.csv"
    done = subprocess.run([sys.executable, "-c", code, str(path)], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == ""


# ---- frames ---------------------------------------------------------------------------------------------


def test_a_frame_is_read_by_the_same_rules() -> None:
    frame = pd.DataFrame(
        {
            "Order": [7, 7, 8],
            "machine": ["CMM", "WASH", "CMM"],
            "minutes": [12.5, 30.0, 0.51],
            "due": [pd.Timestamp("2026-03-02T09:00"), pd.NaT, pd.NaT],
            "step": [1.0, np.nan, 2.0],
            "note": ["hot", None, pd.NA],
        },
        index=[10, 10, 11],
    )
    found = load(frame, start=START)
    assert found.shop.orders.ids == ("7", "8")
    assert found.shop.operations.seconds.tolist() == [750, 1800, 31]
    assert found.shop.operations.row.tolist() == [2, 3, 4]
    assert found.shop.operations.step.tolist() == [1, NO_STEP, 2]
    assert found.shop.operations.notes == {0: "hot"}
    assert [notice.where for notice in found.notices] == ["DataFrame"]
    assert found.inputs[0][0] == "DataFrame"
    assert found.inputs == load(frame.copy(), start=START).inputs
    assert found.inputs != load(frame.assign(note="x"), start=START).inputs


def test_faults_of_a_frame_name_its_rows_by_position() -> None:
    frame = pd.DataFrame({"order": ["A", np.nan, "C"], "machine": "M", "minutes": [1.5, 2, -np.inf]})
    with pytest.raises(InputError) as caught:
        read_orders(frame)
    assert [fault.text() for fault in caught.value.faults] == [
        "DataFrame row 3, column order: '' is empty; write the order's number",
        "DataFrame row 4, column minutes: '-inf' is no time; "
        "write minutes such as 30 or 12.5, or h:mm such as 0:30",
    ]


def test_frames_without_rows_or_columns() -> None:
    for frame, rule in (
        (pd.DataFrame(), "file-empty"),
        (pd.DataFrame({"order": [], "machine": []}), "no-rows"),
    ):
        with pytest.raises(InputError) as caught:
            read_orders(frame)
        assert [fault.rule for fault in caught.value.faults] == [rule]


def test_the_package_offers_read_orders() -> None:
    assert shopfloor.read_orders is read_orders
    assert len(shopfloor.read_orders(io.BytesIO(b"order,machine\nA,M\n"), start=START, end="14:00")) == 1


# ---- reading back what was written ------------------------------------------------------------------------


def rows_of(shop: Shop, write: object) -> list[list[str]]:
    """Write a shop as the rows of an orders file; what belongs to an order stands in its first row only."""
    rows = [
        ["order", "machine", "minutes", "release", "due", "priority", "step", "splittable", "heads", "note"]
    ]
    seen: set[str] = set()
    for operation in shop:
        job = shop.orders[operation.job]
        own = ["", "", ""]
        if operation.order not in seen:
            seen.add(operation.order)
            due = "" if job.due_s is None else write(job.due_s)  # type: ignore[operator]
            own = [write(job.release_s), due, str(job.priority)]  # type: ignore[operator]
        rows.append(
            [
                operation.order,
                operation.machine_id,
                elapsed(operation.seconds, with_seconds=True),
                *own,
                "" if operation.step is None else str(operation.step),
                "yes" if operation.splittable else "",
                str(operation.heads),
                operation.note,
            ]
        )
    return rows


def as_csv(rows: list[list[str]], separator: str, encoding: str) -> bytes:
    out = io.StringIO(newline="")
    csv.writer(out, delimiter=separator).writerows(rows)
    return out.getvalue().encode(encoding)


def as_xlsx(rows: list[list[str]]) -> bytes:
    book = openpyxl.Workbook()
    for row, texts in enumerate(rows, start=1):
        for column, text in enumerate(texts, start=1):
            cell = book.active.cell(row, column, text)
            cell.data_type = "s"  # a text that begins with = is no formula
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def assert_same(shop: Shop, other: Shop) -> None:
    """The other shop has the orders that have operations, and otherwise the same content."""
    assert other.clock == shop.clock
    assert [machine.id for machine in other.machines] == [machine.id for machine in shop.machines]
    assert len(other) == len(shop)
    for one, two in zip(shop, other, strict=True):
        for name in ("order", "machine_id", "seconds", "step", "splittable", "heads", "note"):
            assert getattr(one, name) == getattr(two, name), name
        assert shop.orders[one.job] == other.orders[two.job]


@st.composite
def named_shops(draw: st.DrawFn) -> Shop:
    """Shops with names, notes and clocks that are harder to write than those of the other tests."""
    shop = draw(shops(max_orders=3, max_operations=6, max_seconds=100_000))
    letters = st.text(st.sampled_from("aé7,;\t-=\"'<&שß"), min_size=1, max_size=6).map(str.strip)
    names = draw(
        st.lists(
            letters.filter(bool).filter(lambda t: t.isprintable()), min_size=10, max_size=10, unique=True
        )
    )
    notes = {k: draw(letters) for k in range(len(shop)) if draw(st.booleans())}
    clock = draw(
        st.sampled_from([Clock(), Clock(datetime(2026, 3, 2, 6)), Clock(datetime(2026, 12, 31, 22, 15, 30))])
    )
    columns = shop.operations
    return Shop(
        machines=tuple(Machine(name) for name in names[: len(shop.machines)]),
        orders=Orders(
            tuple(names[-len(shop.orders) :]), shop.orders.release_s, shop.orders.due_s, shop.orders.priority
        ),
        operations=Operations(
            columns.job,
            columns.machine,
            columns.seconds,
            columns.step,
            columns.splittable,
            columns.heads,
            notes={k: note for k, note in notes.items() if note},
        ),
        clock=clock,
    )


@patient
@given(
    named_shops(),
    st.sampled_from([",", ";", "\t", "xlsx", "frame"]),
    st.sampled_from(["utf-8", "utf-8-sig", "utf-16"]),
)
def test_a_shop_that_is_written_reads_back_the_same(shop: Shop, form: str, encoding: str) -> None:
    header, *body = rows_of(shop, shop.clock.write)
    names = {place for place, name in enumerate(header) if name in ("order", "machine", "family", "note")}
    rows = [header]  # names and notes as a spreadsheet holds them: none that it would run as a formula
    rows += [[harmless(cell) if k in names else cell for k, cell in enumerate(row)] for row in body]
    listed = "".join(f"[[machine]]\nid = {toml(machine.id)}\n" for machine in shop.machines)
    if form == "frame":
        source: object = pd.DataFrame(rows[1:], columns=rows[0])
    else:
        source = as_xlsx(rows) if form == "xlsx" else as_csv(rows, form, encoding)
    start = None if shop.clock.start is None else shop.clock.start.isoformat()
    assert_same(shop, load(source, shop=listed.encode(), start=start).shop)  # type: ignore[arg-type]


def toml(text: str) -> str:
    """Write a text as TOML does: JSON's rules will do for what these tests draw."""
    return '"' + text.replace("\\", "\\\\").replace('"', '\\"').replace("\t", "\\t") + '"'


def test_reading_twice_gives_the_same_and_so_does_another_hash_seed() -> None:
    """Nothing depends on the order of a set or a dictionary of hashes."""
    code = (
        "import sys; from shopfloor.read.orders import load; from pathlib import Path\n"
        "shop = load(Path(sys.argv[1])).shop\n"
        "print(shop.orders.ids, [m.id for m in shop.machines], shop.operations.seconds.tolist())"
    )
    path = Path(__file__).parents[2] / "data" / "rounds" / "orders.csv"
    outputs = {
        subprocess.run(
            [sys.executable, "-c", code, str(path)],
            capture_output=True, text=True, check=True, env={"PYTHONHASHSEED": seed},
        ).stdout
        for seed in ("0", "1", "2")
    }  # fmt: skip
    assert len(outputs) == 1


def test_a_due_time_moves_with_the_start_it_is_counted_from() -> None:
    text = "order,machine,due\nA,M,2026-03-02T12:00\n"
    for hours in range(6, 12):
        start = datetime(2026, 3, 2) + timedelta(hours=hours)
        assert shop_of(text, start=start).orders.due_s.tolist() == [(12 - hours) * 3600]
