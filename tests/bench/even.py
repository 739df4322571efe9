"""Even rounds under a crew limit: what evening out costs beyond the colouring. Prints markdown.

    python tests/bench/even.py                        10^5 and 10^6 edges, a few minutes
    python tests/bench/even.py --sizes 100000 --shapes dense regular

No peer evens out bipartite colourings in Δ colours, so the colouring itself is the measure: both are timed in
turn in one process, warm, and the table gives medians.
"""

from __future__ import annotations

import argparse
import time
from collections.abc import Callable
from importlib.util import find_spec
from statistics import median

import numpy as np

from shopfloor.kernel.colouring import Kernel, colour_with_steps
from shopfloor.kernel.equitable import even_colours
from tests.bench.rounds import SHAPES, columns, milliseconds, table


def timed(call: Callable[[], object]) -> float:
    before = time.perf_counter()
    call()
    return time.perf_counter() - before


def check(left: np.ndarray, right: np.ndarray, colours: np.ndarray, rounds: int) -> None:
    sizes = np.bincount(colours, minlength=rounds)
    if len(sizes) != rounds or sizes.max() - sizes.min() > 1:
        raise AssertionError(f"sizes from {sizes.min()} to {sizes.max()} in {len(sizes)} rounds")
    for column in (left, right):
        if len(np.unique(column * rounds + colours)) != len(column):
            raise AssertionError("two edges that meet share a colour")


def measure(size: int, shape: str, kernels: list[Kernel], repeats: int) -> list[list[str]]:
    left, right = columns(shape, size)
    delta = int(max(np.bincount(left).max(), np.bincount(right).max()))
    sizes = np.bincount(colour_with_steps(left, right).colours)
    rows = []
    for crew in (None, 100, 20, 4):
        rounds = delta if crew is None else -(-len(left) // crew)
        if rounds < delta:
            continue
        row = [shape, f"{len(left):,}", "no limit" if crew is None else str(crew), f"{rounds:,}"]
        row.append(f"{sizes.min():,} to {sizes.max():,}" if crew is None else "")
        for kernel in kernels:
            check(left, right, even_colours(left, right, rounds, kernel=kernel), rounds)
            alone, both = [], []
            for _ in range(repeats):
                alone.append(timed(lambda kernel=kernel: colour_with_steps(left, right, kernel=kernel)))
                both.append(
                    timed(lambda kernel=kernel, k=rounds: even_colours(left, right, k, kernel=kernel))
                )
            beyond = median(both) - median(alone)
            row += [
                milliseconds(median(alone)),
                f"{beyond / len(left) * 1e6:.2f}",
                f"{beyond / median(alone):.2f}",
            ]
        rows.append(row)
    return rows


def main() -> None:
    parser = argparse.ArgumentParser(description="Even rounds beyond the colouring, as markdown tables.")
    parser.add_argument("--sizes", type=int, nargs="+", default=[10**5, 10**6])
    parser.add_argument("--shapes", nargs="+", choices=list(SHAPES), default=list(SHAPES))
    parser.add_argument("--repeats", type=int, default=3, help="runs behind a median")
    options = parser.parse_args()
    kernels: list[Kernel] = ["plain", "fast"] if find_spec("numba") else ["plain"]
    head = ["shape", "edges", "crew", "rounds", "a round before"]
    for kernel in kernels:
        name = "compiled" if kernel == "fast" else "plain"
        head += [f"{name}: colouring ms", "beyond, µs an edge", "beyond / colouring"]
    for size in options.sizes:
        rows = [row for shape in options.shapes for row in measure(size, shape, kernels, options.repeats)]
        print(f"### Even rounds, about {size:,} edges\n")
        table(head, rows)


if __name__ == "__main__":
    main()
