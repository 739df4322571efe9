"""`shopfloor replan`: a journal in, a new plan out, and what moved; one shift from plan to carry-over."""

from __future__ import annotations

import csv
import io
import json
import re
import shlex
import shutil
from pathlib import Path

import pytest

from shopfloor.journal.errors import JournalError
from shopfloor.journal.events import Journal
from tests.cli.run import DATA, Said, shopfloor
from tests.render.browser import chromium, needs_browser

ORDERS = """order,machine,minutes,due,priority,step,note
TQ-1,RIG,30,07:10,2,1,
TQ-1,CMM,20,07:10,2,2,handle by the rim
TQ-2,CMM,40,,,,
TQ-2,BENCH,30,,,,
=TQ-3,BENCH,30,08:00,,,
=TQ-3,RIG,20,08:00,,,
"""
SHOP = """[shift]
start = "2026-03-02T06:00"
end = "14:00"

[[machine]]
id = "RIG"

[[machine]]
id = "CMM"

[[machine]]
id = "BENCH"
"""
EVENTS = """event,at,order,machine,good,reason
start,06:00,TQ-1,RIG,,
start,06:00,TQ-2,CMM,,
down,06:10,,CMM,,probe
"""
QUICK = ("--time-limit", 60, "--no-xlsx")  # this shift is proved long before


@pytest.fixture
def shift(tmp_path: Path) -> Path:
    """A folder with orders, hall, plan, and a journal in which the CMM is down at 06:10."""
    for name, text in {"orders.csv": ORDERS, "shop.toml": SHOP, "events.csv": EVENTS}.items():
        (tmp_path / name).write_text(text, encoding="utf-8")
    hall = ("--shop", tmp_path / "shop.toml")
    assert shopfloor("plan", tmp_path / "orders.csv", *hall, "--out", tmp_path / "plan", "--quiet").code == 0
    journal = ("--journal", tmp_path / "shift.db", "--quiet")
    assert shopfloor("log", "open", tmp_path / "plan" / "plan.json", *journal).code == 0
    assert shopfloor("log", "import", tmp_path / "events.csv", *journal).code == 0
    return tmp_path


def replan(shift: Path, *more: object) -> Said:
    files = (shift / "shift.db", shift / "orders.csv", "--shop", shift / "shop.toml")
    return shopfloor("replan", *files, "--now", "06:12", *QUICK, *more)


def test_the_rest_is_planned_around_the_outage_and_the_moves_are_told(shift: Path) -> None:
    said = replan(shift, "--back", "CMM=07:00")
    assert said.code == 0
    assert all(line.endswith(" s left") for line in said.err.splitlines()), "nothing but progress"
    text = " ".join(said.out.split())
    assert "At 06:12: operations done 0, running 2, waiting 4." in text
    assert "Running work is expected to be done: RIG 06:30, CMM 07:30." in text
    assert "up to 5 min is no move" in text
    assert max(map(len, said.out.splitlines())) <= 80


def test_json_has_plan_moves_and_parent(shift: Path) -> None:
    data = replan(shift, "--back", "CMM=07:00", "--json").json
    assert data["now_s"] == data["begin_s"] == 12 * 60
    assert data["makespan_s"] == 120 * 60  # the CMM goes on at 07:00 until 07:30, then 30 min on the BENCH
    assert data["lower_bound_s"] <= data["makespan_s"]
    assert (
        data["parent"]
        == json.loads(shopfloor("log", "show", "--journal", shift / "shift.db", "--json").out)["entries"][0][
            "sha256"
        ]
    )
    assert data["moves"]["moved"] == data["compare"]["counts"]["moved"]
    assert data["options"]["parent"] == data["parent"]
    assert data["issued"] is None


