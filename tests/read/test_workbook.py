"""Workbooks: dates, times, numbers, formulas, sheets; damaged, hostile, and other kinds of file."""

from __future__ import annotations

import contextlib
import io
import zipfile
from collections.abc import Iterable
from datetime import date, datetime, time, timedelta
from typing import Any

import openpyxl
import pytest

from shopfloor import settings
from shopfloor.errors import InputError
from shopfloor.read.orders import load
from tests.read.reading import START, faults_of, reading, rules_of, shop_of, texts_of

HEADER = ("order", "machine", "minutes", "release", "due", "priority", "step", "splittable", "note")


def workbook(*rows: Iterable[Any], sheet: str = "Orders") -> openpyxl.Workbook:
    book = openpyxl.Workbook()
    book.active.title = sheet
    for row in rows:
        book.active.append(list(row))
    return book


def bytes_of(book: openpyxl.Workbook) -> bytes:
    out = io.BytesIO()
    book.save(out)
    return out.getvalue()


def changed(data: bytes, **parts: bytes | None) -> bytes:
    """Return a workbook with parts replaced, by the end of their names, or taken out."""
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new:
        for name in old.namelist():
            match = next((key for key in parts if name.endswith(f"{key}.xml")), None)
            content = old.read(name) if match is None else parts[match]
            if content is not None:
                new.writestr(name, content)
    return out.getvalue()


def test_cells_of_every_kind_become_the_text_that_csv_would_hold() -> None:
    book = workbook(
        HEADER,
        (42, "CMM", 30, time(7, 0), datetime(2026, 3, 2, 9, 30), 2, 1, True, "a\nb"),
        (42.0, "CMM", 12.1, None, None, None, None, None, None),
        ("0042", "WASH", time(0, 45), datetime(2026, 3, 2, 8, 0, 30), None, 0.125, 10.0, "no", None),
        ("T", "WASH", timedelta(hours=30), None, None, None, None, None, "=1+1 as text"),
    )
    book.active["I5"].data_type = "s"
    shop = shop_of(bytes_of(book), start=START)
    assert shop.orders.ids == ("42", "0042", "T")
    assert shop.operations.seconds.tolist() == [1800, 726, 2700, 108_000]
    assert shop.orders.release_s.tolist() == [3600, 7230, 0]
    assert shop.orders[0].due_s == 12_600
    assert shop.orders.priority.tolist() == [2, 0.125, 1]
    assert shop.operations.step.tolist() == [1, -1, 10, -1]
    assert shop.operations.splittable.tolist() == [1, 0, 0, 0]
    assert shop.operations.notes == {0: "a\nb", 3: "=1+1 as text"}
    assert shop.operations.row.tolist() == [2, 3, 4, 5]


def test_a_number_shown_with_leading_zeros_keeps_them() -> None:
    book = workbook(("order", "machine"), (42, "CMM"))
    book.active["A2"].number_format = "00000"
    assert shop_of(bytes_of(book)).orders.ids == ("00042",)


def test_a_date_without_a_time_is_refused_as_in_csv() -> None:
    data = bytes_of(workbook(("order", "machine", "due"), ("A", "CMM", date(2026, 3, 2))))
    assert texts_of(data, start=START) == [
        "orders.csv [Orders] row 2, column due: '2026-03-02' is no time this tool reads; "
        "write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"
    ]


def test_decimal_commas_typed_as_text_are_read_and_thousands_are_not() -> None:
    assert (
        shop_of(bytes_of(workbook(("order", "machine", "minutes"), ("A", "M", "12,5")))).operations.seconds[0]
        == 750
    )
    data = bytes_of(workbook(("order", "machine", "minutes"), ("A", "M", "1,500"), ("A", "M", 1.125)))
    assert rules_of(data) == ["number-ambiguous"]


def test_formulas_are_read_by_their_saved_results() -> None:
    data = bytes_of(workbook(("order", "machine", "minutes"), ("A", "M", "=20+10")))
    sheet = zipfile.ZipFile(io.BytesIO(data)).read("xl/worksheets/sheet1.xml")
    saved = (
        sheet.replace(b"<v></v>", b"<v>30</v>").replace(b"<v />", b"<v>30</v>").replace(b"<v/>", b"<v>30</v>")
    )
    assert saved != sheet
    assert shop_of(changed(data, sheet1=saved)).operations.seconds.tolist() == [1800]


