"""Text tables: every encoding, separator and decimal mark; quotes, row numbers, limits."""

from __future__ import annotations

import csv
import io
import random

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor import settings
from shopfloor.errors import InputError
from shopfloor.read.orders import load
from shopfloor.read.separated import MAX_LINE_BYTES
from tests.read.reading import faults_of, patient, reading, rules_of, shop_of, texts_of

ENCODINGS = {
    "utf-8": b"",
    "utf-8-sig": b"",  # the codec writes the mark
    "utf-16": b"",  # here too
    "utf-16-le": b"",
    "utf-16-be": b"",
    "utf-16-be with mark": b"\xfe\xff",
    "utf-32": b"",
    "cp1252": b"",
}
WORDS = "Prüfstand – «Größe 3»"  # every letter exists in Windows-1252


@pytest.mark.parametrize("newline", ["\n", "\r\n", "\r"])
@pytest.mark.parametrize("separator", [",", ";", "\t"])
@pytest.mark.parametrize("encoding", ENCODINGS)
def test_every_encoding_and_separator_gives_the_same_shop(
    encoding: str, separator: str, newline: str
) -> None:
    mark = "." if separator == "," else ","
    lines = [
        ["Order", "MACHINE", "minutes", "note"],
        ["007", WORDS, f"12{mark}5", '"say ""now""; a, b\tc"'],
        ["TQ-2", "CMM", "1:30", ""],
    ]
    text = newline.join(separator.join(line) for line in lines) + newline
    data = ENCODINGS[encoding] + text.encode(encoding.removesuffix(" with mark"))
    shop = shop_of(data)
    assert shop.orders.ids == ("007", "TQ-2")
    assert [machine.id for machine in shop.machines] == [WORDS, "CMM"]
    assert shop.operations.seconds.tolist() == [750, 5400]
    assert shop.operations.notes == {0: 'say "now"; a, b\tc'}
    assert shop.operations.row.tolist() == [2, 3]


@pytest.mark.parametrize(
    ("separator", "mark"), [(",", "."), (";", "."), (";", ","), ("\t", "."), ("\t", ",")]
)
def test_every_decimal_mark_that_a_separator_allows(separator: str, mark: str) -> None:
    text = separator.join(("order", "machine", "minutes")) + "\n"
    text += "".join(separator.join(("A", "M", f"{whole}{mark}25")) + "\n" for whole in range(3))
    assert shop_of(text).operations.seconds.tolist() == [15, 75, 135]


_cells = st.text(st.sampled_from('aé,;\t "\n|='), max_size=5)


@patient
@given(
    st.lists(st.tuples(_cells, _cells), min_size=1, max_size=5),
    st.sampled_from([",", ";", "\t"]),
    st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "cp1252"]),
    st.sampled_from(["\n", "\r\n"]),
)
def test_notes_survive_whatever_they_hold(
    notes: list[tuple[str, str]], separator: str, encoding: str, newline: str
) -> None:
    """A table written by the standard writer reads back, cell for cell."""
    out = io.StringIO(newline="")
    writer = csv.writer(out, delimiter=separator, lineterminator=newline)
    writer.writerow(["order", "machine", "minutes", "note", "extra"])
    writer.writerows(["A", "M", 5, note, extra] for note, extra in notes)
    shop = shop_of(out.getvalue().encode(encoding))
    assert [shop.operation(k).note for k in range(len(notes))] == [note.strip() for note, _ in notes]


def test_the_separator_is_found_by_the_header_and_not_by_counting() -> None:
    text = 'order;machine;note;minutes\nA;M;"a, b, c, d, e";1,5\nB;M;"f, g, h, i, j";2,5\n'
    assert shop_of(text).operations.seconds.tolist() == [90, 150]


def test_separators_inside_quoted_headers_do_not_count() -> None:
    text = '"order";"machine";"plant, area, line";"minutes"\nA;M;"1, 2, 3";5\n'
    assert shop_of(text).operations.seconds.tolist() == [300]


def test_a_line_that_names_the_separator_is_obeyed_and_not_counted() -> None:
    shop = shop_of("sep=;\r\norder;machine;minutes\r\nA;M;5\r\n")
    assert shop.operations.row.tolist() == [2]


def test_a_separator_that_is_not_read_is_named_as_the_fault() -> None:
    (fault,) = faults_of("order|machine|minutes\nA|M|5\n")
    assert fault.rule == "separator-unknown"
    assert fault.text() == (
        "orders.csv row 1: 'order|machine|minutes' is one cell where a header should be; "
        "separate columns by comma, semicolon or tab"
    )


