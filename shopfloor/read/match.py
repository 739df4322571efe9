"""Which column of a table is which of ours, and what is wrong or worth saying about the header."""

from __future__ import annotations

import json

from shopfloor.read.headers import Wanted, listed, loose, nearest
from shopfloor.read.rules import Findings, shorten
from shopfloor.read.table import Table
from shopfloor.read.times import TIME_COLUMNS

_MISSPELT = 0.8  # likeness from which an unknown header is taken for a slip of the pen
_NAMESAKE = 0.5  # likeness from which a header is worth naming when a needed column is missing


def match_columns(table: Table, wanted: Wanted, findings: Findings) -> dict[str, int]:
    """Return the position in `table` of each wanted column it has.

    Faults: a needed column missing, a column twice, a mapped header that is not there. Notice: the columns
    that are not used, each with the column it may have been meant for.
    """
    found = wanted.find(table.header)
    for name, where in found.items():
        if len(where) > 1:
            _report_twice(table, name, where, findings)
    positions = {name: where[0] for name, where in found.items()}
    taken = {position for where in found.values() for position in where}
    unknown = [text for position, text in enumerate(table.header) if text and position not in taken]
    _report_missing(table, wanted, positions, unknown, findings)
    _report_mapped(table, wanted, positions, unknown, findings)
    blank = [k for k, text in enumerate(table.header) if not text and any(table.header[k:])]
    if unknown or blank:
        names = [_with_hint(text, wanted, positions) for text in unknown[:6]]
        more = [f"{len(unknown) - 6:,} more"] if len(unknown) > 6 else []
        without = [f"{len(blank)} without a header"] if blank else []
        findings.notice(table.place, "columns-not-used", names=", ".join([*names, *more, *without]))
    return positions


def _report_twice(table: Table, name: str, positions: list[int], findings: Findings) -> None:
    first = positions[0]
    for position in positions[1:]:
        place = table.at(table.place.row, position)
        if table.header[position] == table.header[first]:
            findings.fault(place, "header-duplicate", place.column, one=first + 1, two=position + 1)
        else:
            findings.fault(place, "header-clash", place.column, name=name, other=table.header[first])


def _report_missing(
    table: Table, wanted: Wanted, positions: dict[str, int], unknown: list[str], findings: Findings
) -> None:
    missing = [name for name in wanted.needed if name not in positions]
    if missing and len([text for text in table.header if text]) == 1 and len(wanted.needed) > 1:
        findings.fault(table.place, "separator-unknown", next(filter(None, table.header)))
        return
    for name in missing:
        if name in wanted.mapped:
            continue  # the mapped header is reported instead
        close = _nearest_header(name, unknown)
        findings.fault(
            table.place,
            "column-missing",
            name=name,
            nearest=f" (the nearest header is {shorten(close)!r})" if close else "",
            map=f"[columns] {name} = {json.dumps(close or 'your header', ensure_ascii=False)}",
        )


def _report_mapped(
    table: Table, wanted: Wanted, positions: dict[str, int], unknown: list[str], findings: Findings
) -> None:
    """Report headers named in ``[columns]`` that the table lacks.

    A table that has some of them, or that would lose its times, is the export meant by them, and wrong. One
    that has none, such as a carry-over list of our own, is merely another.
    """
    here = {loose(text) for text in table.header}
    export = any(loose(header) in here for header in wanted.mapped.values())
    timeless = not any(name in positions for name in TIME_COLUMNS)
    for name, header in wanted.mapped.items():
        if name in positions:
            continue
        if export or name in wanted.needed or (timeless and name in TIME_COLUMNS):
            close = _nearest_header(header, unknown)
            hint = f"; the nearest is {shorten(close)!r}" if close else ""
            findings.fault(table.place, "mapped-header-missing", header, name=name, nearest=hint)
        else:
            findings.notice(table.place, "mapped-header-absent", header, name=name)


def _nearest_header(name: str, headers: list[str]) -> str | None:
    close = nearest(loose(name), (loose(text) for text in headers), _NAMESAKE)
    return next((text for text in headers if close is not None and loose(text) == close), None)


def _with_hint(text: str, wanted: Wanted, positions: dict[str, int]) -> str:
    close = nearest(loose(text), (loose(name) for name in wanted.names if name not in positions), _MISSPELT)
    meant = next((name for name in wanted.names if close is not None and loose(name) == close), None)
    return f"{listed([text])} (is {meant} meant?)" if meant else listed([text])
