"""The main job through the command line: a file in, an audited and proved plan out."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path
from unittest import mock

import pytest

from tests.cli.run import DATA, shopfloor

ROUNDS = DATA / "rounds" / "orders.csv"
FILES = {"plan.json", "plan.csv", "gantt.html", "dispatch.html"}


@pytest.fixture
def planned(tmp_path: Path) -> Path:
    assert shopfloor("plan", ROUNDS, "--out", tmp_path / "out", "--quiet").code == 0
    return tmp_path / "out"


def test_a_unit_shift_is_planned_in_as_many_rounds_as_its_busiest_machine_has(tmp_path: Path) -> None:
    said = shopfloor("plan", ROUNDS, "--out", tmp_path, "--json")
    data = said.json
    assert said.code == 0
    assert data["proved_optimal"] is True
    assert data["makespan_s"] == data["lower_bound_s"] == 15 * 1800
    assert data["gap_s"] == 0
    assert data["method"]["name"] == "unit rounds"
    assert "assignments" not in data
    assert data["solve_s"] >= 0
    assert {Path(name).name for name in data["files"]} >= FILES


def test_the_plan_passes_the_audit_as_csv_and_as_json(planned: Path) -> None:
    for name in ("plan.csv", "plan.json"):
        said = shopfloor("audit", planned / name, ROUNDS)
        assert (said.code, said.err) == (0, "")
        assert "every rule kept" in said.out


def test_two_start_times_swapped_by_hand_are_caught_with_both_rows(planned: Path) -> None:
    path = planned / "plan.csv"
    rows = list(csv.reader(io.StringIO(path.read_text(encoding="utf-8-sig"))))
    wash = [index for index, row in enumerate(rows) if row[1] == "WASH"]
    first, second = wash[0], wash[1]
    rows[first][3], rows[second][3] = rows[second][3], rows[first][3]
    out = io.StringIO()
    csv.writer(out).writerows(rows)
    path.write_text(out.getvalue(), encoding="utf-8")
    said = shopfloor("audit", path, ROUNDS)
    assert said.code == 1
    assert f"{first + 1}" in said.out
    assert f"{second + 1}" in said.out


def test_a_plan_survives_a_spreadsheet_that_reorders_rows_and_adds_columns(planned: Path) -> None:
    path = planned / "plan.csv"
    rows = list(csv.reader(io.StringIO(path.read_text(encoding="utf-8-sig"))))
    header, body = rows[0], rows[1:]
    turned = [["checked by", *header[::-1]], *(["", *row[::-1]] for row in reversed(body))]
    out = io.StringIO()
    csv.writer(out, delimiter=";").writerows(turned)
    path.write_text(out.getvalue(), encoding="utf-16")
    assert shopfloor("audit", path, ROUNDS).code == 0


def test_a_date_in_local_style_is_refused_with_its_row(planned: Path) -> None:
    path = planned / "plan.csv"
    shop = DATA / "rounds" / "shop.toml"
    shopfloor("plan", ROUNDS, "--shop", shop, "--out", planned, "--quiet")
    path.write_text(
        path.read_text(encoding="utf-8-sig").replace("2026-03-02T06:00:00", "02/03/2026 06:00", 1)
    )
    said = shopfloor("audit", path, ROUNDS, "--shop", shop)
    assert said.code == 2
    assert "row" in said.err
    assert "02/03/2026 06:00" in said.err


def test_the_same_input_gives_the_same_bytes(planned: Path, tmp_path: Path) -> None:
    shopfloor("plan", ROUNDS, "--out", tmp_path / "again", "--quiet")
    for name in FILES:
        assert (planned / name).read_bytes() == (tmp_path / "again" / name).read_bytes(), name


def test_another_seed_is_another_plan_of_the_same_length(planned: Path, tmp_path: Path) -> None:
    shopfloor("plan", ROUNDS, "--out", tmp_path / "again", "--seed", 5, "--quiet")
    one, two = (json.loads((folder / "plan.json").read_text()) for folder in (planned, tmp_path / "again"))
    assert one["makespan_s"] == two["makespan_s"]
    assert one["assignments"] != two["assignments"]


def test_faults_are_listed_and_nothing_is_written(tmp_path: Path) -> None:
    said = shopfloor("plan", DATA / "faulty" / "orders.csv", "--out", tmp_path / "out")
    assert said.code == 2
    assert said.out == ""
    assert "nothing was planned or written" in said.err
    assert not (tmp_path / "out").exists()


def test_faults_as_json_carry_file_row_column_value_rule_and_advice() -> None:
    said = shopfloor("check", DATA / "faulty" / "orders.csv", "--json")
    assert said.code == 2
    assert all(
        {"file", "sheet", "row", "column", "value", "rule", "problem", "advice"} == set(fault)
        for fault in said.json["faults"]
    )
    assert len(said.json["faults"]) > 10


def test_orders_come_from_standard_input() -> None:
    said = shopfloor("check", "-", "--json", stdin=b"order,machine\nA,X\nB,X\n")
    assert (said.code, said.json["lower_bound_s"]) == (0, 3600)


def test_an_overload_is_known_before_the_shift_starts() -> None:
    folder = DATA / "overload"
    said = shopfloor("check", folder / "orders.csv", "--shop", folder / "shop.toml")
    assert said.code == 1
    assert "This does not fit the shift: it ends 14:00, 3 h 30 too early." in said.out
    assert "What would help:" in said.out
    assert all(len(line) <= 80 for line in said.out.splitlines())
    planned = shopfloor("plan", folder / "orders.csv", "--shop", folder / "shop.toml", "--json")
    assert (planned.code, planned.json["fits_shift"]) == (1, False)


def test_an_empty_list_of_orders_is_a_fault(tmp_path: Path) -> None:
    path = tmp_path / "orders.csv"
    path.write_text("order,machine\n")
    assert shopfloor("plan", path).code == 2


def test_hostile_names_stay_text_on_every_page(tmp_path: Path) -> None:
    names = ["<img src=x onerror=alert(1)>", "</script><b>x", "=1+1", "طلب ١", "a&lt;b"]
    path = tmp_path / "orders.csv"
    out = io.StringIO()
    csv.writer(out).writerows([["order", "machine"], *([name, "WASH"] for name in names)])
    path.write_text(out.getvalue(), encoding="utf-8")
    assert shopfloor("plan", path, "--out", tmp_path / "out", "--quiet").code == 0
    for page in ("gantt.html", "dispatch.html"):
        text = (tmp_path / "out" / page).read_text(encoding="utf-8")
        assert "<img src=x" not in text
        assert "</script><b>" not in text
    assert "'=1+1" in (tmp_path / "out" / "plan.csv").read_text(encoding="utf-8-sig")
    assert shopfloor("audit", tmp_path / "out" / "plan.csv", path).code == 0


def test_demo_writes_sets_that_plan(tmp_path: Path) -> None:
    said = shopfloor("demo", tmp_path)
    assert said.code == 0
    for name in ("rounds", "groups", "crew", "splits", "breaks", "mixed", "overload", "faulty"):
        assert (tmp_path / name / "orders.csv").read_bytes() == (DATA / name / "orders.csv").read_bytes()


def test_a_folder_that_cannot_be_written_is_one_line(tmp_path: Path) -> None:
    blocked = tmp_path / "file"
    blocked.write_text("")
    said = shopfloor("plan", ROUNDS, "--out", blocked / "out")
    assert said.code == 2
    assert "Traceback" not in said.err
    assert said.err.startswith("shopfloor: ")
    with mock.patch("shopfloor.pipeline.plan", side_effect=AssertionError("nothing is searched before")):
        assert shopfloor("plan", ROUNDS, "--out", blocked / "out") == said


@pytest.mark.parametrize("command", ["check", "plan", "audit", "fit", "demo"])
def test_every_command_has_help(command: str) -> None:
    said = shopfloor(command, "--help")
    assert said.code == 0
    assert "Usage" in said.out