def test_rows_are_numbered_as_a_spreadsheet_shows_them() -> None:
    """Blank rows count; a cell with line breaks is still one row."""
    text = 'order,machine,minutes,note\n\nA,M,5,"two\nlines"\n,,,\nB,M,5,\n   \nC,M,x,\n'
    (fault,) = faults_of(text)
    assert fault.row == 7
    shop = shop_of(text.replace("x", "5"))
    assert shop.operations.row.tolist() == [3, 5, 7]


def test_a_blank_after_the_separator_belongs_to_no_cell() -> None:
    shop = shop_of('order, machine, minutes\nA, "M, left", 5\n')
    assert shop.machines[0].id == "M, left"


def test_a_quote_never_closed_is_the_end_of_a_truncated_file() -> None:
    text = 'order,machine,minutes,note\nA,M,5,fine\nB,M,x,fine\nC,M,5,"cut he'
    assert [(fault.rule, fault.row) for fault in faults_of(text)] == [
        ("minutes-unreadable", 3),
        ("open-quote", 4),
    ]


def test_a_quote_that_swallows_pages_is_reported_where_it_opens() -> None:
    text = 'order,machine,minutes,note\nA,M,5,"open\n' + "B,M,5,fine\n" * 20_000
    assert [(fault.rule, fault.row) for fault in faults_of(text)] == [("open-quote", 2)]


def test_after_a_stray_quote_reading_goes_on_with_the_next_line() -> None:
    text = 'order,machine,minutes\nA,"M" x,5\nB,M,x\nC,"N" y,5\n'
    assert [(fault.rule, fault.row) for fault in faults_of(text)] == [
        ("stray-quote", 2),
        ("minutes-unreadable", 3),
        ("stray-quote", 4),
    ]


def test_an_inch_mark_inside_a_cell_needs_no_care() -> None:
    assert shop_of('order,machine,minutes\nA,Lathe 3",5\n').machines[0].id == 'Lathe 3"'


@pytest.mark.parametrize("data", [b"", b"\n\n\n", b" , ,\n,,\n", "\ufeff".encode()])
def test_empty_files(data: bytes) -> None:
    (fault,) = faults_of(data)
    assert fault.rule == "file-empty"
    assert fault.text() == "orders.csv: is empty; export it again"


def test_a_header_alone_is_no_orders_file() -> None:
    for text in ("order,machine,minutes", "order,machine\n\n,\n"):
        (fault,) = faults_of(text)
        assert fault.rule == "no-rows"
        assert fault.text() == "orders.csv row 1: has a header but no rows; export it again with its rows"


def test_bytes_that_are_no_text() -> None:
    (fault,) = faults_of(b"order,machine\n\x00\x01\x02\n")
    assert fault.rule == "binary"
    assert fault.text() == "orders.csv: is no text file: it holds NUL bytes; save it as CSV or XLSX"
    assert rules_of(bytes(range(256)) * 8) == ["binary"]
    assert rules_of("order,machine\nA,M\0\n".encode("utf-16")) == ["binary"]


def test_a_byte_that_no_encoding_has_is_pointed_at() -> None:
    (fault,) = faults_of(b"order,machine\nA,M\x81\n")
    assert fault.rule == "encoding-unknown"
    assert fault.text() == (
        "orders.csv: is neither UTF-8, UTF-16 nor Windows-1252 (byte 18 is 0x81); save it as CSV in UTF-8"
    )


def test_utf8_with_a_flaw_is_not_taken_for_windows_1252() -> None:
    data = "order,machine\nA,Prüfstand\nB,Größe\nC,Wäsche\n".encode() + b"D,M\xff\n"
    (fault,) = faults_of(data)
    assert fault.rule == "encoding-broken"
    assert fault.text() == "orders.csv: is not valid UTF-8 from byte 51 on; save it again as CSV in UTF-8"


@pytest.mark.parametrize("data", [b"\xef\xbb\xbforder,machine\nA,\xff\n", b"\xff\xfeo\x00r\x00d"])
def test_a_byte_order_mark_is_a_promise(data: bytes) -> None:
    assert rules_of(data) == ["encoding-broken"]


