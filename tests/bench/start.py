"""What starting costs: whole commands on a 200-row unit shift, against a bare interpreter and a heavy import.

Run: python -m tests.bench.start
"""

from __future__ import annotations

import csv
import random
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

RUNS = 9
HEAVY = "import pandas, plotly.graph_objects"


def orders_file(path: Path) -> None:
    """Write a unit shift of 200 operations, about 80 orders on 12 machines."""
    rng = random.Random(3)
    with path.open("w", newline="") as file:
        writer = csv.writer(file)
        writer.writerow(["order", "machine"])
        for row in range(200):
            writer.writerow([f"TQ-{row % 80:03d}", f"M{rng.randrange(12):02d}"])


def seconds(command: list[str]) -> float:
    """Return the time of one run, wall clock."""
    began = time.perf_counter()
    subprocess.run(command, check=False, capture_output=True)
    return time.perf_counter() - began


def main() -> None:
    """Print a row a command: median of runs taken in turn, so that a drifting machine hits all alike."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        orders_file(folder / "orders.csv")
        tool = [sys.executable, "-m", "shopfloor"]
        journal = ["--journal", str(folder / "shift.journal")]
        seconds([*tool, "plan", str(folder / "orders.csv"), "--out", str(folder / "out")])
        seconds([*tool, "log", "open", str(folder / "out" / "plan.json"), *journal])
        commands = {
            "bare interpreter": [sys.executable, "-c", "pass"],
            HEAVY: [sys.executable, "-c", HEAVY],
            "`--help`": [*tool, "--help"],
            "`check`": [*tool, "check", str(folder / "orders.csv")],
            "`plan`, all files": [*tool, "plan", str(folder / "orders.csv"), "--out", str(folder / "out")],
            "`log remark`": [*tool, "log", "remark", "--at", "0:00", *journal],
        }
        times: dict[str, list[float]] = {what: [] for what in commands}
        for run in range(RUNS + 1):
            for what, command in commands.items():
                took = seconds([*command, f"word {run}"] if what == "`log remark`" else command)
                if run:  # the first warms the file cache
                    times[what].append(took)
    median = {what: statistics.median(values) for what, values in times.items()}
    bare, heavy = median["bare interpreter"], median[HEAVY]
    print("| command | median, ms | bare starts | of the import line | of the import line + 0.5 s |")
    print("| --- | --- | --- | --- | --- |")
    for what, value in median.items():
        ratios = f"{value / bare:.1f} | {value / heavy:.2f} | {value / (heavy + 0.5):.2f}"
        print(f"| {what} | {value * 1000:.0f} | {ratios} |")


if __name__ == "__main__":
    main()
