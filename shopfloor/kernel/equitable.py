"""Even rounds: proper edge colourings whose colour classes differ in size by one at most.

With c people, at most c operations can run at once, so m operations need at least ⌈m / c⌉ rounds, and Δ
rounds anyway. Both are enough together: k = max(Δ, ⌈m / c⌉) rounds of ⌊m / k⌋ or ⌈m / k⌉ operations each,
which is at most c.

Why any k >= Δ classes can be evened out (de Werra 1971, McDiarmid 1972). Take two classes A and B, A the
larger. No node has more than one edge of each, so together they form trails that use A and B in turn:
cycles and even trails have as many edges of both, and any other trail has one more of the class it begins
and ends with. So at least |A| - |B| trails begin and end in A, and swapping the two classes along one of
them moves one edge's worth from A to B and stays proper. Such a trail has odd length, so of its ends
exactly one is on the left: it is found by walking from the left nodes of A that have no edge of B.

Sizes are brought to their targets pair by pair, the fullest class with the emptiest. Each pairing settles
at least one class, so there are fewer than k. Loading a class costs its size, once; and a pairing that
moves s edges looks at no more than 2|B| + s nodes of A and walks no more than 3|B| + s edges, since every
fruitless look meets an edge of B of its own. With |B| below the target m / k, all pairings together take
O(m + k) time.

References
----------
- D. de Werra, INFOR 9 (1971) 230-237, and C. J. H. McDiarmid, Journal of the Institute of Mathematics and its
  Applications 10 (1972) 161-165: that every number of classes from Δ up can be evened out.
"""

from __future__ import annotations

from importlib import import_module
from operator import index

import numpy as np
from numpy.typing import ArrayLike

from shopfloor.kernel.colouring import Kernel, colour_with_steps, fast_kernel
from shopfloor.kernel.multigraph import IntArray, as_columns, compact

__all__ = ["even_colours", "even_rounds"]


