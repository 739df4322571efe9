"""plan.xlsx, read back by openpyxl and, where it is installed, by LibreOffice."""

from __future__ import annotations

import csv
import io
import shutil
import subprocess
import zipfile
from dataclasses import replace
from datetime import datetime, timedelta

import numpy as np
import openpyxl
import pytest

from shopfloor.audit.schedule import audit
from shopfloor.errors import SaveError
from shopfloor.model.calendar import Clock
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Operations, Orders, Shop
from shopfloor.read.plan import load_plan
from shopfloor.render import workbook
from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.tables import CSV_COLUMNS, plan_csv, plan_id, plan_json
from shopfloor.render.workbook import plan_xlsx
from tests.render.expected import START, round_plan, small_plan
from tests.render.floor import floor_plan
from tests.render.plans import HOSTILE, hall_plan


def opened(plan, **options):
    return openpyxl.load_workbook(io.BytesIO(plan_xlsx(plan, **options)))


def rows(sheet):
    return [list(row) for row in sheet.iter_rows(values_only=True)]


def test_sheets_and_plan_rows():
    book = opened(small_plan())
    assert book.sheetnames == ["Plan", "Machines", "Orders", "Bounds", "Notes"]
    at = lambda minutes: START + timedelta(minutes=minutes)  # noqa: E731
    assert rows(book["Plan"]) == [
        [*CSV_COLUMNS, "paused_min"],
        ["TQ-01", "Wash", 1, at(0), at(30), None, 1, 1, "seal kit on cart 4", None],
        ["TQ-02", "Wash", 2, at(0), at(20), None, 1, 1, None, None],
        ["TQ-02", "Coat", 1, at(20), at(40), None, 1, 2, None, None],
        ["TQ-04 Ø12", "Wash", 2, at(20), at(30), None, 1, 1, "@ night; see Å 7", None],
        ["TQ-01", "CMM", 1, at(30), at(90), None, 1, 1, None, 15],
        ["TQ-02", "Coat", 1, at(75), at(95), None, 2, 2, None, None],
        ["=3", "CMM", 1, at(90), at(115), None, 1, 1, None, None],
        ["=3", "Coat", 1, at(115), at(145), None, 1, 1, '+ "mask" the bore,\ntwo coats', None],
    ]


def test_machines_and_orders_add_up():
    book = opened(small_plan())
    machines = rows(book["Machines"])
    titles = ["machine", "name", "units", "runs", "work_min", "busy", "first_start", "last_end", "closed"]
    assert machines[0] == titles
    assert machines[1][:5] == ["Wash", "Washing bay", 2, 3, 60]
    assert machines[1][5] == pytest.approx(60 / (2 * 145))
    assert machines[2][6:8] == [START + timedelta(minutes=30), START + timedelta(minutes=115)]
    assert machines[2][8] == "07:00 – 07:15 tea"
    assert machines[4][:8] == ["Engrave", None, 1, 0, 0, 0, None, None]
    orders = rows(book["Orders"])
    assert orders[0][-1] == "late_min"
    assert orders[1] == [
        *("TQ-01", None, START + timedelta(minutes=80), 1, 2, 75),
        *(START, START + timedelta(minutes=90), 10),
    ]
    assert orders[3][:3] == ["=3", START + timedelta(minutes=30), None]


def test_bounds_and_notes():
    plan = small_plan()
    book = opened(plan, stamp="Mon 05:41")
    assert rows(book["Bounds"])[1] == [
        "machine",
        START + timedelta(minutes=85),
        85,
        plan.bounds[0].sentence,
        '{"machine": "CMM", "load_s": 4200}',
    ]
    notes = rows(book["Notes"])
    assert notes[1] == ["care", CARE_NOTICE]
    assert ["plan", plan_id(plan_json(plan))] in notes
    assert ["printed", "Mon 05:41"] in notes
    assert ["not two machines", "there are 4"] in notes
    assert ["SHA-256 of orders.csv", "5e" * 32] in notes


