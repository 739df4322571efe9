"""`shopfloor handover`: a recorded shift in; a report and tables out; the next shift plans the rest."""

from __future__ import annotations

import csv
import io
from pathlib import Path

import pytest

from tests.cli.run import Said, shopfloor
from tests.render.browser import chromium, needs_browser

ORDERS = """order,machine,minutes,setup_minutes,due,priority,step,family,note
TQ-1,RIG,25,5,07:00,2,1,,
TQ-1,CMM,20,,07:00,2,2,blue,handle by the rim
TQ-2,CMM,40,,,,,red,
TQ-2,BENCH,30,,,,,,
=TQ-3,BENCH,30,,08:00,,,,
=TQ-3,RIG,15,5,08:00,,,,
"""
SHOP = """[shift]
start = "2026-03-02T06:00"
end = "14:00"

[[machine]]
id = "RIG"
setup_minutes = 5

[[machine]]
id = "CMM"

[[machine]]
id = "BENCH"

[changeover.CMM]
between = 0
"""
EVENTS = """event,at,order,machine,good,scrap,reason,text
start,06:00,TQ-1,RIG,,,,
start,06:00,TQ-2,CMM,,,,
stop,06:10,TQ-1,RIG,,,no gasket,
resume,06:20,TQ-1,RIG,,,,
finish,06:40,TQ-2,CMM,4,0,,
finish,06:42,TQ-1,RIG,6,1,,
start,06:45,=TQ-3,RIG,,,,
down,06:50,,CMM,,,probe,
remark,06:55,,,,,,<b>the gauge drifts</b>
"""


@pytest.fixture
def shift(tmp_path: Path) -> Path:
    """A folder with the orders, the hall, a plan and a journal of the first hour."""
    files = {"orders.csv": ORDERS, "shop.toml": SHOP, "events.csv": EVENTS}
    for name, text in files.items():
        (tmp_path / name).write_text(text, encoding="utf-8")
    hall = ("--shop", tmp_path / "shop.toml")
    assert shopfloor("plan", tmp_path / "orders.csv", *hall, "--out", tmp_path / "plan", "--quiet").code == 0
    journal = ("--journal", tmp_path / "shift.db", "--quiet")
    assert shopfloor("log", "open", tmp_path / "plan" / "plan.json", *journal).code == 0
    assert shopfloor("log", "import", tmp_path / "events.csv", *journal).code == 0
    return tmp_path


def handover(shift: Path, *more: object) -> Said:
    files = (shift / "shift.db", shift / "orders.csv", "--shop", shift / "shop.toml")
    return shopfloor("handover", *files, "--at", "07:15", *more)


def test_the_shift_is_told_in_eighty_columns(shift: Path) -> None:
    said = handover(shift)
    assert (said.code, said.err) == (0, "")
    assert max(map(len, said.out.splitlines())) <= 80
    for words in (
        "handed over at 07:15",
        "2 of 6 operations done by 07:15. 4 operations of 3 orders carry over",
        "Pieces reported: 10 good, 1 scrapped (scrap ratio 9.1%)",
    ):
        assert words in said.out
    assert "CMM            down 0:25: probe" in said.out
    assert "RIG            stopped 0:10: no gasket" in said.out
    assert "<b>the gauge drifts</b>" in said.out
    assert "from memory, not quoted" in " ".join(said.out.split())


def test_json_has_planned_and_actual_by_machine_and_order(shift: Path) -> None:
    data = handover(shift, "--json").json
    machines = {row["machine"]: row for row in data["machines"]}
    assert machines["RIG"]["work_s"] == (10 + 22 + 30) * 60
    assert machines["RIG"]["setup_s"] == 10 * 60
    assert machines["RIG"]["stopped_s"] == 600
    assert machines["CMM"]["down_s"] == 25 * 60
    assert machines["CMM"]["outages"] == [{"reason": "probe", "seconds": 25 * 60}]
    orders = {row["order"]: row for row in data["orders"]}
    assert orders["TQ-1"]["late_s"] == 15 * 60
    assert {one["kind"] for one in orders["TQ-1"]["why"]} >= {"down", "stopped"}
    assert data["iso_22400_2"]["scrap_ratio"] == round(1 / 11, 4)
    assert {row["order"] for row in data["carry_over"]} == {"TQ-1", "TQ-2", "=TQ-3"}


def rows(path: Path) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(path.read_text(encoding="utf-8-sig"))))