def test_the_files_are_those_of_a_plan_and_the_moves(shift: Path) -> None:
    said = replan(shift, "--back", "CMM=07:00", "--out", shift / "new", "--json")
    names = {Path(name).name for name in said.json["files"]}
    assert names == {"plan.json", "plan.csv", "gantt.html", "moves.html", "dispatch.html"}
    data = json.loads((shift / "new" / "plan.json").read_text())
    rows = {(row["order"], row["machine"]): row for row in data["assignments"]}
    assert rows["TQ-1", "RIG"]["start_s"] == 0  # running work keeps its true start
    assert {"name": "parent plan.json", "sha256": said.json["parent"]} in data["inputs"]
    for page in ("gantt.html", "moves.html", "dispatch.html"):
        assert "not a permit" in (shift / "new" / page).read_text(encoding="utf-8")


def test_without_a_word_on_when_it_is_back_an_assumption_is_made_and_said(shift: Path) -> None:
    text = " ".join(replan(shift).out.split())
    assert "CMM is down since 06:10; nobody said until when, so it is taken to be back at 06:42." in text
    text = " ".join(replan(shift, "--outage", 60).out.split())
    assert "it is taken to be back at 07:12" in text


def test_an_issued_plan_is_in_force_and_numbers_its_work_as_before(shift: Path) -> None:
    assert replan(shift, "--back", "CMM=07:00", "--issue", "--who", "Lead", "--quiet").code == 0
    shown = json.loads(
        shopfloor("log", "show", "--at", "06:13", "--journal", shift / "shift.db", "--json").out
    )
    assert shown["entries"][-1]["event"] == "issued"
    assert shown["entries"][-1]["who"] == "Lead"
    keys = [(row["order"], row["machine"], row["piece"]) for row in shown["state"]["operations"]]
    assert sorted(keys) == sorted({(order, machine, 1) for order, machine, _ in keys})
    assert len(keys) == 6
    again = replan(shift, "--back", "CMM=07:00", "--json").json
    assert again["moves"]["moved"] == 0
    assert again["parent"] == shown["entries"][-1]["sha256"]


def test_a_plan_issued_by_hand_goes_on_with_stopped_work_as_replan_does(shift: Path) -> None:
    """The rest of TQ-1 on the RIG, TQ-2 on the CMM and a scrapped TQ-2 on the BENCH, under either issue."""
    told = (
        ("stop", "TQ-1", "RIG", "--reason", "no gauge", "--at", "06:11"),
        ("start", "=TQ-3", "BENCH", "--at", "06:11"),
        ("finish", "=TQ-3", "BENCH", "--good", 0, "--scrap", 2, "--at", "06:12"),
    )
    found = []
    for way in ("replan --issue", "log open --again"):
        folder = shift / way.replace(" ", "-")
        folder.mkdir()
        journal = folder / "shift.db"
        shutil.copy(shift / "shift.db", journal)

        def log(*words: object, journal: Path = journal) -> Said:
            said = shopfloor("log", *words, "--journal", journal, "--json")
            assert said.code == 0, said.out
            return said

        for words in told:
            log(*words)
        files = (journal, shift / "orders.csv", "--shop", shift / "shop.toml", "--now", "06:13", *QUICK)
        issue = ("--issue",) if "--issue" in way else ()
        options = ("--back", "CMM=07:00", "--out", folder, *issue)
        assert shopfloor("replan", *files, *options, "--quiet").code == 0
        if not issue:
            log("open", folder / "plan.json", "--again", "--at", "06:13")
        for words in (
            ("resume", "TQ-1", "RIG", "--at", "06:20"),
            ("finish", "TQ-1", "RIG", "--good", 1, "--at", "06:45"),
            ("up", "CMM", "--at", "07:00"),
            ("start", "=TQ-3", "BENCH", "--at", "07:05"),
        ):
            log(*words)
        state = log("show", "--at", "08:00").json["state"]
        rig = [row for row in state["operations"] if (row["order"], row["machine"]) == ("TQ-1", "RIG")]
        assert [(row["piece"], row["status"]) for row in rig] == [(1, "done")]
        report = shopfloor("handover", *files[:4], "--at", "08:00", "--json").json
        assert report["operations"] == 6
        found.append((state, report, (folder / "plan.json").read_bytes()))
    assert found[0] == found[1]


