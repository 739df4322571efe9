"""Edge colouring: proper, exactly Δ colours, repeatable, on every kind of multigraph and by every route."""

from __future__ import annotations

import random
import sys
from importlib.util import find_spec

import networkx as nx
import numpy as np
import pytest
import rustworkx
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.kernel import colouring
from shopfloor.kernel.colouring import colour_edges, colour_with_steps
from shopfloor.kernel.multigraph import as_columns, folded, shuffled
from tests.kernel.graphs import (
    assert_exact,
    circulant,
    complete,
    largest_degree,
    multigraphs,
    named_graphs,
    on_each_kernel,
    random_regular,
)

NAMED = named_graphs()


@on_each_kernel
@pytest.mark.parametrize("name", NAMED)
def test_every_kind_of_graph_is_coloured_exactly(name, kernel):
    left, right = NAMED[name]
    for seed in range(3):
        assert_exact(left, right, colour_with_steps(left, right, seed=seed, kernel=kernel).colours)


@on_each_kernel
@given(graph=multigraphs(), seed=st.integers(-(2**70), 2**70))
@settings(max_examples=200, deadline=None)
def test_any_multigraph_is_coloured_exactly(kernel, graph, seed):
    """D. König, Mathematische Annalen 77 (1916): as many colours as the largest degree are enough."""
    assert_exact(*graph, colour_with_steps(*graph, seed=seed, kernel=kernel).colours)


@on_each_kernel
@pytest.mark.parametrize(
    ("rows", "cols"), [(1, 1), (1, 8), (8, 1), (5, 9), (9, 5), (12, 12), (70, 64), (129, 130)]
)
def test_complete_graph_needs_the_larger_side(rows, cols, kernel):
    """K(r, s) has the edge chromatic number max(r, s) (König 1916)."""
    left, right = complete(rows, cols)
    colours = colour_with_steps(left, right, kernel=kernel).colours
    assert_exact(left, right, colours)
    assert colours.max() + 1 == max(rows, cols)


@on_each_kernel
def test_no_edges(kernel):
    for nothing in ([], np.empty(0, dtype=np.int64), ()):
        colours = colour_with_steps(nothing, nothing, kernel=kernel).colours
        assert colours.dtype == np.int64
        assert colours.shape == (0,)


def rustworkx_colours(left, right) -> list[int]:
    """Colour with rustworkx, which follows N. Alon, Information Processing Letters 85 (2003) 301-302."""
    graph = rustworkx.PyGraph(multigraph=True)
    lefts, us = np.unique(left, return_inverse=True)
    rights, vs = np.unique(right, return_inverse=True)
    graph.add_nodes_from(range(len(lefts) + len(rights)))
    graph.add_edges_from_no_data(list(zip(us.tolist(), (vs + len(lefts)).tolist(), strict=True)))
    by_edge = rustworkx.graph_bipartite_edge_color(graph)
    return [by_edge[edge] for edge in range(len(us))]


@pytest.mark.parametrize("name", NAMED)
def test_as_many_colours_as_rustworkx(name):
    left, right = NAMED[name]
    theirs = np.array(rustworkx_colours(left, right))
    assert_exact(left, right, theirs)
    assert len(set(colour_edges(left, right).tolist())) == len(set(theirs.tolist()))


@given(graph=multigraphs(least=1, most=25))
@settings(max_examples=40, deadline=None)
def test_never_more_colours_than_greedy_on_the_line_graph(graph):
    """networkx's greedy colouring of the line graph is proper but may exceed Δ."""
    left, right = graph
    shop = nx.MultiGraph()
    for edge, (u, v) in enumerate(zip(left.tolist(), right.tolist(), strict=True)):
        shop.add_edge(("order", u), ("machine", v), key=edge)
    greedy = nx.greedy_color(nx.line_graph(shop))
    assert len(set(colour_edges(left, right).tolist())) <= len(set(greedy.values()))


@on_each_kernel
@pytest.mark.parametrize("degree", range(3, 12))
def test_circulants_in_natural_order_need_few_path_steps(degree, kernel):
    """Rows taken in natural order go quadratic on this family; shuffled rows must not."""
    for nodes in (500, 20_000):
        left, right = circulant(nodes, degree)
        found = colour_with_steps(left, right, kernel=kernel)
        assert not found.by_splitting
        assert found.steps <= 10 * len(left)
        assert len(np.unique(left * degree + found.colours)) == len(left)
        assert len(np.unique(right * degree + found.colours)) == len(left)
        assert found.colours.max() < degree


