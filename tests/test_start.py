"""What is imported, and when: the cost of starting is counted in modules, not in seconds."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest

DATA = Path(__file__).parents[1] / "data"
HEAVY = (
    "pandas", "networkx", "plotly.graph_objects", "plotly.express", "ortools", "openpyxl", "numba", "scipy",
)  # fmt: skip


def loaded(*arguments: str) -> tuple[int, set[str]]:
    """Run the command line in a fresh interpreter; return its exit code and the modules it loaded."""
    code = (
        "import sys, json\n"
        "from shopfloor.cli.main import run\n"
        "sys.argv = ['shopfloor', *json.loads(sys.stdin.readline())]\n"
        "code = 0\n"
        "try:\n    run()\nexcept SystemExit as end:\n    code = end.code or 0\n"
        "print('\\nLOADED', code, *sys.modules)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code],
        input=json.dumps(arguments) + "\n",
        capture_output=True,
        text=True,
        check=True,
    )
    words = done.stdout.rsplit("LOADED", 1)[1].split()
    return int(words[0]), set(words[1:])


def heavy(modules: set[str]) -> set[str]:
    return {name for name in HEAVY if name in modules}


def test_help_loads_nothing_heavy() -> None:
    code, modules = loaded("--help")
    assert (code, heavy(modules)) == (0, set())
    assert "numpy" not in modules


@pytest.mark.parametrize("command", ["check", "plan"])
def test_an_input_error_loads_nothing_heavy(command: str) -> None:
    code, modules = loaded(command, str(DATA / "faulty" / "orders.csv"))
    assert (code, heavy(modules)) == (2, set())


def test_a_unit_round_plan_loads_no_solver_and_no_frames(tmp_path: Path) -> None:
    code, modules = loaded("plan", str(DATA / "rounds" / "orders.csv"), "--out", str(tmp_path))
    assert (code, heavy(modules)) == (0, {"openpyxl"})  # for plan.xlsx, and nothing else
    code, modules = loaded("plan", str(DATA / "rounds" / "orders.csv"), "--out", str(tmp_path), "--no-xlsx")
    assert (code, heavy(modules)) == (0, set())


def test_importing_the_package_loads_nothing() -> None:
    done = subprocess.run(
        [sys.executable, "-c", "import sys, shopfloor; print(*[m for m in sys.modules if 'numpy' in m])"],
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    assert done.stdout.strip() == ""


def test_recording_what_happens_loads_no_numbers_library(tmp_path: Path) -> None:
    """A shift makes hundreds of short calls of `log`; each pays for what it imports."""
    plan, journal = tmp_path / "plan", ("--journal", str(tmp_path / "shift.journal"))
    rows = tmp_path / "orders.csv"
    rows.write_text("order,machine,minutes\nTQ-1,CMM,30\nTQ-2,CMM,20\n", encoding="utf-8")
    assert loaded("plan", str(rows), "--out", str(plan), "--no-xlsx", "--quiet")[0] == 0
    assert loaded("log", "open", str(plan / "plan.json"), *journal)[0] == 0
    calls = (
        (0, "start", "TQ-1", "CMM", "--at", "0:00"),
        (0, "left", "TQ-1", "CMM", "12.5", "--at", "0:05"),
        (0, "down", "CMM", "--at", "0:10", "--reason", "probe"),
        (0, "up", "CMM", "--at", "0:15"),
        (0, "finish", "TQ-1", "CMM", "--at", "0:40"),
        (0, "add", "TQ-9", "CMM=0:15", "--due", "3:00", "--at", "0:45"),
        (0, "undo", "--at", "0:50"),
        (0, "show", "--at", "0:50"),
        (1, "finish", "TQ-2", "CMM", "--at", "0:50"),
        (2, "start", "TQ-2", "CMM", "--at", "soon"),
    )
    for wanted, *call in calls:
        code, modules = loaded("log", *call, *journal)
        assert (call[0], code, "numpy" in modules, heavy(modules)) == (call[0], wanted, False, set())