def test_a_plan_issued_by_hand_that_follows_another_one_is_told_of(shift: Path) -> None:
    assert replan(shift, "--back", "CMM=07:00", "--out", shift / "first", "--quiet").code == 0
    assert replan(shift, "--back", "CMM=08:00", "--issue", "--quiet").code == 0
    said = shopfloor("log", "open", shift / "first" / "plan.json", "--again", "--journal", shift / "shift.db")
    assert said.code == 0
    assert re.search(
        r"Note: it was made to follow the plan [0-9a-f]{8}, not plan\.json [0-9a-f]{8}, which was in force "
        r"until now; compare the two, or replan\.",
        said.out,
    )


def test_the_compare_command_tells_the_same_moves(shift: Path) -> None:
    said = replan(shift, "--back", "CMM=07:00", "--out", shift / "new", "--json")
    files = (shift / "plan" / "plan.json", shift / "new" / "plan.json")
    data = shopfloor("compare", *files, "--tolerance", 5, "--json").json
    assert data["counts"] == said.json["compare"]["counts"]
    assert data["b"]["from_s"] == 12 * 60


def test_a_plan_that_overruns_the_shift_says_so_by_its_exit_code(shift: Path) -> None:
    said = replan(shift, "--back", "CMM=13:50")
    assert said.code == 1
    assert "It overruns the shift" in said.out


@needs_browser
def test_the_page_of_moves_opens_without_a_word_of_complaint(shift: Path) -> None:
    replan(shift, "--back", "CMM=07:00", "--out", shift / "new", "--quiet")
    complaints: list[str] = []
    with chromium() as browser:
        tab = browser.new_context(offline=True).new_page()
        tab.on("console", lambda said: complaints.append(said.text))
        tab.on("pageerror", lambda fault: complaints.append(str(fault)))
        tab.goto((shift / "new" / "moves.html").resolve().as_uri())
        lines = tab.locator("svg line.now").count()
    assert complaints == []
    assert lines == 1


# ---- refusals ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("given", "words"),
    [
        ("CMM", "--back: 'CMM' is no MACHINE=TIME; write CMM=08:00, or CMM:2=08:00 for its unit 2"),
        (
            "RIG=08:00",
            "--back: 'RIG=08:00' names nothing that is down; down are: CMM; record that it is down first",
        ),
        ("CMM=soon", "--back: 'CMM=soon' is no time this tool reads"),
        ("CMM=06:05", "--back: 'CMM=06:05' is not after 06:12; record that it is up, or give a later time"),
    ],
)
def test_what_cannot_be_meant_by_back_is_refused(shift: Path, given: str, words: str) -> None:
    said = replan(shift, "--back", given)
    assert said.code == 2
    assert words in " ".join(said.err.split())


def test_an_unknown_goal_is_refused(shift: Path) -> None:
    said = replan(shift, "--objective", "beauty")
    assert said.code == 2
    assert "'beauty' is not one of makespan, tardiness, changeovers" in " ".join(said.err.split())


@pytest.mark.parametrize(
    ("given", "words"),
    [
        (("--now", "later"), "now: 'later' is no time this tool reads"),
        (("--time-limit", -1), "Invalid value for '--time-limit'"),
        (("--workers", -1), "Invalid value for '--workers'"),
    ],
)
def test_an_option_that_cannot_be_meant_is_refused(
    shift: Path, given: tuple[object, ...], words: str
) -> None:
    said = replan(shift, *given)
    assert said.code == 2
    assert words in " ".join(said.err.split())


def test_a_crew_that_the_shop_has_not_is_told_of(shift: Path) -> None:
    journal = ("--journal", shift / "shift.db")
    assert shopfloor("log", "crew", 3, "--pool", "riggers", "--at", "06:11", *journal).code == 0
    said = replan(shift, "--back", "CMM=07:00")
    assert said.code == 0
    assert " ".join(said.err.split()) == (
        "Note: log crew --pool: 'riggers' names no crew of the shop; it is left out; undo it, and name one "
        "of its crews"
    )


