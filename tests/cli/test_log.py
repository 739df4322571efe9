"""The shift through the command line: a plan is opened, the floor is recorded, and its state is shown."""

from __future__ import annotations

import csv
import json
import subprocess
import sys
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import pytest

from shopfloor.cli import log, log_common
from tests.cli.run import Said, shopfloor

ROWS = (
    ("TQ-1", "WASH", 1, 0, 30),
    ("TQ-1", "CMM", 1, 30, 60),
    ("TQ-2", "CMM", 1, 0, 30),
    ("TQ-2", "BENCH", 1, 30, 60),
    ("TQ-3", "BENCH", 2, 0, 30),
)
NOW = datetime(2026, 3, 2, 9, tzinfo=UTC)


def plan_json(path: Path, **changes: Any) -> Path:
    """Write a small plan.json."""
    rows = [
        {
            "order": order,
            "machine": machine,
            "unit": unit,
            "start_s": start * 60,
            "end_s": end * 60,
            "round": None,
            "part": 1,
            "parts": 1,
        }
        for order, machine, unit, start, end in ROWS
    ]
    head = {"schema": 1, "shift_start": "2026-03-02T06:00:00", "shift_end_s": 28800, "time_zone": None}
    path.write_text(json.dumps({**head, "bounds": [], "assignments": rows, **changes}))
    return path


