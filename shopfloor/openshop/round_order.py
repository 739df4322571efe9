"""The order of rounds: any permutation keeps the makespan, so take one that serves the due times.

An order is finished when the last of its rounds is. Minimised first is weighted tardiness, then
weighted completion. Both are sums over time: after t rounds, every order not yet finished adds what
the next round costs it. So the cost of a sequence is a sum over its prefixes, each depending only
on *which* rounds it holds, and

* up to ``EXACT_ROUNDS`` rounds a recursion over sets finds the least cost (M. Held, R. M. Karp,
  J. SIAM 10 (1962) 196-210, for sequencing), in O(R² 2^R);
* beyond, the sequence is filled from the back, each time with the round that costs least there
  (after E. L. Lawler, Management Science 19 (1973) 544-546, where it is exact for the maximum), in
  O(m + R²), and then improved by swapping two rounds.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from shopfloor.model.shop import NO_DUE, Ints

EXACT_ROUNDS = 12
MOVES_TRIED = 4_000  # swaps of two rounds tried after filling from the back
PRIORITY_UNIT = 1_000  # priorities have at most three decimals: exact as whole thousandths


@dataclass(frozen=True, slots=True)
class RoundOrder:
    """Where each colour goes: `position[colour]` counts from 0; and what that costs.

    `tardiness` and `completion` are weighted sums in seconds × thousandths of priority. `proved` says
    that no permutation of these rounds has less tardiness (and, if `exact`, less completion).
    """

    position: Ints
    tardiness: int
    completion: int
    proved: bool
    exact: bool


def order_rounds(colour: Ints, job: Ints, ends: Ints, due_s: Ints, priority: Any) -> RoundOrder:
    """Return a good order of the rounds of a colouring.

    Parameters
    ----------
    colour, job
        Round and order of each operation; colours are 0 … rounds-1.
    ends
        When the first, second, … round ends, in seconds; their number is the number of colours.
    due_s, priority
        An entry an order; ``NO_DUE`` where an order has none.
    """
    weight = np.rint(np.asarray(priority, dtype=np.float64) * PRIORITY_UNIT).astype(np.int64)
    pairs = np.unique(np.stack([colour, job]), axis=1) if len(colour) else np.empty((2, 0), np.int64)
    bill = _Bill(pairs[0], pairs[1], np.asarray(ends, np.int64), due_s, weight)
    exact = len(ends) <= EXACT_ROUNDS
    position = _by_sets(bill) if exact else _improve(bill, _from_the_back(bill))
    tardiness, completion = bill.total(position)
    return RoundOrder(position, tardiness, completion, proved=exact or tardiness == 0, exact=exact)


class _Bill:
    """What a permutation costs; `colour` and `job` list each pair of a round and an order in it once."""

    def __init__(self, colour: Ints, job: Ints, ends: Ints, due_s: Ints, weight: Ints) -> None:
        self.colour, self.job, self.ends, self.rounds = colour, job, ends, len(ends)
        self.due_s, self.weight = due_s, weight
        self.has_work = np.bincount(job, minlength=len(weight)) > 0

    def total(self, position: Ints) -> tuple[int, int]:
        """Return weighted tardiness and weighted completion of one permutation."""
        last = np.full(len(self.weight), -1, np.int64)
        np.maximum.at(last, self.job, position[self.colour])
        done = np.r_[self.ends, 0][last]  # -1, an order without operations, takes the zero
        late = np.where(self.has_work & (self.due_s != NO_DUE), np.maximum(done - self.due_s, 0), 0)
        return int((self.weight * late).sum()), int((self.weight * done).sum())

    def round_cost(self, t: int) -> tuple[Ints, Ints]:
        """Return what one more unfinished round costs each order when it is the t-th, counted from 0."""
        begin, end = int(self.ends[t - 1]) if t else 0, int(self.ends[t])
        due = np.where(self.due_s == NO_DUE, end, self.due_s)
        # An order already late at time zero has been charged for that in full at the first round.
        begin_late = np.maximum(begin - due, 0) if t else 0
        return self.weight * (np.maximum(end - due, 0) - begin_late), self.weight * (end - begin)


def _by_sets(bill: _Bill) -> Ints:
    """Return the best permutation by a recursion over the sets of rounds already run."""
    rounds = bill.rounds
    if rounds == 0:
        return np.zeros(0, np.int64)
    masks = np.zeros(len(bill.weight), np.int64)
    np.bitwise_or.at(masks, bill.job, np.int64(1) << bill.colour)
    sets = np.arange(1 << rounds)
    size = np.array([int(s).bit_count() for s in sets])
    # least[0], least[1]: weighted tardiness and completion of the best sequence of each set
    worst = np.iinfo(np.int64).max // 4
    least = np.full((2, 1 << rounds), worst, np.int64)
    least[:, 0] = 0
    last_round = np.full(1 << rounds, -1, np.int64)
    for t in range(rounds):
        here = sets[size == t]
        cost = np.stack([_unfinished(masks, charge, rounds)[here] for charge in bill.round_cost(t)])
        reach = least[:, here] + cost
        for r in range(rounds):
            free = (here >> r) & 1 == 0
            there, new = here[free] | (1 << r), reach[:, free]
            better = (new[0] < least[0, there]) | ((new[0] == least[0, there]) & (new[1] < least[1, there]))
            least[:, there[better]] = new[:, better]
            last_round[there[better]] = r
    position, left = np.empty(rounds, np.int64), (1 << rounds) - 1
    for t in range(rounds - 1, -1, -1):
        position[last_round[left]] = t
        left &= ~(1 << int(last_round[left]))
    return position


def _unfinished(masks: Ints, charge: Ints, rounds: int) -> Ints:
    """Return, for every set of rounds, the charge of all orders not finished within it (a zeta transform)."""
    finished: Ints = np.zeros(1 << rounds, np.int64)
    np.add.at(finished, masks, charge)
    for r in range(rounds):
        view = finished.reshape(-1, 2, 1 << r)
        view[:, 1] += view[:, 0]
    unfinished: Ints = finished[-1] - finished
    return unfinished


def _from_the_back(bill: _Bill) -> Ints:
    """Fill positions from the last to the first, each with the round that costs least there.

    Last of those left, a round costs Σ w·max(0, end - due) over its orders not yet placed; kept as
    slope · end - level, so each order enters and leaves each of its rounds once.
    """
    rounds = bill.rounds
    by_job = np.argsort(bill.job, kind="stable")
    colour_of = bill.colour[by_job]
    ends = np.searchsorted(bill.job[by_job], np.arange(len(bill.weight) + 1))
    by_colour = np.argsort(bill.colour, kind="stable")
    job_of = bill.job[by_colour]
    starts = np.searchsorted(bill.colour[by_colour], np.arange(rounds + 1))

    late = bill.has_work & (bill.due_s < bill.ends[-1])
    slope = np.bincount(bill.colour, (bill.weight * late)[bill.job], rounds)
    level = np.bincount(bill.colour, (bill.weight * np.where(late, bill.due_s, 0))[bill.job], rounds)
    weight = np.bincount(bill.colour, bill.weight[bill.job].astype(np.float64), rounds)
    soonest_last = sorted(np.flatnonzero(late).tolist(), key=lambda j: (int(bill.due_s[j]), j))
    placed = np.zeros(len(bill.weight), bool)
    position, open_rounds = np.full(rounds, -1, np.int64), np.ones(rounds, bool)

    def leave(j: int) -> None:
        mine = colour_of[ends[j] : ends[j + 1]]
        slope[mine] -= bill.weight[j]
        level[mine] -= bill.weight[j] * bill.due_s[j]

    for t in range(rounds - 1, -1, -1):
        end = int(bill.ends[t])
        while soonest_last and bill.due_s[soonest_last[-1]] >= end:
            j = soonest_last.pop()
            if not placed[j]:
                leave(j)
                late[j] = False
        candidates = np.flatnonzero(open_rounds)
        cost = slope[candidates] * end - level[candidates]
        cheapest = candidates[cost <= cost.min()]
        chosen = int(cheapest[weight[cheapest].argmin()])
        position[chosen], open_rounds[chosen] = t, False
        for j in job_of[starts[chosen] : starts[chosen + 1]].tolist():
            if not placed[j]:
                placed[j] = True
                weight[colour_of[ends[j] : ends[j + 1]]] -= bill.weight[j]
                if late[j]:
                    leave(j)
    return position


def _improve(bill: _Bill, position: Ints) -> Ints:
    """Swap two rounds while that helps, at most ``MOVES_TRIED`` tries in a fixed order."""
    rounds = bill.rounds
    sequence = np.argsort(position)
    best = bill.total(position)
    # Whole totals are recomputed each time: tries shrink as the operations grow, to keep this in its place.
    tries = min(MOVES_TRIED, 20_000_000 // max(1, len(bill.colour)))
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