def test_the_danger_in_natural_order_is_real():
    """Were this to fail, shuffling the rows would be needless."""
    left, right = circulant(3_000, 4)
    graph = folded(*as_columns(left, right))
    _, steps = colouring._colour_rows(graph, list(range(3_000)), *colouring._runs(graph)[1:], 10**9)
    assert steps > 10 * len(left)


@pytest.mark.parametrize("name", NAMED)
def test_halving_is_exact_too(name):
    left, right = NAMED[name]
    found = colour_with_steps(left, right, shuffles=0)
    assert found.by_splitting
    assert_exact(left, right, found.colours)


@given(graph=multigraphs(least=1))
@settings(max_examples=60, deadline=None)
def test_halving_is_exact_on_any_multigraph(graph):
    assert_exact(*graph, colour_with_steps(*graph, shuffles=0).colours)


@on_each_kernel
def test_budget_spent_leads_to_another_order_and_then_to_halving(kernel):
    left, right = random_regular(40, 9, 1)
    found = colour_with_steps(left, right, budget=0, kernel=kernel)
    assert found.by_splitting
    assert found.shuffles == colouring.SHUFFLES
    assert_exact(left, right, found.colours)
    # A graph on which some orders of rows need no path at all: there the second or third order can succeed.
    left, right = random_regular(6, 3, 1)
    outcomes = [colour_with_steps(left, right, seed=seed, budget=0, kernel=kernel) for seed in range(60)]
    for found in outcomes:
        assert_exact(left, right, found.colours)
    assert any(found.shuffles > 1 and not found.by_splitting for found in outcomes)


@on_each_kernel
def test_same_seed_same_bytes_whatever_the_integer_type(kernel):
    def coloured(us, vs, seed=5) -> bytes:
        return colour_with_steps(us, vs, seed=seed, kernel=kernel).colours.tobytes()

    left, right = NAMED["sparse"]
    first = coloured(left, right)
    assert first == coloured(left, right)
    assert first == coloured(left.tolist(), right.tolist())
    for dtype in (np.uint8, np.int16, np.int32, np.uint64):
        assert first == coloured(left.astype(dtype), right.astype(dtype))
    assert first == coloured(np.repeat(left, 2)[::2], right)
    assert first != coloured(left, right, seed=6)


@pytest.mark.skipif(find_spec("numba") is None, reason="numba is not installed")
@given(graph=multigraphs(most=200), seed=st.integers(0, 9), budget=st.integers(0, 1))
@settings(max_examples=100, deadline=None)
def test_both_kernels_agree_to_the_last_step(graph, seed, budget):
    """A plan must not depend on whether numba is installed."""
    plain, fast = (
        colour_with_steps(*graph, seed=seed, budget=budget, kernel=each) for each in ("plain", "fast")
    )
    assert plain.colours.tobytes() == fast.colours.tobytes()
    assert plain[1:] == fast[1:]


@pytest.mark.skipif(find_spec("numba") is None, reason="numba is not installed")
@pytest.mark.parametrize(
    ("left", "right"),
    [
        random_regular(700, 13, 2),
        random_regular(60, 150, 3),  # several words of colours
        random_regular(34_000, 2, 4),  # more groups than 16 bits tell apart
        random_regular(3, 1000, 5),
    ],
)
def test_both_kernels_agree_on_larger_graphs(left, right):
    plain, fast = (colour_with_steps(left, right, kernel=each) for each in ("plain", "fast"))
    assert_exact(left, right, plain.colours)
    assert plain.steps == fast.steps > 0
    assert plain.colours.tobytes() == fast.colours.tobytes()


@on_each_kernel
def test_inputs_and_global_random_generators_are_left_alone(kernel):
    left, right = (column.copy() for column in NAMED["regular"])
    left.flags.writeable = right.flags.writeable = False
    before = random.getstate(), np.random.get_state()[1].tobytes()
    colour_with_steps(left, right, seed=3, kernel=kernel)
    colour_with_steps(left, right, shuffles=0, kernel=kernel)
    assert before == (random.getstate(), np.random.get_state()[1].tobytes())


