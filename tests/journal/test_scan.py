"""The grammar of a bar-code scanner: codes, verbs that complete, and bad lines that change nothing."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.cli.log_common import seconds_of
from shopfloor.journal import moments
from shopfloor.journal.entries import Entry
from shopfloor.journal.scan import VERBS, Scanner
from shopfloor.model.actuals import Kind
from tests.journal.floor import CLOCK

ORDERS, MACHINES = {"TQ-1", "TQ-2", "BOTH"}, {"CMM", "WASH", "BOTH"}
START = Entry(Kind.STARTED, None, order="TQ-1", machine="CMM")


def scanner(**options: str) -> Scanner:
    return Scanner(
        lambda code: (code if code in ORDERS else None, code if code in MACHINES else None),
        lambda text: moments.read(CLOCK, text, None),
        seconds_of,
        **options,
    )


def entries(*lines: str, **options: str) -> list[Entry]:
    device = scanner(**options)
    return [entry for line in lines for entry in device.take(line).entries]


@pytest.mark.parametrize(
    "lines",
    [
        ["CMM", "TQ-1", "START"],
        ["TQ-1\n", "CMM\r\n", "\n", "start"],
        ["CMM\tTQ-1\tStart"],
        ["WASH", "CMM", "TQ-2", "TQ-1", "START"],
        ["WASH\tTQ-2", "CLEAR", "CMM\tTQ-1\tSTART"],
        ["MACHINE=CMM", "order=TQ-1", "START"],
        ["CMM", "TQ-3", "TQ-1", "START"],
    ],
)
def test_a_machine_an_order_and_a_verb_make_an_entry(lines: list[str]) -> None:
    assert entries(*lines) == [START]


def test_what_else_belongs_to_an_entry_is_scanned_before_the_verb() -> None:
    assert entries("WHO=Ann", "CMM", "TQ-1", "GOOD=9", "SCRAP=1", "AT=06:05", "FINISH") == [
        Entry(Kind.FINISHED, 300, who="Ann", order="TQ-1", machine="CMM", data={"good": 9, "scrap": 1})
    ]
    assert entries("CMM\tREASON=no gauge\tUNIT=2\tDOWN") == [
        Entry(Kind.DOWN, machine="CMM", unit=2, data={"reason": "no gauge"})
    ]
    assert entries("CMM", "TQ-1", "PIECE=2", "LEFT=0:25", "REASON=gauge", "STOP") == [
        Entry(Kind.STOPPED, order="TQ-1", machine="CMM", piece=2, data={"left_s": 1500, "reason": "gauge"})
    ]


def test_a_scanner_fixed_to_a_machine_needs_no_machine_and_who_stays() -> None:
    found = entries("TQ-1", "START", "WHO=Bo", "TQ-1", "FINISH", machine="CMM", who="Ann")
    assert [(entry.machine, entry.who) for entry in found] == [("CMM", "Ann"), ("CMM", "Bo")]


def test_nothing_is_carried_over_to_the_next_entry() -> None:
    device = scanner()
    device.take("CMM\tTQ-1\tGOOD=9\tFINISH")
    assert device.take("START").fault == "order: is missing; give the order"


@pytest.mark.parametrize(
    ("line", "fault"),
    [
        ("TQ-3", "code: 'TQ-3' is not known here; scan a machine, an order or a verb of this shift"),
        ("BOTH", "code: 'BOTH' names an order and a machine; scan ORDER=BOTH or MACHINE=BOTH"),
        ("\x1b[2J", "code: '?[2J' is not known here; scan a machine, an order or a verb of this shift"),
        ("GOOD=ten", "good: 'ten' is no whole number from 0 on; correct it"),
        ("AT=25:00", "at: '25:00' is no time of day; write YYYY-MM-DDTHH:MM, or HH:MM on the shift's date"),
        ("CMM\tDOWN", "reason: is missing; say why in a few words"),
        ("CMM\tTQ-1\tUP", "order: 'TQ-1' says nothing for up; scan CLEAR, then the machine and the verb"),
        ("CMM\tTQ-1\tGOOD=9\tSTART", "good: '9' says nothing for started; leave it out"),
        ("A" * 5_000, f"line: '{'A' * 40}' is too long; scan one code a line"),
    ],
)
def test_a_bad_line_is_told(line: str, fault: str) -> None:
    assert scanner().take(line).fault == fault


@given(
    st.lists(
        st.sampled_from(["CMM", "TQ-1", "TQ-2", "START", "CLEAR", "GOOD=2", "nonsense", "UP"]), max_size=8
    )
)
def test_a_line_with_a_fault_changes_nothing(codes: list[str]) -> None:
    device = scanner()
    device.take("CMM")
    before = device.pending
    said = device.take("\t".join([*codes, "nonsense"]))
    assert said.fault
    assert (said.entries, device.pending) == ((), before)


@given(st.text(max_size=60))
def test_whatever_is_scanned_gets_an_answer(text: str) -> None:
    said = scanner().take(text)
    assert isinstance(said.fault, str)
    assert said.fault.isprintable()


def test_the_grammar_is_documented_where_people_look() -> None:
    from shopfloor.cli.log_book import scan

    for verb in (*VERBS, "CLEAR", "PIECE", "UNIT", "GOOD", "SCRAP", "LEFT", "REASON", "AT", "WHO"):
        assert verb in (scan.__doc__ or "")
