"""Edge colouring against its peers: time, peak memory, and colours needed. Prints markdown.

    python tests/bench/rounds.py                          the whole of it, about an hour
    python tests/bench/rounds.py --sizes 1000 10000       a couple of minutes
    python tests/bench/rounds.py --sizes 1000000 --shapes regular --limit 30

Every size and shape is measured in a process of its own that is stopped after ``--limit`` seconds; ours go
first, so a peer that does not finish costs only its own figure, and the table says so. All times run from
NumPy columns to an array of colours, and are warm: a method is repeated for a fifth of a second at each turn,
and the first call of a series is left out where there are others. A ratio compares medians of one process.
"""

from __future__ import annotations

import argparse
import gc
import json
import resource
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from importlib.util import find_spec
from pathlib import Path
from statistics import median

import numpy as np

Columns = tuple[np.ndarray, np.ndarray]
MEGABYTE = 1 << 20
#: Seconds for which a method is run again and again before the next one has its turn.
IN_A_ROW = 0.2


# The graphs -------------------------------------------------------------------------------------------------


def _mixed(left: np.ndarray, right: np.ndarray, random: np.random.Generator) -> Columns:
    order = random.permutation(len(left))
    return left[order].astype(np.int64), right[order].astype(np.int64)


def sparse(edges: int, random: np.random.Generator) -> Columns:
    """Orders of 20 operations each, 2·√m machines, pairs drawn evenly."""
    return random.integers(0, max(1, edges // 20), edges), random.integers(0, round(2 * edges**0.5), edges)


def dense(edges: int, random: np.random.Generator) -> Columns:
    """Every order on every machine once: K(√m, √m)."""
    side = int(edges**0.5)
    return _mixed(*np.divmod(np.arange(side * side), side), random)


def few_machines(edges: int, random: np.random.Generator) -> Columns:
    """20 machines share the operations of m/20 orders evenly."""
    return random.integers(0, max(1, edges // 20), edges), random.integers(0, 20, edges)


def power_law(edges: int, random: np.random.Generator) -> Columns:
    """The k-th of 2·√m machines has a load in proportion to k to the power -0.88."""
    weights = np.arange(1, round(2 * edges**0.5) + 1) ** -0.88
    right = random.choice(len(weights), edges, p=weights / weights.sum())
    return random.integers(0, max(1, edges // 20), edges), right


def parallel(edges: int, random: np.random.Generator) -> Columns:
    """m/10 random pairs of √(m/10) orders and as many machines, each ten times over."""
    side = max(1, round((edges / 10) ** 0.5))
    left, right = random.integers(0, side, (2, max(1, edges // 10)))
    return _mixed(np.repeat(left, 10), np.repeat(right, 10), random)


def regular(edges: int, random: np.random.Generator) -> Columns:
    """51 random permutations: every order and machine has 51 operations, so nothing has slack."""
    side = max(1, edges // 51)
    right = np.concatenate([random.permutation(side) for _ in range(51)])
    return _mixed(np.tile(np.arange(side), 51), right, random)


SHAPES: dict[str, Callable[[int, np.random.Generator], Columns]] = {
    "sparse": sparse,
    "dense": dense,
    "few machines": few_machines,
    "power law": power_law,
    "parallel": parallel,
    "regular": regular,
}


def columns(shape: str, edges: int) -> Columns:
    """The same graph for the same shape and size, everywhere."""
    return SHAPES[shape](edges, np.random.default_rng(1916))


# The colourings ---------------------------------------------------------------------------------------------


def plain(left: np.ndarray, right: np.ndarray) -> np.ndarray:
    from shopfloor.kernel.colouring import colour_with_steps

    return colour_with_steps(left, right, kernel="plain").colours


def fast(left: np.ndarray, right: np.ndarray) -> np.ndarray:
    from shopfloor.kernel.colouring import colour_with_steps

    return colour_with_steps(left, right, kernel="fast").colours


def rustworkx_exact(left: np.ndarray, right: np.ndarray) -> np.ndarray:
    """Alon's algorithm (2003) in compiled code."""
    import rustworkx

    graph = rustworkx.PyGraph(multigraph=True)
    lefts = int(left.max()) + 1
    graph.add_nodes_from(range(lefts + int(right.max()) + 1))
    graph.add_edges_from_no_data(list(zip(left.tolist(), (right + lefts).tolist(), strict=True)))
    colours = rustworkx.graph_bipartite_edge_color(graph)
    return np.fromiter((colours[edge] for edge in range(len(left))), dtype=np.int64, count=len(left))


def networkx_greedy(left: np.ndarray, right: np.ndarray) -> np.ndarray:
    """Greedy node colouring of the line graph, in networkx's default order."""
    import networkx as nx

    graph = nx.MultiGraph()
    for edge, (u, v) in enumerate(zip(left.tolist(), right.tolist(), strict=True)):
        graph.add_edge(("order", u), ("machine", v), key=edge)
    greedy = nx.greedy_color(nx.line_graph(graph))
    colours = np.empty(len(left), dtype=np.int64)
    for (_, _, edge), colour in greedy.items():
        colours[edge] = colour
    return colours


def cpsat_intervals(left: np.ndarray, right: np.ndarray, seconds: float) -> tuple[np.ndarray | None, str]:
    """One unit interval an operation, no overlap at a node, and Δ given as the horizon: any plan will do."""
    from ortools.sat.python import cp_model

    rounds = int(max(np.bincount(left).max(), np.bincount(right).max()))
    model = cp_model.CpModel()
    starts = [model.new_int_var(0, rounds - 1, "") for _ in range(len(left))]
    intervals = [model.new_fixed_size_interval_var(start, 1, "") for start in starts]
    for column in (left, right):
        order = np.argsort(column, kind="stable")
        for node in np.split(order, np.flatnonzero(np.diff(column[order])) + 1):
            if len(node) > 1:
                model.add_no_overlap([intervals[edge] for edge in node])
    solver = cp_model.CpSolver()
    solver.parameters.max_time_in_seconds = seconds
    solver.parameters.num_workers = 2
    status = solver.solve(model)
    if status not in (cp_model.OPTIMAL, cp_model.FEASIBLE):
        return None, solver.status_name(status).lower()
    return np.array([solver.value(start) for start in starts]), "found"


METHODS: dict[str, Callable[[np.ndarray, np.ndarray], np.ndarray]] = {
    "plain": plain,
    "fast": fast,
    "rustworkx": rustworkx_exact,
    "networkx": networkx_greedy,
}


def check(left: np.ndarray, right: np.ndarray, colours: np.ndarray, rounds: int | None) -> int:
    """Raise unless proper, with ``rounds`` colours where given; return the number of colours."""
    used = int(colours.max()) + 1
    for column in (left, right):
        if len(np.unique(column * used + colours)) != len(column):
            raise AssertionError("two edges that meet share a colour")
    if rounds is not None and used != rounds:
        raise AssertionError(f"{used} colours, not {rounds}")
    return used


# One child process a measurement ----------------------------------------------------------------------------


def child_times(shape: str, edges: int, repeats: int, with_networkx: bool, solver_seconds: float) -> None:
    """Print one JSON line a timing, ours before the peers', round after round."""
    left, right = columns(shape, edges)
    rounds = int(max(np.bincount(left).max(), np.bincount(right).max()))
    say(what="graph", edges=len(left), rounds=rounds)
    ours = ["plain", "fast"] if find_spec("numba") else ["plain"]
    if "fast" in ours:
        fast(left[:10], right[:10])
    once = {"rustworkx"}
    rustworkx_exact(left[:10], right[:10])
    for turn in range(repeats):
        for method in [*ours, "argsort", "rustworkx"]:
            if turn and method in once:
                continue
            gc.collect()
            # Several times in a row where that is quick, so that each method finds its own code and data
            # warm.
            begun = time.perf_counter()
            runs = []
            while not runs or (len(runs) < 20 and time.perf_counter() - begun < IN_A_ROW):
                before = time.perf_counter()
                if method == "argsort":
                    np.argsort(left, kind="stable")
                else:
                    colours = METHODS[method](left, right)
                runs.append(time.perf_counter() - before)
            for seconds in runs[1:] or runs:
                say(what=method, seconds=seconds)
            if method != "argsort" and turn == 0:
                check(left, right, colours, rounds)
            if method == "rustworkx" and runs[0] < 2:
                once.clear()
    if with_networkx:
        before = time.perf_counter()
        colours = networkx_greedy(left, right)
        say(what="networkx", seconds=time.perf_counter() - before, colours=check(left, right, colours, None))
    if solver_seconds:
        before = time.perf_counter()
        found, status = cpsat_intervals(left, right, solver_seconds)
        seconds = time.perf_counter() - before
        if found is not None:
            check(left, right, found, rounds)
        say(what="cpsat", seconds=seconds, status=status)


def child_memory(folder: str, method: str) -> None:
    """Print how far the peak of this process rose above what it held with the columns in place."""
    import psutil

    left, right = (np.load(Path(folder) / f"{side}.npy") for side in ("left", "right"))
    METHODS[method](left[:10].copy(), right[:10].copy())
    gc.collect()
    held = psutil.Process().memory_info().rss
    METHODS[method](left, right)
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * 1024
    say(what=method, peak=max(0, peak - held))


def say(**facts: object) -> None:
    print(json.dumps(facts), flush=True)


def listen(arguments: list[str], limit: float) -> Iterator[dict[str, object]]:
    """Run a child, and give its lines; {'what': 'stopped'} at the end if the limit stopped it."""
    command = [sys.executable, __file__, "--child", *arguments]
    with tempfile.TemporaryFile("w+") as lines:
        try:
            subprocess.run(command, stdout=lines, timeout=limit, check=True)
            stopped = False
        except subprocess.TimeoutExpired:
            stopped = True
        lines.seek(0)
        for line in lines.read().splitlines():
            if line.endswith("}"):
                yield json.loads(line)
        if stopped:
            yield {"what": "stopped"}


# The tables -------------------------------------------------------------------------------------------------


def milliseconds(seconds: float) -> str:
    value = seconds * 1e3
    return f"{value:,.0f}" if value >= 100 else f"{value:.3g}"


def ratio(theirs: list[float] | None, ours: list[float] | None) -> str:
    if not theirs or not ours:
        return "—"
    return f"{median(theirs) / median(ours):,.3g}"


def table(head: list[str], rows: list[list[str]]) -> None:
    print("| " + " | ".join(head) + " |")
    print("|" + " --- |" * len(head))
    for row in rows:
        print("| " + " | ".join(row) + " |")
    print(flush=True)


def measure_times(size: int, shape: str, options: argparse.Namespace) -> tuple[list[str], list[str] | None]:
    with_networkx = size <= options.networkx_to
    solver = options.solver_seconds if size <= options.solver_to else 0
    repeats = options.repeats or max(3, min(15, 200_000 // size))
    arguments = ["times", shape, str(size), str(repeats), str(int(with_networkx)), str(solver)]
    seconds: dict[str, list[float]] = {}
    facts: dict[str, dict[str, object]] = {}
    for fact in listen(arguments, options.limit + solver):
        facts[str(fact["what"])] = fact
        if "seconds" in fact:
            seconds.setdefault(str(fact["what"]), []).append(float(str(fact["seconds"])))
    if "plain" not in seconds:
        raise SystemExit(f"{shape}, {size} edges: nothing finished within {options.limit:g} s")
    over = f"over {options.limit:g} s"
    ours, theirs, compiled = seconds["plain"], seconds.get("rustworkx"), seconds.get("fast")
    row = [shape, f"{facts['graph']['edges']:,}", f"{facts['graph']['rounds']:,}"]
    row += [milliseconds(median(theirs)) if theirs else over, milliseconds(median(ours)), ratio(theirs, ours)]
    row += [milliseconds(median(compiled)) if compiled else "—", ratio(theirs, compiled)]
    row += [ratio(compiled, seconds.get("argsort")) if size >= 1_000_000 else "—"]
    if not with_networkx and not solver:
        return row, None
    other = row[:3]
    if "networkx" in facts:
        extra = int(str(facts["networkx"]["colours"])) - int(str(facts["graph"]["rounds"]))
        other += [milliseconds(seconds["networkx"][0]), f"+{extra}", ratio(seconds["networkx"], ours)]
    else:
        other += [over if with_networkx else "left out", "—", "—"]
    if "cpsat" in facts:
        found = facts["cpsat"]["status"] == "found"
        other += [
            milliseconds(seconds["cpsat"][0]) if found else f"{facts['cpsat']['status']} after {solver:g} s"
        ]
        other += [ratio(seconds["cpsat"], ours) if found else "—"]
    else:
        other += ["left out" if not solver else over, "—"]
    return row, other


def measure_memory(size: int, shape: str, limit: float) -> list[str]:
    left, right = columns(shape, size)
    row = [shape, f"{len(left):,}"]
    with tempfile.TemporaryDirectory() as folder:
        np.save(Path(folder) / "left.npy", left)
        np.save(Path(folder) / "right.npy", right)
        for method in ("rustworkx", "plain", "fast"):
            if method == "fast" and not find_spec("numba"):
                row += ["—", "—"]
                continue
            facts = {str(fact["what"]): fact for fact in listen(["memory", folder, method], limit)}
            if method not in facts:
                row += [f"over {limit:g} s", "—"]
                continue
            peak = int(str(facts[method]["peak"]))
            row += [f"{peak / MEGABYTE:,.1f}", f"{peak / len(left):,.0f}"]
    return row


def main() -> None:
    parser = argparse.ArgumentParser(description="Edge colouring against its peers, as markdown tables.")
    parser.add_argument("--sizes", type=int, nargs="+", default=[10**3, 10**4, 10**5, 10**6])
    parser.add_argument("--shapes", nargs="+", choices=list(SHAPES), default=list(SHAPES))
    parser.add_argument("--repeats", type=int, default=0, help="runs behind a median (default: by size)")
    parser.add_argument("--limit", type=float, default=150, help="seconds for one size and shape")
    parser.add_argument("--networkx-to", type=int, default=1000, help="largest size given to networkx")
    parser.add_argument("--solver-to", type=int, default=10_000, help="largest size given to CP-SAT")
    parser.add_argument("--solver-seconds", type=float, default=30, help="CP-SAT's time on each graph")
    parser.add_argument(
        "--memory-from", type=int, default=100_000, help="smallest size whose memory is measured"
    )
    options = parser.parse_args()
    head = ["shape", "edges", "Δ", "rustworkx ms", "plain ms", "times faster", "compiled ms", "times faster"]
    head += ["compiled / argsort"]
    others = []
    for size in options.sizes:
        rows = []
        for shape in options.shapes:
            row, other = measure_times(size, shape, options)
            rows.append(row)
            if other:
                others.append(other)
        print(f"### Colouring, about {size:,} edges: medians, in milliseconds\n")
        table(head, rows)
    if others:
        print("### Other routes: greedy on the line graph (networkx), intervals (CP-SAT, horizon Δ given)\n")
        head = ["shape", "edges", "Δ", "networkx ms", "colours over Δ", "plain is faster by", "CP-SAT ms"]
        table([*head, "plain is faster by"], others)
    for size in options.sizes:
        if size >= options.memory_from:
            print(f"### Extra peak memory, about {size:,} edges, the returned array included\n")
            head = ["shape", "edges", "rustworkx MB", "B an edge", "plain MB", "B an edge", "compiled MB"]
            table(
                [*head, "B an edge"], [measure_memory(size, shape, options.limit) for shape in options.shapes]
            )


if __name__ == "__main__":
    if sys.argv[1:2] == ["--child"]:
        kind, *rest = sys.argv[2:]
        if kind == "memory":
            child_memory(*rest)
        else:
            child_times(rest[0], int(rest[1]), int(rest[2]), rest[3] == "1", float(rest[4]))
    else:
        main()
