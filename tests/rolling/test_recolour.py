"""Rounds mended: proper in the fewest colours, and what could stay has stayed."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.kernel.colouring import colour_edges
from shopfloor.rolling.recolour import recolour

EDGES = st.lists(st.tuples(st.integers(0, 5), st.integers(0, 4)), max_size=20)


def degree(edges: list[tuple[int, int]]) -> int:
    """The largest number of edges at one node."""
    ends = [[edge[side] for edge in edges] for side in (0, 1)]
    return max((side.count(node) for side in ends for node in side), default=0)


def proper(edges: list[tuple[int, int]], colour: list[int]) -> bool:
    seen = {(side, edge[side], c) for edge, c in zip(edges, colour, strict=True) for side in (0, 1)}
    return len(seen) == 2 * len(edges)


@given(EDGES, st.data())
def test_any_old_colours_become_a_proper_colouring_in_the_fewest(
    edges: list[tuple[int, int]], data: st.DataObject
) -> None:
    old = data.draw(st.lists(st.integers(-1, 7), min_size=len(edges), max_size=len(edges)))
    order = data.draw(st.permutations(range(len(edges))))
    colours = degree(edges)
    found = recolour([a for a, _ in edges], [b for _, b in edges], old, colours, order)
    assert proper(edges, found)
    assert all(0 <= c < colours for c in found)


@given(EDGES)
def test_a_colouring_that_is_proper_already_stays(edges: list[tuple[int, int]]) -> None:
    left, right = [a for a, _ in edges], [b for _, b in edges]
    old = colour_edges(np.array(left, np.int64), np.array(right, np.int64)).tolist() if edges else []
    assert recolour(left, right, old, degree(edges), range(len(edges))) == old


@given(EDGES, st.data())
def test_one_new_edge_moves_no_more_than_one_path(edges: list[tuple[int, int]], data: st.DataObject) -> None:
    """Only edges of two colours move, along one path: fewer of them than there are nodes."""
    left, right = [a for a, _ in edges], [b for _, b in edges]
    old = colour_edges(np.array(left, np.int64), np.array(right, np.int64)).tolist() if edges else []
    more = data.draw(st.tuples(st.integers(0, 5), st.integers(0, 4)))
    grown = [*edges, more]
    found = recolour([*left, more[0]], [*right, more[1]], [*old, -1], degree(grown), range(len(grown)))
    assert proper(grown, found)
    changed = [k for k in range(len(edges)) if found[k] != old[k]]
    assert len({old[k] for k in changed} | {found[k] for k in changed}) <= 2
    assert len(changed) < 6 + 5


def test_too_few_colours_are_refused() -> None:
    with pytest.raises(ValueError, match="more than 1 edges"):
        recolour([0, 0], [0, 1], [0, 1], 1, [0, 1])
