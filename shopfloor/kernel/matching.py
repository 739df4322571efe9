"""Halving even bipartite multigraphs, and perfect matchings of regular ones, in guaranteed time.

Both work on two integer columns (edge e joins left[e] and right[e]) and walk without recursion.

References
----------
- H. N. Gabow, "Using Euler partitions to edge color bipartite multigraphs", International Journal of Computer
  and Information Sciences 5 (1976) 345-355.
- N. Alon, "A simple algorithm for edge-coloring bipartite multigraphs", Information Processing Letters 85
  (2003) 301-302.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from shopfloor.kernel.multigraph import IntArray

__all__ = ["euler_halves", "perfect_matching"]

BoolArray = NDArray[np.bool_]


def euler_halves(left: IntArray, right: IntArray) -> BoolArray:
    """Return a mask that picks, at every node, exactly half of its edges; every degree must be even.

    At each node pair its edges off. An edge then has one partner at its left end and one at its right, and
    the partnerships link the edges into closed trails (Gabow 1976). A trail uses left and right
    partnerships in turn, so its length is even and its edges can be picked alternately: of any two
    partners, one. Walking the trails takes O(m) time and memory, sorting the edges aside.
    """
    edges = len(left)
    by_left = np.argsort(left, kind="stable")
    by_right = np.argsort(right[by_left], kind="stable")
    # Number the edges by their place in left order: partners there are 2i and 2i+1.
    partner = np.empty(edges, dtype=np.int64)
    partner[by_right[0::2]] = by_right[1::2]
    partner[by_right[1::2]] = by_right[0::2]
    across = partner.tolist()
    picked = bytearray(edges)
    seen = bytearray(edges)
    for start in range(0, edges, 2):
        place = start
        while not seen[place]:
            picked[place] = 1
            seen[place] = 1
            place ^= 1
            seen[place] = 1
            place = across[place]
    mask = np.empty(edges, dtype=np.bool_)
    mask[by_left] = np.frombuffer(picked, dtype=np.bool_)
    return mask


def perfect_matching(left: IntArray, right: IntArray, nodes: int, degree: int) -> IntArray:
    """Return the edges of a perfect matching of a ``degree``-regular multigraph with ``nodes`` nodes a side.

    Alon's halving (2003). Choose 2**t >= nodes * degree. Give each edge the weight 2**t // degree and add a
    "bad" matching, node i to node i, that makes up the weight missing at each node, less than ``degree``.
    Every node then has weight 2**t. Halve t times: each weight w leaves w // 2 on both sides, and the edges
    of odd weight, which meet every node an even number of times, share out their odd units by Euler halves.
    Keep the side with less bad weight each time: it starts below 2**t, so after t halvings none is left,
    every node has weight one, and what remains is a perfect matching of real edges. O(m log m) time.
    """
    halvings = (nodes * degree - 1).bit_length()
    weight, missing = divmod(1 << halvings, degree)
    real = len(left)
    ends = np.arange(nodes if missing else 0, dtype=np.int64)
    edge = np.arange(real + len(ends), dtype=np.int64)
    us = np.concatenate((left, ends))
    vs = np.concatenate((right, ends))
    load = np.full(len(edge), weight, dtype=np.int64)
    load[real:] = missing
    for _ in range(halvings):
        odd = np.flatnonzero(load & 1)
        load >>= 1
        picked = euler_halves(us[odd], vs[odd])
        bad = edge[odd] >= real
        if 2 * np.count_nonzero(bad & picked) > np.count_nonzero(bad):
            picked = ~picked
        load[odd[picked]] += 1
        kept = np.flatnonzero(load)
        edge, us, vs, load = edge[kept], us[kept], vs[kept], load[kept]
    return edge
