"""How fast orders are read: seconds, ratio to pandas.read_csv on the same file, peak memory.

Run:  python tests/bench/read.py [ROWS ...]

Every reading runs in a child process, so that its peak memory is its own; the best of three counts.
Times are processor seconds of reading alone, all threads together, so that other work on the machine and the
start of the interpreter stay out of them.
"""

from __future__ import annotations

import random
import subprocess
import sys
import tempfile
from pathlib import Path

CHILD = """
import resource, sys, time
path, what = sys.argv[1:]
if what == "pandas":
    import pandas
    read = lambda: len(pandas.read_csv(path))
else:
    from shopfloor.read.orders import load
    read = lambda: len(load(path, start="2026-03-02T06:00").shop)
began = time.process_time()
rows = read()
print(rows, time.process_time() - began, resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024)
"""
REPEATS = 3


def write_orders(path: Path, rows: int, seed: int = 0) -> None:
    """Write `rows` operations: ten an order, times to a tenth of a minute, due times."""
    choose = random.Random(seed)
    with path.open("w", encoding="utf-8") as file:
        file.write("order,machine,minutes,due\n")
        for row in range(rows):
            order = row // 10
            due = f"2026-03-{2 + order % 5:02d}T{6 + order % 16:02d}:{order % 60:02d}"
            machine, minutes = choose.randrange(200), choose.randrange(10, 1200) / 10
            file.write(f"TQ-{order:06d},M-{machine:03d},{minutes},{due}\n")


def measure(path: Path, what: str) -> tuple[int, float, float]:
    """Return rows, the best time in seconds, and the peak memory in megabytes of a child process."""
    runs = []
    for _ in range(REPEATS):
        done = subprocess.run(
            [sys.executable, "-c", CHILD, str(path), what], capture_output=True, text=True, check=True
        )
        rows, seconds, peak = done.stdout.split()
        runs.append((int(rows), float(seconds), float(peak)))
    return min(runs, key=lambda run: run[1])


def main(sizes: list[int]) -> None:
    print("| rows | read, CPU s | pandas.read_csv, CPU s | ratio | peak memory, MB | of pandas, MB |")
    print("| ---: | ---: | ---: | ---: | ---: | ---: |")
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "orders.csv"
        for size in sizes:
            write_orders(path, size)
            rows, seconds, peak = measure(path, "shopfloor")
            _, theirs, their_peak = measure(path, "pandas")
            ratio = seconds / theirs
            print(
                f"| {rows:,} | {seconds:.2f} | {theirs:.2f} | {ratio:.1f} | {peak:.0f} | {their_peak:.0f} |"
            )


if __name__ == "__main__":
    main([int(text) for text in sys.argv[1:]] or [10_000, 100_000, 1_000_000])
