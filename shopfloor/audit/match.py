"""Which operation of the shop each row of a plan runs, wholly or in part.

A plan names an order and a machine, not an operation. Where an order visits a machine once, that
settles it. Where it visits the same machine several times the rows are told apart by how long they
take, and equally long ones by time: the earlier visit is the lower step. An operation cut into parts
is put together again from its part numbers first. What still does not fit is matched longest to
longest, so that a wrong duration is reported as one, and not as a visit too many and one too few.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from shopfloor.audit.columns import ranks, run_starts, run_sums
from shopfloor.audit.pieces import Piece, Search, assemble
from shopfloor.audit.settle import settle
from shopfloor.model.shop import NO_STEP, Bools, Ints, Shop
from shopfloor.model.stated import StatedPlan


@dataclass(frozen=True, eq=False)
class _Rows:
    """The rows whose order visits their machine at all, as columns.

    `pair` numbers the combinations of order and machine that occur in the shop.
    """

    row: Ints
    pair: Ints
    part: Ints
    parts: Ints
    start_s: Ints
    end_s: Ints
    seconds: Ints


@dataclass(frozen=True, eq=False)
class _Visits:
    """Rows put together into visits: `of_row` gives each row's visit, the rest has an entry a visit.

    `rows` is the first row of each visit; `pieces` tells whether it is, or claims to be, in parts.
    """

    of_row: Ints
    pair: Ints
    seconds: Ints
    start_s: Ints
    rows: Ints
    pieces: Bools


def match_rows(shop: Shop, stated: StatedPlan, job: Ints, machine: Ints, seconds: Ints) -> Ints:
    """Return the index of the operation that each row runs, -1 for a row that runs none.

    Parameters
    ----------
    job, machine
        Index of each row's order and machine, -1 where the shop has none of that name.
    seconds
        Seconds worked in each row.

    Returns
    -------
    An entry a row. Rows with the same entry are the parts of one operation. O(n log n), apart from
    orders that visit one machine several times in several interleaved parts each, where a bounded
    search puts the parts together (see :mod:`shopfloor.audit.pieces`).
    """
    operation = np.full(len(stated), -1, np.int64)
    machines = max(1, len(shop.machines))
    pairs, pair_of = np.unique(shop.operations.job * machines + shop.operations.machine, return_inverse=True)
    rows = _known_rows(stated, job, machine, seconds, machines, pairs)
    if not len(rows.row):
        return operation
    of_row = _number_visits(rows)
    visits = _put_together(rows, of_row)
    found = _match_equal(shop, pair_of, visits)
    regrouped = _regroup(shop, pair_of, rows, visits, found)
    if regrouped is not None:
        visits = _put_together(rows, regrouped)
        found = _match_equal(shop, pair_of, visits)
    _match_rest(shop, pair_of, visits, found)
    operation[rows.row] = found[visits.of_row]
    return settle(shop, stated, seconds, operation)


def _known_rows(
    stated: StatedPlan, job: Ints, machine: Ints, seconds: Ints, machines: int, pairs: Ints
) -> _Rows:
    wide = np.where((job >= 0) & (machine >= 0), job * machines + machine, -1)
    place = np.searchsorted(pairs, wide)
    known = place < len(pairs)
    known[known] = pairs[place[known]] == wide[known]
    row = np.flatnonzero(known)
    return _Rows(
        row=row,
        pair=place[row],
        part=stated.part[row],
        parts=stated.parts[row],
        start_s=stated.start_s[row],
        end_s=stated.end_s[row],
        seconds=seconds[row],
    )


def _number_visits(rows: _Rows) -> Ints:
    """Number the visits: a whole row is one; the k-th part 1, k-th part 2, … of a pair are another."""
    whole = rows.parts <= 1
    parts, part = np.where(whole, 1, rows.parts), np.where(whole, 0, rows.part)
    order = np.lexsort((rows.row, rows.start_s, part, parts, rows.pair))
    copy = np.empty(len(order), np.int64)
    copy[order] = ranks(run_starts(rows.pair[order], parts[order], part[order]))
    order = np.lexsort((copy, parts, rows.pair))
    of_row = np.empty(len(order), np.int64)
    of_row[order] = np.cumsum(run_starts(rows.pair[order], parts[order], copy[order])) - 1
    return of_row


def _put_together(rows: _Rows, of_row: Ints) -> _Visits:
    order = np.lexsort((rows.row, rows.start_s, of_row))
    first = run_starts(of_row[order])
    begins = order[np.flatnonzero(first)]
    size = np.diff(np.r_[np.flatnonzero(first), len(order)])
    return _Visits(
        of_row,
        rows.pair[begins],
        run_sums(first, rows.seconds[order]),
        rows.start_s[begins],
        rows.row[begins],
        (size > 1) | (rows.parts[begins] > 1),
    )


def _join(left: Ints, right: Ints) -> Ints:
    """Return, for each left key, the position of its right partner or -1.

    The first of a key on the left goes with the first of that key on the right, and so on.
    """
    result = np.full(len(left), -1, np.int64)
    by_left, by_right = np.argsort(left, kind="stable"), np.argsort(right, kind="stable")
    keys, others = left[by_left], right[by_right]
    place = np.searchsorted(others, keys, "left") + ranks(run_starts(keys))
    paired = place < np.searchsorted(others, keys, "right")
    result[by_left[paired]] = by_right[place[paired]]
    return result


def _match_equal(shop: Shop, pair_of: Ints, visits: _Visits) -> Ints:
    """Match visits to operations of exactly their length: earlier visits to lower steps."""
    operations = shop.operations
    needs = np.lexsort((np.arange(len(operations)), operations.step, operations.step == NO_STEP))
    runs = np.lexsort((visits.rows, visits.start_s))
    lengths, code = np.unique(np.concatenate((visits.seconds, operations.seconds)), return_inverse=True)
    visit_key = visits.pair * len(lengths) + code[: len(visits.pair)]
    need_key = pair_of * len(lengths) + code[len(visits.pair) :]
    partner = _join(visit_key[runs], need_key[needs])
    found = np.full(len(visits.pair), -1, np.int64)
    found[runs] = np.where(partner >= 0, needs[partner], -1)
    return found


def _open(size: int, found: Ints) -> Bools:
    """Whether each operation is still without a visit."""
    free = np.ones(size, bool)
    free[found[found >= 0]] = False
    return free


def _regroup(shop: Shop, pair_of: Ints, rows: _Rows, visits: _Visits, found: Ints) -> Ints | None:
    """Put parts together afresh where a pair has several cut visits and not all of them fitted.

    Returns the new numbering of the visits, or None when nothing changed.
    """
    free = _open(len(shop), found)
    pairs = int(pair_of.max()) + 1
    cut = np.bincount(visits.pair[visits.pieces], minlength=pairs)
    unfit = np.bincount(visits.pair[found < 0], minlength=pairs)
    wanting = np.bincount(pair_of[free], minlength=pairs)
    doubtful = (cut > 1) & (unfit > 0) & (wanting > 0)
    if not doubtful.any():
        return None
    of_row, fresh, search = visits.of_row.copy(), len(visits.pair), Search()
    settled = np.zeros(len(shop), bool)
    settled[found[(found >= 0) & ~visits.pieces]] = True
    for members, needs in _by_pair(doubtful, rows, visits, pair_of, ~settled):
        pieces = [
            Piece(*columns)
            for columns in zip(
                *(
                    column[members].tolist()
                    for column in (rows.parts, rows.part, rows.start_s, rows.end_s, rows.seconds)
                ),
                strict=True,
            )
        ]
        for group in assemble(pieces, shop.operations.seconds[needs].tolist(), search) or []:
            of_row[members[group]] = fresh
            fresh += 1
    if fresh == len(visits.pair):
        return None
    return np.unique(of_row, return_inverse=True)[1].astype(np.int64)


def _by_pair(
    doubtful: Bools, rows: _Rows, visits: _Visits, pair_of: Ints, free: Bools
) -> list[tuple[Ints, Ints]]:
    """Return the cut rows and the open operations of each doubtful pair."""
    members = np.flatnonzero(doubtful[rows.pair] & visits.pieces[visits.of_row])
    members = members[np.lexsort((rows.row[members], rows.start_s[members], rows.pair[members]))]
    needs = np.flatnonzero(doubtful[pair_of] & free)
    needs = needs[np.argsort(pair_of[needs], kind="stable")]
    pairs = np.flatnonzero(doubtful)
    row_cut = np.searchsorted(rows.pair[members], pairs[1:])
    need_cut = np.searchsorted(pair_of[needs], pairs[1:])
    return list(zip(np.split(members, row_cut), np.split(needs, need_cut), strict=True))


def _match_rest(shop: Shop, pair_of: Ints, visits: _Visits, found: Ints) -> None:
    """Match what did not fit exactly, in place: all that is left to the one operation left, if it adds
    up; otherwise the longest visit to the longest operation.
    """
    loose = np.flatnonzero(found < 0)
    wanting = np.flatnonzero(_open(len(shop), found))
    if not len(loose) or not len(wanting):
        return
    seconds = shop.operations.seconds
    pairs = int(pair_of.max()) + 1
    loose = loose[np.argsort(visits.pair[loose], kind="stable")]
    only = np.full(pairs, -1, np.int64)
    only[pair_of[wanting]] = wanting
    only[np.bincount(pair_of[wanting], minlength=pairs) != 1] = -1
    total = np.zeros(pairs, np.int64)
    np.add.at(total, visits.pair[loose], visits.seconds[loose])
    adds_up = (only >= 0) & (total == seconds[only])
    joined = loose[adds_up[visits.pair[loose]]]
    found[joined] = only[visits.pair[joined]]

    loose = loose[found[loose] < 0]
    wanting = wanting[~adds_up[pair_of[wanting]]]
    loose = loose[np.lexsort((visits.rows[loose], visits.start_s[loose], -visits.seconds[loose]))]
    wanting = wanting[np.lexsort((wanting, -seconds[wanting]))]
    partner = _join(visits.pair[loose], pair_of[wanting])
    paired = partner >= 0
    found[loose[paired]] = wanting[partner[paired]]
