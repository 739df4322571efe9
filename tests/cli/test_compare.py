"""`shopfloor compare`: two plan files in, what moved out; text, JSON and a page; what it refuses."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from tests.cli.run import DATA, shopfloor
from tests.render.browser import chromium, needs_browser

ROUNDS, HALL = DATA / "rounds" / "orders.csv", DATA / "rounds" / "shop.toml"
SMALL = b"order,machine,minutes,due\nTQ-1,WASH,30,07:00\nTQ-2,WASH,20,\nTQ-2,CMM,40,\n"
WITH_MORE = SMALL + b"TQ-3,WASH,90,07:00\n"


@pytest.fixture
def plans(tmp_path: Path) -> tuple[Path, Path]:
    """A plan of three operations, and one of the same with an order more that comes first."""
    for name, orders in (("a", SMALL), ("b", WITH_MORE)):
        arguments = ("--start", "2026-03-02T06:00", "--out", tmp_path / name, "--quiet")
        assert shopfloor("plan", "-", *arguments, stdin=orders).code == 0
    return tmp_path / "a" / "plan.json", tmp_path / "b" / "plan.json"


def test_a_plan_and_itself_are_the_same(plans: tuple[Path, Path]) -> None:
    said = shopfloor("compare", plans[0], plans[0])
    assert said.code == 0
    assert "The two plans are the same." in said.out


def test_finish_bound_lateness_and_every_kind_of_change_are_said(plans: tuple[Path, Path]) -> None:
    said = shopfloor("compare", *plans)
    assert said.code == 0
    assert "ends 07:00, proved earliest; no order late" in said.out
    assert "B ends 1 h 20 later than A" in said.out
    assert "Added\n  WASH         TQ-3" in said.out
    assert max(map(len, said.out.splitlines())) <= 80


def test_json_has_the_same_facts_as_numbers(plans: tuple[Path, Path]) -> None:
    data = shopfloor("compare", *plans, "--json").json
    assert data["makespan_change_s"] == 80 * 60
    assert data["counts"]["added"] == 1
    assert data["b"]["late_orders"] >= 1
    added = [change for change in data["changes"] if change["kind"] == "added"]
    assert [(change["order"], change["a"]) for change in added] == [("TQ-3", None)]
    assert data["a"]["operations"] + 1 == data["b"]["operations"]


def test_the_page_says_it_too_and_is_no_permit(plans: tuple[Path, Path], tmp_path: Path) -> None:
    assert shopfloor("compare", *plans, "--page", tmp_path / "compare.html", "--quiet").out == ""
    page = (tmp_path / "compare.html").read_text(encoding="utf-8")
    assert "B ends 1 h 20 later than A" in page
    assert "not a permit" in page
    assert "http" not in page.replace("http-equiv", "")
    again = tmp_path / "again.html"
    shopfloor("compare", *plans, "--page", again, "--quiet")
    assert again.read_bytes() == (tmp_path / "compare.html").read_bytes()


def test_names_on_the_page_are_only_text(tmp_path: Path) -> None:
    for name, minutes in (("a", 30), ("b", 40)):
        orders = f"order,machine,minutes\n<script>alert(1)</script>,<b>,{minutes}\n".encode()
        shopfloor("plan", "-", "--out", tmp_path / name, "--quiet", stdin=orders)
    page = tmp_path / "compare.html"
    shopfloor("compare", tmp_path / "a" / "plan.json", tmp_path / "b" / "plan.json", "--page", page)
    text = page.read_text(encoding="utf-8")
    assert "<script" not in text
    assert "<b>" not in text


@needs_browser
def test_the_page_opens_offline_without_a_word_of_complaint(plans: tuple[Path, Path], tmp_path: Path) -> None:
    page = tmp_path / "compare.html"
    shopfloor("compare", *plans, "--page", page, "--quiet")
    complaints: list[str] = []
    with chromium() as browser:
        tab = browser.new_context(offline=True).new_page()
        tab.on("console", lambda said: complaints.append(said.text))
        tab.on("pageerror", lambda fault: complaints.append(str(fault)))
        tab.goto(page.resolve().as_uri())
        bars = tab.locator("svg[role=img] rect").count()
        dark = tab.locator("svg[role=img] rect.added").evaluate("bar => getComputedStyle(bar).stroke")
    assert complaints == []
    assert bars == 7
    assert dark == "rgb(17, 17, 17)"


def test_a_tolerance_hides_small_shifts(tmp_path: Path) -> None:
    for name, minutes in (("a", 30), ("b", 31)):
        orders = f"order,machine,minutes\nTQ-1,WASH,{minutes}\nTQ-1,CMM,10\n".encode()
        shopfloor("plan", "-", "--out", tmp_path / name, "--quiet", stdin=orders)
    files = tmp_path / "a" / "plan.json", tmp_path / "b" / "plan.json"
    assert shopfloor("compare", *files, "--json").json["counts"]["moved"] > 0
    assert shopfloor("compare", *files, "--json", "--tolerance", 1).json["counts"]["moved"] == 0


def test_plans_of_two_starts_are_compared_by_wall_time(tmp_path: Path) -> None:
    for name, start in (("a", "06:00"), ("b", "06:30")):
        arguments = ("--start", f"2026-03-02T{start}", "--out", tmp_path / name, "--quiet")
        shopfloor("plan", "-", *arguments, stdin=SMALL)
    data = shopfloor("compare", tmp_path / "a" / "plan.json", tmp_path / "b" / "plan.json", "--json").json
    assert data["makespan_change_s"] == 30 * 60
    assert data["counts"]["moved"] == 3


# ---- refusals ----------------------------------------------------------------------------------------


def refused(*files: Path) -> str:
    said = shopfloor("compare", *files)
    assert (said.code, said.out) == (2, "")
    return " ".join(said.err.split())


def test_a_csv_is_refused_and_told_why(plans: tuple[Path, Path]) -> None:
    text = refused(plans[0], plans[1].with_name("plan.csv"))
    assert (
        "plan.csv: is no plan.json, and only that says bound and lateness; give the plan.json that stands "
        "beside it" in text
    )


def test_a_missing_file_is_refused(plans: tuple[Path, Path], tmp_path: Path) -> None:
    assert "none.json" in refused(plans[0], tmp_path / "none.json")


def edited(plan: Path, **changes: Any) -> Path:
    data = json.loads(plan.read_text(encoding="utf-8")) | changes
    path = plan.with_name("edited.json")
    path.write_text(json.dumps(data), encoding="utf-8")
    return path


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        (
            {"late": [{"order": 5}]},
            "column late: '' holds something else than late orders; make the plan anew",
        ),
        ({"shift_start": None}, "has no start of the shift, and the other plan has one; give --start when"),
        ({"time_zone": "Europe/London"}, "is for another time zone; compare plans of one hall"),
        ({"shift_start": "yesterday"}, "has no clock: shift_start 'yesterday' is no date and time"),
        ({"assignments": [{"order": 1}]}, "is a whole number, not a text"),
        ({"schema": 99}, "is not a version this release reads"),
    ],
    ids=lambda value: next(iter(value)) if isinstance(value, dict) else "",
)
def test_a_spoilt_plan_is_refused(plans: tuple[Path, Path], changes: dict[str, Any], words: str) -> None:
    assert words in refused(plans[0], edited(plans[1], **changes))


def test_the_demo_plan_under_two_seeds_ends_alike(tmp_path: Path) -> None:
    for seed in (1, 2):
        shopfloor("plan", ROUNDS, "--shop", HALL, "--seed", seed, "--out", tmp_path / str(seed), "--quiet")
    said = shopfloor("compare", tmp_path / "1" / "plan.json", tmp_path / "2" / "plan.json")
    assert "Both end 13:30" in said.out
    assert max(map(len, said.out.splitlines())) <= 80
