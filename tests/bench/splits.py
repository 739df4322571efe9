"""Splittable work against the textbook: cuts and time. Prints markdown.

    python tests/bench/splits.py                      a few minutes
    python tests/bench/splits.py --networkx-to 20     seconds

The peer pads the matrix of times to equal line totals and peels off maximum matchings found by networkx, as
the proof of Birkhoff's theorem does (with Gonzalez and Sahni's padding, 1976). Both plans are checked, and
end at the largest total; adjacent pieces count as one. Times are medians of one process.
"""

from __future__ import annotations

import argparse
import time
from collections import defaultdict
from itertools import pairwise
from statistics import mean, median

import numpy as np

from shopfloor.kernel.decompose import split_loads
from shopfloor.kernel.units import split_units
from tests.bench.rounds import milliseconds, table

Shop = tuple[np.ndarray, np.ndarray, np.ndarray]
Pieces = list[tuple[int, int, int]]


def of_matrix(matrix: np.ndarray) -> Shop:
    left, right = np.nonzero(matrix)
    return left, right, matrix[left, right]


def shop(orders: int, machines: int, filled: float, most: int, seed: int) -> Shop:
    """Durations even on 1 ... most, each order on each machine with the given chance."""
    random = np.random.default_rng(seed)
    matrix = random.integers(1, most + 1, (orders, machines))
    return of_matrix(matrix * (random.random((orders, machines)) < filled))


def tight(lines: int, most: int, seed: int) -> Shop:
    """A weighted sum of three permutations a line: every order and machine is busy from beginning to end."""
    random = np.random.default_rng(seed)
    matrix = np.zeros((lines, lines), dtype=np.int64)
    for _ in range(3 * lines):
        matrix[np.arange(lines), random.permutation(lines)] += random.integers(1, most + 1)
    return of_matrix(matrix)


def peeled(left: np.ndarray, right: np.ndarray, seconds: np.ndarray) -> Pieces:
    """Schedule by padding and peeling with networkx's Hopcroft-Karp matchings."""
    import networkx as nx

    rows, columns = int(left.max()) + 1, int(right.max()) + 1
    work = np.zeros((rows, columns), dtype=np.int64)
    work[left, right] = seconds
    span = int(max(work.sum(axis=0).max(), work.sum(axis=1).max()))
    padded = np.block([[work, np.diag(span - work.sum(axis=1))], [np.diag(span - work.sum(axis=0)), work.T]])
    edge = {pair: number for number, pair in enumerate(zip(left.tolist(), right.tolist(), strict=True))}
    tops = [("row", row) for row in range(len(padded))]
    graph = nx.Graph()
    graph.add_nodes_from(tops)
    graph.add_edges_from((("row", int(u)), ("column", int(v))) for u, v in np.argwhere(padded))
    spells: dict[int, list[list[int]]] = defaultdict(list)
    clock = 0
    while clock < span:
        matching = nx.bipartite.hopcroft_karp_matching(graph, tops)
        pairs = [(row[1], matching[row][1]) for row in tops]
        until = clock + int(min(padded[pair] for pair in pairs))
        for pair in pairs:
            padded[pair] -= until - clock
            if not padded[pair]:
                graph.remove_edge(("row", pair[0]), ("column", pair[1]))
            if pair in edge:
                mine = spells[edge[pair]]
                if mine and mine[-1][1] == clock:
                    mine[-1][1] = until
                else:
                    mine.append([clock, until])
        clock = until
    return [(number, start, end) for number, mine in spells.items() for start, end in mine]


def cuts(
    left: np.ndarray, right: np.ndarray, seconds: np.ndarray, pieces: Pieces, end: int | None = None
) -> int:
    """Raise unless the pieces are a plan that ends at the largest total, or at ``end``; return the cuts."""
    done = np.zeros(len(seconds), dtype=np.int64)
    for edge, start, stop in pieces:
        done[edge] += stop - start
    if (done != seconds).any():
        raise AssertionError("an operation does not run for its time")
    for column in (left, right) if end is None else (left,):
        spells = sorted((int(column[edge]), start, stop) for edge, start, stop in pieces)
        if any(one[0] == two[0] and two[1] < one[2] for one, two in pairwise(spells)):
            raise AssertionError("two pieces at one node overlap")
    largest = max(np.bincount(left, weights=seconds).max(), np.bincount(right, weights=seconds).max())
    if max(stop for *_, stop in pieces) != (largest if end is None else end):
        raise AssertionError("the plan does not end when it must")
    return len(pieces) - len(seconds)


