"""Tables of text: opens CSV, XLSX or a DataFrame; hands out cells with file, sheet, row and column."""

from __future__ import annotations

import csv
import hashlib
import io
import sys
from array import array
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import chain, dropwhile, islice
from operator import itemgetter
from typing import TYPE_CHECKING, TypeGuard, cast

import numpy as np

from shopfloor import settings
from shopfloor.read.forms import text_of
from shopfloor.read.headers import HEADER_ROWS, Wanted, find_header
from shopfloor.read.rules import Findings, Place, refuse
from shopfloor.read.separated import open_text
from shopfloor.read.source import Readable, Source, refuse_other_kinds, take
from shopfloor.read.workbook import ZIP_MAGIC, open_sheet

if TYPE_CHECKING:
    import pandas as pd

    from shopfloor.model.shop import Ints

Record = tuple[int, Sequence[str]]

MAX_COLUMNS = 1_000
CHUNK = 256  # records at a time: few enough to stay in the processor's cache, measured best of 256 to 8192


@dataclass(frozen=True)
class Table:
    """A table that has been opened: its header is known, its rows are still to come, once.

    Attributes
    ----------
    place
        File, sheet and row of the header.
    sha256
        Of the file's bytes; of a DataFrame's cells written as CSV.
    header
        As it stands in the file, each run of blanks and line breaks as one space.
    separator
        Of a text table; empty for a workbook or a DataFrame, whose numbers come as numbers.
    records
        Row number and cells of each row below the header; a row may be shorter or longer than the header.
    """

    place: Place
    sha256: str
    header: tuple[str, ...]
    separator: str
    records: Iterator[Record]

    def at(self, row: int, position: int) -> Place:
        """Return the place of one cell, its column called as in the header."""
        return self.place.at(int(row), self.header[position], position + 1)


@dataclass(frozen=True)
class Coded:
    """One column with every distinct text held once: cell `i` reads ``texts[codes[i]]``, blanks trimmed."""

    codes: Ints
    texts: Sequence[str]

    def text(self, index: int) -> str:
        """Return the text of one cell."""
        return self.texts[int(self.codes[index])]


@dataclass(frozen=True)
class Cells:
    """The rows that are not blank: their numbers, and the columns asked for."""

    row: Ints
    columns: Mapping[str, Coded]

    def __len__(self) -> int:
        return len(self.row)


def open_table(
    source: Readable | pd.DataFrame, wanted: Wanted, findings: Findings, *, name: str | None = None
) -> Table:
    """Open `source` and find its header.

    Parameters
    ----------
    source
        Path, bytes or an open binary file holding CSV or XLSX (told apart by content), or a DataFrame.
    wanted
        The columns looked for: they decide between separators, sheets and candidate headers.
    findings
        Takes the faults met later, while rows are read, and the notices.
    name
        What messages call the source.

    Raises
    ------
    InputError
        With one fault, if there is no table in it.
    """
    separator = ""
    if is_frame(source):
        place = Place(name or "DataFrame")
        records, sha256 = _frame_records(source)
    else:
        taken = take(cast("Readable", source), name=name)
        sha256 = taken.sha256
        place, separator, records = _file_records(taken, wanted, findings)
    records = dropwhile(lambda pair: not any(map(str.strip, pair[1])), records)
    first = list(islice(records, HEADER_ROWS))
    if not first:
        raise refuse(place, "file-empty")
    at, _ = find_header([record for _, record in first], wanted)
    row, record = first[at]
    header = tuple(" ".join(cell.split()) for cell in record)
    if len(header) > MAX_COLUMNS:
        raise refuse(place.at(row), "too-many-columns", count=len(header), limit=MAX_COLUMNS)
    if any(any(map(str.strip, above)) for _, above in first[:at]):
        findings.notice(place, "rows-above-header", row=row)
    return Table(place.at(row), sha256, header, separator, chain(first[at + 1 :], records))


def is_frame(source: object) -> TypeGuard[pd.DataFrame]:
    """Whether `source` is a DataFrame; pandas is not imported to find out."""
    pandas = sys.modules.get("pandas")
    return pandas is not None and isinstance(source, pandas.DataFrame)


