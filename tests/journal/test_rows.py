"""A table of events: every row an entry, or every fault with its row, column, value and what to do."""

from __future__ import annotations

import pytest

from shopfloor.cli.log_common import seconds_of
from shopfloor.journal.entries import Entry
from shopfloor.journal.errors import Refusal
from shopfloor.journal.rows import WORDS, Rows
from shopfloor.model.actuals import Kind
from tests.journal.floor import CLOCK

WORK = {"at": "06:05", "order": "TQ-1", "machine": "CMM"}


def reading(*rows: dict[str, str]) -> Rows:
    found = Rows(CLOCK, 8 * 3600, seconds_of, "actuals.csv")
    for number, row in enumerate(rows, 2):
        found.take(number, row)
    return found


@pytest.mark.parametrize(
    ("row", "entry"),
    [
        (
            {"event": "start", "at": "06:05", "order": "TQ-1", "machine": "CMM", "piece": "2", "who": "Ann"},
            Entry(Kind.STARTED, 300, who="Ann", order="TQ-1", machine="CMM", piece=2),
        ),
        (
            WORK | {"event": "Stopped", "reason": "gauge", "minutes": "9"},
            Entry(Kind.STOPPED, 300, order="TQ-1", machine="CMM", data={"left_s": 540, "reason": "gauge"}),
        ),
        (
            WORK | {"event": "FINISH", "at": "2026-03-02T06:05", "good": "9", "id": "7"},
            Entry(Kind.FINISHED, 300, order="TQ-1", machine="CMM", id="7", data={"good": 9}),
        ),
        (
            {"event": "down", "at": "06:05", "machine": "CMM", "unit": "1", "reason": "seal"},
            Entry(Kind.DOWN, 300, machine="CMM", unit=1, data={"reason": "seal"}),
        ),
        ({"event": "crew", "at": "06:05", "heads": "0"}, Entry(Kind.CREW, 300, data={"heads": 0})),
        (
            WORK | {"event": "add", "order": "TQ-9", "minutes": "0:25", "due": "13:00"},
            Entry(Kind.ADDED, 300, order="TQ-9", data={"due_s": 25200, "operations": [("CMM", 1500)]}),
        ),
        (
            {"event": "change", "at": "06:05", "order": "TQ-9", "priority": "2,5"},
            Entry(Kind.CHANGED, 300, order="TQ-9", data={"priority": 2.5}),
        ),
        ({"event": "remark", "at": "06:05", "text": "seal"}, Entry(Kind.REMARK, 300, data={"text": "seal"})),
    ],
)
def test_a_row_is_an_entry(row: dict[str, str], entry: Entry) -> None:
    found = reading(row)
    assert (found.faults, found.entries) == ([], [entry])


def test_every_fault_of_every_row_is_listed_with_its_place() -> None:
    found = reading(
        {"event": "begin", "at": "25:00", "order": "TQ-1", "machine": "CMM"},
        {"event": "start", "order": "TQ-1"},
        {"event": "stop", "at": "06:05", "order": "TQ-1", "machine": "CMM"},
        {"event": "finish", "at": "06:05", "order": "TQ-1", "machine": "CMM", "good": "ten", "scrap": "-1"},
        {"event": "left", "at": "06:05", "order": "TQ-1", "machine": "CMM", "minutes": "soon"},
        {"event": "add", "at": "06:05", "order": "TQ-9", "machine": "CMM"},
        {"event": "start", "at": "06:05", "order": "TQ\x07", "machine": "CMM"},
    )
    assert [fault.text().removeprefix("actuals.csv ") for fault in found.faults] == [
        "row 2, column event: 'begin' is no event; write one of start, stop, resume, finish, left, down, up, "
        "crew, add, change, cancel, remark",
        "row 2, column at: '25:00' is no time of day; write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date",
        "row 3, column at: '' is empty; fill it in",
        "row 4, column reason: '' is missing; say why in a few words",
        "row 5, column good: 'ten' is no whole number from 0 on; correct it",
        "row 5, column scrap: '-1' is no whole number from 0 on; correct it",
        "row 6, column minutes: 'soon' is no time; write minutes such as 30 or 12.5, or h:mm such as 0:30",
        "row 7, column minutes: '' is empty; say how long it takes on CMM",
        "row 8, column order: 'TQ?' holds an invisible character (U+0007); delete it",
    ]
    assert found.entries == []


def test_what_the_journal_refuses_is_a_fault_of_its_row() -> None:
    found = reading(
        {"event": "begin", "at": "06:05"},
        {"event": "start", "at": "06:05", "order": "TQ-1", "machine": "CMM"},
    )
    fault = found.refused([Refusal(0, "unit-busy", "CMM runs TQ-2", "stop it")])[0]
    assert fault.text() == "actuals.csv row 3, column event: 'start' cannot be: CMM runs TQ-2; stop it"
    assert fault.rule == "unit-busy"


def test_every_kind_that_a_person_records_has_a_word() -> None:
    assert set(WORDS.values()) == set(Kind) - {Kind.ISSUED, Kind.WITHDRAWN}
