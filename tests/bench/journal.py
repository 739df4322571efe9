"""What a long journal costs: recording, the command `log`, and the state. Prints markdown.

Run: python -m tests.bench.journal [--entries 100000]

The floor is made up so that every entry is possible: 12 machines, each order on one machine at a time, every
operation started, reported on, stopped, resumed and finished. Commands on the short and on the long journal
are run in turn, so that a drifting machine hits both alike.
"""

from __future__ import annotations

import argparse
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from datetime import datetime
from pathlib import Path

from shopfloor.journal.entries import Entry
from shopfloor.journal.events import Journal, Recorder
from shopfloor.journal.pieces import IssuedPlan
from shopfloor.model.actuals import Key, Kind, Piece
from shopfloor.model.calendar import Clock

MACHINES = 12
EACH_S = 20  # seconds an operation
STEPS = (Kind.STARTED, Kind.LEFT, Kind.STOPPED, Kind.RESUMED, Kind.FINISHED)
RUNS = 9
BY = Recorder(now_s=10**7)


def plan(operations: int) -> IssuedPlan:
    """Return a plan in which machine m takes order m + r in round r."""
    rounds = -(-operations // MACHINES)
    rows = tuple(
        Piece(
            Key(f"TQ-{(m + r) % (rounds + MACHINES):05d}", f"M{m:02d}"),
            EACH_S,
            1,
            r * EACH_S,
            (r + 1) * EACH_S,
        )
        for r in range(rounds)
        for m in range(MACHINES)
    )[:operations]
    clock = Clock(datetime(2026, 3, 2, 6))
    return IssuedPlan("0" * 64, "plan.json", clock, rounds * EACH_S, rows, {})


def story(made: IssuedPlan) -> Iterator[Entry]:
    """Yield five entries an operation, in order of time within it."""
    for piece in made.pieces:
        for number, kind in enumerate(STEPS):
            data = {Kind.LEFT: {"left_s": 10}, Kind.STOPPED: {"reason": "gauge"}}.get(kind, {})
            at = (piece.start_s or 0) + number * 4
            yield Entry(kind, at, order=piece.key.order, machine=piece.key.machine, data=data)


def seconds(task: Callable[[], object]) -> float:
    """Return how long a task takes, wall clock."""
    began = time.perf_counter()
    task()
    return time.perf_counter() - began


def command(path: Path, number: int) -> Callable[[], object]:
    """Return one call of `log`, as typed."""
    words = ["log", "remark", f"word {number}", "--at", "06:00", "--quiet", "--journal", str(path)]
    return lambda: subprocess.run([sys.executable, "-m", "shopfloor", *words], check=True)


def row(what: str, *figures: str) -> None:
    """Print one line of the table."""
    print(f"| {what} | {' | '.join(figures)} |")


def in_turn(short: Path, long: Path) -> None:
    """Print one command and one entry in an open journal, on both."""
    commands: dict[Path, list[float]] = {short: [], long: []}
    for run in range(RUNS + 1):
        for path, times in commands.items():
            took = seconds(command(path, run))
            if run:  # the first warms the file cache
                times.append(took)
    one, many = (statistics.median(times) for times in commands.values())
    row("`log remark`, whole command", f"{one * 1e3:.0f} ms", f"{many * 1e3:.0f} ms", f"{many / one:.2f}")
    entries: dict[Path, list[float]] = {short: [], long: []}
    books = {path: Journal.open(path) for path in entries}
    for run in range(200):
        for path, times in entries.items():
            entry = Entry(Kind.REMARK, run, data={"text": "word"})
            times.append(seconds(lambda book=books[path], entry=entry: book.record([entry], BY)))
    one, many = (statistics.median(times) for times in entries.values())
    row("one entry, committed", f"{one * 1e3:.2f} ms", f"{many * 1e3:.2f} ms", f"{many / one:.2f}")
    for book in books.values():
        book.close()


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--entries", type=int, default=100_000)
    wanted = parser.parse_args().entries
    made = plan(max(1, wanted // len(STEPS)))
    print(f"A journal of {wanted:,} entries about {len(made.pieces):,} operations, against an empty one.\n")
    print("| what | empty | long | ratio |\n| --- | --- | --- | --- |")
    with tempfile.TemporaryDirectory() as name:
        short, long = Path(name) / "short.db", Path(name) / "long.db"
        Journal.create(short, made, BY).close()
        with Journal.create(long, made, BY) as book:
            listed = list(story(made))
            took = seconds(lambda: book.record(listed, BY))
            row("recorded in one go, entries a second", "", f"{len(listed) / took:,.0f}", "")
        in_turn(short, long)
        with Journal.open(long, write=False) as book:
            state = statistics.median(seconds(book.state) for _ in range(5))
            row("state, from the file", "", f"{state:.2f} s", "")
            row("check of the whole file", "", f"{seconds(book.check):.2f} s", "")
        row(
            "size of the file",
            f"{short.stat().st_size / 1e6:.1f} MB",
            f"{long.stat().st_size / 1e6:.1f} MB",
            "",
        )


if __name__ == "__main__":
    main()
