"""Even rounds: proper, exactly the rounds a crew allows, and no two rounds more than one operation apart."""

from __future__ import annotations

import random
from importlib.util import find_spec

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.kernel import colouring
from shopfloor.kernel.equitable import even_colours, even_rounds
from tests.kernel.graphs import (
    circulant,
    clash,
    columns,
    largest_degree,
    multigraphs,
    named_graphs,
    on_each_kernel,
    random_regular,
)

NAMED = named_graphs()


def assert_even(left, right, colours, rounds) -> None:
    """Proper, and each of the rounds has ⌊m / k⌋ or ⌈m / k⌉ edges."""
    assert colours.dtype == np.int64
    assert colours.shape == (len(left),)
    assert clash(left, right, colours) is None
    sizes = np.bincount(colours, minlength=rounds)
    assert len(sizes) == rounds
    assert set(sizes.tolist()) <= {len(left) // rounds, -(-len(left) // rounds)}


@on_each_kernel
@given(graph=multigraphs(least=1), seed=st.integers(0, 5))
@settings(max_examples=120, deadline=None)
def test_any_number_of_rounds_from_the_degree_up_can_be_even(kernel, graph, seed):
    """D. de Werra, INFOR 9 (1971); C. McDiarmid, J. Inst. Maths Applics 10 (1972) 161-165."""
    delta = largest_degree(*graph)
    for rounds in (*range(delta, delta + 6), len(graph[0]) + delta):
        assert_even(*graph, even_colours(*graph, rounds, seed=seed, kernel=kernel), rounds)


@on_each_kernel
@given(graph=multigraphs(least=1), crew=st.integers(1, 70))
@settings(max_examples=120, deadline=None)
def test_a_crew_needs_no_more_rounds_than_its_two_bounds(kernel, graph, crew):
    """No round holds more than the crew or two edges of a node, so fewer rounds than these could not do."""
    colours = even_rounds(*graph, crew, kernel=kernel)
    rounds = max(largest_degree(*graph), -(-len(graph[0]) // crew))
    assert_even(*graph, colours, rounds)
    assert np.bincount(colours).max() <= crew


@on_each_kernel
@pytest.mark.parametrize("name", NAMED)
def test_every_kind_of_graph(name, kernel):
    left, right = NAMED[name]
    for crew in (1, 2, 3, 7, 20, 10**12):
        rounds = max(largest_degree(left, right), -(-len(left) // crew))
        assert_even(left, right, even_rounds(left, right, crew, kernel=kernel), rounds)


@on_each_kernel
def test_a_hall_of_four(kernel):
    """Four orders, two on every machine of two: 8 operations, Δ = 4; three people make it no longer."""
    left, right = columns([(order, machine) for order in range(4) for machine in range(2)])
    assert sorted(np.bincount(even_rounds(left, right, 3, kernel=kernel)).tolist()) == [2, 2, 2, 2]
    assert sorted(np.bincount(even_rounds(left, right, 1, kernel=kernel)).tolist()) == [1] * 8


@on_each_kernel
def test_no_edges(kernel):
    assert even_rounds([], [], 4, kernel=kernel).shape == (0,)
    assert even_colours([], [], 0, kernel=kernel).shape == (0,)
    assert even_colours([], [], 3, kernel=kernel).dtype == np.int64


@on_each_kernel
@pytest.mark.parametrize(
    ("call", "text"),
    [
        (lambda kernel: even_rounds([0], [0], 0, kernel=kernel), "crew must be at least 1, got 0"),
        (
            lambda kernel: even_colours([0, 0, 1], [0, 1, 1], 1, kernel=kernel),
            "rounds must be at least 2, the most edges at one node, got 1",
        ),
        (
            lambda kernel: even_rounds([0, -1], [0, 0], 1, kernel=kernel),
            "left must not hold negative node numbers, got -1 at position 1",
        ),
    ],
)
def test_what_cannot_be_is_refused(call, text, kernel):
    with pytest.raises(ValueError, match="must") as caught:
        call(kernel)
    assert str(caught.value) == text


def test_crew_must_be_whole():
    with pytest.raises(TypeError):
        even_rounds([0], [0], 1.5)


@on_each_kernel
def test_repeatable_and_without_side_effects(kernel):
    left, right = (column.copy() for column in NAMED["regular"])
    left.flags.writeable = right.flags.writeable = False
    before = random.getstate(), np.random.get_state()[1].tobytes()
    first = even_rounds(left, right, 5, seed=2, kernel=kernel)
    assert first.tobytes() == even_rounds(left, right, 5, seed=2, kernel=kernel).tobytes()
    assert first.tobytes() != even_rounds(left, right, 5, seed=3, kernel=kernel).tobytes()
    assert before == (random.getstate(), np.random.get_state()[1].tobytes())


@pytest.mark.skipif(find_spec("numba") is None, reason="numba is not installed")
@given(graph=multigraphs(least=1, most=150), seed=st.integers(0, 5), crew=st.integers(1, 50))
@settings(max_examples=100, deadline=None)
def test_both_kernels_agree(graph, seed, crew):
    plain, fast = (even_rounds(*graph, crew, seed=seed, kernel=kernel) for kernel in ("plain", "fast"))
    assert plain.tobytes() == fast.tobytes()


@pytest.mark.skipif(find_spec("numba") is None, reason="numba is not installed")
@pytest.mark.parametrize("graph", [random_regular(300, 12, 1), circulant(400, 7), NAMED["power law"]])
def test_both_kernels_agree_on_larger_graphs(graph):
    for rounds in (15, 40, 300, 2000):
        if rounds < largest_degree(*graph):
            continue
        plain, fast = (even_colours(*graph, rounds, kernel=kernel) for kernel in ("plain", "fast"))
        assert_even(*graph, plain, rounds)
        assert plain.tobytes() == fast.tobytes()


def test_large_graphs_take_the_compiled_route(monkeypatch):
    pytest.importorskip("numba")
    graph = NAMED["sparse"]
    expected = even_rounds(*graph, 10, kernel="plain")
    monkeypatch.setattr(colouring, "FAST_FROM", 1)
    assert even_rounds(*graph, 10).tobytes() == expected.tobytes()