def even_rounds(
    left: ArrayLike, right: ArrayLike, crew: int, *, seed: int = 0, kernel: Kernel = "auto"
) -> IntArray:
    """Colour properly with as few colours as a crew allows that can serve ``crew`` edges of a colour at once.

    Parameters
    ----------
    left, right : array_like of integers, one entry an edge
        As for `shopfloor.kernel.colouring.colour_edges`.
    crew : int
        The most edges one colour may have; at least 1.
    seed : int
        Chooses among the colourings there are; the same edges and seed give the same array.
    kernel : {"auto", "plain", "fast"}
        For tests and benchmarks: the implementation. The result does not depend on it.

    Returns
    -------
    ndarray of int64, shape (m,)
        The colour of each edge, 0 ... k-1, where k = max(Δ, ⌈m / crew⌉). Every colour has ⌊m / k⌋ or ⌈m / k⌉
        edges.

    Raises
    ------
    TypeError, ValueError
        As `colour_edges`; and ValueError if ``crew`` is below 1.

    Notes
    -----
    O(m + k) time after the colouring, O(n + m + k) memory. The module's docstring has the argument.
    """
    crew = index(crew)
    if crew < 1:
        raise ValueError(f"crew must be at least 1, got {crew}")
    us, vs = as_columns(left, right)
    colours = colour_with_steps(us, vs, seed=seed, kernel=kernel).colours
    if not len(colours):
        return colours
    delta = int(colours.max()) + 1
    return _evened(us, vs, colours, max(delta, -(-len(us) // crew)), kernel)


def even_colours(
    left: ArrayLike, right: ArrayLike, rounds: int, *, seed: int = 0, kernel: Kernel = "auto"
) -> IntArray:
    """Colour properly with ``rounds`` colours, each on ⌊m / rounds⌋ or ⌈m / rounds⌉ edges; rounds >= Δ.

    The rest is as for `even_rounds`. Raises ValueError if ``rounds`` is below Δ, which no colouring can be.
    """
    rounds = index(rounds)
    us, vs = as_columns(left, right)
    colours = colour_with_steps(us, vs, seed=seed, kernel=kernel).colours
    delta = int(colours.max(initial=-1)) + 1
    if rounds < delta:
        raise ValueError(f"rounds must be at least {delta}, the most edges at one node, got {rounds}")
    if not len(colours):
        return colours
    return _evened(us, vs, colours, rounds, kernel)


def _evened(left: IntArray, right: IntArray, colours: IntArray, rounds: int, kernel: Kernel) -> IntArray:
    left, left_nodes = compact(left, "left")
    right, right_nodes = compact(right, "right")
    if fast_kernel(len(colours), kernel) is not None:
        fast_even = import_module("shopfloor.kernel.fast_even")
        fast_even.even_out(left, right, left_nodes, right_nodes, colours, rounds)
        return colours
    return _even_out(left, right, left_nodes, right_nodes, colours, rounds)


def _even_out(
    left: IntArray, right: IntArray, left_nodes: int, right_nodes: int, colours: IntArray, rounds: int
) -> IntArray:
    """Swap trails until no class has a surplus or a lack, and return the colours."""
    sizes = np.bincount(colours, minlength=rounds)
    starts = [0, *np.cumsum(sizes).tolist()]
    # Fullest first; the fullest are the ones to keep one edge more than the rest.
    by_size = np.argsort(-sizes, kind="stable").tolist()
    size = sizes.tolist()
    least, larger = divmod(len(colours), rounds)
    surplus = [size[name] - least - (place < larger) for place, name in enumerate(by_size)]
    by_colour = np.argsort(colours, kind="stable").tolist()
    edges = len(colours)
    lefts, rights = left.tolist(), right.tolist()
    # The tables below may hold edges that have left their class. A table's word counts only if the edge still
    # has the class's colour; the edge number `edges` stands for none and has no colour.
    colour = [*colours.tolist(), -1]
    a_left, b_left = [edges] * left_nodes, [edges] * left_nodes
    b_right = [edges] * right_nodes
    needy = (place for place in range(len(surplus) - 1, -1, -1) if surplus[place] < 0)
    lack = 0
    for a, over in zip(by_size, surplus, strict=True):
        if over <= 0:
            continue
        own = by_colour[starts[a] : starts[a + 1]]
        nodes = [lefts[edge] for edge in own]
        for edge in own:
            a_left[lefts[edge]] = edge
        while over:
            if not lack:
                poor = next(needy)
                b = by_size[poor]
                lack = -surplus[poor]
                if not size[b] and lack <= over:
                    # An empty class needs no trails, and one that is filled at a stroke no tables.
                    for node in nodes[-lack:]:
                        colour[a_left[node]] = b
                    del nodes[-lack:]
                    over -= lack
                    lack = 0
                    continue
                for edge in by_colour[starts[b] : starts[b + 1]]:
                    b_left[lefts[edge]] = edge
                    b_right[rights[edge]] = edge
            here = 0
            while over and lack:
                node = nodes[here]
                if colour[b_left[node]] == b:
                    here += 1
                    continue
                # A trail begins here. Walk it: edges of a at even places, of b at odd ones.
                edge = a_left[node]
                trail = [edge]
                while True:
                    edge = b_right[rights[edge]]
                    if colour[edge] != b:
                        break
                    trail.append(edge)
                    edge = a_left[lefts[edge]]
                    if colour[edge] != a:
                        break
                    trail.append(edge)
                if not len(trail) % 2:
                    here += 1
                    continue
                for edge in trail[0::2]:
                    colour[edge] = b
                    b_left[lefts[edge]] = edge
                    b_right[rights[edge]] = edge
                for edge in trail[1::2]:
                    colour[edge] = a
                    a_left[lefts[edge]] = edge
                nodes[here] = nodes[-1]
                nodes.pop()
                over -= 1
                lack -= 1
    colour.pop()
    return np.array(colour, dtype=np.int64)