def timed(function, *arguments) -> tuple[Pieces, float]:
    before = time.perf_counter()
    pieces = function(*arguments)
    return pieces, time.perf_counter() - before


def compare(name: str, shops: list[Shop], with_networkx: bool) -> list[str]:
    ours, theirs = [], []
    for each in shops:
        runs = [timed(split_loads, *each) for _ in range(3)]
        operations = len(each[2])
        ours.append((cuts(*each, runs[0][0]) / operations, median(seconds for _, seconds in runs)))
        if with_networkx:
            pieces, seconds = timed(peeled, *each)
            theirs.append((cuts(*each, pieces) / operations, seconds))
    row = [name, f"{len(shops)} × {len(shops[0][2]):,}"]
    row += [f"{mean(cut for cut, _ in ours):.4f}", milliseconds(median(seconds for _, seconds in ours))]
    if not theirs:
        return [*row, "left out", "—", "—"]
    row += [f"{mean(cut for cut, _ in theirs):.2f}", milliseconds(median(seconds for _, seconds in theirs))]
    return [*row, f"{median(his / mine for (_, mine), (_, his) in zip(ours, theirs, strict=True)):.0f}"]


def limited(name: str, each: Shop, units: dict[int, int], crew: int | None) -> list[str]:
    """Measure groups and crews, for which there is no peer."""
    left, right, seconds = each
    pieces, elapsed = timed(lambda: split_units(left, right, seconds, units=units, crew=crew))
    loads = np.bincount(right, weights=seconds)
    bounds = [np.bincount(left, weights=seconds).max()]
    bounds += [-(-load // units.get(group, 1)) for group, load in enumerate(loads.tolist())]
    if crew is not None:
        bounds.append(-(-seconds.sum() // crew))
    pieces = [(piece.edge, piece.start, piece.end) for piece in pieces]
    cut = cuts(*each, pieces, end=int(max(bounds))) / len(seconds)
    counts = "1 each" if not units else f"{max(units.values())} in {len(units)}, else 1"
    return [name, f"{len(seconds):,}", counts, str(crew or "no limit"), f"{cut:.4f}", milliseconds(elapsed)]


def main() -> None:
    parser = argparse.ArgumentParser(description="Splittable work against its peer, as markdown tables.")
    parser.add_argument(
        "--lines", type=int, nargs="+", default=[10, 20, 30, 50, 100], help="n of n × n shops"
    )
    parser.add_argument("--networkx-to", type=int, default=50, help="largest n given to networkx")
    parser.add_argument("--seeds", type=int, default=5, help="shops of each kind")
    options = parser.parse_args()
    head = ["shop", "shops × operations", "cuts an operation", "ms", "networkx: cuts an operation", "ms"]
    rows = []
    for lines in options.lines:
        shops = [shop(lines, lines, 1.0, 99, seed) for seed in range(options.seeds)]
        rows.append(compare(f"{lines} × {lines}, up to 99", shops, lines <= options.networkx_to))
    rows.append(compare("500 × 50, 10 % filled", [shop(500, 50, 0.1, 99, 1)], False))
    rows.append(compare("5,000 × 50, 10 % filled", [shop(5000, 50, 0.1, 99, 1)], False))
    for lines in (10, 20):
        shops = [tight(lines, 99, seed) for seed in range(options.seeds)]
        rows.append(compare(f"{lines} × {lines}, all lines tight", shops, lines <= options.networkx_to))
    print("### Splittable work\n")
    table([*head, "times faster"], rows)
    hall = shop(300, 20, 0.3, 99, 1)
    groups = dict.fromkeys(range(0, 20, 2), 3)
    rows = [limited("300 × 20, 30 % filled", hall, groups, crew) for crew in (None, 18, 10)]
    rows += [limited("500 × 50, 10 % filled", shop(500, 50, 0.1, 99, 1), {}, crew) for crew in (40, 20)]
    print("### Groups and crews\n")
    table(["shop", "operations", "units a group", "crew", "cuts an operation", "ms"], rows)


if __name__ == "__main__":
    main()