def test_a_formula_without_a_saved_result_is_a_fault_and_no_blank() -> None:
    """Taken as blank, a column of formulas would turn every row into one round."""
    data = bytes_of(workbook(("order", "machine", "minutes"), ("A", "M", "=20+10"), ('="B"', "M", "=5")))
    found = [(fault.rule, fault.row, fault.column) for fault in faults_of(data)]
    assert found == [
        ("formula-not-calculated", 2, "minutes"),
        ("formula-not-calculated", 3, "order"),
        ("formula-not-calculated", 3, "minutes"),
    ]
    assert texts_of(data)[0] == (
        "orders.csv [Orders] row 2, column minutes: 'formula' is a formula whose result was never saved; "
        "open the file in a spreadsheet, save it, and read it again"
    )


def test_an_error_value_is_no_name() -> None:
    book = workbook(("order", "machine"), ("#N/A", "M"))
    book.active["A2"].data_type = "e"
    assert rules_of(bytes_of(book)) == ["formula-error"]


def test_rows_and_columns_left_out_of_the_file_are_blank_and_still_count() -> None:
    book = workbook(("order", "machine", "minutes", "note"), ("A", "M", 5))
    book.active["A7"], book.active["B7"], book.active["C7"] = "B", "M", 5
    assert shop_of(bytes_of(book)).operations.row.tolist() == [2, 7]


def test_the_sheet_that_has_the_columns_is_read_and_the_others_are_named() -> None:
    book = workbook(("Legend", "Meaning"), ("A", "first"), sheet="Read me")
    orders = book.create_sheet("Work orders")
    for row in (("Work Order", "Machine"), ("order", "machine", "minutes"), ("A", "M", 5)):
        orders.append(row)
    hidden = book.create_sheet("Old")
    hidden.append(("order", "machine", "minutes", "due"))
    hidden.sheet_state = "hidden"
    book.create_sheet("Empty")
    found = reading(bytes_of(book))
    assert found.shop.operations.row.tolist() == [3]
    assert [notice.rule for notice in found.notices] == ["sheets-not-read", "rows-above-header"]
    assert found.notices[0].text() == (
        "orders.csv [Work orders]: only this sheet is read, not 'Read me'; "
        "move the right one to the front if another is meant"
    )


def test_the_size_that_a_file_declares_is_not_believed() -> None:
    data = bytes_of(workbook(("order", "machine", "minutes"), ("A", "M", 5), ("B", "M", 5)))
    sheet = zipfile.ZipFile(io.BytesIO(data)).read("xl/worksheets/sheet1.xml")
    for lie in (b'ref="A1"', b'ref="A1:XFD1048576"'):
        told = sheet.replace(b'ref="A1:C3"', lie)
        assert told != sheet
        assert len(shop_of(changed(data, sheet1=told))) == 2


def test_rows_beyond_the_limit_are_a_fault(monkeypatch: pytest.MonkeyPatch) -> None:
    data = bytes_of(workbook(("order", "machine"), *(("A", "M") for _ in range(12))))
    monkeypatch.setattr(settings, "MAX_ROWS", 10)
    (fault,) = faults_of(data)
    assert (fault.rule, fault.sheet, fault.row) == ("too-many-rows", "Orders", 12)


def test_a_row_number_in_the_billions_does_not_hang(monkeypatch: pytest.MonkeyPatch) -> None:
    data = bytes_of(workbook(("order", "machine"), ("A", "M")))
    sheet = zipfile.ZipFile(io.BytesIO(data)).read("xl/worksheets/sheet1.xml")
    far = (
        sheet.replace(b'<row r="2">', b'<row r="2000000000">')
        .replace(b'"A2"', b'"A9"')
        .replace(b'"B2"', b'"B9"')
    )
    assert far != sheet
    monkeypatch.setattr(settings, "MAX_ROWS", 1000)
    assert "too-many-rows" in rules_of(changed(data, sheet1=far))


