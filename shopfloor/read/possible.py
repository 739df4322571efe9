"""Rows that no plan can hold become faults; rows that cannot end within the shift are worth saying."""

from __future__ import annotations

import numpy as np

from shopfloor.model.feasible import Impossible, beyond_shift, impossible
from shopfloor.model.shop import Ints, Shop
from shopfloor.read.columns import Sheet
from shopfloor.read.rules import count_of

_TIMES = ("minutes", "quantity", "minutes_each")
_COLUMNS = {"too-few-heads": ("heads",), "longer-than-heads-stay": ("heads",), "never-open-again": ()}


def report_impossible(sheet: Sheet, shop: Shop, rows: Ints) -> Ints:
    """Report every operation that no plan can hold, at the cell that says most about it, and return them.

    Parameters
    ----------
    shop
        The rows that are sound.
    rows
        The place in `sheet` of each of its operations.
    """
    found = sorted(impossible(shop), key=lambda one: (one.operation, one.rule))

    def add(one: Impossible) -> None:
        row = int(rows[one.operation])
        names = [name for name in _COLUMNS.get(one.rule, _TIMES) if name in sheet and sheet[name].given[row]]
        name = names[0] if names else "machine"
        place, text = sheet.place(row, name), sheet.text(row, name)
        sheet.findings.fault(place, one.rule, text, problem=one.problem, advice=one.advice)

    sheet.findings.each(found, len(found), add)
    return np.array([one.operation for one in found], np.int64)


def notice_late(sheet: Sheet, shop: Shop, rows: Ints, but: Ints) -> None:
    """Notice orders released after the shift, and operations, `but` some, that by themselves outlast it."""
    if shop.shift_end_s is None:
        return
    late = shop.orders.release_s[shop.operations.job] >= shop.shift_end_s
    released = np.flatnonzero(late)
    long = np.setdiff1d(beyond_shift(shop), np.r_[released, but])
    if len(released):
        first = shop.operation(int(released[0]))
        orders = len(np.unique(shop.operations.job[released]))
        sheet.findings.notice(
            sheet.table.place.whole,
            "released-after-shift",
            count=count_of(orders, "order is", "orders are"),
            end=shop.clock.say(shop.shift_end_s),
            order=first.order,
            row=sheet.row(int(rows[first.index])),
        )
    if len(long):
        first = shop.operation(int(long[0]))
        sheet.findings.notice(
            sheet.table.place.whole,
            "beyond-shift",
            count=count_of(len(long), "operation cannot", "operations cannot"),
            order=first.order,
            machine=first.machine_id,
            row=sheet.row(int(rows[first.index])),
        )
