"""Edge colouring of bipartite multigraphs with exactly Δ colours.

Edges are operations between orders (left) and machines (right); colours are rounds. Two edges that share a
node get different colours, and Δ, the largest number of edges at any node, is how many colours are used: no
fewer could do, since the edges at that node all differ.

Why Δ colours are enough (König 1916). Colour the edges one by one. When edge uv comes up, u and v each have
fewer than Δ coloured edges, so some colour a is free at u and some colour b at v. If one colour is free at
both, use it. Otherwise a is taken at v. Follow the trail v -a- . -b- . -a- . that alternates between a and
b for as long as it goes; no node has two edges of one colour, so it never branches or closes. It cannot
reach u: the trail leaves the right side along a, so it enters every left node along a, and u has no edge of
colour a. Hence swapping a and b along the trail leaves the colouring proper and u as it was, but now a is
free at v too, and uv takes it.

The trail argument alone is quadratic. What makes it fast here:

- Nodes are first merged into groups of total degree at most Δ, so that all tables are O(m)
  (`multigraph.fold`).
- Edges come row by row (all edges of one left group), each row sorted by right group and begun a little
  further round than the row before it. Full rows then fall into a Latin square with hardly a trail to swap.
- The rows come in a shuffled order. In natural order some regular families (circulants) grow trails of length
  proportional to n; in random order the trails seen stay a few steps an edge.
- The parallel edges between two groups take whole intervals of free colours at once.
- Where a trail must be swapped, up to `CANDIDATES` choices of a are followed side by side, and the trail that
  ends first is the one swapped. Towards the end trails grow long, and the shortest of eight is far shorter.
- Sets of free colours are the bits of one Python integer a group.

From `FAST_FROM` edges on, where numba is installed, the same steps run compiled (`fast`): the same colours,
sooner.

Trails are counted against a budget of `BUDGET` steps an edge. Past it the rows are shuffled again, and after
`SHUFFLES` orders the colouring starts afresh by halving (`splitting`), whose time is guaranteed.

References
----------
- D. König, "Über Graphen und ihre Anwendung auf Determinantentheorie und Mengenlehre", Mathematische Annalen
  77 (1916) 453-465.
- R. Cole, K. Ost, S. Schirra, "Edge-coloring bipartite multigraphs in O(E log D) time", Combinatorica 21
  (2001) 5-12: merging nodes until their degrees are near Δ.
- N. Alon, "A simple algorithm for edge-coloring bipartite multigraphs", Information Processing Letters 85
  (2003) 301-302, and H. N. Gabow, "Using Euler partitions to edge color bipartite multigraphs", International
  Journal of Computer and Information Sciences 5 (1976) 345-355: the halving route.
"""

from __future__ import annotations

import sys
from importlib import import_module
from itertools import chain
from operator import index
from types import ModuleType
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from shopfloor.kernel.multigraph import Folded, IntArray, as_columns, folded, shuffled
from shopfloor.kernel.splitting import colour_by_splitting

__all__ = [
    "BUDGET",
    "CANDIDATES",
    "FAST_FROM",
    "SHUFFLES",
    "Colouring",
    "Kernel",
    "colour_edges",
    "colour_with_steps",
    "fast_kernel",
]

Kernel = Literal["auto", "plain", "fast"]

#: Edges from which the compiled kernel, where it is installed, repays the half second that loading it takes.
#: On this many the plain one needs between a tenth of a second and two seconds, by shape.
FAST_FROM = 500_000
#: Colours compared when an alternating path is needed, to swap the shortest of as many paths.
CANDIDATES = 8
#: Path steps an edge before an order of rows is given up; random orders have been seen to need 11.
BUDGET = 50
#: Orders of rows tried before the colouring is left to halving.
SHUFFLES = 3


class Colouring(NamedTuple):
    """Colours, and what it took to find them."""

    colours: IntArray
    #: Edges looked at and edges recoloured on alternating paths, all orders of rows together.
    steps: int
    #: Orders of rows that were begun.
    shuffles: int
    #: Whether the colours came from halving after all.
    by_splitting: bool


