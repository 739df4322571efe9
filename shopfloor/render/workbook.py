"""plan.xlsx: the plan as a workbook with real dates and numbers, ready to filter, edit and print.

The sheet Plan begins with the columns of plan.csv, so that an edited workbook can be audited like an edited
CSV.
The only module besides the reader that knows openpyxl; import it only when a workbook is wanted.
"""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Iterable, Sequence
from datetime import datetime, timedelta
from functools import cache
from typing import TYPE_CHECKING, Any

from openpyxl import Workbook
from openpyxl.cell import WriteOnlyCell
from openpyxl.cell.cell import ILLEGAL_CHARACTERS_RE
from openpyxl.styles import Alignment, Border, Font, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.properties import PageSetupProperties

from shopfloor.errors import SaveError
from shopfloor.model.calendar import MINUTE
from shopfloor.render.html import CARE_NOTICE
from shopfloor.render.tables import harmless
from shopfloor.render.workbook_columns import Column, sheets

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
    for title, columns in sheets(plan, stamp).items():
        _add_sheet(book, title, columns, clock)
    raw = io.BytesIO()
    book.save(raw)
    return _timeless(raw.getvalue(), clock.start or _LONG_AGO)


# ---- cells and sheets ------------------------------------------------------------------------------


def _add_sheet(book: Any, title: str, columns: Sequence[Column], clock: Clock) -> None:
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


def _width(column: Column) -> int:
    if column.kind == "moment":
        return 20
    longest = max((len(value) for value in column.values if column.kind == "text" and value), default=0)
    return min(max(longest + 2, len(column.title) + 4, _WIDTHS[0]), _WIDTHS[1])


def _head(sheet: Any, column: Column) -> Any:
    cell = WriteOnlyCell(sheet, column.title)
    cell.font, cell.border = _HEAD_FONT, _HEAD_BORDER
    cell.alignment = _LEFT if column.kind == "text" else _RIGHT
    return cell


def _cells(sheet: Any, column: Column, clock: Clock) -> Iterable[Any]:
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
