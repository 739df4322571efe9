"""The faulty demo set: every fault is listed once, in words that are kept in a file beside.

After a change of wording that is meant:  python -m tests.read.test_faulty
"""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from shopfloor.errors import InputError
from shopfloor.model.results import Fault
from shopfloor.read.floor import load_floor
from shopfloor.read.orders import load
from shopfloor.read.rules import NOTICES, RULES

DATA = Path(__file__).parents[2] / "data" / "faulty"
HERE = Path(__file__).parent
GOLDEN = HERE / "golden" / "faulty.txt"


def listing() -> str:
    """Every fault of the set, a line each, under the command that shows it."""
    parts = []
    for title, orders, floor in (
        ("orders.csv with shop.toml", DATA / "orders.csv", DATA / "shop.toml"),
        ("broken.toml", None, DATA / "broken.toml"),
        ("broken-times.toml", None, DATA / "broken-times.toml"),
    ):
        with pytest.raises(InputError) as caught:
            load(orders, shop=floor) if orders else load_floor(floor)
        parts.append(f"{title}\n" + "".join(f"{line(fault)}\n" for fault in caught.value.faults))
    return "\n".join(parts)


def line(fault: Fault) -> str:
    return f"{fault.rule}: {fault.text()}"


def test_the_faulty_set_is_reported_whole_and_in_order() -> None:
    assert listing() == GOLDEN.read_text(encoding="utf-8")


def test_no_fault_is_listed_twice() -> None:
    lines = [text for text in GOLDEN.read_text(encoding="utf-8").splitlines() if ": " in text]
    assert len(lines) == len(set(lines))


def test_the_faulty_orders_alone_are_refused_too() -> None:
    with pytest.raises(InputError) as caught:
        load(DATA / "orders.csv")
    assert "machine-unknown" not in {fault.rule for fault in caught.value.faults}
    assert len(caught.value.faults) > 40


def test_faults_of_both_files_come_in_one_go() -> None:
    with pytest.raises(InputError) as caught:
        load(DATA / "orders.csv", shop=DATA / "broken.toml")
    assert {fault.file for fault in caught.value.faults} == {"orders.csv", "broken.toml"}


def test_each_set_of_faults_has_one_of_each_rule_of_the_hall() -> None:
    """What can stand in shop.toml and is not shown by the demo set is tested elsewhere, and named here."""
    hall = RULES.keys() - set(list(RULES)[: list(RULES).index("start-unreadable")])
    shown = {text.split(": ")[0] for text in GOLDEN.read_text(encoding="utf-8").splitlines() if ": " in text}
    assert hall - shown == {
        "start-unreadable", "start-implausible", "end-not-after-start", "end-too-late", "round-unusable",
        "toml-syntax", "too-many-names", "crew-option-unusable", "crew-option-taken", "more-faults",
        "too-few-heads", "never-open-again", "longer-than-any-opening", "longer-than-heads-stay",
    }  # fmt: skip


def test_the_readme_of_the_set_names_every_row_that_is_wrong() -> None:
    """Each row of the golden list stands in the README, and no other."""
    readme = (DATA / "README.md").read_text(encoding="utf-8")
    told_in = re.split("`shop.toml` is sound|`broken-times.toml` has", readme)
    listed_in = GOLDEN.read_text(encoding="utf-8").split("\n\n")
    for text, lines in zip(told_in, listed_in, strict=True):
        told = {
            int(number)
            for row in text.splitlines()
            if row.startswith("| ") and row[2].isdigit()
            for number in row.split("|")[1].split(",")
        }
        listed = {
            int(row.split(" row ")[1].split(",")[0].split(":")[0])
            for row in lines.splitlines()
            if " row " in row
        }
        assert told == listed


@pytest.mark.parametrize("code", [*RULES, *NOTICES])
def test_every_rule_is_tested(code: str) -> None:
    """A code that no test of reading names is a rule nobody has seen at work."""
    others = sorted(set(HERE.glob("test_*.py")) - {Path(__file__)})
    tests = "".join(path.read_text(encoding="utf-8") for path in others)
    assert f'"{code}"' in tests or f"\n{code}: " in GOLDEN.read_text(encoding="utf-8")


if __name__ == "__main__":
    GOLDEN.write_text(listing(), encoding="utf-8")