@on_each_kernel
@pytest.mark.parametrize(
    ("left", "right", "error", "text"),
    [
        ([0.0], [0], TypeError, "left must hold integers, got dtype float64"),
        ([0], [True], TypeError, "right must hold integers, got dtype bool"),
        ([0], ["a"], TypeError, "right must hold integers, got dtype <U1"),
        (np.empty(0), [], TypeError, "left must hold integers, got dtype float64"),
        ([[0]], [0], ValueError, "left must be one-dimensional, got shape (1, 1)"),
        (3, [0], ValueError, "left must be one-dimensional, got shape ()"),
        ([0, 1], [0], ValueError, "left and right must have one entry an edge each, got 2 and 1"),
        ([0, 1], [0, -4], ValueError, "right must not hold negative node numbers, got -4 at position 1"),
        (
            [0],
            np.array([2**63], dtype=np.uint64),
            ValueError,
            "right must hold node numbers below 2**63, got 9223372036854775808",
        ),
    ],
)
def test_bad_columns_are_refused(left, right, error, text, kernel):
    with pytest.raises(error) as caught:
        colour_with_steps(left, right, kernel=kernel)
    assert str(caught.value) == text


def test_seed_must_be_an_integer():
    with pytest.raises(TypeError):
        colour_edges([0], [0], seed=0.5)


@pytest.mark.parametrize("count", [0, 1, 2, 3, 64, 65, 1000])
def test_shuffled_is_a_permutation(count):
    for seed in (0, 1, -1, 2**64):
        assert sorted(shuffled(count, seed).tolist()) == list(range(count))


def test_shuffled_orders_differ_by_seed_and_keep_no_pattern():
    first, second = shuffled(1000, 0), shuffled(1000, 1)
    assert first.tolist() != second.tolist()
    # Neighbours in a random order differ by a third of the range on average.
    for order in (first, second):
        assert 250 < np.abs(np.diff(order)).mean() < 420


def test_folding_keeps_tables_linear():
    """Many orders beside one busy machine: 20,000 nodes but a handful of groups."""
    left = np.arange(20_000)
    right = np.where(left < 10_000, 0, left)
    graph = folded(*as_columns(left, right))
    assert graph.delta == largest_degree(left, right) == 10_000
    assert (graph.left_groups + graph.right_groups) * graph.delta <= 5 * len(left)


def test_compiled_kernel_is_for_large_graphs_unless_it_is_loaded(monkeypatch):
    asked = []
    monkeypatch.delitem(sys.modules, "shopfloor.kernel.fast", raising=False)
    monkeypatch.setattr(colouring, "import_module", lambda name: asked.append(name) or colouring)
    assert colouring.fast_kernel(colouring.FAST_FROM - 1, "auto") is None
    assert colouring.fast_kernel(10**9, "plain") is None
    assert not asked
    assert colouring.fast_kernel(colouring.FAST_FROM, "auto") is not None
    assert asked == ["shopfloor.kernel.fast"]
    monkeypatch.setitem(sys.modules, "shopfloor.kernel.fast", colouring)
    assert colouring.fast_kernel(1, "auto") is not None


def test_without_numba_large_graphs_are_coloured_plainly(monkeypatch):
    def missing(name):
        raise ImportError(f"no {name}")

    monkeypatch.setattr(colouring, "import_module", missing)
    monkeypatch.setattr(colouring, "FAST_FROM", 1)
    assert_exact(*NAMED["sparse"], colour_edges(*NAMED["sparse"]))
    with pytest.raises(ImportError):
        colour_with_steps(*NAMED["sparse"], kernel="fast")


def test_compiled_code_goes_to_memory_where_no_folder_takes_it(monkeypatch):
    fast = pytest.importorskip("shopfloor.kernel.fast", exc_type=ImportError)
    tried = []

    def njit(signatures, cache=False, **options):
        tried.append(cache)
        if cache:
            raise RuntimeError("cannot cache function: no locator available")
        return lambda function: function

    monkeypatch.setattr(fast.numba, "njit", njit)
    assert fast.compiled("int64(int64)")(len) is len
    assert tried == [True, False]
