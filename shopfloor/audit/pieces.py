"""Puts the parts of several operations of one order on one machine together again.

A plan says "part 2 of 3" but not of which operation, when an order visits a machine more than once. The
search below looks for a way to deal the parts out so that every visit has its parts in time order and
takes exactly the time of one operation. Dealing out sums is NP-hard in general (Garey and Johnson
1979, problem SP15, 3-partition), so the search is bounded; beyond the bound the parts are taken in
time order, and the audit may then report a duration where another dealing would have none.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

MOST_PIECES = 200
MOST_TRIALS = 200_000


class Piece(NamedTuple):
    """One row that is part `part` of `parts`, with the seconds worked in it."""

    parts: int
    part: int
    start_s: int
    end_s: int
    seconds: int


@dataclass
class Search:
    """The trials left to all searches of one audit together."""

    trials: int = MOST_TRIALS


def assemble(pieces: Sequence[Piece], seconds: Sequence[int], search: Search) -> list[list[int]] | None:
    """Return the pieces of each visit, as positions in `pieces`, or None when no dealing was found.

    Parameters
    ----------
    pieces
        In order of start.
    seconds
        The times of the operations that the visits may stand for, in any order.
    search
        Counts the trials down; shared by several calls.
    """
    if len(pieces) > MOST_PIECES:
        return None
    wanted = Counter(seconds)
    longest = max(wanted, default=0)
    free = [True] * len(pieces)
    groups: list[list[int]] = []

    def begin() -> bool:
        first = next((k for k in range(len(pieces)) if free[k] and pieces[k].part == 1), None)
        if first is None:
            return not any(free)
        return extend([first], pieces[first].seconds)

    def extend(group: list[int], total: int) -> bool:
        search.trials -= 1
        if search.trials < 0 or total > longest:
            return False
        latest = pieces[group[-1]]
        free[group[-1]] = False
        if len(group) == latest.parts:
            if wanted[total]:
                wanted[total] -= 1
                groups.append(group)
                if begin():
                    return True
                groups.pop()
                wanted[total] += 1
        else:
            for k in range(group[-1] + 1, len(pieces)):
                piece = pieces[k]
                follows = (piece.parts, piece.part) == (latest.parts, len(group) + 1)
                fits = free[k] and follows and piece.start_s >= latest.end_s
                if fits and extend([*group, k], total + piece.seconds):
                    return True
        free[group[-1]] = True
        return False

    return groups if begin() else None