def test_every_sheet_is_set_up_to_read_and_to_print():
    for sheet in opened(hall_plan(60)):
        assert sheet.freeze_panes == "A2"
        assert sheet.auto_filter.ref == sheet.dimensions
        assert sheet.print_title_rows == "$1:$1"
        assert sheet.page_setup.orientation == "landscape"
        assert (sheet.sheet_properties.pageSetUpPr.fitToPage, sheet.page_setup.fitToHeight) == (True, 0)
        notice = f"{sheet.oddHeader.left.text} {sheet.oddFooter.left.text}"
        assert notice == CARE_NOTICE
        assert sheet.oddFooter.right.text == "&P of &N"
        assert all(cell.font.bold for cell in sheet[1])
        assert all(8 <= column.width <= 75 for column in sheet.column_dimensions.values())


def test_formulas_stay_text_and_keep_every_letter():
    plan = hall_plan(60, names=HOSTILE)
    sheet = opened(plan)["Plan"]
    cells = {cell.value: cell for column in ("A", "B") for cell in sheet[column][1:]}
    names = {*plan.shop.orders.ids, *(machine.id for machine in plan.shop.machines)}
    assert set(cells) == names
    assert all(cell.data_type == "s" for cell in cells.values())
    assert cells["=1+1"].quotePrefix
    assert not cells["<b>bold</b>"].quotePrefix


def test_control_characters_that_xml_cannot_hold_are_replaced():
    shop = small_plan().shop
    shop = replace(shop, orders=replace(shop.orders, ids=("a\x00b", "c\x1bd", "e", "f")))
    assert {row[0] for row in rows(opened(replace(small_plan(), shop=shop))["Plan"])[1:]} == {
        "a�b",
        "c�d",
        "e",
        "f",
    }


def test_rounds_are_numbers():
    plan = round_plan(clock=Clock(START))
    assert [row[5] for row in rows(opened(plan)["Plan"])[1:4]] == [1, 2, 2]


def test_without_a_shift_start_times_are_durations():
    book = opened(round_plan())
    cell = book["Plan"]["E2"]
    assert cell.number_format == "[h]:mm"
    assert cell.value == timedelta(minutes=30)
    assert book["Orders"]["H2"].value == timedelta(hours=2)


def test_seconds_are_shown_where_there_are_any():
    shop = Shop(
        (small_plan().shop.machines[2],), Orders(("TQ-1",)), Operations([0], [0], [45]), clock=Clock(START)
    )
    plan = replace(small_plan(), shop=shop, schedule=Schedule([0], np.array([0]), np.array([45])), bounds=())
    cell = opened(plan)["Plan"]["E2"]
    assert (cell.number_format, cell.value) == ("yyyy-mm-dd hh:mm:ss", datetime(2026, 3, 2, 6, 0, 45))


def test_empty_plan():
    shop = Shop((), Orders(()), Operations([], [], []))
    book = opened(replace(small_plan(), shop=shop, schedule=Schedule([], [], []), bounds=()))
    assert rows(book["Plan"]) == [list(CSV_COLUMNS)]


def test_same_plan_same_bytes_whenever_it_is_saved(monkeypatch):
    first = plan_xlsx(small_plan(), stamp="now")
    # openpyxl writes the time of saving, and ZIP the local time, into the file
    monkeypatch.setattr("time.localtime", lambda *_: (2031, 1, 1, 0, 0, 0, 0, 1, 0))
    import openpyxl.writer.excel as writer

    class Later(datetime):
        @classmethod
        def now(cls, tz=None):
            return datetime(2031, 1, 1, tzinfo=tz)

    monkeypatch.setattr(writer.datetime, "datetime", Later)
    assert plan_xlsx(small_plan(), stamp="now") == first
    with zipfile.ZipFile(io.BytesIO(first)) as archive:
        assert {entry.date_time for entry in archive.infolist()} == {(1980, 1, 1, 0, 0, 0)}
        assert b"2026-03-02T06:00:00Z" in archive.read("docProps/core.xml")