def test_a_journal_that_cannot_be_written_is_told_before_the_search(
    shift: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(path: Path, **options: object) -> Journal:
        raise JournalError(f"cannot write {path}: the disk is full; make room, then record this again")

    monkeypatch.setattr(Journal, "open", refuse)
    monkeypatch.setattr("shopfloor.rolling.plan.replan", lambda *given, **named: pytest.fail("it searched"))
    said = replan(shift, "--issue")
    assert said.code == 2
    assert "the disk is full; make room" in said.err


def test_nothing_is_issued_when_the_orders_do_not_belong_to_the_journal(shift: Path) -> None:
    (shift / "orders.csv").write_text("order,machine,minutes\nTQ-1,RIG,30\n", encoding="utf-8")
    before = (shift / "shift.db").read_bytes()
    said = replan(shift, "--issue")
    assert said.code == 2
    assert "the journal has work that these orders have not" in said.err
    assert (shift / "shift.db").read_bytes() == before


# ---- one shift from plan to carry-over -----------------------------------------------------------------

JOURNAL = "reports/mixed/shift.journal"
MIXED, HALL = DATA / "mixed" / "orders.csv", DATA / "mixed" / "shop.toml"


class Told:
    """The mixed shift, told as it happens."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.journal = ("--journal", folder / "shift.db")
        self.plan = folder / "plan"

    def done(self, *arguments: object) -> Said:
        said = shopfloor(*arguments)
        assert said.code == 0, said.err + said.out
        return said

    def log(self, *arguments: object) -> Said:
        return self.done("log", *arguments, *self.journal)

    def play(self, since: str, until: str) -> None:
        """Everything that the plan in force wants between two moments happens as planned."""
        events = []
        running = self.running()
        for row in csv.DictReader(io.StringIO((self.plan / "plan.csv").read_text(encoding="utf-8-sig"))):
            start, end = row["start"][11:16], row["end"][11:16]
            key = row["order"], row["machine"]
            if key not in running and since <= start < until:
                events.append((row["start"], 1, ["start", start, *key, row["unit"], ""]))
                running.add(key)
            if key in running and since < end <= until:
                events.append((row["end"], 0, ["finish", end, *key, "", "4"]))
        out = io.StringIO()
        csv.writer(out).writerow(["event", "at", "order", "machine", "unit", "good"])
        csv.writer(out).writerows(row for _, _, row in sorted(events, key=lambda event: event[:2]))
        path = self.folder / f"{since[:2]}.csv"
        path.write_text(out.getvalue(), encoding="utf-8")
        self.log("import", path, "--quiet")

    def running(self) -> set[tuple[str, str]]:
        state = self.log("show", "--json").json["state"]
        return {
            (row["order"], row["machine"])
            for row in state["operations"]
            if row["start_s"] is not None and row["end_s"] is None
        }

    def replan(self, now: str, *more: object) -> dict[str, object]:
        files = (self.folder / "shift.db", MIXED, "--shop", HALL)
        self.plan = self.folder / f"plan-{now[:2]}"
        said = shopfloor(
            "replan",
            *files,
            "--now",
            now,
            *more,
            "--issue",
            "--out",
            self.plan,
            "--json",
            "--time-limit",
            5,
            "--no-xlsx",
        )
        assert said.code in (0, 1), said.err
        data: dict[str, object] = said.json
        return data


def test_a_shift_from_its_plan_to_what_the_next_one_gets(tmp_path: Path) -> None:
    """The CMM breaks down, a hot order comes, an operation is scrapped; at 14:00 the rest is handed over.

    Every `replan` audits its plan against what is left and against the journal before it is written.
    """
    told = Told(tmp_path)
    told.done("plan", MIXED, "--shop", HALL, "--out", told.plan, "--time-limit", 3, "--no-xlsx", "--quiet")
    told.log("open", told.plan / "plan.json", "--at", "06:00")

    told.play("06:00", "07:10")
    told.log("down", "CMM", "--reason", "probe crashed", "--at", "07:10")
    first = told.replan("07:10", "--back", "CMM=08:00")
    assert first["lower_bound_s"] <= first["makespan_s"]
    assert first["scratch"] is None or first["moves"]["moved"] < first["scratch"]["moved"]

    told.play("07:10", "08:00")
    told.log("up", "CMM", "--at", "08:00")
    told.log("add", "TQ-HOT", "CMM=20", "COAT=15", "--due", "10:00", "--priority", "5", "--at", "08:00")
    second = told.replan("08:00")
    added = [change for change in second["compare"]["changes"] if change["kind"] == "added"]
    assert {(change["order"], change["machine"]) for change in added} == {
        ("TQ-HOT", "CMM"),
        ("TQ-HOT", "COAT"),
    }
    hot = [change["b"]["start_s"] for change in added]
    assert min(hot) >= 2 * 3600

    told.play("08:00", "09:30")
    order, machine = sorted(told.running())[0]
    told.log("finish", order, machine, "--good", 0, "--scrap", 4, "--at", "09:30")
    third = told.replan("09:30")
    rows = json.loads((told.plan / "plan.json").read_text())["assignments"]
    assert (order, machine) in {(row["order"], row["machine"]) for row in rows}  # it is run again
    assert third["inputs"][-1]["name"] == "parent plan.json"

    told.play("09:30", "12:00")  # and from noon on nobody records anything
    out = tmp_path / "handover"
    said = told.done(
        "handover", tmp_path / "shift.db", MIXED, "--shop", HALL, "--at", "14:00", "--out", out, "--json"
    )
    report = said.json
    assert len(report["plans"]) == 4
    assert report["done"] + len(report["carry_over"]) == report["operations"] == 139 + 2
    assert report["scrap"] == 4
    cmm = next(row for row in report["machines"] if row["machine"] == "CMM")
    assert (
        cmm["outages"] == [{"reason": "probe crashed", "seconds": 2 * 50 * 60}]
        or cmm["outages"][0]["seconds"] == 3000
    )
    assert cmm["down_s"] == 2 * 50 * 60  # both units

    following = shopfloor(
        "plan", out / "carry-over.csv", "--shop", HALL, "--start", "2026-03-02T14:00", "--end", "22:00",
        "--time-limit", 4, "--out", tmp_path / "next", "--json", "--no-xlsx",
    )  # fmt: skip
    assert following.code == 0
    planned = json.loads((tmp_path / "next" / "plan.json").read_text())["assignments"]
    assert len(planned) == len(report["carry_over"])


# ---- the README's story --------------------------------------------------------------------------------

STORY = (DATA.parent / "README.md").read_text("utf-8").split("## The running shift")[1].split("\n## ")[0]


def test_the_story_of_the_readme_is_told_as_it_stands_there(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Its commands, one after another; what `log show` prints is there word for word.

    What a search finds in the time it has is not compared.
    """
    (tmp_path / "data").symlink_to(DATA)
    monkeypatch.chdir(tmp_path)
    printed = ""
    for block in re.findall(r"```sh\n(.*?)```", STORY, re.S):
        for line in block.splitlines():
            program, *words = shlex.split(line.replace("$SHOPFLOOR_JOURNAL", JOURNAL), comments=True)
            if program == "export":
                assert words == [f"SHOPFLOOR_JOURNAL={JOURNAL}"]
                monkeypatch.setenv("SHOPFLOOR_JOURNAL", JOURNAL)
                continue
            quick = ("--time-limit", 4, "--no-xlsx") if words[0] in ("plan", "replan") else ()
            said = shopfloor(*words, *quick)
            assert said.code in ((0, 1) if quick else (0,)), (line, said.err, said.out)
            printed += said.out
    shown = next(text for text in re.findall(r"```text\n(.*?)```", STORY, re.S) if "At 07:12" in text)
    assert shown in printed
    assert "Recorded 61 of 61 rows." in printed
    assert "CMM since 07:10: probe error; 17 operations wait for it" in printed


def test_the_morning_of_the_story_is_installed(tmp_path: Path) -> None:
    assert shopfloor("demo", tmp_path).code == 0
    assert (tmp_path / "mixed" / "morning.csv").read_bytes() == (DATA / "mixed" / "morning.csv").read_bytes()
