"""How long each row takes: minutes, or quantity × minutes_each, or one round for every row."""

from __future__ import annotations

from fractions import Fraction
from functools import partial
from typing import Any

import numpy as np

from shopfloor import settings
from shopfloor.model.calendar import MINUTE, duration
from shopfloor.model.shop import Bools, Ints
from shopfloor.read.cells import nearest_second
from shopfloor.read.columns import Sheet
from shopfloor.read.rules import count_of

TIME_COLUMNS = ("minutes", "minutes_each", "quantity")
NONE = -1  # a row whose time is not known


def run_times(sheet: Sheet, round_s: int) -> tuple[Ints, bool]:
    """Return the seconds of each row, and whether every row is one round because no row has a time.

    A time that is no whole number of seconds is rounded to the nearest, and one notice says so. Where a fault
    was added the seconds of the row mean nothing.

    Parameters
    ----------
    sheet
        Its time columns, as far as there are any, have been read.
    round_s
        Seconds of one round.
    """
    present = [name for name in TIME_COLUMNS if name in sheet]
    if all(bool(sheet[name].blank.all()) for name in present):
        if present:
            place = sheet.table.at(sheet.table.place.row, sheet.positions[present[0]])
            sheet.findings.notice(place, "one-round-each", place.column, length=duration(round_s))
        return np.full(len(sheet), round_s, np.int64), True

    times, stated = _stated(sheet)
    products, multiplied = _multiplied(sheet)
    _report_disagreement(sheet, times, stated, products, multiplied)
    blank = _blank(sheet, "minutes")
    code = np.where(blank & (multiplied != NONE), multiplied + len(times), stated)
    _report_gaps(sheet)
    return _seconds(sheet, [*times, *products], code), False


def set_up_times(sheet: Sheet, default: Ints) -> Ints:
    """Return the seconds of set-up of each row; `default` stands where the column is blank."""
    if "setup_minutes" not in sheet:
        return default
    column = sheet["setup_minutes"]
    times = [value or Fraction(0) for value in column.values]
    code = np.where(column.given, column.cells.codes, NONE)
    rounded = _rounded(times)[code]
    _notice_rounded(sheet, "setup-rounded", times, code, np.flatnonzero(code != NONE))
    return np.where(column.given, rounded, default)


def _stated(sheet: Sheet) -> tuple[list[Fraction], Ints]:
    """Return the distinct times under `minutes`, and which of them each row has."""
    if "minutes" not in sheet:
        return [], np.full(len(sheet), NONE, np.int64)
    column = sheet["minutes"]
    return [value or Fraction(0) for value in column.values], np.where(column.given, column.cells.codes, NONE)


def _multiplied(sheet: Sheet) -> tuple[list[Fraction], Ints]:
    """Return the distinct products quantity × minutes_each, and which of them each row has."""
    code = np.full(len(sheet), NONE, np.int64)
    if "quantity" not in sheet or "minutes_each" not in sheet:
        return [], code
    pieces, each = sheet["quantity"], sheet["minutes_each"]
    both = pieces.given & each.given
    width = len(each.values)
    pairs, which = np.unique(pieces.cells.codes[both] * width + each.cells.codes[both], return_inverse=True)
    code[both] = which
    return [pieces.values[pair // width] * each.values[pair % width] for pair in pairs.tolist()], code


def _blank(sheet: Sheet, name: str) -> Bools:
    return sheet[name].blank if name in sheet else np.ones(len(sheet), np.bool_)


def _same(words: dict[str, Any], _: int) -> dict[str, Any]:
    return words


def _rounded(times: list[Fraction]) -> Ints:
    return np.array([*map(nearest_second, times), 0], np.int64)  # the last is for NONE


def _report_disagreement(
    sheet: Sheet, times: list[Fraction], stated: Ints, products: list[Fraction], multiplied: Ints
) -> None:
    differ = _rounded(times)[stated] != _rounded(products)[multiplied]
    rows = np.flatnonzero((stated != NONE) & (multiplied != NONE) & differ)
    sheet.fault_rows(
        rows,
        "minutes-disagree",
        "minutes",
        lambda row: {"product": f"{float(products[multiplied[row]] / MINUTE):.9g}"},
    )


def _report_gaps(sheet: Sheet) -> None:
    """Report rows without a time, and those with half of one."""
    blank, no_each, no_pieces = (_blank(sheet, name) for name in TIME_COLUMNS)
    column = "minutes" if "minutes" in sheet or "minutes_each" not in sheet else "minutes_each"
    sheet.fault_rows(np.flatnonzero(blank & no_each & no_pieces), "minutes-missing", column, lambda _: {})
    for name, missing, alone in (
        ("quantity", "minutes_each", ~no_pieces & no_each),
        ("minutes_each", "quantity", ~no_each & no_pieces),
    ):
        words = {"missing": missing}
        sheet.fault_rows(np.flatnonzero(blank & alone), "quantity-alone", name, partial(_same, words))
    beside = np.flatnonzero(~blank & (no_each != no_pieces))
    if len(beside):
        count = count_of(len(beside), "row has", "rows have")
        sheet.findings.notice(
            sheet.table.place.whole, "quantity-beside-minutes", count=count, row=sheet.row(beside[0])
        )


def _seconds(sheet: Sheet, times: list[Fraction], code: Ints) -> Ints:
    """Round each time to a whole second, and report where that changes or undoes it."""
    rounded = _rounded(times)
    known = code != NONE
    stated = ~_blank(sheet, "minutes")
    for name, here in (("minutes", stated), ("minutes_each", ~stated)):
        rows = np.flatnonzero(known & here & (rounded[code] == 0))
        sheet.fault_rows(rows, "minutes-rounds-to-zero", name, lambda _: {})
    limit = settings.MAX_MINUTES
    rows = np.flatnonzero(known & (rounded[code] > limit * MINUTE))
    sheet.fault_rows(rows, "minutes-too-large", "quantity", lambda _: {"limit": limit})
    known_rows = np.flatnonzero(known & (rounded[code] > 0))
    _notice_rounded(sheet, "seconds-rounded", times, code, known_rows)
    return rounded[code]


def _notice_rounded(sheet: Sheet, rule: str, times: list[Fraction], code: Ints, rows: Ints) -> None:
    """Notice which of some rows have a time that is no whole number of seconds."""
    odd = np.array([*(time.denominator != 1 for time in times), False])
    changed = rows[odd[code[rows]]]
    if len(changed):
        first = changed[0]
        one, many = ("time is", "times are") if rule == "seconds-rounded" else ("set-up is", "set-ups are")
        sheet.findings.notice(
            sheet.table.place.whole,
            rule,
            count=count_of(len(changed), f"{one} rounded", f"{many} rounded"),
            row=sheet.row(first),
            seconds=f"{float(times[code[first]]):.9g}",
            rounded=nearest_second(times[code[first]]),
        )