def test_the_next_shift_plans_what_carries_over(shift: Path) -> None:
    handover(shift, "--out", shift / "out", "--quiet")
    carried = shift / "out" / "carry-over.csv"
    found = {(row["order"], row["machine"]): row for row in rows(carried)}
    assert found["TQ-1", "CMM"] | {"note": ""} == {
        "order": "TQ-1",
        "machine": "CMM",
        "minutes": "20",
        "due": "2026-03-02T07:00:00",
        "priority": "2",
        "step": "2",
        "family": "blue",
        "setup_minutes": "0",
        "note": "",
    }
    assert found["TQ-1", "CMM"]["note"] == "handle by the rim"
    running = found["'=TQ-3", "RIG"]
    assert (running["minutes"], running["setup_minutes"]) == ("1", "0")
    assert running["note"] == "under way since 06:45"
    said = shopfloor(
        *("plan", carried, "--shop", shift / "shop.toml"),
        *("--start", "2026-03-02T14:00", "--end", "22:00", "--out", shift / "next", "--json"),
    )
    assert said.code == 0
    assert said.json["makespan_s"] == 60 * 60  # the bench: 30 + 30
    assert said.json["late"][0]["order"] == "TQ-1"
    planned = rows(shift / "next" / "plan.csv")
    assert len(planned) == len(found) == 4
    assert "'=TQ-3" in {row["order"] for row in planned}


def test_the_tables_open_in_a_spreadsheet_without_running_anything(shift: Path) -> None:
    handover(shift, "--out", shift / "out", "--quiet")
    machines = {row["machine"]: row for row in rows(shift / "out" / "machines.csv")}
    assert machines["RIG"]["worked"] == "62"
    assert machines["RIG"]["AUPT"] == "62"
    assert machines["CMM"]["why_down"] == "down 0:25: probe"
    orders = rows(shift / "out" / "order-reports.csv")
    assert [row["order"] for row in orders] == ["TQ-1", "TQ-2", "'=TQ-3"]
    assert orders[0]["late"] == "15"


def test_the_page_is_one_harmless_file_with_equal_bytes(shift: Path) -> None:
    for folder in ("one", "two"):
        handover(shift, "--out", shift / folder, "--quiet")
    page = (shift / "one" / "handover.html").read_text(encoding="utf-8")
    assert page == (shift / "two" / "handover.html").read_text(encoding="utf-8")
    assert "&lt;b&gt;the gauge drifts" in page
    assert "<script" not in page
    assert "not a permit" in page
    assert "actual unit processing time" in page
    assert "from memory, not quoted" in page


@needs_browser
def test_the_page_opens_offline_without_a_word_of_complaint(shift: Path) -> None:
    handover(shift, "--out", shift / "out", "--quiet")
    complaints: list[str] = []
    with chromium() as browser:
        tab = browser.new_context(offline=True).new_page()
        tab.on("console", lambda said: complaints.append(said.text))
        tab.on("pageerror", lambda fault: complaints.append(str(fault)))
        tab.goto((shift / "out" / "handover.html").resolve().as_uri())
        bars = tab.locator("table svg.bar").count()
    assert complaints == []
    assert bars == 3


def test_without_orders_it_tells_what_the_journal_knows(shift: Path) -> None:
    said = shopfloor("handover", shift / "shift.db", "--at", "07:15", "--out", shift / "out")
    assert said.code == 0
    assert "Without ORDERS due times, set-ups and closures are not known" in " ".join(said.out.split())
    assert not (shift / "out" / "carry-over.csv").exists()
    assert (shift / "out" / "handover.html").exists()


def test_the_journal_is_only_read(shift: Path) -> None:
    before = (shift / "shift.db").read_bytes()
    handover(shift, "--out", shift / "out")
    assert (shift / "shift.db").read_bytes() == before


# ---- refusals ----------------------------------------------------------------------------------------


def test_other_orders_than_the_plans_are_refused_by_name(shift: Path) -> None:
    (shift / "orders.csv").write_text("order,machine,minutes\nTQ-1,RIG,30\n", encoding="utf-8")
    said = handover(shift)
    assert said.code == 2
    assert "the journal has work that these orders have not: =TQ-3 on BENCH" in said.err


def test_orders_saved_anew_are_taken_with_a_notice(shift: Path) -> None:
    (shift / "orders.csv").write_text(ORDERS + "\n", encoding="utf-8")
    said = handover(shift)
    assert said.code == 0
    assert "is not, byte for byte, what the shift's first plan was made from" in " ".join(said.err.split())


def test_another_zone_is_another_shift(shift: Path) -> None:
    text = SHOP.replace('end = "14:00"', 'end = "14:00"\nzone = "Europe/London"')
    (shift / "shop.toml").write_text(text, encoding="utf-8")
    said = handover(shift)
    assert said.code == 2
    assert "is read for another shift than the journal's, which starts at 2026-03-02T06:00:00" in " ".join(
        said.err.split()
    )


def test_a_moment_that_is_none_is_refused(shift: Path) -> None:
    said = shopfloor("handover", shift / "shift.db", "--at", "soon")
    assert said.code == 2
    assert "'soon' is no time this tool reads" in said.err


def test_no_journal_no_handover(tmp_path: Path) -> None:
    said = shopfloor("handover", tmp_path / "none.db")
    assert said.code == 2
    assert "there is no such journal" in said.err