def test_more_rows_than_a_sheet_holds_are_refused(monkeypatch):
    monkeypatch.setattr(workbook, "MAX_SHEET_ROWS", 7)
    with pytest.raises(SaveError) as caught:
        plan_xlsx(small_plan())
    assert str(caught.value) == "plan.xlsx cannot hold 8 rows, a sheet ends at 7; use plan.csv"


@pytest.mark.skipif(
    shutil.which("soffice") is None, reason="LibreOffice is not installed (soffice not found)"
)
@pytest.mark.parametrize("plan", [small_plan(), round_plan()], ids=["dates", "durations"])
def test_libreoffice_shows_the_same_plan(plan, tmp_path):
    """What a spreadsheet shows, saved as CSV by it, is plan.csv but for how moments are written."""
    (tmp_path / "plan.xlsx").write_bytes(plan_xlsx(plan))
    command = ["soffice", "--headless", f"-env:UserInstallation=file://{tmp_path}/profile", "--convert-to"]
    command += [
        "csv:Text - txt - csv (StarCalc):44,34,76,1,,0,false,true",
        "--outdir",
        tmp_path,
        tmp_path / "plan.xlsx",
    ]
    subprocess.run(command, check=True, capture_output=True, timeout=120)
    shown = list(csv.DictReader(io.StringIO((tmp_path / "plan.csv").read_text(encoding="utf-8-sig"))))
    expected = list(csv.DictReader(io.StringIO(plan_csv(plan).removeprefix("\ufeff"), newline="")))
    assert len(shown) == len(expected)
    for row, wanted in zip(shown, expected, strict=True):
        for name in ("start", "end"):
            wanted[name] = wanted[name].replace("T", " ").removesuffix(":00")
        for name in ("order", "note"):
            wanted[name] = wanted[name].removeprefix("'")
        assert {name: row[name] for name in wanted} == wanted


def test_the_floor_has_columns_where_it_is_used():
    book = opened(floor_plan())
    plan = rows(book["Plan"])
    extra = ["family", "changeover_min", "set_up_min", "paused_min", "heads", "way_min"]
    assert plan[0] == [*CSV_COLUMNS, *extra]
    coat = [dict(zip(plan[0], row, strict=True)) for row in plan[1:] if row[1] == "COAT"]
    assert [(row["family"], row["changeover_min"], row["set_up_min"]) for row in coat[:3]] == [
        ("black", 15, 5), ("grey primer", 25, 5), ("grey primer", None, 5),
    ]  # fmt: skip
    assert {row["heads"] for row in coat} == {1}
    washed = [dict(zip(plan[0], row, strict=True)) for row in plan[1:] if row[1] == "WASH"]
    assert {(row["family"], row["set_up_min"], row["heads"]) for row in washed} == {(None, None, None)}
    assert 10 in {row["way_min"] for row in washed}
    machines = {
        row[0]: dict(zip(rows(book["Machines"])[0], row, strict=True)) for row in rows(book["Machines"])
    }
    assert machines["CMM"]["closed"] == ("07:10 – 08:00 calibration; 09:00 – 09:15 tea; 11:45 – 12:15 lunch")
    assert [machines["PRESS"][name] for name in ("crew", "attended", "crew_heads", "crew_at_most")] == [
        "fitters", "set-up", "3; 2 from 12:00 to 14:00", 3,
    ]  # fmt: skip
    assert machines["COAT"]["changeover_min"] == 130
    assert machines["WASH"]["crew"] is None


def test_a_plain_hall_has_no_column_of_the_floor():
    book = opened(hall_plan(60))
    assert rows(book["Plan"])[0] == list(CSV_COLUMNS)
    assert rows(book["Machines"])[0][-1] == "last_end"


def test_a_workbook_with_the_floor_in_it_is_read_and_audited_like_plan_csv(tmp_path):
    plan = floor_plan()
    stated = load_plan(plan_xlsx(plan), plan.shop, name="plan.xlsx")
    assert (stated.start_s == plan.schedule.start_s).all()
    assert audit(plan.shop, stated) == []
