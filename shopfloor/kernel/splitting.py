"""Colouring by halving: the route with a guaranteed running time.

`shopfloor.kernel.colouring` is much faster on everything met so far, but its alternating paths could in
principle be long; past a budget of path steps it comes here.
"""

from __future__ import annotations

import numpy as np

from shopfloor.kernel.matching import euler_halves, perfect_matching
from shopfloor.kernel.multigraph import Folded, IntArray

__all__ = ["colour_by_splitting"]


def colour_by_splitting(graph: Folded) -> IntArray:
    """Return a proper colouring in exactly ``graph.delta`` colours, in O(m log m log Δ) time and O(m) memory.

    Dummy edges make the graph Δ-regular on equally many groups a side. A regular graph of even degree falls
    into two halves of half the degree (Gabow 1976); one of odd degree first gives up a perfect matching,
    which always exists (König 1916) and becomes a colour of its own. No part ever needs more colours than
    its degree, and the degrees of the parts add up to Δ.
    """
    real = len(graph.left)
    delta = graph.delta
    nodes = max(graph.left_groups, graph.right_groups)
    left = np.concatenate((graph.left, _spare(graph.left, nodes, delta)))
    right = np.concatenate((graph.right, _spare(graph.right, nodes, delta)))
    colours = np.empty(len(left), dtype=np.int64)
    waiting = [(np.arange(len(left), dtype=np.int64), delta, 0)]
    while waiting:
        part, degree, first = waiting.pop()
        if degree == 1:
            colours[part] = first
            continue
        if degree % 2:
            matching = perfect_matching(left[part], right[part], nodes, degree)
            colours[part[matching]] = first + degree - 1
            part = np.delete(part, matching)
            degree -= 1
        picked = euler_halves(left[part], right[part])
        waiting.append((part[picked], degree // 2, first))
        waiting.append((part[~picked], degree // 2, first + degree // 2))
    return colours[:real]


def _spare(column: IntArray, nodes: int, delta: int) -> IntArray:
    """Return each node as often as its degree falls short of ``delta``."""
    degree = np.bincount(column, minlength=nodes)
    return np.repeat(np.arange(nodes, dtype=np.int64), delta - degree)
