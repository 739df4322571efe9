"""Text tables: finds the encoding and the separator, then yields records with their row numbers."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Sequence
from operator import length_hint

import numpy as np

from shopfloor import settings
from shopfloor.read.headers import Wanted, find_header
from shopfloor.read.rules import Findings, refuse
from shopfloor.read.source import Source

SEPARATORS = (",", ";", "\t")
SNIFFED_CHARACTERS = 1 << 16
SNIFFED_ROWS = 25
MAX_LINE_BYTES = 1_000_000

_MARKS = (  # byte-order marks; UTF-32 before UTF-16, which it begins with
    (b"\xef\xbb\xbf", "utf-8-sig"),
    (b"\xff\xfe\x00\x00", "utf-32"),
    (b"\x00\x00\xfe\xff", "utf-32"),
    (b"\xff\xfe", "utf-16"),
    (b"\xfe\xff", "utf-16"),
)
_SHOWN = {"utf-8-sig": "UTF-8", "utf-8": "UTF-8"}


def find_encoding(source: Source) -> str:
    """Return the name of the codec that reads `source`.

    A byte-order mark decides. Without one the bytes are UTF-16 if every other of the first is NUL, UTF-8 if
    they are valid as such, and else Windows-1252.

    Raises
    ------
    InputError
        If the bytes are no text in any of these, or hold NUL characters.
    """
    data = source.data
    for mark, codec in _MARKS:
        if data.startswith(mark):
            return _checked(source, codec)
    even, odd = data[0:4096:2].count(0), data[1:4096:2].count(0)
    half = min(len(data), 4096) // 2
    if half and max(even, odd) > 0.4 * half and min(even, odd) < 0.02 * half:
        return _checked(source, "utf-16-le" if odd > even else "utf-16-be")
    if b"\0" in data:
        raise refuse(source.place, "binary")
    if data.isascii():
        return "utf-8"
    try:
        data.decode("utf-8")
        return "utf-8"
    except UnicodeDecodeError as error:
        sound, broken = _utf8_characters(data)
        if sound > 2 * broken:  # UTF-8 with a flaw: read as Windows-1252 its names would be garbled
            raise refuse(source.place, "encoding-broken", encoding="UTF-8", byte=error.start + 1) from None
    try:
        data.decode("cp1252")
    except UnicodeDecodeError as error:
        code = data[error.start]
        raise refuse(source.place, "encoding-unknown", byte=error.start + 1, code=code) from None
    return "cp1252"


def _utf8_characters(data: bytes) -> tuple[int, int]:
    """Return how many characters beyond ASCII are sound UTF-8, and how many places are not."""
    ascii_only = len(data.translate(None, bytes(range(128, 256))))
    return len(data.decode("utf-8", "ignore")) - ascii_only, data.decode("utf-8", "replace").count("\ufffd")


def _checked(source: Source, codec: str) -> str:
    try:
        text = source.data.decode(codec)
    except UnicodeDecodeError as error:
        shown = _SHOWN.get(codec, codec.upper())
        raise refuse(source.place, "encoding-broken", encoding=shown, byte=error.start + 1) from None
    if "\0" in text:
        raise refuse(source.place, "binary")
    return codec


def find_separator(text: str, wanted: Wanted) -> str:
    """Return the separator under which the first records read best.

    Best means: most headers known, then most records as wide as the header, then the widest; quotes are
    respected, since every candidate is tried with a real parser.
    """

    def score(separator: str) -> tuple[int, int, int]:
        records = _first_records(io.StringIO(text, newline=""), separator)
        if not records:
            return 0, 0, 0
        at, known = find_header(records, wanted)
        width = len(records[at])
        return known, sum(len(record) == width for record in records[at:]) if width > 1 else 0, width

    return max(SEPARATORS, key=score)  # the first of equals


def _first_records(lines: Iterable[str], separator: str) -> list[Sequence[str]]:
    """Split the first records, tolerantly."""
    reader = csv.reader(lines, delimiter=separator, skipinitialspace=True)
    records: list[Sequence[str]] = []
    while len(records) < SNIFFED_ROWS:
        try:
            records.append(next(reader))
        except StopIteration:
            break
        except csv.Error:
            continue
    return records


def open_text(
    source: Source, wanted: Wanted, findings: Findings
) -> tuple[str, Iterator[tuple[int, Sequence[str]]]]:
    """Return the separator, and the records with the row numbers that a spreadsheet shows.

    Blank rows count but come as empty records. A record whose quotes are wrong becomes a fault, and reading
    goes on with the next line.
    """
    codec = find_encoding(source)
    _refuse_long_lines(source)
    head = _stream(source, codec).read(SNIFFED_CHARACTERS)
    first, _, _ = head.partition("\n")
    lines: Iterator[str] = iter(_stream(source, codec))
    if first.rstrip("\r").lower() in {
        "sep=,",
        "sep=;",
        "sep=\t",
    }:  # a spreadsheet obeys this line and hides it
        separator = first[4]
        next(lines)
    else:
        separator = find_separator(head, wanted)
    return separator, _records(lines, separator, source, findings)


def _stream(source: Source, codec: str) -> io.TextIOWrapper:
    return io.TextIOWrapper(io.BytesIO(source.data), encoding=codec, newline="")


def _refuse_long_lines(source: Source) -> None:
    """Refuse a line that would take far more memory to split than a row of any table.

    Raises
    ------
    InputError
        If there is one.
    """
    data = np.frombuffer(source.data, np.uint8)
    ends = np.flatnonzero((data == 10) | (data == 13))
    gaps = np.diff(np.r_[-1, ends, len(data)])
    if gaps.max() > MAX_LINE_BYTES:
        start = int(np.r_[0, ends + 1][gaps.argmax()])
        line = source.data.count(b"\n", 0, start) + 1
        raise refuse(source.place.at(line), "line-too-long", limit=MAX_LINE_BYTES)


def _records(
    lines: Iterator[str], separator: str, source: Source, findings: Findings
) -> Iterator[tuple[int, Sequence[str]]]:
    # Strict, so that a quote never closed is noticed instead of swallowing the rest of the file.
    reader = csv.reader(lines, delimiter=separator, strict=True, skipinitialspace=True)
    last = settings.MAX_ROWS + 1
    rows = iter(range(1, last + 1))
    while True:
        try:
            yield from zip(rows, reader, strict=False)
            break
        except csv.Error as error:
            place = source.place.at(last - length_hint(rows))  # the number that zip had taken for this record
            if "unexpected end" in str(error) or "field limit" in str(error):
                findings.fault(place, "open-quote")
                return
            findings.fault(place, "stray-quote")
    if not length_hint(rows) and next(lines, None) is not None:
        findings.fault(source.place.at(last + 1), "too-many-rows", limit=settings.MAX_ROWS)
