"""Rounds mended with few moves: what can keep its round keeps it, the rest is put in by short exchanges.

Operations are edges of a bipartite multigraph between orders and units, rounds are colours. D. König's proof
(Math. Annalen 77 (1916) 453-465) that as many colours suffice as the busiest node has edges puts one edge in
after the other: some colour is free at its one end and some at its other; if no colour is free at both, the
two colours are exchanged along the path of their edges that begins at one end, and it never reaches the
other. So an old plan, less what is done and more what is new, becomes a plan in the fewest rounds again, and
only the edges of those paths move.
"""

from __future__ import annotations

from collections.abc import Sequence

FREE = -1


def recolour(
    left: Sequence[int], right: Sequence[int], old: Sequence[int], colours: int, order: Sequence[int]
) -> list[int]:
    """Return a proper colouring that keeps old colours where it can.

    Parameters
    ----------
    left, right
        Ends of each edge, numbered from 0 on either side.
    old
        Old colour of each edge, negative for none. Ones from `colours` on, and ones that clash with an
        earlier edge of `order`, are given up.
    colours
        At least the largest degree.
    order
        Every edge once; who comes first keeps its old colour first.

    Returns
    -------
    list of int
        A colour below `colours` for each edge; edges that meet differ. O(m · (n + colours)) at worst for m
        edges on n nodes, usually little more than O(m).

    Raises
    ------
    ValueError
        If a node has more edges than there are colours.
    """
    at: tuple[dict[tuple[int, int], int], ...] = ({}, {})  # (node, colour) to edge, on either side
    ends = (left, right)
    colour = [FREE] * len(left)

    def put(edge: int, chosen: int) -> None:
        colour[edge] = chosen
        for side in (0, 1):
            at[side][ends[side][edge], chosen] = edge

    waiting = []
    for edge in order:
        kept = old[edge]
        if 0 <= kept < colours and all((ends[side][edge], kept) not in at[side] for side in (0, 1)):
            put(edge, kept)
        else:
            waiting.append(edge)
    for edge in waiting:
        wanted = old[edge] if 0 <= old[edge] < colours else colours - 1
        near = sorted(range(colours), key=lambda c: (abs(c - wanted), c))
        free = [[c for c in near if (ends[side][edge], c) not in at[side]] for side in (0, 1)]
        if not free[0] or not free[1]:
            raise ValueError(f"a node has more than {colours} edges")
        other_free = set(free[1])
        shared = next((c for c in free[0] if c in other_free), None)
        if shared is not None:
            put(edge, shared)
            continue
        one, other = free[0][0], free[1][0]
        _exchange(at, ends, colour, 1, right[edge], one, other)
        put(edge, one)
    return colour


def _exchange(
    at: tuple[dict[tuple[int, int], int], ...],
    ends: tuple[Sequence[int], Sequence[int]],
    colour: list[int],
    side: int,
    node: int,
    one: int,
    other: int,
) -> None:
    """Exchange two colours along the path that leaves a node by an edge of colour `one`."""
    path = []
    wanted = one
    while (edge := at[side].get((node, wanted), FREE)) != FREE:
        path.append(edge)
        side = 1 - side
        node, wanted = ends[side][edge], other if wanted == one else one
    for edge in path:
        for each in (0, 1):
            del at[each][ends[each][edge], colour[edge]]
    for edge in path:
        colour[edge] = other if colour[edge] == one else one
        for each in (0, 1):
            at[each][ends[each][edge], colour[edge]] = edge
