"""Bipartite multigraphs held as two integer columns: row e says that edge e joins left[e] and right[e].

Parallel edges are simply equal rows, and node numbers need not be dense. Everything here is linear in the
number of edges, apart from sorting.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "Folded",
    "IntArray",
    "as_column",
    "as_columns",
    "compact",
    "fold",
    "folded",
    "group_nodes",
    "shuffled",
]

IntArray = NDArray[np.int64]

#: Node numbers up to this many times the edges (plus a little) are used as they are, others renumbered.
SPARSE = 4
#: "A little" above.
SPARSE_FROM = 1024


def as_columns(left: ArrayLike, right: ArrayLike) -> tuple[IntArray, IntArray]:
    """Return both columns as contiguous int64 arrays of one length; values are not looked at yet.

    Raises
    ------
    TypeError
        If a column does not hold integers (booleans and floats are refused, not rounded).
    ValueError
        If a column is not one-dimensional, holds a number of 2**63 or more, or the lengths differ.
    """
    columns = as_column(left, "left"), as_column(right, "right")
    if len(columns[0]) != len(columns[1]):
        raise ValueError(
            f"left and right must have one entry an edge each, got {len(columns[0])} and {len(columns[1])}"
        )
    return columns


def as_column(values: ArrayLike, name: str) -> IntArray:
    """Return one column as a contiguous int64 array; errors as for `as_columns`."""
    column = np.asarray(values)
    if column.ndim != 1:
        raise ValueError(f"{name} must be one-dimensional, got shape {column.shape}")
    if column.dtype.kind not in "iu":
        # NumPy calls an empty list an array of floats; there is nothing in it to refuse.
        if column.size or isinstance(values, np.ndarray):
            raise TypeError(f"{name} must hold integers, got dtype {column.dtype}")
    elif column.dtype == np.uint64 and column.size and column.max() > np.iinfo(np.int64).max:
        raise ValueError(f"{name} must hold node numbers below 2**63, got {column.max()}")
    return np.ascontiguousarray(column, dtype=np.int64)


def compact(column: IntArray, name: str) -> tuple[IntArray, int]:
    """Return the column with node numbers below a few times its length, and one more than the largest.

    A column that is dense enough is returned unchanged. Raises ValueError on a negative node number.
    """
    if not len(column):
        return column, 0
    if column.min() < 0:
        where = int(np.argmax(column < 0))
        raise ValueError(
            f"{name} must not hold negative node numbers, got {column[where]} at position {where}"
        )
    nodes = int(column.max()) + 1
    if nodes > SPARSE * len(column) + SPARSE_FROM:
        distinct, column = np.unique(column, return_inverse=True)
        nodes = len(distinct)
    return column, nodes


def fold(degree: IntArray, cap: int) -> tuple[IntArray | None, int]:
    """Put nodes, in their order, into groups of total degree at most ``cap`` (next fit); cap >= every degree.

    Returns the group of each node (None if every node stays alone) and the number of groups. Two
    neighbouring groups hold more than ``cap`` between them, so groups number at most 2m / cap + 1: a table
    with one cell per group and colour is O(m), where one cell per node and colour would not be.
    """
    nodes = len(degree)
    total = np.cumsum(degree)
    # The group that starts at node i ends before the first node whose running total exceeds this:
    until = np.searchsorted(total, total - degree + cap, side="right").tolist()
    starts = []
    node = 0
    while node < nodes:
        starts.append(node)
        node = until[node]
    if len(starts) == nodes:
        return None, nodes
    opens = np.zeros(nodes, dtype=np.int64)
    opens[starts[1:]] = 1
    return np.cumsum(opens), len(starts)


class Folded(NamedTuple):
    """A multigraph whose nodes were merged into groups of total degree at most ``delta``.

    A proper edge colouring of it is one of the original, for two edges that met before still meet.
    """

    left: IntArray
    right: IntArray
    left_groups: int
    right_groups: int
    delta: int


def group_nodes(column: IntArray, degree: IntArray, delta: int) -> tuple[IntArray, int]:
    """Return the column in terms of groups, and the number of groups."""
    group, groups = fold(degree, delta)
    return (column if group is None else group[column]), groups


def folded(left: IntArray, right: IntArray) -> Folded:
    """Return the multigraph of two columns from `as_columns`, with nodes merged; one edge at least.

    Raises ValueError on a negative node number.
    """
    left, left_nodes = compact(left, "left")
    right, right_nodes = compact(right, "right")
    left_degree = np.bincount(left, minlength=left_nodes)
    right_degree = np.bincount(right, minlength=right_nodes)
    delta = int(max(left_degree.max(), right_degree.max()))
    left, left_groups = group_nodes(left, left_degree, delta)
    right, right_groups = group_nodes(right, right_degree, delta)
    return Folded(left, right, left_groups, right_groups, delta)


def shuffled(count: int, seed: int) -> IntArray:
    """Return 0 ... count-1 in an order drawn from ``seed``, the same on every machine and NumPy release.

    Each number below the next power of two goes through four rounds of steps that can be undone (add a key,
    multiply by an odd number, fold the high half onto the low), so that the results are those numbers in
    another order; the ones not below ``count`` are dropped.
    """
    bits = max(2, (count - 1).bit_length())
    mask = np.uint64((1 << bits) - 1)
    half = np.uint64((bits + 1) // 2)
    number = np.arange(1 << bits, dtype=np.uint64)
    for key in round_keys(seed):
        number += np.uint64(key)
        number *= np.uint64(_ODD)
        number &= mask
        number ^= number >> half
    return number[number < count].astype(np.int64)


_ODD = 0x9E3779B97F4A7C15
_WORD = (1 << 64) - 1


def round_keys(seed: int) -> list[int]:
    """Return the four 64-bit keys that `shuffled` adds, one a round; neighbouring seeds give unlike keys."""
    keys = []
    state = seed & _WORD
    for _ in range(4):
        state = (state + _ODD) & _WORD
        mixed = ((state ^ (state >> 30)) * 0xBF58476D1CE4E5B9) & _WORD
        mixed = ((mixed ^ (mixed >> 27)) * 0x94D049BB133111EB) & _WORD
        keys.append(mixed ^ (mixed >> 31))
    return keys