def _file_records(source: Source, wanted: Wanted, findings: Findings) -> tuple[Place, str, Iterator[Record]]:
    if source.data.startswith(ZIP_MAGIC):
        place, records = open_sheet(source, wanted, findings)
        return place, "", records
    refuse_other_kinds(source)
    separator, records = open_text(source, wanted, findings)
    return source.place, separator, records


def _frame_records(frame: pd.DataFrame) -> tuple[Iterator[Record], str]:
    """Return the header as row 1 and the rows from 2 on, by position, and a hash of all their texts."""
    header = [text_of(label) for label in frame.columns.tolist()]
    columns = [list(map(text_of, frame.iloc[:, k].tolist())) for k in range(len(header))]
    rows = [header, *map(list, zip(*columns, strict=True))]
    digest = hashlib.sha256()
    for start in range(0, len(rows), CHUNK):
        text = io.StringIO(newline="")
        csv.writer(text, lineterminator="\n").writerows(rows[start : start + CHUNK])
        digest.update(text.getvalue().encode("utf-8", "backslashreplace"))
    return iter(enumerate(rows, start=1)), digest.hexdigest()


class _Codes(dict[str, int]):
    """Gives each text the next number when it is first seen."""

    def __missing__(self, text: str) -> int:
        code = self[text] = len(self)
        return code


def gather(table: Table, positions: Mapping[str, int], findings: Findings) -> Cells:
    """Read the rest of `table` and return the columns at `positions`; blank rows are skipped.

    Runs in linear time, holding one chunk of records and each distinct text once. Cells that are too long
    or stand beyond the header become faults.
    """
    rows: array[int] = array("q")
    codes = {name: (_Codes(), array("q")) for name in positions}
    width = max(positions.values(), default=-1) + 1
    named = max((k for k, header in enumerate(table.header) if header), default=-1) + 1
    while chunk := list(islice(table.records, CHUNK)):
        kept = [pair for pair in chunk if (pair[1] and pair[1][0].strip()) or any(map(str.strip, pair[1]))]
        if not kept:
            continue
        numbers, records = zip(*kept, strict=True)
        rows.extend(numbers)
        lengths = set(map(len, records))
        if max(lengths) > named:
            _report_beyond(table, kept, named, findings)
        if min(lengths) < width:
            records = tuple([*record, *[""] * (width - len(record))] for record in records)
        for name, position in positions.items():
            lookup, out = codes[name]
            out.extend(map(lookup.__getitem__, map(itemgetter(position), records)))
    row = np.frombuffer(rows, np.int64) if rows else np.zeros(0, np.int64)
    columns = {
        name: Coded(np.frombuffer(out, np.int64) if out else row, [text.strip() for text in lookup])
        for name, (lookup, out) in codes.items()
    }
    cells = Cells(row, columns)
    for name, position in positions.items():
        _report_long(table, cells, name, position, findings)
    return cells


def _report_beyond(table: Table, records: Sequence[Record], named: int, findings: Findings) -> None:
    for row, record in records:
        for position in range(named, len(record)):
            if record[position].strip():
                place = table.place.at(row, _letters(position), position + 1)
                findings.fault(place, "row-too-wide", record[position])
                break


def _report_long(table: Table, cells: Cells, name: str, position: int, findings: Findings) -> None:
    column = cells.columns[name]
    limit = settings.MAX_CELL_CHARACTERS
    lengths = np.fromiter(map(len, column.texts), np.int64, len(column.texts))
    if not len(lengths) or lengths.max() <= limit:
        return

    def add(index: int) -> None:
        text = column.text(index)
        findings.fault(
            table.at(cells.row[index], position), "cell-too-long", text, length=len(text), limit=limit
        )

    where = np.flatnonzero(lengths[column.codes] > limit)
    findings.each(where.tolist(), len(where), add)


def _letters(position: int) -> str:
    """Return what a spreadsheet calls a column without a header: A … Z, AA …"""
    letters = ""
    position += 1
    while position:
        position, digit = divmod(position - 1, 26)
        letters = chr(ord("A") + digit) + letters
    return letters
