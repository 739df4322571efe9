"""Halving and perfect matchings, the ground under the colouring route with a guaranteed time."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings

from shopfloor.kernel.matching import euler_halves, perfect_matching
from tests.kernel.graphs import multigraphs, random_regular


@given(graph=multigraphs(least=1))
@settings(max_examples=100, deadline=None)
def test_halves_are_equal_at_every_node(graph):
    """H. N. Gabow, Int. J. Comp. Inf. Sci. 5 (1976) 345-355; doubling makes degrees even."""
    left, right = (np.repeat(np.unique(column, return_inverse=True)[1], 2) for column in graph)
    picked = euler_halves(left, right)
    for column in (left, right):
        assert (2 * np.bincount(column[picked], minlength=column.max() + 1) == np.bincount(column)).all()


def test_halving_a_closed_trail_through_all_nodes():
    left, right = random_regular(301, 2, 3)
    picked = euler_halves(left, right)
    assert sorted(left[picked].tolist()) == sorted(right[picked].tolist()) == list(range(301))


@pytest.mark.parametrize("degree", [1, 2, 3, 4, 5, 7, 8, 13])
@pytest.mark.parametrize("nodes", [1, 2, 3, 10, 64, 101])
def test_regular_multigraphs_have_perfect_matchings(nodes, degree):
    """N. Alon, Information Processing Letters 85 (2003) 301-302."""
    left, right = random_regular(nodes, degree, nodes + degree)
    matching = perfect_matching(left, right, nodes, degree)
    assert sorted(left[matching].tolist()) == sorted(right[matching].tolist()) == list(range(nodes))
