"""Rules about what the rows say one by one: names, units, lengths, parts, and every operation once."""

from __future__ import annotations

from collections.abc import Callable
from difflib import get_close_matches
from functools import cache

import numpy as np

from shopfloor.audit.columns import ranks, run_sums
from shopfloor.audit.reading import Breaches, Reading, breaches
from shopfloor.model.calendar import duration
from shopfloor.model.shop import Bools, Ints, Shop

MOST_NAMES_COMPARED = 2_000  # beyond, a nearest name costs more time than it saves


def unknown_orders(reading: Reading) -> Breaches:
    """Every row's order is one of the shop's."""
    nearest = _nearest(reading.shop.orders.ids)

    def say(row: int) -> str:
        name = reading.stated.order[row]
        return f"{reading.visit(row)}: the orders file has no order {name!r}{nearest(name)}."

    return breaches(say, np.flatnonzero(reading.job < 0))


def unknown_machines(reading: Reading) -> Breaches:
    """Every row's machine is one of the shop's."""
    nearest = _nearest(tuple(machine.id for machine in reading.shop.machines))

    def say(row: int) -> str:
        name = reading.stated.machine[row]
        return f"{reading.visit(row)}: the shop has no machine {name!r}{nearest(name)}."

    return breaches(say, np.flatnonzero(reading.machine < 0))


def missing_operations(reading: Reading) -> Breaches:
    """Every operation of the shop is in the plan."""
    absent = np.ones(len(reading.shop), bool)
    absent[reading.operation[reading.operation >= 0]] = False
    return breaches(
        lambda operation: f"{reading.need(operation)} is missing from the plan.",
        np.flatnonzero(absent),
        are_rows=False,
    )


def extra_rows(reading: Reading) -> Breaches:
    """No row runs what the orders do not ask for, or what another row runs already."""
    extra = np.flatnonzero((reading.operation < 0) & (reading.job >= 0) & (reading.machine >= 0))
    rival, asked = _rivals(reading, extra)
    asked_at = dict(zip(extra.tolist(), asked.tolist(), strict=True))

    def say(other: int, row: int) -> str:
        if not asked_at[row]:
            return f"{reading.visit(row)}: the orders do not ask for this visit."
        often = "once" if asked_at[row] == 1 else f"{asked_at[row]} times"
        again = f"{reading.visit(other)}, and again {reading.span(row)}" if other >= 0 else reading.visit(row)
        return f"{again}: the orders ask for this visit {often}."

    return Breaches(np.column_stack([rival, extra]), say)


def _rivals(reading: Reading, extra: Ints) -> tuple[Ints, Ints]:
    """Return, for each extra row, the first row that runs the same visit, and how many are asked for."""
    machines = max(1, len(reading.shop.machines))
    operations = reading.shop.operations
    asked = np.sort(operations.job * machines + operations.machine)
    rows = reading.pieces[0]
    rows = rows[np.lexsort((rows, reading.stated.start_s[rows]))]
    pairs, first = np.unique(reading.job[rows] * machines + reading.machine[rows], return_index=True)
    mine = reading.job[extra] * machines + reading.machine[extra]
    rival = np.full(len(extra), -1, np.int64)
    if len(pairs):
        place = np.minimum(np.searchsorted(pairs, mine), len(pairs) - 1)
        rival = np.where(pairs[place] == mine, rows[first[place]], -1)
    return rival, np.searchsorted(asked, mine, "right") - np.searchsorted(asked, mine, "left")


def lengths(reading: Reading) -> Breaches:
    """Every row ends after it starts."""

    def say(row: int) -> str:
        start, end = reading.stated.start_s[row], reading.stated.end_s[row]
        what = "as it starts: a visit must take time" if start == end else "before it starts"
        return f"{reading.visit(row)} ends {what}."

    return breaches(say, np.flatnonzero(~reading.lasting))


