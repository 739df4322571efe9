"""Headers: spelling, an ERP's own names, and what is missing, double or unknown."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.read.columns import COLUMNS
from shopfloor.read.headers import Wanted, loose, nearest
from tests.read.reading import faults_of, patient, reading, shop_of, texts_of

WANTED = Wanted(tuple(COLUMNS), ("order", "machine"))


def respelt(name: str) -> st.SearchStrategy[str]:
    """Other spellings of a header: case, and blanks, `_` or `-` anywhere."""
    letters = [st.sampled_from([c.lower(), c.upper()]) for c in name.replace("_", "")]
    gaps = st.lists(st.sampled_from(["", " ", "_", "-", " - "]), min_size=len(letters), max_size=len(letters))
    return st.tuples(st.tuples(*letters), gaps).map(
        lambda drawn: "".join(c + gap for c, gap in zip(*drawn, strict=True))
    )


@patient
@given(st.sampled_from(list(COLUMNS)).flatmap(lambda name: st.tuples(st.just(name), respelt(name))))
def test_headers_match_whatever_their_case_and_blanks(named: tuple[str, str]) -> None:
    name, header = named
    assert WANTED.find(["x", header]) == {name: [1]}


def test_columns_stand_in_any_order() -> None:
    shop = shop_of("Minutes Each,QUANTITY,Machine-,order\n10,3,M,A\n")
    assert shop.operations.seconds.tolist() == [1800]


def test_the_nearest_name_is_found_whatever_its_case() -> None:
    assert nearest("maschine", ["Machine", "Order"]) == "Machine"
    assert nearest("xyz", ["Machine", "Order"]) is None
    assert nearest("Cmm", ["WASH", "CMM", "cmm"]) == "CMM"  # the first of equals
    assert loose("Minutes-Each \u00a0") == "minuteseach"


def test_missing_columns_are_named_with_the_nearest_header() -> None:
    faults = faults_of('Work Order No,"Mach""ine Nr",Text\nA,M,t\n')
    assert [fault.rule for fault in faults] == ["column-missing", "column-missing"]
    assert faults[0].text() == (
        "orders.csv row 1: has no column order (the nearest header is 'Work Order No'); name it order in the "
        'header, or map it in shop.toml: [columns] order = "Work Order No"'
    )
    assert faults[1].advice.endswith(r'[columns] machine = "Mach\"ine Nr"')
    assert texts_of("order,xyz\nA,B\n") == [
        "orders.csv row 1: has no column machine; name it machine in the header, or map it in shop.toml: "
        '[columns] machine = "your header"'
    ]


def test_a_file_without_a_needed_column_is_read_to_its_end_all_the_same() -> None:
    assert [(f.rule, f.row) for f in faults_of("order,minutes\nA,x\n,5\n")] == [
        ("column-missing", 1),
        ("minutes-unreadable", 2),
        ("order-missing", 3),
    ]


MAPPED = '[columns]\norder = "Work Order No"\nmachine = "Work centre"\nminutes = "Run time"\ndue = "Due by"\n'


def test_an_erps_own_headers_are_mapped() -> None:
    text = "WORK ORDER NO;Work-Centre;run_time;Due by;Order\nA;M;5;9:00;sales order\n"
    found = reading(text, shop=MAPPED)
    assert found.shop.orders.ids == ("A",)
    assert found.shop.orders[0].due_s == 9 * 3600
    (notice,) = found.notices
    assert notice.rule == "columns-not-used"
    assert notice.text() == (
        "orders.csv row 1: these columns are not used: 'Order'; "
        "map them in shop.toml under [columns] if they matter"
    )


def test_faults_call_a_column_as_its_file_does() -> None:
    text = "WORK ORDER NO;Work-Centre;run_time;Due by\nA;M;x;9:00\n"
    assert faults_of(text, shop=MAPPED)[0].where == "orders.csv row 2, column run_time"


def test_a_mapped_header_that_the_export_lacks_is_a_fault() -> None:
    (fault,) = faults_of("Work order no;Work centre;Run time;Due date\nA;M;5;9:00\n", shop=MAPPED)
    assert fault.rule == "mapped-header-missing"
    assert fault.text() == (
        "orders.csv row 1: 'Due by' is not in the header, but [columns] in shop.toml maps due to it; "
        "the nearest is 'Due date'; correct the one or the other"
    )


def test_a_table_with_our_own_headers_is_read_beside_a_mapping() -> None:
    """Such as a carry-over list, which knows nothing of the ERP."""
    found = reading("order,machine,minutes\nA,M,5\n", shop=MAPPED)
    (notice,) = found.notices
    assert notice.rule == "mapped-header-absent"
    assert notice.text() == (
        "orders.csv row 1: 'Due by' is not in the header, though [columns] in shop.toml maps due to it; "
        "nothing to do if this is another export"
    )


def test_times_do_not_get_lost_by_a_slip_in_their_mapping() -> None:
    """Without this every row would be one round."""
    (fault,) = faults_of("order,machine,Run time\nA,M,5\n", shop='[columns]\nminutes = "Run tme"\n')
    assert fault.rule == "mapped-header-missing"
    assert "the nearest is 'Run time'" in fault.problem


def test_columns_that_stand_twice() -> None:
    faults = faults_of("order,machine,note,Note,note,text,text\nA,M,x,y,z,,\n")
    assert [(fault.rule, fault.column) for fault in faults] == [
        ("header-clash", "Note"),
        ("header-duplicate", "note"),
    ]


def test_unknown_columns_are_ignored_with_one_notice() -> None:
    header = "order,machine,minuts,Plant," + ",".join(f"c{k}" for k in range(8))
    found = reading(header + ",,last\n" + "A,M" + ",1" * 12 + "\n")
    assert [notice.rule for notice in found.notices] == ["columns-not-used"]
    assert found.notices[0].problem == (
        "these columns are not used: 'minuts' (is minutes meant?), 'Plant', 'c0', 'c1', 'c2', 'c3', 5 more, "
        "1 without a header"
    )


@pytest.mark.parametrize("junk", ["<script>", "=1+1", "a" * 900, "\u202e", "{name}"])
def test_hostile_headers_are_shown_short_and_harmless(junk: str) -> None:
    (notice,) = reading(f'order,machine,"{junk}"\nA,M,1\n').notices
    assert len(notice.problem) < 120
    assert notice.text().isprintable()
