"""plan.xlsx: the plan as a workbook with real dates and numbers, ready to filter, edit and print.

The sheet Plan has the columns of plan.csv, so that an edited workbook can be audited like an edited CSV.
The only module besides the reader that knows openpyxl; import it only when a workbook is wanted.
"""

from __future__ import annotations

import io
import json
import re
import zipfile
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from functools import cache
from typing import TYPE_CHECKING, Any

import numpy as np
from openpyxl import Workbook
from openpyxl.cell import WriteOnlyCell
from openpyxl.cell.cell import ILLEGAL_CHARACTERS_RE
from openpyxl.styles import Alignment, Border, Font, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.properties import PageSetupProperties

from shopfloor.errors import SaveError
from shopfloor.model.calendar import MINUTE
from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import NO_DUE
from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.tables import CSV_COLUMNS, harmless, plan_id, plan_json, summary

if TYPE_CHECKING:
    from shopfloor.model.calendar import Clock
    from shopfloor.model.results import Plan

MAX_SHEET_ROWS = 1_048_575  # below the header, as the format allows
_LONG_AGO = datetime(1980, 1, 1)  # the first moment that a ZIP archive can name
_WIDTHS = (8, 75)  # characters
_LINE_PT = 15
_HEAD_FONT = Font(name="Calibri", size=11, bold=True)
_HEAD_BORDER = Border(bottom=Side(style="medium"))
_LEFT, _RIGHT = Alignment(horizontal="left"), Alignment(horizontal="right")
_WRAPPED = Alignment(wrap_text=True)


@dataclass(frozen=True, slots=True)
class _Column:
    """One column: its title, what its values are (text, number, moment, minutes, share), and they."""

    title: str
    kind: str
    values: Sequence[Any]


def plan_xlsx(plan: Plan, *, stamp: str | None = None) -> bytes:
    """Return the content of plan.xlsx: the sheets Plan, Machines, Orders, Bounds and Notes.

    Moments are real dates, or real durations when the clock starts at zero; text that looks like a formula
    is stored as text and marked so, which keeps it text when somebody edits it. Every sheet repeats its
    titles and prints the care notice at its foot. Equal plans give equal bytes with one version of
    openpyxl and zlib.

    Parameters
    ----------
    plan
        What to write; about 30 microseconds a cell.
    stamp
        The time of printing for the sheet Notes, in the words to print.

    Raises
    ------
    SaveError
        If the plan has more rows than a sheet holds.
    """
    if len(plan.schedule) > MAX_SHEET_ROWS:
        raise SaveError(
            f"plan.xlsx cannot hold {len(plan.schedule):,} rows, a sheet ends at {MAX_SHEET_ROWS:,}; "
            "use plan.csv"
        )
    book = Workbook(write_only=True)
    clock = plan.shop.clock
    for title, columns in (
        ("Plan", _plan_columns(plan)),
        ("Machines", _machine_columns(plan)),
        ("Orders", _order_columns(plan)),
        ("Bounds", _bound_columns(plan)),
        ("Notes", _note_columns(plan, stamp)),
    ):
        _add_sheet(book, title, columns, clock)
    raw = io.BytesIO()
    book.save(raw)
    return _timeless(raw.getvalue(), clock.start or _LONG_AGO)


# ---- what stands on each sheet ---------------------------------------------------------------------


def _plan_columns(plan: Plan) -> list[_Column]:
    shop, schedule = plan.shop, plan.schedule
    orders, machines, notes = shop.orders.ids, shop.machines, shop.operations.notes
    operation = schedule.operation
    values: tuple[tuple[str, Sequence[Any]], ...] = (
        ("text", [orders[index] for index in shop.operations.job[operation].tolist()]),
        ("text", [machines[index].id for index in shop.operations.machine[operation].tolist()]),
        ("number", schedule.unit.tolist()),
        ("moment", schedule.start_s.tolist()),
        ("moment", schedule.end_s.tolist()),
        ("number", [None if rank == NO_ROUND else rank for rank in schedule.round.tolist()]),
        ("number", schedule.part.tolist()),
        ("number", schedule.parts.tolist()),
        ("text", [notes.get(index) for index in operation.tolist()]),
    )
    return [_Column(title, *column) for title, column in zip(CSV_COLUMNS, values, strict=True)]


