"""Rules about round numbers, for plans that state them: a round is one slot, shared by all its rows."""

from __future__ import annotations

import numpy as np

from shopfloor.audit.columns import latest_so_far, run_starts
from shopfloor.audit.reading import Breaches, Reading, breaches
from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import Ints


def round_numbers(reading: Reading) -> Breaches:
    """Rounds count from 1, and where one row states a round, every row does."""
    rank = reading.stated.round

    def say(row: int) -> str:
        if rank[row] == NO_ROUND:
            return f"{reading.visit(row)} is in no round, though the rest of the plan runs in rounds."
        return f"{reading.visit(row)} is in round {rank[row]}, but rounds count from 1."

    wrong = (rank < 1) & (rank != NO_ROUND)
    if bool((rank != NO_ROUND).any()):
        wrong |= rank == NO_ROUND
    return breaches(say, np.flatnonzero(wrong))


def round_starts(reading: Reading) -> Breaches:
    """Rows of one round start together, and rows that start together are in one round."""
    rank, start = reading.stated.round, reading.stated.start_s
    rows = _in_rounds(reading)
    one, two = _odd_ones(rows, rank[rows], start[rows])
    other, odd = _odd_ones(rows, start[rows], rank[rows])

    def say(usual: int, row: int) -> str:
        if rank[usual] == rank[row]:
            return (
                f"{reading.visit(row)} is in round {rank[row]}, which starts at {reading.at(start[usual])} "
                f"({reading.stated.order[usual]} on {reading.place(usual)})."
            )
        return (
            f"{reading.visit(row)} is in round {rank[row]}, but {reading.stated.order[usual]} on "
            f"{reading.place(usual)} starts with it in round {rank[usual]}."
        )

    return breaches(say, np.r_[one, other], np.r_[two, odd])


def round_order(reading: Reading) -> Breaches:
    """Each round starts only when the rounds before it have ended."""
    rank, start, end = reading.stated.round, reading.stated.start_s, reading.stated.end_s
    rows = _in_rounds(reading)
    rows = rows[np.lexsort((rows, start[rows], rank[rows]))]

    def say(earlier: int, row: int) -> str:
        return (
            f"Round {rank[row]} starts at {reading.at(start[row])} ({reading.stated.order[row]} on "
            f"{reading.place(row)}), but round {rank[earlier]} ends at {reading.at(end[earlier])} "
            f"({reading.stated.order[earlier]} on {reading.place(earlier)})."
        )

    if not len(rows):
        return breaches(say, rows, rows)
    begins = np.flatnonzero(run_starts(rank[rows]))[1:]
    before = latest_so_far(run_starts(np.zeros(len(rows), np.int64)), end[rows])[begins - 1]
    early = start[rows[begins]] < end[rows[before]]
    return breaches(say, rows[before[early]], rows[begins[early]])


def round_visits(reading: Reading) -> Breaches:
    """In a round an order visits one machine and a unit of a machine serves one order."""
    rank = reading.stated.round
    rows = _in_rounds(reading)
    known = rows[reading.job[rows] >= 0]
    one, two = _repeats(known, rank[known], reading.job[known])
    known = rows[reading.machine[rows] >= 0]
    other, again = _repeats(known, rank[known], reading.machine[known], reading.stated.unit[known])
    by_order = set(zip(one.tolist(), two.tolist(), strict=True))

    def say(first: int, row: int) -> str:
        if (first, row) in by_order:
            return (
                f"{reading.stated.order[row]} is on {reading.place(first)} and on {reading.place(row)} "
                f"in round {rank[row]}."
            )
        return (
            f"{reading.place(row)} serves {reading.stated.order[first]} and {reading.stated.order[row]} "
            f"in round {rank[row]}."
        )

    both = np.unique(np.column_stack([np.r_[one, other], np.r_[two, again]]), axis=0)
    return breaches(say, both[:, 0], both[:, 1])


def _in_rounds(reading: Reading) -> Ints:
    return np.flatnonzero(reading.stated.round != NO_ROUND)


def _odd_ones(rows: Ints, group: Ints, value: Ints) -> tuple[Ints, Ints]:
    """Return the rows whose value is not the usual one of their group, after a row that has it.

    The usual value is the most frequent, the lowest of several.
    """
    order = np.lexsort((rows, value, group))
    rows, group, value = rows[order], group[order], value[order]
    cells = np.flatnonzero(run_starts(group, value))
    size = np.diff(np.r_[cells, len(rows)])
    ranked = np.lexsort((value[cells], -size, group[cells]))
    usual = cells[ranked][np.flatnonzero(run_starts(group[cells][ranked]))]
    mine = usual[np.cumsum(run_starts(group)) - 1] if len(rows) else usual
    odd = np.flatnonzero(value != value[mine])
    return rows[mine[odd]], rows[odd]


def _repeats(rows: Ints, *columns: Ints) -> tuple[Ints, Ints]:
    """Return the rows that agree with an earlier row in every column, after the first that does."""
    order = np.lexsort((rows, *columns[::-1]))
    rows = rows[order]
    first = run_starts(*(column[order] for column in columns))
    repeated = np.flatnonzero(~first)
    begin = np.flatnonzero(first)[(np.cumsum(first) - 1)[repeated]]
    return rows[begin], rows[repeated]