def test_what_unpacks_to_too_much_is_refused_before_it_is_unpacked(monkeypatch: pytest.MonkeyPatch) -> None:
    data = changed(bytes_of(workbook(("order", "machine"), ("A", "M"))), sheet1=b" " * 2_000_000)
    assert len(data) < 20_000
    monkeypatch.setattr(settings, "MAX_FILE_BYTES", 100_000)
    (fault,) = faults_of(data)
    assert fault.rule == "workbook-too-large"
    assert fault.text() == (
        "orders.csv: unpacks to more than 800,000 bytes; "
        "delete the sheets that are not needed, or save it as CSV"
    )


def test_parts_that_are_loaded_whole_have_a_limit_of_their_own() -> None:
    data = changed(bytes_of(workbook(("order", "machine"), ("A", "M"))), styles=b" " * 40_000_000)
    assert rules_of(data) == ["workbook-too-large"]


def test_entities_that_multiply_are_a_damaged_workbook() -> None:
    """Expat bounds the amplification of entities since 2.4 (CVE-2013-0340)."""
    entities = b"".join(b'<!ENTITY e%d "%s">' % (k, b"&e%d;" % (k - 1) * 10) for k in range(1, 10))
    bomb = (
        b'<!DOCTYPE x [<!ENTITY e0 "0123456789">'
        + entities
        + b"]><worksheet><sheetData>&e9;</sheetData></worksheet>"
    )
    assert rules_of(changed(bytes_of(workbook(("order", "machine"), ("A", "M"))), sheet1=bomb)) == [
        "workbook-damaged"
    ]


@pytest.mark.parametrize("cut", [10, 100, 1000])
def test_a_workbook_cut_short_is_damaged(cut: int) -> None:
    data = bytes_of(workbook(("order", "machine"), ("A", "M")))
    (fault,) = faults_of(data[:-cut])
    assert fault.rule == "workbook-damaged"
    assert fault.text() == (
        "orders.csv: is a damaged workbook (BadZipFile: File is not a zip file); "
        "open it in a spreadsheet and save it again"
    )


@pytest.mark.parametrize("part", ["workbook", "sheet1", "styles", "[Content_Types]", "sharedStrings"])
@pytest.mark.parametrize("content", [None, b"", b"<broken", b"<a/>", b"\xff\xfe\x00"])
def test_a_workbook_with_a_broken_part_gives_a_fault_or_is_read(part: str, content: bytes | None) -> None:
    """No way of breaking one part leads to anything but an answer."""
    data = changed(bytes_of(workbook(("order", "machine"), ("A", "M"))), **{part: content})
    with contextlib.suppress(InputError):
        assert load(data).shop.orders.ids == ("A",)


@pytest.mark.parametrize(
    ("name", "content", "kind"),
    [
        ("mimetype", b"application/vnd.oasis.opendocument.spreadsheet", "an .ods workbook"),
        ("xl/workbook.bin", b"", "an .xlsb workbook"),
        ("word/document.xml", b"", "a text document"),
        ("anything.txt", b"", "a zip archive"),
    ],
)
def test_other_zip_files_are_called_by_their_name(name: str, content: bytes, kind: str) -> None:
    out = io.BytesIO()
    with zipfile.ZipFile(out, "w") as archive:
        archive.writestr(name, content)
    assert texts_of(out.getvalue()) == [
        f"orders.csv: is {kind}, which this tool does not read; save it as CSV or XLSX"
    ]


def test_the_name_of_a_sheet_cannot_play_with_the_terminal() -> None:
    data = bytes_of(workbook(("order", "machine"), ("", "M"), sheet="a\u202eb"))
    assert texts_of(data) == ["orders.csv [a?b] row 2, column order: '' is empty; write the order's number"]


def test_a_sheet_that_breaks_off_far_down_does_not_hide_the_faults_of_the_floor() -> None:
    data = bytes_of(workbook(("order", "machine"), *(("A", "M") for _ in range(2000))))
    sheet = zipfile.ZipFile(io.BytesIO(data)).read("xl/worksheets/sheet1.xml")
    cut = changed(data, sheet1=sheet[: len(sheet) - 200])
    assert rules_of(cut, shop="[shitf]\n") == ["unknown-key", "workbook-damaged"]
