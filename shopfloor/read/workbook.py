"""XLSX workbooks: refuses what is unsafe or is none, finds the sheet, yields its rows as text."""

from __future__ import annotations

import io
import re
import warnings
import zipfile
from collections.abc import Callable, Iterator, Sequence
from itertools import islice
from typing import Any, TypeVar

from shopfloor import settings
from shopfloor.read.forms import NOT_CALCULATED, text_of
from shopfloor.read.headers import HEADER_ROWS, Wanted, find_header, listed
from shopfloor.read.rules import Findings, Place, printable, refuse
from shopfloor.read.source import Source

ZIP_MAGIC = b"PK\x03\x04"
MAX_UNPACKED = 8  # times settings.MAX_FILE_BYTES: all sheets and shared texts together
MAX_PARTS = 2_000
MAX_LOADED_BYTES = 32 * 1024 * 1024  # styles, relations and the like, which are loaded whole
MAX_SHEETS_SEEN = 20

_FORMULA = re.compile(rb"<(?:\w{1,20}:)?f[\s>/]")
_T = TypeVar("_T")


def open_sheet(
    source: Source, wanted: Wanted, findings: Findings
) -> tuple[Place, Iterator[tuple[int, Sequence[str]]]]:
    """Return the sheet that reads best, and its rows with their numbers.

    Best means: most headers known, then the first. Dates, times and numbers come in the text forms of
    :func:`text_of`; formulas as their saved results.

    Raises
    ------
    InputError
        If the file is no XLSX workbook, is damaged, or unpacks to more than this tool reads.
    """
    formulas = _inspect(source)
    book = _whole(source, lambda: _load(source, results=True))
    sheets = [sheet for sheet in book.worksheets if sheet.sheet_state == "visible"] or list(book.worksheets)
    if not sheets:
        raise refuse(source.place, "workbook-damaged", reason="it has no sheet")

    def known(index: int) -> int:
        sheet = sheets[index]
        sheet.reset_dimensions()  # the size a file declares may be wrong, and is not needed
        top = _whole(source, lambda: [_texts(row) for row in islice(sheet.iter_rows(), HEADER_ROWS)])
        return find_header(top, wanted)[1] if any(map(any, top)) else -1

    scores = [known(index) for index in range(min(len(sheets), MAX_SHEETS_SEEN))]
    best = max(range(len(scores)), key=lambda index: scores[index])
    title = str(sheets[best].title)
    place = Place(source.name, printable(title))
    others = [str(sheets[index].title) for index, score in enumerate(scores) if index != best and score >= 0]
    if others:
        findings.notice(place, "sheets-not-read", names=listed(others))
    plain = None
    if formulas:
        plain = _whole(source, lambda: _load(source, results=False))[title]
        plain.reset_dimensions()
    return place, _rows(source, sheets[best], plain, place, findings)


def _inspect(source: Source) -> bool:
    """Check the container before anything is unpacked; return whether any sheet holds formulas."""
    place = source.place
    try:
        with zipfile.ZipFile(io.BytesIO(source.data)) as archive:
            parts = archive.infolist()
            names = {part.filename for part in parts}
            if "xl/workbook.xml" not in names and not any(name.endswith("workbook.xml") for name in names):
                raise refuse(place, "not-a-table", kind=_other_kind(archive, names), extra="")
            if any(part.flag_bits & 1 for part in parts):
                raise refuse(
                    place, "not-a-table", kind="a workbook with a password", extra=", without a password"
                )
            limit = MAX_UNPACKED * settings.MAX_FILE_BYTES
            texts = [part for part in parts if part.filename.endswith((".xml", ".rels"))]
            bulk = [p for p in texts if "/worksheets/" in p.filename or "sharedStrings" in p.filename]
            loaded = sum(part.file_size for part in texts) - sum(part.file_size for part in bulk)
            if (
                sum(part.file_size for part in bulk) > limit
                or loaded > MAX_LOADED_BYTES
                or len(parts) > MAX_PARTS
            ):
                raise refuse(place, "workbook-too-large", limit=limit)
            return any(_holds(archive, part, _FORMULA) for part in bulk)
    except (zipfile.BadZipFile, EOFError, OSError, ValueError, NotImplementedError, RuntimeError) as error:
        raise refuse(place, "workbook-damaged", reason=_reason(error)) from None


def _other_kind(archive: zipfile.ZipFile, names: set[str]) -> str:
    if "mimetype" in names:
        kind = archive.read("mimetype")[:80]
        if b"opendocument.spreadsheet" in kind:
            return "an .ods workbook"
    if "xl/workbook.bin" in names:
        return "an .xlsb workbook"
    if "word/document.xml" in names:
        return "a text document"
    return "a zip archive"


def _holds(archive: zipfile.ZipFile, part: zipfile.ZipInfo, pattern: re.Pattern[bytes]) -> bool:
    """Whether a part holds the pattern; it is unpacked a piece at a time and never kept."""
    overlap = 32
    tail = b""
    with archive.open(part) as stream:
        while piece := stream.read(1 << 20):
            if pattern.search(tail + piece):
                return True
            tail = piece[-overlap:]
    return False


def _load(source: Source, *, results: bool) -> Any:
    import openpyxl  # heavy: only when a workbook is read

    return openpyxl.load_workbook(
        io.BytesIO(source.data), read_only=True, data_only=results, keep_links=False
    )


def _whole(source: Source, step: Callable[[], _T]) -> _T:
    """Run one step of the library on the file; whatever it stumbles over means a damaged workbook.

    The one place that catches everything: on a damaged part the library raises whatever its own parsing
    meets (KeyError, TypeError, an XML error …), and nothing of ours runs inside but :func:`text_of`.
    """
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # about features of the workbook that do not matter here
            return step()
    except Exception as error:
        raise refuse(source.place, "workbook-damaged", reason=_reason(error)) from error


def _reason(error: Exception) -> str:
    words = " ".join(str(error).split())[:80].strip("\"'")
    return f"{type(error).__name__}: {words}" if words else type(error).__name__


def _rows(
    source: Source, sheet: Any, plain: Any, place: Place, findings: Findings
) -> Iterator[tuple[int, Sequence[str]]]:
    """Yield the rows; `plain` is the same sheet with formulas in place of their results, or None."""
    rows = sheet.iter_rows()
    shadows = plain.iter_rows() if plain is not None else None
    row = 0
    while True:
        row += 1
        cells = _whole(source, lambda: next(rows, None))
        if cells is None:
            return
        if row > settings.MAX_ROWS + 1:
            findings.fault(place.at(row), "too-many-rows", limit=settings.MAX_ROWS)
            return
        texts = _texts(cells)
        if shadows is not None:
            for position, shadow in enumerate(_whole(source, lambda: next(shadows, ()))):
                if shadow.data_type == "f" and cells[position].value is None:
                    texts[position] = NOT_CALCULATED
        yield row, texts


def _texts(cells: Sequence[Any]) -> list[str]:
    return [text_of(cell.value, _format(cell)) for cell in cells]


def _format(cell: Any) -> str:
    """Return how a number or a date is shown; nothing else depends on it."""
    return "" if cell.value is None or isinstance(cell.value, str) else str(cell.number_format)
