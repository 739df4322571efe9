"""Which number each row of a plan gets, so that the same work keeps one name from plan to plan.

A plan names orders and machines, not visits: which of its rows goes on with what the journal knows is found
out here, from how each operation stood when the plan was made. Pure: no file, no clock.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from itertools import count
from typing import NamedTuple

from shopfloor.model.actuals import PieceState, Status


class Row(NamedTuple):
    """One row of a plan, of one order on one machine; in the order in which they are counted."""

    start_s: int
    end_s: int
    unit: int
    place: int
    part: int

    @property
    def length_s(self) -> int:
        """From start to end."""
        return self.end_s - self.start_s


def row_numbers(
    rows: Sequence[Row], known: Sequence[PieceState], made_s: int | None = None
) -> dict[int, int]:
    """Return the number of each row, by its place in the file.

    Parameters
    ----------
    rows
        Those of one order on one machine, in order.
    known
        How the operations of that order on that machine stood at `made_s`, by number. Without any the rows
        count 1, 2, …
    made_s
        The moment at which the plan was made of what was left then; None for a plan of the whole shift.

    Returns
    -------
    dict
        A row that begins when an operation under way did is that operation. The others go on with what was
        stopped, then with what waits, then repeat under a new number what was scrapped whole; each takes the
        one that is nearest to it in length. A new number is the last resort, but for further parts of an
        operation that is cut anew. O(n log n).
    """
    if not known:
        return {row.place: number for number, row in enumerate(rows, 1)}
    found = _under_way(rows, known, made_s)
    named, taken = set(found.values()), {piece.key.piece for piece in known}
    fresh = (number for number in count(1) if number not in taken)
    rest = [row for row in rows if row.place not in found]
    anew = [row for row in rest if made_s is not None and row.part > 1]
    whole = sorted((row for row in rest if made_s is None or row.part == 1), key=lambda row: row.length_s)
    free = [piece for piece in known if piece.key.piece not in named]
    free = sorted(free, key=lambda piece: _rank(piece, made_s is not None))[: len(whole)]
    offers = [(_length(piece, made_s), next(fresh) if piece.failed else piece.key.piece) for piece in free]
    found |= {row.place: number for row, (_, number) in zip(whole, sorted(offers), strict=False)}
    for row in (*sorted(whole[len(free) :]), *sorted(anew, key=lambda row: row.place)):
        found[row.place] = next(fresh)
    return found


def _under_way(rows: Sequence[Row], known: Sequence[PieceState], made_s: int | None) -> dict[int, int]:
    """Return the number of each row that begins when an operation did.

    In a plan of what is left, all that begins before it was made was running then, whatever was corrected
    since.
    """
    begun = [piece for piece in known if piece.start_s is not None]
    begun.sort(key=lambda piece: (not _is_running(piece), piece.start_s))
    starts: dict[int | None, list[int]] = defaultdict(list)
    for piece in begun:
        starts[piece.start_s].append(piece.key.piece)
    found: dict[int, int] = {}
    for row in rows:
        if starts.get(row.start_s) and (made_s is None or row.start_s <= made_s):
            found[row.place] = starts[row.start_s].pop(0)
    if made_s is not None:
        named = set(found.values())
        running = [one.key.piece for one in begun if _is_running(one) and one.key.piece not in named]
        early = [row.place for row in rows if row.start_s < made_s and row.place not in found]
        found |= dict(zip(early, running, strict=False))
    return found


def _rank(piece: PieceState, rest: bool) -> tuple[int, int, int]:
    """Return how likely a row goes on with an operation, the likeliest first; of those stopped the last."""
    if piece.failed:
        rank = 2
    elif piece.status in (Status.DONE, Status.CANCELLED):
        rank = 4
    elif rest and _is_running(piece):
        rank = 3  # its row would have begun before the plan was made
    else:
        rank = 0 if piece.touched else 1
    return rank, -(piece.start_s or 0), piece.key.piece


def _length(piece: PieceState, made_s: int | None) -> int:
    """Return how long a row of it would be: all of it, or in a plan of what is left that much."""
    return (piece.left_s if made_s is not None and piece.left_s else piece.total_s) or 0


def _is_running(piece: PieceState) -> bool:
    """Whether it is on its machine, be that up or down."""
    return bool(piece.runs) and piece.runs[-1].end_s is None
