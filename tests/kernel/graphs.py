"""Multigraphs to colour, and a judge of colourings that shares nothing with the kernel."""

from __future__ import annotations

from collections import Counter
from importlib.util import find_spec

import numpy as np
import pytest
from hypothesis import strategies as st

#: Both implementations pass the same tests; without numba the skips say so.
KERNELS = [
    "plain",
    pytest.param(
        "fast", marks=pytest.mark.skipif(find_spec("numba") is None, reason="numba is not installed")
    ),
]
on_each_kernel = pytest.mark.parametrize("kernel", KERNELS)

Columns = tuple[np.ndarray, np.ndarray]


def largest_degree(left, right) -> int:
    degrees = [*Counter(np.asarray(left).tolist()).values(), *Counter(np.asarray(right).tolist()).values()]
    return max(degrees, default=0)


def clash(left, right, colours):
    """Return two edges that share a node and a colour, or None."""
    for column in (left, right):
        seen = {}
        rows = zip(np.asarray(column).tolist(), np.asarray(colours).tolist(), strict=True)
        for edge, cell in enumerate(rows):
            if cell in seen:
                return seen[cell], edge
            seen[cell] = edge
    return None


def assert_exact(left, right, colours) -> None:
    """Every edge has one colour, edges that meet differ, and exactly Δ colours 0 ... Δ-1 are used."""
    assert isinstance(colours, np.ndarray)
    assert colours.dtype == np.int64
    assert colours.shape == (len(left),)
    assert clash(left, right, colours) is None
    assert set(colours.tolist()) == set(range(largest_degree(left, right)))


def columns(pairs) -> Columns:
    table = np.array(pairs, dtype=np.int64).reshape(-1, 2)
    return table[:, 0].copy(), table[:, 1].copy()


@st.composite
def multigraphs(draw, least: int = 0, most: int = 60) -> Columns:
    """Small multigraphs: few nodes, so many parallel edges; sometimes far-apart node numbers."""
    rows = draw(st.integers(1, 9))
    cols = draw(st.integers(1, 9))
    pair = st.tuples(st.integers(0, rows - 1), st.integers(0, cols - 1))
    pairs = draw(st.lists(pair, min_size=least, max_size=most))
    copies = draw(st.integers(1, 3))
    left, right = columns(pairs * copies)
    spread = draw(st.sampled_from([1, 7, 10**12]))
    return left * spread, right * draw(st.sampled_from([1, spread]))


def complete(rows: int, cols: int) -> Columns:
    left, right = np.divmod(np.arange(rows * cols), cols)
    return left, right


def circulant(nodes: int, degree: int) -> Columns:
    """Left i meets right i, i+1, ... i+degree-1 (mod nodes), in natural order."""
    left = np.repeat(np.arange(nodes), degree)
    return left, (left + np.tile(np.arange(degree), nodes)) % nodes


def random_regular(nodes: int, degree: int, seed: int) -> Columns:
    random = np.random.default_rng(seed)
    left = np.tile(np.arange(nodes), degree)
    return left, np.concatenate([random.permutation(nodes) for _ in range(degree)])


def named_graphs() -> dict[str, Columns]:
    """One graph of each kind the kernel must live with, a few hundred edges each."""
    random = np.random.default_rng(7)
    weights = 1 / np.arange(1, 31)
    star = np.zeros(40, dtype=np.int64)
    return {
        "one edge": columns([(0, 0)]),
        "one row": (np.zeros(30, dtype=np.int64), np.arange(30)),
        "one column": (np.arange(30), np.zeros(30, dtype=np.int64)),
        "one pair": (star, star.copy()),
        "matching": (np.arange(50), np.arange(50)[::-1].copy()),
        "long cycle": circulant(200, 2),
        "dense": complete(17, 17),
        "oblong": complete(40, 7),
        "sparse": (random.integers(0, 60, 400), random.integers(0, 40, 400)),
        "few machines": (random.integers(0, 60, 400), random.integers(0, 3, 400)),
        "power law": (random.integers(0, 60, 400), random.choice(30, 400, p=weights / weights.sum())),
        "parallel": tuple(np.repeat(random.integers(0, 6, (2, 40)), 10, axis=1)),
        "regular": random_regular(40, 9, 1),
        "star beside a matching": (
            np.concatenate((np.zeros(40, dtype=np.int64), np.arange(1, 200))),
            np.concatenate((np.arange(40), np.arange(1000, 1199))),
        ),
        "sparse numbers": (random.integers(0, 9, 200) * 10**15, random.integers(0, 9, 200) + 2**62),
    }
