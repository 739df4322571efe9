"""Splittable work: the shortest schedule of an open shop whose operations may be interrupted, with few cuts.

Every operation joins an order (left) and a machine (right) and runs some whole seconds in all. Nothing may
run on two machines, or serve two orders, at once; so no schedule ends before T, the largest total at any
order or machine. Gonzalez and Sahni (1976) showed that T is always reached when work may be cut. (If every
order and machine has the total T, the schedule writes the matrix of times as a weighted sum of permutation
matrices: Birkhoff 1946, von Neumann 1953.)

Why T is reached. Say that a line (an order or a machine) is *critical* at some moment if the work it has
left equals the time left, L. The schedule may go on as long as no line has more than that; so critical
lines must run, all of them, all the time. They can: the critical orders alone can be matched with machines
on which they have work left, because any j of them have j·L left between them, and the machines concerned
hold at most L each, so there are at least j (Hall 1935). Likewise the critical machines, and from two such
matchings one can be made that covers both sets (Mendelsohn and Dulmage 1958). Run it until an operation
ends or a line outside it becomes critical. Such moments are at most as many as operations and lines
together, for a line stays critical. All of them are sums and differences of the durations given: if those
are multiples of a minute, so is every cut.

How cuts are kept few. Textbook versions pad all totals to T and pick a fresh matching at every moment. Here
what runs goes on running, and a critical line that lies idle is served by an alternating path: a free
partner, else the interruption of as few operations as will do, the line left idle being the one with most
time to spare. A few lines with time to spare are kept waiting on purpose, for with nobody free every
operation that ends on a critical line costs a cut. A few such reserves are tried while there are cuts, and
the plan with fewest wins. `spells` does all this.

Groups of identical machines and a limited crew are reduced to this case in `units`.

References
----------
- T. Gonzalez, S. Sahni, "Open shop scheduling to minimize finish time", Journal of the ACM 23 (1976) 665-679.
- P. Hall, "On representatives of subsets", Journal of the London Mathematical Society 10 (1935) 26-30.
- N. S. Mendelsohn, A. L. Dulmage, "Some generalizations of the problem of distinct representatives", Canadian
  Journal of Mathematics 10 (1958) 230-241.
- G. Birkhoff, "Tres observaciones sobre el algebra lineal", Universidad Nacional de Tucumán, Revista A 5
  (1946) 147-151; J. von Neumann, "A certain zero-sum two-person game equivalent to the optimal assignment
  problem", Contributions to the Theory of Games II (1953) 5-12.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Hashable, Iterable, Sequence
from typing import NamedTuple, TypeVar

import numpy as np
from numpy.typing import ArrayLike

from shopfloor.kernel.multigraph import as_column, as_columns
from shopfloor.kernel.spells import Load, Spell, fewest_cuts

__all__ = ["Block", "numbered", "pairs_of", "pour", "split_loads", "time_blocks"]

Name = TypeVar("Name", bound=Hashable)
Where = TypeVar("Where")


def split_loads(left: ArrayLike, right: ArrayLike, seconds: ArrayLike) -> list[tuple[int, int, int]]:
    """Schedule splittable operations in the least time possible, the largest total at any node.

    Parameters
    ----------
    left, right : array_like of integers, one entry an operation
        The order and the machine of each, as for `shopfloor.kernel.colouring.colour_edges`.
    seconds : array_like of integers, one entry an operation
        How long it runs in all; 0 or more.

    Returns
    -------
    list of (edge, start, end)
        Pieces in order of start, then edge; integers with start < end. The pieces of an operation add up to
        its seconds and never touch each other; an operation of 0 seconds has none. No two pieces at one
        node overlap. The last end is the largest total at any node, or there are no pieces.

    Raises
    ------
    TypeError
        If a column does not hold integers.
    ValueError
        If a column is not one-dimensional, lengths differ, or a node number or a duration is negative.

    Notes
    -----
    At most m + n moments at which something ends or becomes critical, each served by paths of O(m) steps;
    in practice well under a hundredth of the operations are cut unless nearly all lines are tight. O(m + n)
    memory beside the pieces.
    """
    pairs = pairs_of(left, right, seconds)
    rows = numbered(row for row, _ in pairs)
    columns = numbered(column for _, column in pairs)
    loads = [
        Load(rows[row], columns[column], sum(amount for _, amount in edges))
        for (row, column), edges in pairs.items()
    ]
    pieces = []
    for edges, spells in zip(pairs.values(), fewest_cuts(loads), strict=True):
        pieces += [(edge, *spell) for edge, spell, _ in pour(edges, [(spell, None) for spell in spells])]
    return sorted(pieces, key=lambda piece: (piece[1], piece[0]))


def pairs_of(
    left: ArrayLike, right: ArrayLike, seconds: ArrayLike
) -> dict[tuple[int, int], list[tuple[int, int]]]:
    """Check the columns and return, for each pair of nodes with work, its operations and their seconds.

    Parallel operations are scheduled as one load. Raises as `split_loads` says.
    """
    us, vs = as_columns(left, right)
    amounts = as_column(seconds, "seconds")
    if len(amounts) != len(us):
        raise ValueError(f"seconds must have one entry an operation, got {len(amounts)} for {len(us)}")
    for name, column in (("left", us), ("right", vs), ("seconds", amounts)):
        if len(column) and column.min() < 0:
            where = int(np.argmax(column < 0))
            raise ValueError(f"{name} must not be negative, got {column[where]} at position {where}")
    pairs: dict[tuple[int, int], list[tuple[int, int]]] = {}
    for edge, row, column, amount in zip(
        range(len(us)), us.tolist(), vs.tolist(), amounts.tolist(), strict=True
    ):
        if amount:
            pairs.setdefault((row, column), []).append((edge, amount))
    return pairs


def numbered(names: Iterable[Name]) -> dict[Name, int]:
    """Number the distinct names from 0, the most frequent first, then as they come.

    Lines with many loads are hardest to fit in, and low numbers win where time to spare is equal.
    """
    return {name: number for number, (name, _) in enumerate(Counter(names).most_common())}


def pour(
    edges: Sequence[tuple[int, int]], spells: Sequence[tuple[Spell, Where]]
) -> list[tuple[int, Spell, Where]]:
    """Fill the spells of a pair, each with where it runs, with its operations and their seconds, in order."""
    pieces = []
    waiting = iter(spells)
    (start, end), where = next(waiting)
    for edge, amount in edges:
        while amount:
            if start == end:
                (start, end), where = next(waiting)
            until = min(end, start + amount)
            pieces.append((edge, (start, until), where))
            amount -= until - start
            start = until
    return pieces


class Block(NamedTuple):
    """A stretch of time during which the same operations run."""

    start: int
    end: int
    edges: tuple[int, ...]


def time_blocks(pieces: Iterable[tuple[int, int, int]]) -> list[Block]:
    """Cut a plan into the longest stretches during which the same operations run, idle ones left out.

    The stretches may be put in any order, one after the other, without a clash and without a longer plan:
    within each of them no two operations meet. That makes a plan's early part a matter of choice, at the
    price of cuts between stretches that are pulled apart.
    """
    changes: dict[int, list[int]] = {}
    for edge, start, end in pieces:
        changes.setdefault(start, []).append(edge)
        changes.setdefault(end, []).append(~edge)
    blocks: list[Block] = []
    running: set[int] = set()
    before = 0
    for moment in sorted(changes):
        if running:
            blocks.append(Block(before, moment, tuple(sorted(running))))
        running.difference_update(~edge for edge in changes[moment] if edge < 0)
        running.update(edge for edge in changes[moment] if edge >= 0)
        before = moment
    return blocks
