"""Prices for the time of one machine or crew: what its operations cost at least, each where it is cheapest.

The time-indexed relaxation (J. P. Sousa, L. A. Wolsey, Mathematical Programming 54 (1992) 353-367) in its
Lagrangian form: a price on each slot of time pays for what runs there; every operation then stands where
its lateness and what it pays are least together; what all slots hold is paid back. Any prices give a lower
bound; the best give that of the linear program. The last slot is free and has no end. Running time of a
step: linear in operations times slots.
"""

from __future__ import annotations

import numpy as np

from shopfloor.bounds.ascent import Climb
from shopfloor.bounds.places import Places
from shopfloor.model.shop import Floats, Ints

DEAR = 2**62  # the cost of where nothing may stand


def summed(rates: Ints, seconds: Ints) -> Ints:
    """Return what has come together before each slot: of all slots but the last, line by line."""
    return np.concatenate(
        [np.zeros((len(seconds), 1), np.int64), np.cumsum(rates[..., :-1] * seconds, axis=1)], axis=1
    )


class Prices:
    """One machine or crew under prices.

    Parameters
    ----------
    prices
        Where they begin: an entry a slot, the last one aside.

    Attributes
    ----------
    least
        What each operation cost at least when it was last asked.
    """

    def __init__(self, places: Places, prices: Floats) -> None:
        self.places = places
        self.climb = Climb(prices)
        self.least = np.zeros(len(places.rows), np.int64)
        self._lengths = np.diff(places.open_at, axis=1)
        self._late_s = np.diff(np.maximum(places.edges, places.late_from[:, None]), axis=1)

    def value(self, shares: Ints) -> tuple[int, Ints]:
        """Return a lower bound of the lateness, and the seconds of it in each slot, a line an operation.

        Parameters
        ----------
        shares
            What a second of lateness costs: a line an operation, a column a slot.
        """
        value, _, late = self._cheapest(shares)
        return value, late

    def step(self, shares: Ints, length: float) -> tuple[int, Ints]:
        """Return the same, and move the prices."""
        value, begin, late = self._cheapest(shares)
        taken = (self.places.rate[:, None] * self.places.taken_in(begin)).sum(axis=0)
        self.climb.step((taken - self.places.room).astype(np.float64), length)
        return value, late

    def _cheapest(self, shares: Ints) -> tuple[int, Ints, Ints]:
        places, spots = self.places, self.places.spots
        prices = np.append(np.floor(self.climb.values).astype(np.int64), 0)
        every = np.arange(len(places.rows))
        lines, machines = every[:, None], places.line[:, None]
        slot, into = spots.late
        cost = summed(shares, self._late_s)[lines, slot] + shares[lines, slot] * into
        paid = summed(prices, self._lengths)
        for sign, (slot, into) in ((1, spots.taken_to), (-1, spots.taken_from)):
            cost += sign * places.rate[:, None] * (paid[machines, slot] + prices[slot] * into)
        cost[~spots.legal] = DEAR
        best = cost.argmin(axis=1)
        self.least = cost[every, best]
        value = int(self.least.sum()) - int((prices[:-1] * places.room).sum())
        return value, spots.begin[every, best], places.late_in(spots.finish[every, best])
