"""Writes reports/benchmarks.md: every benchmark's table under the command that made it.

Run: python -m tests.bench.report [NAME ...]

With names, only those sections are made anew and the others stay as they are. Benchmarks run one after
the other, so that none disturbs another; the whole takes the better part of an hour on two cores.
"""

from __future__ import annotations

import platform
import re
import subprocess
import sys
from importlib.metadata import version
from pathlib import Path

REPORT = Path(__file__).parents[2] / "reports" / "benchmarks.md"

SECTIONS: dict[str, tuple[str, str]] = {
    "rounds": ("Edge colouring against rustworkx, networkx and CP-SAT", "tests.bench.rounds"),
    "even": ("Even rounds against the colouring itself", "tests.bench.even"),
    "splits": ("Splittable work against peeling matchings", "tests.bench.splits"),
    "fit": ("Which orders fit: 2,000 orders on 40 machines", "tests.bench.fit"),
    "read": ("Reading an orders file against pandas.read_csv", "tests.bench.read"),
    "audit": ("Auditing a plan", "tests.bench.audit"),
    "start": ("What starting costs", "tests.bench.start"),
    "pages": ("The Gantt page in headless Chromium", "tests.bench.pages"),
    "published": ("Published open shops against a plain CP-SAT model", "tests.bench.published"),
    "large": ("Large open shops", "tests.bench.large"),
    "shifts": ("Shifts as they are", "tests.bench.shifts"),
    "lateness": ("How late a shift must be", "tests.bench.lateness"),
    "scale": ("As shops grow", "tests.bench.scale"),
    "replan": ("Replanning after disruptions", "tests.bench.replan"),
}


def machine() -> str:
    """Return what the figures were measured on, without a name or path of it."""
    packages = ", ".join(
        f"{name} {version(name)}" for name in ("numpy", "numba", "ortools", "rustworkx", "networkx")
    )
    return (
        f"Python {platform.python_version()}, {packages}; two shared cores, so compare ratios, not seconds."
    )


def section(name: str) -> str:
    """Run one benchmark and return its section."""
    title, module = SECTIONS[name]
    done = subprocess.run([sys.executable, "-m", module], capture_output=True, text=True, check=True)
    return f"## {title}\n\n`python -m {module}`\n\n{done.stdout.strip()}\n"


def main() -> None:
    """Make the named sections, or all whose benchmark is there."""
    wanted = sys.argv[1:] or list(SECTIONS)
    text = REPORT.read_text(encoding="utf-8") if REPORT.exists() else ""
    parts = dict(re.findall(r"^(## .*?)\n(.*?)(?=^## |\Z)", text, re.M | re.S))
    for name in wanted:
        print(f"{name} …", file=sys.stderr, flush=True)
        head, _, body = section(name).partition("\n")
        parts[head] = body
        known = [f"## {title}" for title, _ in SECTIONS.values()]
        listed = "\n".join(f"{head}\n{parts[head].rstrip()}\n" for head in known if head in parts)
        REPORT.write_text(
            f"# Benchmarks\n\nMade by `python -m tests.bench.report`.\n{machine()}\n\n{listed}", "utf-8"
        )


if __name__ == "__main__":
    main()