def colour_edges(left: ArrayLike, right: ArrayLike, *, seed: int = 0) -> IntArray:
    """Colour the edges of a bipartite multigraph properly with exactly Δ colours, Δ being the largest degree.

    Parameters
    ----------
    left, right : array_like of integers, one entry an edge
        Edge e joins left node ``left[e]`` to right node ``right[e]``. Node numbers are not negative and may
        have gaps; the two sides are numbered apart. Equal rows are parallel edges.
    seed : int
        Chooses among the colourings there are. The same edges and seed always give the same array; no
        global random state is read or written.

    Returns
    -------
    ndarray of int64, shape (m,)
        The colour of each edge, 0 ... Δ-1. Every colour is used. Empty for no edges.

    Raises
    ------
    TypeError
        If a column does not hold integers.
    ValueError
        If a column is not one-dimensional, the lengths differ, or a node number is negative or 2**63 or more.

    Notes
    -----
    Memory is O(m). Time is O(m log m) plus the alternating paths, which in practice take a few steps an
    edge and are bounded by a budget; the route taken past it is O(m log m log Δ). The module's docstring
    has the proof and the sources.
    """
    return colour_with_steps(left, right, seed=seed).colours


def colour_with_steps(
    left: ArrayLike,
    right: ArrayLike,
    *,
    seed: int = 0,
    budget: int = BUDGET,
    shuffles: int = SHUFFLES,
    kernel: Kernel = "auto",
) -> Colouring:
    """Do as `colour_edges` and also return what it took.

    ``budget`` is in path steps an edge; ``kernel`` forces the plain or the compiled implementation, which
    agree to the last step.
    """
    seed = index(seed)
    us, vs = as_columns(left, right)
    if not len(us):
        return Colouring(np.empty(0, dtype=np.int64), 0, 0, False)
    fast = fast_kernel(len(us), kernel)
    if fast is None:
        return _colour_plain(folded(us, vs), seed, budget * len(us), shuffles)
    steps = 0
    for attempt in range(shuffles):
        colours, spent = fast.colour_rows(us, vs, seed + attempt, budget * len(us), CANDIDATES)
        steps += spent
        if colours is not None:
            return Colouring(colours, steps, attempt + 1, False)
    return Colouring(colour_by_splitting(folded(us, vs)), steps, shuffles, True)


def fast_kernel(edges: int, kernel: Kernel) -> ModuleType | None:
    """Return the compiled implementation if it is asked for, is loaded already, or is worth loading."""
    name = "shopfloor.kernel.fast"
    if kernel == "plain" or (kernel == "auto" and edges < FAST_FROM and name not in sys.modules):
        return None
    try:
        return import_module(name)
    except ImportError:
        if kernel == "fast":
            raise
        return None


def _colour_plain(graph: Folded, seed: int, budget: int, shuffles: int) -> Colouring:
    edge, starts, ends, sizes = _runs(graph)
    steps = 0
    for attempt in range(shuffles):
        order = shuffled(graph.left_groups, seed + attempt).tolist()
        table, spent = _colour_rows(graph, order, starts, ends, sizes, budget)
        steps += spent
        if table is not None:
            return Colouring(_read_back(graph, edge, table), steps, attempt + 1, False)
    return Colouring(colour_by_splitting(graph), steps, shuffles, True)


def _runs(graph: Folded) -> tuple[IntArray, list[int], list[int], list[int]]:
    """Sort the edges by left and then right group, and find the runs of parallel edges.

    Returns the edge at each place; where each row begins in the two lists that follow (one entry more than
    rows); the right group of each run, each row's runs already rotated; and the size of each run.
    """
    edges = len(graph.left)
    pair = graph.left * graph.right_groups + graph.right
    if graph.left_groups * graph.right_groups * edges < 1 << 62:
        # Unique keys sort several times faster than a stable argsort, and to the same order.
        pair *= edges
        pair += np.arange(edges)
        pair.sort()
        by_pair = pair
        pair = by_pair // edges
        edge = by_pair - pair * edges
    else:
        edge = np.argsort(pair, kind="stable")
        pair = pair[edge]
    first = np.empty(edges, dtype=np.bool_)
    first[0] = True
    np.not_equal(pair[1:], pair[:-1], out=first[1:])
    at = first.nonzero()[0]
    pair = pair[at]
    sizes = np.empty(len(at), dtype=np.int64)
    np.subtract(at[1:], at[:-1], out=sizes[:-1])
    sizes[-1] = edges - at[-1]
    row = pair // graph.right_groups
    ends = pair - row * graph.right_groups
    starts = np.searchsorted(row, np.arange(graph.left_groups + 1))
    # One Python integer a group, not one a run: less memory, and trails stay in the processor's cache.
    names = np.arange(graph.right_groups).astype(object)
    return edge, starts.tolist(), names[ends].tolist(), sizes.tolist()


