"""A long search: progress on standard error, Ctrl-C keeps the best plan, the time limit is kept."""

from __future__ import annotations

import json
import signal
import subprocess
import sys
import time
from pathlib import Path

from tests.bench.instances import instances, orders_csv

HARD = next(instance for instance in instances("brucker") if instance.name == "j7-per0-0")


def started(tmp_path: Path, *options: str) -> subprocess.Popen[str]:
    """Start planning an instance that no minute settles."""
    (tmp_path / "orders.csv").write_text(orders_csv(HARD))
    command = [sys.executable, "-m", "shopfloor", "plan", str(tmp_path / "orders.csv"), "--no-xlsx", *options]
    return subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)


def test_ctrl_c_keeps_the_best_plan_so_far(tmp_path: Path) -> None:
    run = started(tmp_path, "--time-limit", "600", "--out", str(tmp_path / "out"))
    time.sleep(8)  # long enough to be searching, on a busy machine too
    run.send_signal(signal.SIGINT)
    out, err = run.communicate(timeout=120)
    assert run.returncode == 0
    assert "Stopping; keeping the best plan so far." in err
    assert "Traceback" not in err
    assert "The search was interrupted; this is the best plan it had." in out
    plan = json.loads((tmp_path / "out" / "plan.json").read_text())
    assert plan["stopped"] == "interrupted"
    assert plan["repeatable"] is False
    assert plan["makespan_s"] >= plan["lower_bound_s"]


def test_a_time_limit_is_kept_progress_is_shown_and_the_gap_is_honest(tmp_path: Path) -> None:
    run = started(tmp_path, "--time-limit", "5", "--json")
    out, err = run.communicate(timeout=120)
    plan = json.loads(out)
    assert run.returncode == 0
    assert plan["stopped"] == "time limit"
    assert plan["proved_optimal"] == (plan["gap_s"] == 0)
    assert "best" in err
    assert "bound" in err
    assert "s left" in err