def _machine_columns(plan: Plan) -> list[_Column]:
    shop, schedule = plan.shop, plan.schedule
    place = shop.operations.machine[schedule.operation]
    first = np.full(len(shop.machines), np.iinfo(np.int64).max)
    last = np.zeros(len(shop.machines), np.int64)
    np.minimum.at(first, place, schedule.start_s)
    np.maximum.at(last, place, schedule.end_s)
    runs = np.bincount(place, minlength=len(shop.machines)).tolist()
    units = [machine.count for machine in shop.machines]
    work = shop.machine_load_s.tolist()
    span = plan.makespan_s or 1
    return [
        _Column("machine", "text", [machine.id for machine in shop.machines]),
        _Column("name", "text", [machine.name or None for machine in shop.machines]),
        _Column("units", "number", units),
        _Column("runs", "number", runs),
        _Column("work_min", "minutes", work),
        _Column("busy", "share", [load / (span * count) for load, count in zip(work, units, strict=True)]),
        _Column("first_start", "moment", _where(runs, first.tolist())),
        _Column("last_end", "moment", _where(runs, last.tolist())),
    ]


def _order_columns(plan: Plan) -> list[_Column]:
    shop, schedule = plan.shop, plan.schedule
    job = shop.operations.job
    begin = np.full(len(shop.orders), np.iinfo(np.int64).max)
    np.minimum.at(begin, job[schedule.operation], schedule.start_s)
    finish = schedule.completion_s(job, len(shop.orders))
    visits = np.bincount(job, minlength=len(shop.orders)).tolist()
    release, due = shop.orders.release_s.tolist(), shop.orders.due_s
    late = np.maximum(finish - np.minimum(due, finish), 0).tolist()
    return [
        _Column("order", "text", shop.orders.ids),
        _Column("release", "moment", _where(release, release)),
        _Column("due", "moment", _where((due != NO_DUE).tolist(), due.tolist())),
        _Column("priority", "number", shop.orders.priority.tolist()),
        _Column("operations", "number", visits),
        _Column("work_min", "minutes", shop.job_load_s.tolist()),
        _Column("start", "moment", _where(visits, begin.tolist())),
        _Column("finish", "moment", _where(visits, finish.tolist())),
        _Column("late_min", "minutes", _where(late, late)),
    ]


def _bound_columns(plan: Plan) -> list[_Column]:
    bounds = summary(plan)["bounds"]
    return [
        _Column("kind", "text", [bound["kind"] for bound in bounds]),
        _Column("not_before", "moment", [bound["value_s"] for bound in bounds]),
        _Column("minutes", "minutes", [bound["value_s"] for bound in bounds]),
        _Column("sentence", "text", [bound["sentence"] for bound in bounds]),
        _Column("witness", "text", [json.dumps(bound["witness"], ensure_ascii=False) for bound in bounds]),
    ]


def _note_columns(plan: Plan, stamp: str | None) -> list[_Column]:
    data, clock = summary(plan), plan.shop.clock
    rows: list[tuple[str, Any]] = [
        ("care", CARE_NOTICE),
        ("plan", plan_id(plan_json(plan))),
        ("printed", stamp),
        ("shift_start", data["shift_start"] or "time counts from 0:00"),
        ("shift_end", data["shift_end"]),
        ("everything ends", clock.write(plan.makespan_s)),
        ("nothing can end before", clock.write(plan.lower_bound_s)),
        ("proved optimal", "yes" if plan.proved_optimal else "no"),
        ("fits the shift", None if plan.fits_shift is None else "yes" if plan.fits_shift else "no"),
        ("method", f"{plan.choice.name}: {plan.choice.why}"),
        *((f"not {name}", reason) for name, reason in plan.choice.others.items()),
        *(("remark", remark) for remark in plan.remarks),
        *(("would help", sentence) for sentence in plan.would_help),
        ("repeatable", "yes" if plan.repeatable else "no"),
        ("options", json.dumps(data["options"], ensure_ascii=False)),
        *((f"SHA-256 of {name}", digest) for name, digest in plan.inputs),
        ("tool", f"shopfloor {data['tool_version']}"),
    ]
    kept = [(name, value) for name, value in rows if value]
    return [
        _Column("what", "text", [name for name, _ in kept]),
        _Column("value", "text", [value for _, value in kept]),
    ]


def _where(wanted: Iterable[Any], values: Iterable[Any]) -> list[Any]:
    return [value if keep else None for keep, value in zip(wanted, values, strict=True)]


# ---- cells and sheets ------------------------------------------------------------------------------


