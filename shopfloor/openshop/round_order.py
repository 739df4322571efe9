"""The order of rounds: any permutation keeps the makespan, so take one that serves the due times.

The rounds of a colouring, and the blocks of a plan whose work is cut, may run in any sequence. An order
is finished when the last round it is in ends. Minimised first is weighted tardiness, then weighted
completion.

* Up to ``EXACT_ROUNDS`` rounds a recursion over sets finds the least cost (M. Held, R. M. Karp, J. SIAM
  10 (1962) 196-210): which orders end with a round depends only on the set of rounds run by then.
  O(R 2^R n) for R rounds and n orders.
* Beyond, the sequence is filled from the back, each time with the round that costs least there (after
  E. L. Lawler, Management Science 19 (1973) 544-546, where that is exact for the largest cost), in
  O(m + R²), and then improved by swapping two rounds.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from shopfloor.model.calendar import duration
from shopfloor.model.shop import Ints

EXACT_ROUNDS = 12
SETS_TIMES_ORDERS = 20_000_000  # a set of rounds and an order are looked at together: memory and time
MOVES_TRIED = 4_000  # swaps of two rounds tried after filling from the back
PRIORITY_UNIT = 1_000  # priorities have at most three decimals: exact as whole thousandths


@dataclass(frozen=True, slots=True)
class RoundOrder:
    """Where each round goes: `position[round]` counts from 0; and what that costs.

    `tardiness` and `completion` are weighted sums in seconds × thousandths of priority. `proved` says
    that no sequence of these rounds has less tardiness (and, if `exact`, less completion).
    """

    position: Ints
    tardiness: int
    completion: int
    proved: bool
    exact: bool

    def about(self, what: str) -> str:
        """Say what the order of `what` (rounds, blocks) did for the due times, and what is proved."""
        if self.tardiness == 0:
            return f"The {what} were put in an order in which nothing is late."
        left = duration(round(self.tardiness / PRIORITY_UNIT))
        best = "no" if self.proved else "perhaps some"
        return (
            f"The {what} were put in order for the due times; lateness weighted by priority comes to {left}, "
            f"and {best} other order of them has less."
        )


def order_rounds(
    rounds: Ints, job: Ints, lengths: Ints, moment: Callable[[Any], Any], due_s: Ints, priority: Any
) -> RoundOrder:
    """Return a good sequence of rounds.

    Parameters
    ----------
    rounds, job
        Round and order of each operation, or piece of one; rounds are 0 … len(lengths)-1.
    lengths
        The length of each round, in any unit.
    moment
        When rounds of so much length together, run first, are over, in seconds; for arrays of lengths.
    due_s, priority
        An entry an order; the largest integer (``NO_DUE``) where an order has none.
    """
    weight = np.rint(np.asarray(priority, dtype=np.float64) * PRIORITY_UNIT).astype(np.int64)
    pairs = np.unique(np.stack([rounds, job]), axis=1) if len(rounds) else np.empty((2, 0), np.int64)
    bill = _Bill(pairs[0], pairs[1], np.asarray(lengths, np.int64), moment, due_s, weight)
    exact = bill.rounds <= EXACT_ROUNDS and len(weight) << bill.rounds <= SETS_TIMES_ORDERS
    position = _by_sets(bill) if exact else _improve(bill, _from_the_back(bill))
    tardiness, completion = bill.total(position)
    return RoundOrder(position, tardiness, completion, proved=exact or tardiness == 0, exact=exact)


class _Bill:
    """What a sequence costs; `round` and `job` list each pair of a round and an order in it once."""

    def __init__(
        self, round_: Ints, job: Ints, lengths: Ints, moment: Callable[[Any], Any], due_s: Ints, weight: Ints
    ) -> None:
        self.round, self.job, self.lengths, self.rounds = round_, job, lengths, len(lengths)
        self.moment, self.due_s, self.weight = moment, due_s, weight
        self.has_work = np.bincount(job, minlength=len(weight)) > 0

    def total(self, position: Ints) -> tuple[int, int]:
        """Return weighted tardiness and weighted completion of one sequence."""
        ends = np.empty(self.rounds, np.int64)
        sequence = np.argsort(position)
        ends[sequence] = self.moment(np.cumsum(self.lengths[sequence]))
        done = np.zeros(len(self.weight), np.int64)
        np.maximum.at(done, self.job, ends[self.round])
        late = np.where(self.has_work, np.maximum(done, self.due_s) - self.due_s, 0)
        return int((self.weight * late).sum()), int((self.weight * done).sum())


def _by_sets(bill: _Bill) -> Ints:
    """Return the best sequence by a recursion over the sets of rounds already run."""
    rounds = bill.rounds
    if rounds == 0:
        return np.zeros(0, np.int64)
    masks = np.zeros(len(bill.weight), np.int64)
    np.bitwise_or.at(masks, bill.job, np.int64(1) << bill.round)
    sets = np.arange(1 << rounds)
    size = np.array([int(s).bit_count() for s in sets])
    length = sum(np.where((sets >> r) & 1, bill.lengths[r], 0) for r in range(rounds))
    ends = bill.moment(length)
    over = (masks[None, :] & ~sets[:, None]) == 0  # whether an order is finished within a set
    # least[0], least[1]: weighted tardiness and completion of the best sequence of each set
    least = np.full((2, 1 << rounds), np.iinfo(np.int64).max // 4, np.int64)
    least[:, 0] = 0
    last_round = np.full(1 << rounds, -1, np.int64)
    for t in range(1, rounds + 1):
        here = sets[size == t]
        end = ends[here][:, None]
        late = np.maximum(end, bill.due_s[None, :]) - bill.due_s[None, :]
        for r in range(rounds):
            holds = (here >> r) & 1 == 1
            there = here[holds]
            new = (over[there] & ~over[there ^ (1 << r)]) * bill.weight[None, :]
            cost = np.stack([(new * late[holds]).sum(axis=1), (new * end[holds]).sum(axis=1)])
            reach = least[:, there ^ (1 << r)] + cost
            now = least[:, there]
            better = (reach[0] < now[0]) | ((reach[0] == now[0]) & (reach[1] < now[1]))
            least[:, there[better]] = reach[:, better]
            last_round[there[better]] = r
    position, left = np.empty(rounds, np.int64), (1 << rounds) - 1
    for t in range(rounds - 1, -1, -1):
        position[last_round[left]] = t
        left &= ~(1 << int(last_round[left]))
    return position


def _from_the_back(bill: _Bill) -> Ints:
    """Fill positions from the last to the first, each with the round that costs least there.

    Last of those left, a round costs Σ w·max(0, end - due) over its orders not yet placed; kept as
    slope · end - level, so that each order enters and leaves each of its rounds once.
    """
    rounds = bill.rounds
    by_job = np.argsort(bill.job, kind="stable")
    round_of = bill.round[by_job]
    ends = np.searchsorted(bill.job[by_job], np.arange(len(bill.weight) + 1))
    by_round = np.argsort(bill.round, kind="stable")
    job_of = bill.job[by_round]
    starts = np.searchsorted(bill.round[by_round], np.arange(rounds + 1))

    length_left = int(bill.lengths.sum())
    late = bill.has_work & (bill.due_s < int(bill.moment(length_left)))
    slope = np.bincount(bill.round, (bill.weight * late)[bill.job], rounds)
    level = np.bincount(bill.round, (bill.weight * np.where(late, bill.due_s, 0))[bill.job], rounds)
    weight = np.bincount(bill.round, bill.weight[bill.job].astype(np.float64), rounds)
    latest_due_last = sorted(np.flatnonzero(late).tolist(), key=lambda j: (int(bill.due_s[j]), j))
    placed = np.zeros(len(bill.weight), bool)
    position, open_rounds = np.full(rounds, -1, np.int64), np.ones(rounds, bool)

    def leave(j: int) -> None:
        mine = round_of[ends[j] : ends[j + 1]]
        slope[mine] -= bill.weight[j]
        level[mine] -= bill.weight[j] * bill.due_s[j]

    for t in range(rounds - 1, -1, -1):
        end = int(bill.moment(length_left))
        while latest_due_last and bill.due_s[latest_due_last[-1]] >= end:
            j = latest_due_last.pop()
            if not placed[j]:
                leave(j)
                late[j] = False
        candidates = np.flatnonzero(open_rounds)
        cost = slope[candidates] * end - level[candidates]
        cheapest = candidates[cost <= cost.min()]
        chosen = int(cheapest[weight[cheapest].argmin()])
        position[chosen], open_rounds[chosen] = t, False
        length_left -= int(bill.lengths[chosen])
        for j in job_of[starts[chosen] : starts[chosen + 1]].tolist():
            if not placed[j]:
                placed[j] = True
                weight[round_of[ends[j] : ends[j + 1]]] -= bill.weight[j]
                if late[j]:
                    leave(j)
    return position


def _improve(bill: _Bill, position: Ints) -> Ints:
    """Swap two rounds while that helps, at most ``MOVES_TRIED`` tries in a fixed order."""
    rounds = bill.rounds
    sequence = np.argsort(position)
    best = bill.total(position)
    # Whole totals are recomputed each time: tries shrink as the operations grow, to keep this in its place.
    tries = min(MOVES_TRIED, 20_000_000 // max(1, len(bill.round)))
    improved = True
    while improved and tries > 0:
        improved = False
        for distance, place in ((d, p) for d in range(1, rounds) for p in range(rounds - d)):
            if tries <= 0:
                break
            tries -= 1
            swapped = sequence.copy()
            swapped[[place, place + distance]] = sequence[[place + distance, place]]
            trial = np.empty(rounds, np.int64)
            trial[swapped] = np.arange(rounds)
            cost = bill.total(trial)
            if cost < best:
                sequence, position, best, improved = swapped, trial, cost, True
    return position