@pytest.fixture(autouse=True)
def _nine_o_clock(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(log_common, "wall_time", lambda: NOW)
    monkeypatch.delenv("SHOPFLOOR_JOURNAL", raising=False)
    monkeypatch.delenv("SHOPFLOOR_WHO", raising=False)


@pytest.fixture
def journal(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    path = tmp_path / "shift.db"
    assert shopfloor("log", "open", plan_json(tmp_path / "plan.json"), "--journal", path).code == 0
    monkeypatch.setenv("SHOPFLOOR_JOURNAL", str(path))
    return path


def said(*arguments: object, stdin: bytes = b"") -> Said:
    return shopfloor("log", *arguments, stdin=stdin)


def ok(*arguments: object, stdin: bytes = b"") -> str:
    """Run a command that must succeed, and return what it printed."""
    answer = said(*arguments, stdin=stdin)
    assert (answer.code, answer.err) == (0, "")
    return answer.out


def events() -> list[dict[str, Any]]:
    entries: list[dict[str, Any]] = said("show", "--json").json["entries"]
    return entries


@pytest.mark.usefixtures("journal")
def test_a_morning_is_recorded_event_by_event() -> None:
    commands = (
        "start TQ-1 WASH --at 06:02 --who Ann",
        "finish TQ-1 WASH --at 06:33 --good 10 --scrap 1",
        "finish TQ-2 CMM --from 06:00 --at 06:40",
        "start TQ-1 CMM --at 06:45 --left 0:20",
        "stop TQ-1 CMM --at 06:50 --reason gauge",
        "resume TQ-1 CMM --at 07:00",
        "left TQ-1 CMM 12.5 --at 07:01",
        "down BENCH --unit 2 --at 07:10 --reason vice",
        "up BENCH --unit 2 --at 07:20",
        "crew 4 --at 07:00",
        "add TQ-9 CMM=25 WASH=0:10 --due 13:00 --priority 5 --at 07:30",
        "change TQ-9 CMM=30 --release 08:00 --at 07:40",
        "cancel TQ-9 --reason customer --at 07:50",
        "remark moved --machine CMM --at 07:55",
        "start TQ-3 BENCH",
        "undo",
    )
    assert [line for command in commands for line in ok(*command.split()).splitlines()] == [
        "No 2: TQ-1 on WASH started 06:02 [by Ann]",
        "No 3: TQ-1 on WASH finished 06:33: good 10, scrap 1",
        "No 4: TQ-2 on CMM started 06:00",
        "No 5: TQ-2 on CMM finished 06:40",
        "No 6: TQ-1 on CMM started 06:45, 20 min left",
        "No 7: TQ-1 on CMM stopped 06:50: gauge",
        "No 8: TQ-1 on CMM resumed 07:00",
        "No 9: TQ-1 on CMM at 07:01, 12 min 30 s left",
        "No 10: BENCH unit 2 down 07:10: vice",
        "No 11: BENCH unit 2 up 07:20",
        "No 12: Crew 07:00: 4 present",
        "No 13: Order TQ-9 added 07:30: CMM 25 min, WASH 10 min, due 13:00, priority 5",
        "No 14: Order TQ-9 changed 07:40: CMM 30 min, release 08:00",
        "No 15: Order TQ-9 cancelled 07:50: customer",
        "No 16: Remark 07:55 on CMM: moved",
        "No 17: TQ-3 on BENCH started 09:00",
        "No 18: No 17 struck out 09:00",
    ]


@pytest.mark.usefixtures("journal")
def test_the_state_is_shown_as_it_stood_at_any_time() -> None:
    for command in (
        "start TQ-1 WASH --at 06:05",
        "down CMM --at 06:10 --reason seal",
        "start TQ-3 BENCH --at 06:10",
        "stop TQ-3 BENCH --at 06:15 --reason gauge",
    ):
        ok(*command.split())
    assert ok("show", "--at", "06:20", "--entries", "2") == (
        "shift.db: shift from 2026-03-02 06:00, 5 entries.\n"
        "At 06:20: operations 1 waiting, 1 running, 3 blocked. Good 0, scrap 0.\n"
        "\n"
        "Running\n"
        "  WASH           TQ-1 since 06:05, 15 min left, ends about 06:35\n"
        "\n"
        "Blocked\n"
        "  BENCH          TQ-3 since 06:15, stopped: gauge\n"
        "\n"
        "Down\n"
        "  CMM since 06:10: seal; 2 operations wait for it\n"
        "\n"
        "Last entries\n"
        "  No 4: TQ-3 on BENCH started 06:10\n"
        "  No 5: TQ-3 on BENCH stopped 06:15: gauge\n"
    )
    data = said("show", "--at", "06:06", "--json").json["state"]
    assert data["counts"] == {"waiting": 4, "running": 1, "blocked": 0, "done": 0, "cancelled": 0}
    (running,) = [row for row in data["operations"] if row["status"] == "running"]
    assert (running["planned_start_s"], running["start_s"], running["left_s"]) == (0, 300, 29 * 60)


# ---- exit codes and words ----------------------------------------------------------------------------


@pytest.mark.usefixtures("journal")
def test_what_cannot_be_is_refused_with_exit_code_1() -> None:
    answer = said("finish", "TQ-1", "WASH", "--at", "06:33")
    assert (answer.code, answer.out) == (1, "")
    assert answer.err == (
        "Refused: TQ-1 on WASH has not been started; record its start first.\n"
        "To record it all the same, with a mark, add --accept.\n"
    )
    answer = said("finish", "TQ-1", "WASH", "--at", "06:33", "--json")
    assert answer.code == 1
    assert answer.json == {
        "ok": False,
        "refused": [
            {
                "rule": "not-started",
                "problem": "TQ-1 on WASH has not been started",
                "advice": "record its start first",
                "final": False,
            }
        ],
    }
    answer = said("finish", "TQ-1", "WASH", "--at", "06:33", "--accept")
    assert answer.code == 0
    assert "[accepted: not-started]" in answer.out


@pytest.mark.usefixtures("journal")
def test_bad_input_has_exit_code_2() -> None:
    answer = said("start", "TQ-1", "WASH", "--at", "half past")
    assert (answer.code, answer.out) == (2, "")
    assert answer.err.startswith("at: 'half past' is no time this tool reads; write")
    answer = said("left", "TQ-1", "WASH", "soon", "--json")
    assert answer.code == 2
    assert answer.json["faults"][0]["rule"] == "minutes-unreadable"
    answer = said("add", "TQ-9", "CMM", "--at", "06:05")
    assert (answer.code, answer.err) == (2, "machine=minutes: 'CMM' is no MACHINE=MINUTES; write CMM=25\n")
    answer = said("stop", "TQ-1", "WASH", "--at", "06:05")
    assert (answer.code, answer.err) == (2, "reason: is missing; say why in a few words\n")
    assert said("crew", "many").code == 2
    assert len(events()) == 1


def test_a_journal_is_used_only_where_one_was_named(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    answer = said("remark", "x")
    assert (answer.code, answer.err) == (
        2,
        "shopfloor: no journal is named; give --journal FILE, or set SHOPFLOOR_JOURNAL to it\n",
    )
    answer = said("remark", "x", "--journal", "none.db")
    assert (answer.code, answer.err) == (
        2,
        "shopfloor: cannot open none.db: there is no such journal; make one with: shopfloor log open PLAN\n",
    )
    assert list(tmp_path.iterdir()) == []


@pytest.mark.usefixtures("journal")
def test_quiet_says_nothing_and_json_says_all() -> None:
    assert ok("start", "TQ-1", "WASH", "--at", "06:02", "--quiet") == ""
    data = json.loads(ok("start", "TQ-1", "WASH", "--at", "06:02", "--json"))
    (entry,) = data["entries"]
    assert (data["ok"], entry["repeat"], entry["no"], entry["at"]) == (True, True, 2, "2026-03-02T06:02:00")


@pytest.mark.usefixtures("journal")
def test_an_id_makes_a_repeat_harmless_and_corrects_replaces() -> None:
    ok("start", "TQ-1", "WASH", "--at", "06:02", "--id", "a-1")
    assert ok("start", "TQ-1", "WASH", "--id", "a-1").startswith("No 2 (recorded already)")
    assert ok("start", "TQ-1", "WASH", "--at", "06:04", "--corrects", "2") == (
        "No 3: TQ-1 on WASH started 06:04 [instead of No 2]\n"
    )
    answer = said("undo", "2")
    assert (answer.code, answer.err) == (
        1,
        "Refused: No 2 was corrected by No 3; correct that one instead.\n",
    )
    ok("undo", "3")  # and so the first entry stands again
    found = said("show", "--at", "06:10", "--json").json["state"]["operations"]
    assert [row["start_s"] for row in found if row["machine"] == "WASH"] == [120]


@pytest.mark.usefixtures("journal")
def test_undo_without_a_number_takes_the_last_entry_of_whoever_asks() -> None:
    ok("start", "TQ-1", "WASH", "--at", "06:02", "--who", "Ann")
    ok("down", "CMM", "--at", "06:03", "--reason", "seal", "--who", "Bo")
    assert ok("undo", "--who", "Ann").startswith("No 4: No 2 struck out")
    assert ok("undo").startswith("No 5: No 3 struck out")
    answer = said("undo", "--who", "Ann")
    assert (answer.code, answer.err) == (
        1,
        "Refused: there is nothing to undo by Ann; look it up with: shopfloor log show.\n",
    )


@pytest.mark.usefixtures("journal")
def test_an_order_is_changed_in_one_thing_and_leaves_the_rest() -> None:
    assert (
        ok("change", "TQ-1", "--due", "12:30", "--at", "06:22")
        == "No 2: Order TQ-1 changed 06:22: due 12:30\n"
    )
    answer = said("change", "TQ-1", "--at", "06:23")
    assert (answer.code, answer.err) == (
        2,
        "order: 'TQ-1' is not changed in any way; give what is to change\n",
    )


@pytest.mark.usefixtures("journal")
def test_crews_are_counted_by_name_and_the_hall_as_a_whole() -> None:
    ok("crew", 5, "--at", "06:10")
    assert "Crew present: 5." in ok("show", "--at", "06:20")
    ok("crew", 4, "--pool", "fitters", "--at", "06:15")
    assert "Crew present: the hall 5, fitters 4." in ok("show", "--at", "06:20")


@pytest.mark.usefixtures("journal")
def test_a_start_after_its_finish_is_told_as_such() -> None:
    answer = said("finish", "TQ-1", "WASH", "--from", "06:30", "--at", "06:10")
    assert answer.code == 2
    assert " ".join(answer.err.split()) == (
        "from: '06:30' is after the finish, 06:10; give the start with --from, the finish with --at"
    )


@pytest.mark.usefixtures("journal")
def test_a_table_without_its_columns_is_not_sent_to_a_shop_toml(tmp_path: Path) -> None:
    """`log import` reads none."""
    table = tmp_path / "events.csv"
    table.write_text("what,when,order\nstart,06:00,TQ-1\n")
    answer = said("import", table)
    assert answer.code == 2
    assert "has no column event; name it event in the header" in " ".join(answer.err.split())
    assert "shop.toml" not in answer.err


# ---- open --------------------------------------------------------------------------------------------


def test_the_same_plan_is_opened_once_and_another_only_when_asked(tmp_path: Path) -> None:
    plan, path = plan_json(tmp_path / "plan.json"), tmp_path / "shift.db"
    first = ok("open", plan, "--journal", path)
    assert first.startswith("No 1: plan.json ")
    assert first.endswith(" in force from 06:00\n")
    assert ok("open", plan, "--journal", path).startswith("No 1 (recorded already): plan.json ")
    other = plan_json(tmp_path / "plan2.json", seed=2)
    answer = said("open", other, "--journal", path)
    assert answer.code == 1
    assert "has another plan in force, plan.json" in answer.err
    assert ok("open", other, "--journal", path, "--again").endswith(" in force from 09:00\n")
    tuesday = plan_json(tmp_path / "plan3.json", shift_start="2026-03-03T06:00:00")
    answer = said("open", tuesday, "--journal", path, "--again")
    assert answer.code == 2
    assert "its shift starts 2026-03-02T06:00:00, the plan's 2026-03-03T06:00:00" in answer.err


@pytest.mark.parametrize(
    ("content", "message"),
    [
        ("order,machine\n", "plan.json: is no plan.json; give the plan.json that `plan --out` wrote"),
        ("{", "plan.json: is not valid JSON"),
        ("{}", "schema"),
        ("[1]", "plan.json"),
        (
            '{"schema": 1, "shift_start": "soon", "assignments": []}',
            "has no clock: shift_start 'soon' is no date",
        ),
    ],
)
def test_what_is_no_plan_is_told_and_no_journal_is_made(content: str, message: str, tmp_path: Path) -> None:
    plan = tmp_path / "plan.json"
    plan.write_text(content)
    answer = said("open", plan, "--journal", tmp_path / "shift.db")
    assert answer.code == 2
    assert "nothing was recorded" in answer.err
    assert message in answer.err
    assert not (tmp_path / "shift.db").exists()


def test_a_row_that_ends_before_it_starts_is_told(tmp_path: Path) -> None:
    rows = [{"order": "A", "machine": "M", "start_s": 60, "end_s": 60}]
    plan = plan_json(tmp_path / "plan.json", assignments=rows)
    answer = said("open", plan, "--journal", tmp_path / "shift.db")
    assert answer.code == 2
    assert "plan.json row 1, column assignments: '' ends before it starts, or has no unit" in answer.err


def test_a_plan_without_a_start_counts_from_zero(tmp_path: Path) -> None:
    path = tmp_path / "shift.db"
    ok("open", plan_json(tmp_path / "plan.json", shift_start=None, shift_end_s=None), "--journal", path)
    answer = said("start", "TQ-1", "WASH", "--journal", path)
    assert answer.code == 2
    assert answer.err.startswith(
        "at: is missing, and the plan has no start; give the time since then, as h:mm"
    )
    assert (
        ok("start", "TQ-1", "WASH", "--at", "0:05", "--journal", path) == "No 2: TQ-1 on WASH started 0:05\n"
    )
    assert "time counts from 0:00" in ok("show", "--journal", path)


# ---- import ------------------------------------------------------------------------------------------

GOOD = (
    "event;at;Order;MACHINE;good;reason\n"
    "start;06:02;TQ-1;WASH;;\n"
    "finish;06:33;TQ-1;WASH;10;\n"
    "down;06:40;;CMM;;\u2019seal\u2019 \u2013 again\n"
)


@pytest.mark.usefixtures("journal")
@pytest.mark.parametrize("encoding", ["utf-8-sig", "utf-16", "cp1252"])
def test_a_table_is_recorded_whole_and_once(encoding: str, tmp_path: Path) -> None:
    path = tmp_path / "actuals.csv"
    path.write_bytes(GOOD.encode(encoding))
    assert ok("import", path, "--who", "Ann") == "Recorded 3 of 3 rows.\n"
    assert ok("import", path) == "Recorded 0 of 3 rows; 3 were recorded already.\n"
    assert [entry["who"] for entry in events()[1:]] == ["Ann"] * 3
    assert events()[3]["reason"] == "\u2019seal\u2019 \u2013 again"


@pytest.mark.usefixtures("journal")
def test_a_table_with_faults_is_not_recorded_and_every_fault_is_listed(tmp_path: Path) -> None:
    path = tmp_path / "actuals.csv"
    path.write_text(
        "event,at,order,machine,good\nstart,06:02,TQ-1,WASH,\nfinish,6h,TQ-1,WASH,ten\nbegin,06:02,,,\n"
    )
    answer = said("import", path)
    assert answer.code == 2
    assert answer.err.startswith("3 faults; nothing was recorded.\n")
    assert [line.split(":")[0] for line in answer.err.splitlines()[1:] if line.startswith("actuals")] == [
        "actuals.csv row 3, column at",
        "actuals.csv row 3, column good",
        "actuals.csv row 4, column event",
    ]
    assert len(events()) == 1
    data = said("import", path, "--json").json
    assert {"file", "sheet", "row", "column", "value", "rule", "problem", "advice"} == set(data["faults"][0])


@pytest.mark.usefixtures("journal")
def test_a_table_that_contradicts_the_journal_is_refused_whole(tmp_path: Path) -> None:
    path = tmp_path / "actuals.csv"
    with path.open("w", newline="") as file:
        rows = csv.writer(file)
        rows.writerow(["event", "at", "order", "machine"])
        rows.writerows([["start", "06:02", "TQ-1", "WASH"], ["start", "06:05", "TQ-7", "WASH"]])
        rows.writerow(["finish", "06:09", "TQ-2", "CMM"])
    answer = said("import", path)
    assert answer.code == 1
    assert "3 faults; nothing was recorded." in answer.err
    assert "actuals.csv row 3, column event: 'start' cannot be: there is no order TQ-7" in answer.err
    assert "row 4" in answer.err
    assert len(events()) == 1
    accepted = said("import", path, "--accept")
    assert accepted.code == 0
    assert accepted.out.startswith("Recorded 3 of 3 rows.\nNo 3: TQ-7 on WASH started 06:05 [accepted: ")


@pytest.mark.usefixtures("journal")
def test_a_table_without_its_columns_or_rows_is_told(tmp_path: Path) -> None:
    path = tmp_path / "actuals.csv"
    path.write_text("order,machine\nTQ-1,WASH\n")
    assert "has no column event" in said("import", path).err
    path.write_text("event,at\n")
    assert "has a header but no rows" in said("import", path).err
    assert said("import", tmp_path / "none.csv").code == 2


# ---- scan --------------------------------------------------------------------------------------------


@pytest.mark.usefixtures("journal")
def test_scanned_lines_are_answered_one_by_one() -> None:
    lines = b"WASH\nTQ-1\nSTART\nTQ-8\nTQ-1\tWASH\tGOOD=9\tFINISH\nCMM\nUP\n"
    answer = said("scan", "--who", "Ann", stdin=lines)
    assert answer.code == 2
    assert answer.out == (
        "Line 1: … MACHINE=WASH\n"
        "Line 2: … MACHINE=WASH ORDER=TQ-1\n"
        "Line 3: No 2: TQ-1 on WASH started 09:00 [by Ann]\n"
        "Line 5: No 3: TQ-1 on WASH finished 09:00: good 9 [by Ann]\n"
        "Line 6: … MACHINE=CMM\n"
    )
    assert answer.err == (
        "Line 4: Skipped: code: 'TQ-8' is not known here; scan a machine, an order or a verb of this shift.\n"
        "Line 7: Refused: CMM is not down at 09:00; record first that it went down.\n"
    )


@pytest.mark.usefixtures("journal")
def test_scanning_has_exit_codes_of_its_own_and_speaks_json() -> None:
    assert said("scan", stdin=b"WASH\tTQ-1\tSTART\n").code == 0
    assert said("scan", stdin=b"CMM\tUP\n").code == 1
    answer = said("scan", "--json", stdin=b"CMM\nTQ-2\tSTART\nCMM\n")
    assert answer.code == 2
    lines = [json.loads(line) for line in answer.out.splitlines()]
    assert [(line["line"], line["ok"]) for line in lines] == [(1, True), (2, True), (3, True), (3, False)]
    assert lines[1]["entries"][0]["order"] == "TQ-2"
    assert lines[3]["fault"] == "the input ended before a verb; not recorded: MACHINE=CMM"


# ---- times -------------------------------------------------------------------------------------------


def test_learned_times_are_shown_over_journals_and_written_as_csv(journal: Path, tmp_path: Path) -> None:
    ok("finish", "TQ-1", "WASH", "--from", "06:00", "--at", "06:40")
    ok("finish", "TQ-2", "CMM", "--from", "06:00", "--at", "06:24")
    other = tmp_path / "other.db"
    ok("open", tmp_path / "plan.json", "--journal", other)
    ok("finish", "TQ-1", "WASH", "--from", "06:00", "--at", "06:30", "--journal", other)
    before = journal.read_bytes()
    assert ok("times", journal, other, "--csv", tmp_path / "times.csv") == (
        "machine        family        done  planned   actual       quartiles  ratio\n"
        "CMM                             1       30       24         24 – 24   0.80\n"
        "WASH                            2       30       35     32.5 – 37.5   1.17\n"
        "Minutes; medians, and the quartiles of what was actual. Nothing of this is\n"
        "  applied by itself.\n"
        f"Wrote {tmp_path / 'times.csv'}.\n"
    )
    assert (tmp_path / "times.csv").read_text(encoding="utf-8-sig") == (
        "machine,family,operations,planned_minutes,actual_low,actual_high,ratio,minutes\n"
        "CMM,,1,30,24,24,0.800,24\n"
        "WASH,,2,30,32.5,37.5,1.167,35\n"
    )
    assert journal.read_bytes() == before
    assert said("times", journal, "--json").json["times"][0]["machine"] == "CMM"


def test_families_and_breaks_come_from_the_orders_and_the_hall(journal: Path, tmp_path: Path) -> None:
    orders, shop = tmp_path / "orders.csv", tmp_path / "shop.toml"
    orders.write_text("order,machine,minutes,family\nTQ-1,WASH,20,oily\nTQ-2,CMM,30,\n")
    shop.write_text(
        '[shift]\nstart = "2026-03-02T06:00"\nend = "14:00"\nbreaks = [{ from = "06:10", to = "06:20" }]\n'
        '[[machine]]\nid = "WASH"\npauses = true\n[[machine]]\nid = "CMM"\n'
    )
    ok("finish", "TQ-1", "WASH", "--from", "06:00", "--at", "06:40")
    rows = said("times", journal, "--orders", orders, "--shop", shop, "--json").json["times"]
    assert [(row["family"], row["planned_s"], row["actual_s"]) for row in rows] == [("oily", 1200, 1800)]


# ---- hostile input, help, start ----------------------------------------------------------------------


@pytest.mark.usefixtures("journal")
def test_hostile_text_stays_text_on_the_terminal_and_in_the_sheet(journal: Path, tmp_path: Path) -> None:
    answer = said("remark", "bell\x07 \x1b[2J", "--at", "06:05")
    assert answer.code == 2
    assert "\x1b" not in answer.err
    ok("add", "=1+1", "@x=5", "--at", "06:05", "--accept")
    ok("finish", "=1+1", "@x", "--from", "06:10", "--at", "06:20")
    ok("times", journal, "--csv", tmp_path / "times.csv")
    assert "'@x" in (tmp_path / "times.csv").read_text(encoding="utf-8-sig")


def test_every_subcommand_has_help_and_every_option_of_it() -> None:
    names = [command.name for command in log.app.registered_commands]
    assert names == [
        "open", "start", "stop", "resume", "finish", "left", "down", "up", "crew", "add", "change", "cancel",
        "remark", "undo", "import", "scan", "show", "times",
    ]  # fmt: skip
    for name in names:
        answer = said(name, "--help")
        assert (answer.code, answer.err) == (0, "")
        assert f" log {name} [OPTIONS]" in answer.out


def test_recording_loads_nothing_heavy(journal: Path) -> None:
    code = (
        "import sys\nfrom shopfloor.cli import log\n"
        "log.app(sys.argv[1:], standalone_mode=False)\nprint(*sys.modules)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, "remark", "x", "--at", "06:05", "--quiet", "--journal", str(journal)],
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    modules = set(done.stdout.split())
    assert "sqlite3" in modules
    assert not modules & {"pandas", "networkx", "plotly", "ortools", "openpyxl", "numba", "scipy"}