def _add_sheet(book: Any, title: str, columns: Sequence[_Column], clock: Clock) -> None:
    sheet = book.create_sheet(title)
    sheet.freeze_panes = "A2"
    sheet.print_title_rows = "1:1"
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.fitToHeight = 0
    sheet.sheet_properties.pageSetUpPr = PageSetupProperties(fitToPage=True)
    # half above, half below: neither wraps by itself, and openpyxl spoils a line end in them
    first, _, rest = CARE_NOTICE.partition(" Site ")
    sheet.oddHeader.left.text, sheet.oddFooter.left.text = first, f"Site {rest}"
    sheet.oddFooter.right.text = "&P of &N"
    for part in (sheet.oddHeader.left, sheet.oddFooter.left, sheet.oddFooter.right):
        part.size = 8
    for number, column in enumerate(columns, 1):
        sheet.column_dimensions[get_column_letter(number)].width = _width(column)
    sheet.auto_filter.ref = f"A1:{get_column_letter(len(columns))}{len(columns[0].values) + 1}"
    texts = [column.values for column in columns if column.kind == "text"]
    for number, row in enumerate(zip(*texts, strict=True), 2):
        lines = max(_lines(text) for text in row)
        if lines > 1:  # programs other than Excel keep every row at one line unless told
            sheet.row_dimensions[number].height = _LINE_PT * lines
    sheet.append([_head(sheet, column) for column in columns])
    for row in zip(*(_cells(sheet, column, clock) for column in columns), strict=True):
        sheet.append(row)


def _lines(text: str | None) -> int:
    return sum(1 + len(line) // _WIDTHS[1] for line in text.split("\n")) if text else 1


def _width(column: _Column) -> int:
    if column.kind == "moment":
        return 20
    longest = max((len(value) for value in column.values if column.kind == "text" and value), default=0)
    return min(max(longest + 2, len(column.title) + 4, _WIDTHS[0]), _WIDTHS[1])


def _head(sheet: Any, column: _Column) -> Any:
    cell = WriteOnlyCell(sheet, column.title)
    cell.font, cell.border = _HEAD_FONT, _HEAD_BORDER
    cell.alignment = _LEFT if column.kind == "text" else _RIGHT
    return cell


def _cells(sheet: Any, column: _Column, clock: Clock) -> Iterable[Any]:
    if column.kind == "text":
        return (_text(sheet, value) for value in column.values)
    if column.kind == "number":
        return column.values
    values = column.values
    if column.kind == "minutes":
        look, values = "0.##", [None if value is None else value / MINUTE for value in values]
    elif column.kind == "share":
        look = "0%"
    else:
        whole = all(value is None or value % MINUTE == 0 for value in values)
        day, hours = ("yyyy-mm-dd hh:mm", "[h]:mm") if whole else ("yyyy-mm-dd hh:mm:ss", "[h]:mm:ss")
        look = day if clock.running else hours
        turn = cache(clock.moment if clock.running else lambda seconds: timedelta(seconds=seconds))
        values = [None if value is None else turn(value) for value in values]
    return (_number(sheet, value, look) for value in values)


def _text(sheet: Any, value: str | None) -> Any:
    """A text cell, plain where openpyxl cannot misread it: it takes "=…" for a formula."""
    if value is None:
        return None
    value = ILLEGAL_CHARACTERS_RE.sub("\N{REPLACEMENT CHARACTER}", value)
    if value.startswith("'"):
        value = harmless(value)  # a reader takes one apostrophe off, as in plan.csv
    hides, wraps = harmless(value) != value, _lines(value) > 1
    if not hides and not wraps:
        return value
    cell = WriteOnlyCell(sheet, value)
    cell.data_type = "s"
    cell.quotePrefix = hides  # what a spreadsheet itself sets for an apostrophe typed in front
    if wraps:
        cell.alignment = _WRAPPED
    return cell


def _number(sheet: Any, value: Any, look: str) -> Any:
    if value is None:
        return None
    cell = WriteOnlyCell(sheet, value)
    cell.number_format = look
    return cell


# ---- the same bytes every time -----------------------------------------------------------------------


def _timeless(raw: bytes, moment: datetime) -> bytes:
    """Rewrite a workbook so that nothing in it tells when it was saved."""
    stamp = moment.isoformat(timespec="seconds") + "Z"
    out = io.BytesIO()
    with (
        zipfile.ZipFile(io.BytesIO(raw)) as source,
        zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as target,
    ):
        for name in source.namelist():
            data = source.read(name)
            if name == "docProps/core.xml":
                data = re.sub(rb"(<dcterms:(created|modified)[^>]*>)[^<]*", rb"\g<1>" + stamp.encode(), data)
            entry = zipfile.ZipInfo(name, _LONG_AGO.timetuple()[:6])
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = 0o644 << 16
            target.writestr(entry, data)
    return out.getvalue()
