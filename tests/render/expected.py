"""Expected outputs as readable files in `golden/`, and the small plans they are made from.

After an intended change run the tests once with SHOPFLOOR_REWRITE=1 and read the difference.
"""

from __future__ import annotations

import difflib
import os
from datetime import datetime
from html.parser import HTMLParser
from pathlib import Path

import numpy as np

from shopfloor.model.calendar import Clock
from shopfloor.model.results import Bound, Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import NO_DUE, Closure, Machine, Operations, Orders, Shop

GOLDEN = Path(__file__).parent / "golden"
START = datetime(2026, 3, 2, 6, 0)


def assert_golden(name: str, text: str) -> None:
    """Compare `text` with the golden file `name`, showing the lines that differ."""
    path = GOLDEN / name
    if os.environ.get("SHOPFLOOR_REWRITE"):
        path.write_text(text, encoding="utf-8", newline="\n")
    expected = path.read_text(encoding="utf-8")
    difference = difflib.unified_diff(
        expected.splitlines(), text.splitlines(), "expected", "actual", lineterm=""
    )
    assert text == expected, "\n".join(difference)


def small_plan() -> Plan:
    """Everything the sheets know on one page: a group, a break, parts, notes, a late order, an overrun."""
    minutes = 60
    shop = Shop(
        machines=(
            Machine("Wash", "Washing bay", count=2),
            Machine("CMM", "Measuring machine", pauses=True),
            Machine("Coat"),
            Machine("Engrave"),
        ),
        orders=Orders(
            ("TQ-01", "TQ-02", "=3", "TQ-04 Ø12"),
            release_s=np.array([0, 0, 30, 0]) * minutes,
            due_s=np.array([80 * minutes, 200 * minutes, NO_DUE, NO_DUE]),
        ),
        operations=Operations(
            job=np.array([0, 0, 1, 1, 2, 2, 3]),
            machine=np.array([0, 1, 0, 2, 1, 2, 0]),
            seconds=np.array([30, 45, 20, 40, 25, 30, 10]) * minutes,
            splittable=np.array([0, 0, 0, 1, 0, 0, 0]),
            notes={0: "seal kit on cart 4", 5: '+ "mask" the bore,\ntwo coats', 6: "@ night; see Å 7"},
        ),
        breaks=(Closure(60 * minutes, 75 * minutes, "tea"),),
        clock=Clock(START),
        shift_end_s=140 * minutes,
    )
    schedule = Schedule(
        operation=np.array([0, 1, 2, 3, 3, 4, 5, 6]),
        start_s=np.array([0, 30, 0, 20, 75, 90, 115, 20]) * minutes,
        end_s=np.array([30, 90, 20, 40, 95, 115, 145, 30]) * minutes,
        unit=np.array([1, 1, 2, 1, 1, 1, 1, 2]),
    )
    bound = "CMM has 1 h 10 of work, and a break of 15 min lies in it, so nothing can end before 07:25."
    return Plan(
        shop=shop,
        schedule=schedule,
        bounds=(
            Bound("machine", 85 * minutes, {"machine": "CMM", "load_s": np.int64(4200)}, bound),
            Bound("order", 75 * minutes, {"order": "TQ-01"}, "Order TQ-01 needs 1 h 15."),
        ),
        choice=Choice(
            "general", "times differ", {"unit rounds": "times differ", "two machines": "there are 4"}
        ),
        inputs=(("orders.csv", "5e" * 32),),
        options={"time_limit_s": 30.0, "workers": 0, "seed": 7},
        remarks=("The gap is 1 h.",),
        would_help=("A second CMM: nothing could end before 06:55.",),
        stopped="time limit",
        repeatable=False,
    )


def round_plan(orders: int = 3, machines: int = 4, *, clock: Clock | None = None) -> Plan:
    """A Latin square: order i is on machine j in round i + j, so somebody is idle in most rounds."""
    job = np.repeat(np.arange(orders), machines)
    machine = np.tile(np.arange(machines), orders)
    rounds = job + machine
    shop = Shop(
        machines=tuple(Machine(f"Bench {j + 1}") for j in range(machines)),
        orders=Orders(tuple(f"TQ-{i + 1}" for i in range(orders))),
        operations=Operations(job, machine, np.full(len(job), 1800)),
        clock=clock or Clock(),
        unit_rounds=True,
    )
    end = 1800 * (orders + machines - 1)
    return Plan(
        shop=shop,
        schedule=Schedule(np.arange(len(job)), rounds * 1800, rounds * 1800 + 1800, round=rounds + 1),
        bounds=(Bound("drawn", end, {}, "Drawn for a test."),),
        choice=Choice("drawn", "drawn for a test", {}),
    )


class _Text(HTMLParser):
    """Markup to lines: a line a row, paragraph or heading; cells apart; nothing from the head."""

    blocks = frozenset({"tr", "p", "h1", "h2", "h3", "li", "section", "article", "header", "div", "nav"})

    def __init__(self) -> None:
        super().__init__()
        self.parts: list[str] = []
        self.silent = 0

    def handle_starttag(self, tag, attrs):
        if tag in ("head", "style", "script"):
            self.silent += 1
        if tag in self.blocks:
            self.parts.append("\n")
        if tag in ("td", "th"):
            self.parts.append(" | ")
        if tag == "br":
            self.parts.append(" / ")
        if ("class", "tick") in attrs:
            self.parts.append("[ ] ")

    def handle_endtag(self, tag):
        if tag in ("head", "style", "script"):
            self.silent -= 1
        if tag in self.blocks:
            self.parts.append("\n")

    def handle_data(self, data):
        if not self.silent:
            self.parts.append(" ".join(data.split(" ")).replace("\n", " "))


def page_text(page: str) -> str:
    """Return what a reader sees of a page, as lines."""
    parser = _Text()
    parser.feed(page)
    lines = (" ".join(line.split()) for line in "".join(parser.parts).split("\n"))
    return "\n".join(line for line in lines if line) + "\n"