def durations(reading: Reading) -> Breaches:
    """The parts of an operation together take its time; rows without length are reported as such."""
    rows, first = reading.pieces
    begins = np.flatnonzero(first)
    planned = run_sums(first, reading.seconds[rows])
    sound = run_sums(first, (~reading.lasting[rows]).astype(np.int64)) == 0
    operation = reading.operation[rows[begins]]
    wrong = np.flatnonzero(sound & (planned != reading.shop.operations.seconds[operation]))
    ends = np.r_[begins[1:], len(rows)] - 1
    stated = dict(zip(rows[begins[wrong]].tolist(), planned[wrong].tolist(), strict=True))

    def say(row: int, last: int) -> str:
        long = duration(stated[row])
        how = long if row == last else f"{long} in all its parts"
        when = f"from {reading.at(reading.stated.start_s[row])} to {reading.at(reading.stated.end_s[last])}"
        return f"{reading.need(int(reading.operation[row]))} is planned {when}: {how}."

    return breaches(say, rows[begins[wrong]], rows[ends[wrong]])


def starts(reading: Reading) -> Breaches:
    """Nothing starts before the shift."""

    def say(row: int) -> str:
        early = reading.at(reading.stated.start_s[row])
        return f"{_who(reading, row)} starts at {early}, before the shift does at {reading.at(0)}."

    return breaches(say, np.flatnonzero(reading.stated.start_s < 0))


def units(reading: Reading) -> Breaches:
    """Every row's unit is one of its machine's."""
    counts = np.array([machine.count for machine in reading.shop.machines], np.int64)
    known = np.flatnonzero(reading.machine >= 0)
    unit = reading.stated.unit[known]
    wrong = known[(unit < 1) | (unit > counts[reading.machine[known]])] if len(known) else known

    def say(row: int) -> str:
        count, name = int(counts[reading.machine[row]]), reading.stated.machine[row]
        have = "is a single unit" if count == 1 else f"has the units 1 to {count}"
        return f"{reading.visit(row)}: {name} {have}."

    return breaches(say, wrong)


def splits(reading: Reading) -> Breaches:
    """Only operations that may be split are in more than one part."""
    rows, first = reading.pieces
    begins = np.flatnonzero(first)
    cut = begins[np.diff(np.r_[begins, len(rows)]) > 1]
    cut = cut[~_may_split(reading.shop, reading.operation[rows[cut]])]

    def say(row: int, _next: int) -> str:
        operation = int(reading.operation[row])
        parts = int((reading.operation == operation).sum())
        return f"{reading.need(operation)} is cut into {parts} parts, but it may not be split."

    return breaches(say, rows[cut], rows[cut + 1])


def _may_split(shop: Shop, operations: Ints) -> Bools:
    may: Bools = shop.operations.splittable[operations] == 1
    return may


def part_numbers(reading: Reading) -> Breaches:
    """The parts of an operation are numbered by time, from 1 to how many there are."""
    stated = reading.stated
    rows, first = reading.pieces
    part, parts = np.zeros(len(stated), np.int64), np.zeros(len(stated), np.int64)
    if len(rows):
        part[rows] = ranks(first) + 1
        begins = np.flatnonzero(first)
        parts[rows] = np.diff(np.r_[begins, len(rows)])[np.cumsum(first) - 1]
    matched = reading.operation >= 0
    wrong = matched & ((stated.part != part) | (stated.parts != parts))
    wrong |= ~matched & ((stated.part < 1) | (stated.part > stated.parts))

    def say(row: int) -> str:
        numbered = f"numbered part {stated.part[row]} of {stated.parts[row]}"
        if not matched[row]:
            return f"{reading.visit(row)} is {numbered}."
        return f"{reading.visit(row)} is part {part[row]} of {parts[row]} by time, but {numbered}."

    return breaches(say, np.flatnonzero(wrong))


def _who(reading: Reading, row: int) -> str:
    return f"{reading.stated.order[row]} on {reading.place(row)}"


def _nearest(names: tuple[str, ...]) -> Callable[[str], str]:
    @cache
    def nearest(name: str) -> str:
        if len(names) > MOST_NAMES_COMPARED:
            return ""
        close = get_close_matches(name, names, n=1)
        return f"; the nearest is {close[0]}" if close else ""

    return nearest
