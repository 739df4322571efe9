"""Sorted columns: where runs of equal rows begin, ranks inside them, and the latest end so far.

All work is done by sorting, so a rule over n rows costs O(n log n).
"""

from __future__ import annotations

import numpy as np

from shopfloor.model.shop import Bools, Ints


def run_starts(*columns: Ints) -> Bools:
    """Return, for sorted columns of equal length, whether each row differs from the one before it."""
    size = len(columns[0])
    first = np.zeros(size, bool)
    first[:1] = True
    for column in columns:
        first[1:] |= column[1:] != column[:-1]
    return first


def ranks(first: Bools) -> Ints:
    """Return each row's rank inside its run, counted from 0; `first` as from :func:`run_starts`."""
    if not len(first):
        return np.zeros(0, np.int64)
    begins = np.flatnonzero(first)
    rank: Ints = np.arange(len(first)) - begins[np.cumsum(first) - 1]
    return rank


def run_sums(first: Bools, values: Ints) -> Ints:
    """Return the sum of `values` over each run, one entry a run."""
    if not len(first):
        return np.zeros(0, np.int64)
    sums: Ints = np.add.reduceat(values, np.flatnonzero(first))
    return sums


def latest_so_far(first: Bools, end: Ints) -> Ints:
    """Return, for each row, the position of the row with the latest end in its run up to here.

    Ranks of the ends stand in for the ends themselves, so that no time is too large to be compared.
    """
    size = len(end)
    if not size:
        return np.zeros(0, np.int64)
    by_end = np.argsort(end, kind="stable")
    rank = np.empty(size, np.int64)
    rank[by_end] = np.arange(size)
    run = np.cumsum(first) - 1
    latest: Ints = by_end[np.maximum.accumulate(run * size + rank) % size]
    return latest