def _colour_rows(
    graph: Folded, order: list[int], starts: list[int], ends: list[int], sizes: list[int], budget: int
) -> tuple[list[list[int]] | None, int]:
    """Colour row by row in the given order; return each row's right group by colour, and the path steps.

    Colours that a row leaves free hold -1. None instead of the table if the budget ran out.
    """
    left_groups, delta = graph.left_groups, graph.delta
    every_colour = (1 << delta) - 1
    free = [every_colour] * graph.right_groups
    blank = [-1] * delta
    at_left = [blank] * left_groups
    at_right = [blank.copy() for _ in free]
    steps = 0
    for u in order:
        start, stop = starts[u], starts[u + 1]
        turn = start + (stop - start) * u // left_groups
        at_left[u] = row = blank.copy()
        free_u = every_colour
        rotated = ends[turn:stop] + ends[start:turn]
        for v, size in zip(rotated, sizes[turn:stop] + sizes[start:turn], strict=False):
            free_v = free[v]
            common = free_u & free_v
            if size == 1:
                if common:
                    bit = common & -common
                    free_u ^= bit
                    free[v] = free_v ^ bit
                    colour = bit.bit_length() - 1
                    row[colour] = v
                    at_right[v][colour] = u
                    continue
            elif common:
                column = at_right[v]
                while common and size:
                    # Take the lowest interval of common colours, or as much of it as there are edges.
                    colour = (common & -common).bit_length() - 1
                    above = (common >> colour) + 1
                    width = (above & -above).bit_length() - 1
                    if width > size:  # a call to min costs a sixth of this loop
                        width = size
                    bits = ((1 << width) - 1) << colour
                    free_u ^= bits
                    free_v ^= bits
                    common ^= bits
                    row[colour : colour + width] = [v] * width
                    column[colour : colour + width] = [u] * width
                    size -= width
                free[v] = free_v
            for _ in range(size):
                bit_b = free_v & -free_v
                b = bit_b.bit_length() - 1
                a, probed = _shortest_trail(free_u, b, at_right[v], at_left, at_right)
                steps += probed
                bit_a = 1 << a
                free_u ^= bit_a
                free_v ^= bit_b
                free[v] = free_v
                row[a] = v
                # Swap a and b along the trail from v: the edge y z turns from a to b, then z's next one back.
                z = v
                column = at_right[z]
                y, column[a] = column[a], u
                while True:
                    column[b] = y
                    line = at_left[y]
                    z, line[b] = line[b], z
                    steps += 1
                    if z < 0:
                        line[a] = -1
                        break
                    line[a] = z
                    column = at_right[z]
                    steps += 1
                    y, column[a] = column[a], y
                    if y < 0:
                        column[b] = -1
                        free[z] ^= bit_a | bit_b
                        break
                if steps > budget:
                    return None, steps
    return at_left, steps


def _shortest_trail(
    free_u: int, b: int, at_v: list[int], at_left: list[list[int]], at_right: list[list[int]]
) -> tuple[int, int]:
    """Return the colour a free at u whose trail with b from v ends soonest, and the steps looked ahead.

    The lowest `CANDIDATES` colours are followed in turn, two edges at a time, until one of the trails ends.
    """
    first = free_u & -free_u
    if free_u == first:
        return first.bit_length() - 1, 0
    colours: list[int] = []
    while free_u and len(colours) < CANDIDATES:
        bit = free_u & -free_u
        free_u ^= bit
        colours.append(bit.bit_length() - 1)
    tips = [at_v[a] for a in colours]
    steps = 0
    while True:
        steps += 2 * len(colours)
        for i, a in enumerate(colours):
            z = at_left[tips[i]][b]
            if z < 0:
                return a, steps
            tips[i] = at_right[z][a]
            if tips[i] < 0:
                return a, steps


def _read_back(graph: Folded, edge: IntArray, table: list[list[int]]) -> IntArray:
    """Turn the table of right groups by row and colour into the colour of each edge.

    Sorted by row, right group and colour, the table's cells line up with the edges sorted by row and group.
    """
    cells = np.fromiter(chain.from_iterable(table), dtype=np.int64, count=graph.left_groups * graph.delta)
    place = np.flatnonzero(cells >= 0)
    row = place // graph.delta
    cells = cells[place]
    cells += row * graph.right_groups
    place -= row * graph.delta
    if graph.left_groups * graph.right_groups * graph.delta < 1 << 62:
        cells *= graph.delta
        cells += place
        cells.sort()
        place = cells % graph.delta
    else:
        place = place[np.argsort(cells, kind="stable")]
    colours = np.empty(len(edge), dtype=np.int64)
    colours[edge] = place
    return colours
