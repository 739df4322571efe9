"""Splitting work: every plan is judged by a checker of its own, and ends when the totals say it can."""

from __future__ import annotations

import random
from collections import Counter, defaultdict
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.kernel.decompose import Block, split_loads, time_blocks
from shopfloor.kernel.units import UnitPiece, split_units
from tests.kernel.graphs import columns


def overlap(spells) -> bool:
    ordered = sorted(spells)
    return any(later[0] < earlier[1] for earlier, later in pairwise(ordered))


def judge(left, right, seconds, pieces, units=None, crew=None) -> None:
    """Everything a plan must keep to, and the end the totals allow."""
    left, right, seconds = (np.asarray(column).tolist() for column in (left, right, seconds))
    units = units or {}
    done, running = Counter(), Counter()
    orders, machines, operations = defaultdict(list), defaultdict(list), defaultdict(list)
    for edge, unit, start, end in pieces:
        assert all(type(number) is int for number in (edge, unit, start, end))
        assert 0 <= start < end
        assert 0 <= unit < units.get(right[edge], 1)
        done[edge] += end - start
        running.update({start: 1})
        running.subtract({end: 1})
        orders[left[edge]].append((start, end))
        machines[right[edge], unit].append((start, end))
        operations[edge].append((start, end, unit))
    assert [done[edge] for edge in range(len(seconds))] == seconds
    assert not any(overlap(spells) for spells in (*orders.values(), *machines.values()))
    for spells in operations.values():
        spells.sort()
        for (_, end, unit), (start, _, other) in pairwise(spells):
            assert end < start or unit != other, "adjacent pieces are one piece"
    order_load, group_load = Counter(), Counter()
    for u, v, amount in zip(left, right, seconds, strict=True):
        order_load[u] += amount
        group_load[v] += amount
    bounds = [0, *order_load.values(), *(-(-load // units.get(v, 1)) for v, load in group_load.items())]
    if crew is not None:
        bounds.append(-(-sum(seconds) // crew))
        at_once = 0
        for moment in sorted(running):
            at_once += running[moment]
            assert at_once <= crew
    assert max((end for *_, end in pieces), default=0) == max(bounds)
    assert [(piece[2], piece[0]) for piece in pieces] == sorted((piece[2], piece[0]) for piece in pieces)


def split(left, right, seconds) -> list[UnitPiece]:
    """Split, judge, and return the pieces."""
    pieces = [UnitPiece(edge, 0, start, end) for edge, start, end in split_loads(left, right, seconds)]
    judge(left, right, seconds, pieces)
    return pieces


def of_matrix(matrix) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    matrix = np.asarray(matrix)
    left, right = np.nonzero(matrix)
    return left, right, matrix[left, right]


def dense(orders: int, machines: int, most: int, seed: int, filled: float = 1.0):
    numbers = np.random.default_rng(seed)
    matrix = numbers.integers(1, most + 1, (orders, machines))
    return of_matrix(matrix * (numbers.random((orders, machines)) < filled))


def permutations_sum(lines: int, terms: int, seed: int) -> np.ndarray:
    numbers = np.random.default_rng(seed)
    matrix = np.zeros((lines, lines), dtype=np.int64)
    for _ in range(terms):
        matrix[np.arange(lines), numbers.permutation(lines)] += numbers.integers(1, 60)
    return matrix


HOSTILE = {
    "all lines tight": permutations_sum(12, 30, 1),
    "a Latin square": (np.add.outer(np.arange(7), np.arange(7)) % 7) + 1,
    "equal everywhere": np.full((9, 9), 5),
    "one giant": np.array([[10**12, 1, 1], [1, 1, 1], [1, 1, 1]]),
    "a giant in every row": np.eye(8, dtype=np.int64) * 10**9 + 1,
    "one row": np.array([[3, 1, 4, 1, 5]]),
    "one column": np.array([[3], [1], [4], [1], [5]]),
    "one cell": np.array([[7]]),
    "zero rows and columns": np.pad(permutations_sum(5, 6, 2), 2),
    "block of tight lines in a loose shop": np.block(
        [[permutations_sum(6, 12, 3), np.zeros((6, 6), int)], [np.zeros((6, 6), int), np.eye(6, dtype=int)]]
    ),
    "long and short": np.where(np.add.outer(np.arange(10), np.arange(10)) % 3, 1, 1000),
    "wide": np.random.default_rng(4).integers(0, 9, (3, 40)),
    "tall": np.random.default_rng(5).integers(0, 9, (40, 3)),
}


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_matrices(name):
    """T. Gonzalez, S. Sahni, J. ACM 23 (1976) 665-679: the largest total is always reached."""
    split(*of_matrix(HOSTILE[name]))


@st.composite
def shops(draw):
    """Small shops with parallel operations, empty ones, and now and then far-apart numbers."""
    rows, cols = draw(st.integers(1, 6)), draw(st.integers(1, 6))
    operation = st.tuples(st.integers(0, rows - 1), st.integers(0, cols - 1), st.integers(0, 12))
    table = np.array(draw(st.lists(operation, max_size=30)), dtype=np.int64).reshape(-1, 3)
    return table[:, 0] * draw(st.sampled_from([1, 10**13])), table[:, 1].copy(), table[:, 2].copy()


@given(shop=shops())
@settings(max_examples=300, deadline=None)
def test_any_shop_ends_with_its_largest_total(shop):
    split(*shop)


@given(shop=shops(), counts=st.lists(st.integers(1, 4), min_size=6, max_size=6), crew=st.integers(1, 7))
@settings(max_examples=300, deadline=None)
def test_units_and_crew_cost_no_more_than_their_totals(shop, counts, crew):
    """R. McNaughton, Management Science 6 (1959) 1-12, for the units; dummies of idle time for the crew."""
    units = dict(enumerate(counts))
    judge(*shop, split_units(*shop, units=units), units)
    judge(*shop, split_units(*shop, crew=crew), crew=crew)
    judge(*shop, split_units(*shop, units=units, crew=crew), units, crew)


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_matrices_with_units_and_crew(name):
    left, right, seconds = of_matrix(HOSTILE[name])
    units = {int(node): 1 + int(node) % 3 for node in np.unique(right)}
    for crew in (1, 2, 3, 8, 100):
        judge(left, right, seconds, split_units(left, right, seconds, units=units, crew=crew), units, crew)


def test_without_units_or_crew_it_is_the_same_plan():
    shop = dense(8, 6, 40, 1)
    assert [(p.edge, p.start, p.end) for p in split_units(*shop)] == split_loads(*shop)


def test_cutting_at_the_edge_of_a_unit():
    """Three orders of 2 s on a group of two: 6 s of work in 3 s, which needs one order on both units."""
    left, right, seconds = [0, 1, 2], [0, 0, 0], [2, 2, 2]
    pieces = split_units(left, right, seconds, units={0: 2})
    judge(left, right, seconds, pieces, {0: 2})
    assert max(piece.end for piece in pieces) == 3
    assert len(pieces) == 4


@given(terms=st.integers(1, 8), lines=st.integers(1, 7), seed=st.integers(0, 99))
@settings(max_examples=60, deadline=None)
def test_equal_totals_are_a_weighted_sum_of_permutations(terms, lines, seed):
    """G. Birkhoff (1946), J. von Neumann (1953): the blocks of such a plan are permutations that sum back."""
    matrix = permutations_sum(lines, terms, seed)
    left, right, seconds = of_matrix(matrix)
    blocks = time_blocks(split_loads(left, right, seconds))
    total = np.zeros_like(matrix)
    for block in blocks:
        edges = list(block.edges)
        assert sorted(left[edges].tolist()) == sorted(right[edges].tolist()) == list(range(lines))
        total[left[edges], right[edges]] += block.end - block.start
    assert total.tolist() == matrix.tolist()
    assert sum(block.end - block.start for block in blocks) == matrix[0].sum()


@given(shop=shops(), seed=st.integers(0, 99))
@settings(max_examples=60, deadline=None)
def test_blocks_may_come_in_any_order(shop, seed):
    blocks = time_blocks(split_loads(*shop))
    random.Random(seed).shuffle(blocks)
    moved, clock = defaultdict(list), 0
    for block in blocks:
        for edge in block.edges:
            moved[edge].append((clock, clock + block.end - block.start))
        clock += block.end - block.start
    pieces = []
    for edge, spells in moved.items():
        joined = [list(spells[0])]
        for start, end in spells[1:]:
            if start == joined[-1][1]:
                joined[-1][1] = end
            else:
                joined.append([start, end])
        pieces += [UnitPiece(edge, 0, start, end) for start, end in joined]
    judge(*shop, sorted(pieces, key=lambda piece: (piece.start, piece.edge)))


def test_blocks_of_a_small_plan():
    assert time_blocks([(4, 0, 3), (2, 1, 3), (2, 5, 6)]) == [
        Block(0, 1, (4,)),
        Block(1, 3, (2, 4)),
        Block(5, 6, (2,)),
    ]
    assert time_blocks([]) == []


def cuts(shop) -> int:
    pieces = split(*shop)
    return len(pieces) - int(np.count_nonzero(shop[2]))


@pytest.mark.parametrize(("lines", "seeds"), [(20, 5), (30, 3), (50, 1)])
def test_dense_shops_are_hardly_cut(lines, seeds):
    """Durations up to 99: a hundredth of the operations at most, on average."""
    shops_ = [dense(lines, lines, 99, seed) for seed in range(seeds)]
    assert sum(cuts(shop) for shop in shops_) <= 0.01 * lines * lines * seeds


def test_a_sparse_hall_is_not_cut_at_all():
    assert cuts(dense(500, 50, 99, 1, filled=0.1)) == 0


def test_cuts_fall_on_the_common_measure_of_the_durations():
    left, right, seconds = of_matrix(permutations_sum(6, 9, 2))
    assert cuts((left, right, seconds)) > 0
    assert all(start % 60 == end % 60 == 0 for _, start, end in split_loads(left, right, seconds * 60))


def test_parallel_operations_follow_one_another():
    left, right = columns([(0, 0), (0, 0), (1, 1)])
    pieces = split(left, right, [4, 3, 7])
    assert [(piece.edge, piece.start, piece.end) for piece in pieces] == [(0, 0, 4), (2, 0, 7), (1, 4, 7)]


def test_nothing_to_do():
    assert split_loads([], [], []) == []
    assert split_loads([3, 1], [0, 0], [0, 0]) == []
    assert split_units([3], [0], [0], units={0: 2}, crew=1) == []


def test_repeatable_and_without_side_effects():
    left, right, seconds = dense(10, 10, 99, 3)
    for column in (left, right, seconds):
        column.flags.writeable = False
    before = random.getstate(), np.random.get_state()[1].tobytes()
    first = split_loads(left, right, seconds)
    assert first == split_loads(left.tolist(), right.astype(np.int16), seconds.astype(np.uint32))
    assert before == (random.getstate(), np.random.get_state()[1].tobytes())


@pytest.mark.parametrize(
    ("arguments", "error", "text"),
    [
        (([0], [0], [1.0]), TypeError, "seconds must hold integers, got dtype float64"),
        (([0], [0], [1, 2]), ValueError, "seconds must have one entry an operation, got 2 for 1"),
        (([0, 0], [0, 1], [1, -2]), ValueError, "seconds must not be negative, got -2 at position 1"),
        (([0, -3], [0, 1], [1, 2]), ValueError, "left must not be negative, got -3 at position 1"),
        (([0], [[0]], [1]), ValueError, "right must be one-dimensional, got shape (1, 1)"),
    ],
)
def test_bad_columns_are_refused(arguments, error, text):
    for function in (split_loads, split_units):
        with pytest.raises(error) as caught:
            function(*arguments)
        assert str(caught.value) == text


def test_bad_units_and_crews_are_refused():
    with pytest.raises(ValueError, match="units must be at least 1, got 0 at right node 5"):
        split_units([0], [5], [1], units={5: 0})
    with pytest.raises(ValueError, match="crew must be at least 1, got 0"):
        split_units([0], [5], [1], crew=0)