@pytest.mark.parametrize(
    ("start", "kind"),
    [
        (b"%PDF-1.7\n", "a PDF"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an old .xls workbook or one with a password"),
        (b"\x1f\x8b\x08", "a compressed file"),
        (b"<!DOCTYPE html><table>", "a web page"),
        (b"\xef\xbb\xbf  <html>", "a web page"),
        (b"<?xml version='1.0'?><Workbook/>", "an XML file"),
        (b"\x89PNG\r\n", "a picture"),
    ],
)
def test_other_kinds_of_file_are_called_by_their_name(start: bytes, kind: str) -> None:
    (fault,) = faults_of(start + b"\0" * 100)
    assert fault.rule == "not-a-table"
    assert fault.problem == f"is {kind}, which this tool does not read"
    assert fault.advice.startswith("save it as CSV or XLSX")


def test_limits_on_size_rows_columns_and_cells(monkeypatch: pytest.MonkeyPatch) -> None:
    rows = "A,M,5\n" * 50
    monkeypatch.setattr(settings, "MAX_ROWS", 20)
    (fault,) = faults_of("order,machine,minutes\n" + rows)
    assert (fault.rule, fault.row) == ("too-many-rows", 22)
    assert fault.text() == "orders.csv row 22: is beyond the 20 rows this tool reads; split the file"
    assert len(shop_of("order,machine,minutes\n" + "A,M,5\n" * 20)) == 20

    monkeypatch.setattr(settings, "MAX_FILE_BYTES", 300)
    (fault,) = faults_of("order,machine,minutes\n" + rows)
    assert fault.rule == "file-too-large"
    assert fault.text() == (
        "orders.csv: has more than 300 bytes; delete what is not needed, or split the file"
    )

    monkeypatch.setattr(settings, "MAX_CELL_CHARACTERS", 10)
    text = "order,machine,minutes,note,other\nA,M,5,eleven char,a cell that nobody reads\n"
    assert texts_of(text) == [
        "orders.csv row 2, column note: 'eleven char' has 11 characters, more than 10; shorten it"
    ]


def test_a_header_of_a_thousand_columns_is_enough() -> None:
    (fault,) = faults_of("order,machine" + ",x" * 1000 + "\nA,M\n")
    assert fault.rule == "too-many-columns"
    assert fault.text() == (
        "orders.csv row 1: has 1,002 columns, more than 1,000; delete the columns not needed"
    )


def test_one_endless_line_is_refused_before_it_is_split() -> None:
    (fault,) = faults_of(b"order,machine\nA,M\n" + b"," * (MAX_LINE_BYTES + 1) + b"\nB,M\n")
    assert (fault.rule, fault.row) == ("line-too-long", 3)
    assert fault.text() == (
        "orders.csv row 3: is a line of more than 1,000,000 bytes; check that this is the right file"
    )


def test_hostile_names_are_read_as_the_text_they_are() -> None:
    names = [
        "</script><script>alert(1)</script>",
        "=cmd|' /C calc'!A0",
        "@SUM(A1)",
        "-2+3",
        "שלום עולם",
        "{problem}",
        "%s",
    ]
    out = io.StringIO()
    csv.writer(out).writerows([["order", "machine", "minutes"], *([name, name, 5] for name in names)])
    shop = shop_of(out.getvalue())
    assert list(shop.orders.ids) == names
    assert [machine.id for machine in shop.machines] == names


def test_a_cell_of_ten_thousand_characters_is_one_fault_and_shown_short() -> None:
    for column in ("order", "machine", "minutes", "note"):
        row = {"order": "A", "machine": "M", "minutes": "5", "note": ""} | {column: "7" * 10_000}
        (fault,) = faults_of(",".join(row) + "\n" + ",".join(row.values()) + "\n")
        assert (fault.rule, fault.column, len(fault.value)) == ("cell-too-long", column, 40)


def test_a_title_above_the_header_is_skipped_and_mentioned() -> None:
    text = "Work orders of 2 March,,\n,,\norder,machine,minutes\nA,M,5\n"
    found = reading(text)
    (notice,) = found.notices
    assert notice.rule == "rows-above-header"
    assert notice.text() == (
        "orders.csv: the rows above the header (row 3) are not read; nothing to do if they are a title"
    )
    assert found.shop.operations.row.tolist() == [4]


def test_random_bytes_are_a_fault_and_never_a_crash() -> None:
    """Whatever the bytes, the answer is a shop or a list of faults."""
    choose = random.Random(1)
    for length in (1, 2, 3, 10, 200) * 60:
        assert rules_of(choose.randbytes(length))


@patient
@given(st.binary(max_size=200))
def test_any_bytes_after_a_header_give_a_shop_or_faults(tail: bytes) -> None:
    try:
        shop = load(b"order,machine,minutes,due,priority\nA,M,5,1:00,2\n" + tail).shop
    except InputError as error:
        said = [fault.text() for fault in error.faults]
    else:
        said = [shop.operation(0).order]
    assert said
    assert all(said)
