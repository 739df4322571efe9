"""What a journal takes and what it refuses, in exact words; repeats, corrections and marks."""

from __future__ import annotations

import contextlib
import re
import sqlite3
from dataclasses import replace
from itertools import combinations
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.journal.entries import Entry
from shopfloor.journal.errors import EntryError, JournalError, RefusedError
from shopfloor.journal.events import Journal, Recorder
from shopfloor.journal.migrations import OPEN
from shopfloor.journal.state import counting
from shopfloor.model.actuals import Key, Kind, Status
from shopfloor.model.calendar import Clock
from tests.journal.floor import CLOCK, LATE, MIN, issued, journal, machine, pieces, put, refused, strike, work

STARTED = work("started", "TQ-1", "WASH", 5)
FINISHED = work("finished", "TQ-1", "WASH", 33, good=10, scrap=1)


@pytest.fixture
def book() -> Journal:
    return journal()


def test_an_entry_stands_in_the_journal_as_it_was_said(book: Journal) -> None:
    put(book, replace(STARTED, who="Ann"), FINISHED)
    first, second, third = book.events()
    assert (first.kind, first.seq, len(first.pieces)) == (Kind.ISSUED, 1, 7)
    assert (second.key, second.unit, second.at_s, second.at) == (
        Key("TQ-1", "WASH"),
        1,
        300,
        "2026-03-02T06:05:00",
    )
    assert (second.who, second.entered, second.entered_s) == ("Ann", LATE.entered, LATE.now_s)
    assert third.data == {"good": 10, "scrap": 1}


# ---- refusals ----------------------------------------------------------------------------------------

REFUSALS = {
    "finish before start": (
        [FINISHED],
        ["TQ-1 on WASH has not been started; record its start first"],
    ),
    "finish earlier than the start": (
        [STARTED, work("finished", "TQ-1", "WASH", 4)],
        [
            "TQ-1 on WASH has not been started; record its start first",
            "No 2 (started, 06:05) would contradict it; undo or correct that entry first",
        ],
    ),
    "started twice": (
        [STARTED, work("started", "TQ-1", "WASH", 9)],
        ["TQ-1 on WASH is running since 06:05; undo that start if it is wrong"],
    ),
    "started after a stop": (
        [STARTED, work("stopped", "TQ-1", "WASH", 9, reason="x"), work("started", "TQ-1", "WASH", 12)],
        ["TQ-1 on WASH was started and is stopped since 06:09; record that it is resumed"],
    ),
    "stopped twice": (
        [
            STARTED,
            work("stopped", "TQ-1", "WASH", 9, reason="x"),
            work("stopped", "TQ-1", "WASH", 12, reason="x"),
        ],
        ["TQ-1 on WASH is stopped since 06:09; undo that stop if it is wrong"],
    ),
    "stopped after the finish": (
        [STARTED, FINISHED, work("stopped", "TQ-1", "WASH", 40, reason="x")],
        ["TQ-1 on WASH was finished at 06:33; undo that entry if it is wrong"],
    ),
    "two on one unit": (
        [work("started", "TQ-2", "CMM", 0), work("started", "TQ-1", "CMM", 10)],
        ["CMM runs TQ-2 on CMM since 06:00; record first that it is finished or stopped"],
    ),
    "two on one unit of a group": (
        [work("started", "TQ-2", "BENCH", 0), work("started", "TQ-3", "BENCH", 10, unit=1)],
        [
            "BENCH unit 1 runs TQ-2 on BENCH since 06:00; record first that it is finished or stopped, or "
            "name another of its 2 units"
        ],
    ),
    "one that ran then": (
        [
            work("started", "TQ-2", "CMM", 0),
            work("finished", "TQ-2", "CMM", 30),
            work("started", "TQ-1", "CMM", 10),
        ],
        ["CMM runs TQ-2 on CMM from 06:00 to 06:30; record first that it is finished or stopped"],
    ),
    "one order in two places": (
        [STARTED, work("started", "TQ-1", "CMM", 10)],
        ["TQ-1 runs on WASH since 06:05; record first that it is finished or stopped there"],
    ),
    "unknown order": (
        [work("started", "TQ-11", "WASH", 0)],
        ["there is no order TQ-11 in this shift; TQ-1 is the nearest; correct it, or add the order first"],
    ),
    "order and machine the wrong way round": (
        [work("started", "WASH", "TQ-1", 0)],
        [
            "there is no order WASH in this shift; the order comes first, then the machine; correct it, or "
            "add the order first",
            "there is no machine TQ-1 in this shift; the order comes first, then the machine; correct it",
        ],
    ),
    "a machine it does not visit": (
        [work("started", "TQ-2", "WASH", 0)],
        ["TQ-2 does not visit WASH; it visits BENCH, CMM; correct the machine"],
    ),
    "a piece too many": (
        [work("started", "TQ-3", "CMM", 0, piece=3)],
        ["TQ-3 has no piece 3 on CMM, only 1 to 2; correct the number"],
    ),
    "a unit too many": (
        [work("started", "TQ-2", "BENCH", 0, unit=3)],
        ["BENCH has no unit 3, only 1 to 2; correct the number"],
    ),
    "the future": (
        [work("started", "TQ-1", "WASH", 8 * 60 + 2)],
        ["14:02 is in the future, it is 14:00 now; correct the time"],
    ),
    "a time of day before the start": (
        [work("started", "TQ-1", "WASH", 23 * 60 + 45)],
        [
            "Tue 05:45 is in the future, it is 14:00 now (a time of day before 06:00 is taken as past "
            "midnight); correct the time"
        ],
    ),
    "before the shift": (
        [work("started", "TQ-1", "WASH", -1)],
        ["05:59 is before the start of the shift, 06:00; correct the time"],
    ),
    "a machine that is down": (
        [machine("down", "WASH", 2, reason="seal"), STARTED],
        ["WASH is down since 06:02 (seal); record first that it is up"],
    ),
    "a unit that is down": (
        [machine("down", "BENCH", 2, 1, reason="vice"), work("started", "TQ-2", "BENCH", 3)],
        ["BENCH unit 1 is down since 06:02 (vice); record first that it is up"],
    ),
    "down twice": (
        [machine("down", "WASH", 2, reason="seal"), machine("down", "WASH", 9, reason="door")],
        ["WASH is down since 06:02 (seal); undo that entry if it is wrong"],
    ),
    "down before it went down": (
        [machine("down", "WASH", 9, reason="seal"), machine("down", "WASH", 2, reason="door")],
        ["No 2 (down, 06:09) would contradict it; undo or correct that entry first"],
    ),
    "up but not down": (
        [machine("up", "WASH", 9)],
        ["WASH is not down at 06:09; record first that it went down"],
    ),
    "all up when one unit is down": (
        [machine("down", "BENCH", 2, 2, reason="vice"), machine("up", "BENCH", 9)],
        ["BENCH is not down at 06:09; BENCH unit 2 is; record first that it went down"],
    ),
    "an order that is there": (
        [Entry(Kind.ADDED, 60, order="TQ-1", data={"operations": [("CMM", 600)]})],
        ["order TQ-1 is in this shift already; change it instead"],
    ),
    "work on a cancelled order": (
        [Entry(Kind.CANCELLED, 60, order="TQ-1"), STARTED],
        ["TQ-1 was cancelled at 06:01; undo that entry if it is wrong"],
    ),
    "cancelled before it was worked on": (
        [STARTED, Entry(Kind.CANCELLED, 60, order="TQ-1")],
        ["TQ-1 was worked on at 06:05; correct the one time or the other"],
    ),
    "a new time for one of two pieces": (
        [Entry(Kind.CHANGED, 60, order="TQ-3", data={"operations": [("CMM", 600)]})],
        ["TQ-3 has 2 pieces on CMM; say which, as in CMM:2=30"],
    ),
    "striking out what later entries stand on": (
        [STARTED, FINISHED, strike(2)],
        ["No 3 (finished, 06:33) would contradict it; undo or correct that entry first"],
    ),
    "striking out twice": (
        [STARTED, strike(2), strike(2, id="again")],
        ["No 2 was corrected by No 3; correct that one instead"],
    ),
    "striking out nothing": (
        [strike(7)],
        ["there is no entry No 7; look it up with: shopfloor log show"],
    ),
    "striking out the plan": (
        [strike(1)],
        ["No 1 issued a plan; issue another plan instead"],
    ),
    "correcting a start by a stop": (
        [STARTED, work("stopped", "TQ-1", "WASH", 9, reason="x", corrects=2)],
        ["No 2 says started, not stopped; undo it, then record what happened"],
    ),
    "striking out an order that was worked on": (
        [
            Entry(Kind.ADDED, 60, order="TQ-9", data={"operations": [("CMM", 600)]}),
            work("started", "TQ-9", "CMM", 200),
            strike(2),
        ],
        ["TQ-9 has entries of its own, the first is No 3; undo those first"],
    ),
}


@pytest.mark.parametrize("case", REFUSALS)
def test_what_cannot_be_is_refused_with_its_reason_and_nothing_is_recorded(case: str, book: Journal) -> None:
    entries, reasons = REFUSALS[case]
    assert refused(book, *entries) == reasons


def test_a_refused_entry_may_be_recorded_with_a_mark(book: Journal) -> None:
    done = put(book, FINISHED, accept=True)[0]
    assert done.event.accepted == ("not-started",)
    assert done.notes == ("recorded although TQ-1 on WASH has not been started",)
    assert book.state().pieces[Key("TQ-1", "WASH")].status is Status.DONE
    assert [odd.rule for odd in book.state().odd] == ["not-started"]


def test_an_accepted_oddity_does_not_stand_in_the_way_of_what_follows(book: Journal) -> None:
    put(book, work("started", "TQ-2", "CMM", 0))
    put(book, work("started", "TQ-1", "CMM", 5), accept=True)
    put(book, work("stopped", "TQ-1", "CMM", 9, reason="x"), work("finished", "TQ-2", "CMM", 30))
    assert [event.accepted for event in book.events()] == [(), (), ("unit-busy",), (), ()]


def test_an_accepted_oddity_of_an_operation_does_not_either(book: Journal) -> None:
    put(book, STARTED)
    put(book, work("started", "TQ-1", "WASH", 9), accept=True)
    put(book, work("stopped", "TQ-1", "WASH", 12, reason="x"), work("finished", "TQ-1", "WASH", 30))
    assert [odd.rule for odd in book.state().odd] == ["already-running"]


def test_one_may_start_in_the_very_minute_in_which_the_other_ends(book: Journal) -> None:
    put(book, work("started", "TQ-2", "CMM", 0), work("finished", "TQ-2", "CMM", 30))
    put(book, work("started", "TQ-1", "CMM", 30), work("finished", "TQ-1", "CMM", 60))
    put(book, work("started", "TQ-1", "WASH", 60), work("started", "TQ-3", "CMM", 60))


def test_work_resumed_goes_on_where_it_ran_unless_another_unit_is_named(book: Journal) -> None:
    put(
        book,
        work("started", "TQ-2", "BENCH", 0, unit=2),
        work("stopped", "TQ-2", "BENCH", 5, reason="x"),
        work("resumed", "TQ-2", "BENCH", 6),
        work("stopped", "TQ-2", "BENCH", 8, reason="x"),
        work("resumed", "TQ-2", "BENCH", 9, unit=1),
    )
    assert [run.unit for run in book.state().pieces[Key("TQ-2", "BENCH")].runs] == [2, 2, 1]


def test_an_unknown_order_that_is_accepted_shows_in_the_state(book: Journal) -> None:
    put(book, work("started", "TQ-77", "CMM", 5), accept=True)
    piece = book.state(10 * MIN).pieces[Key("TQ-77", "CMM")]
    assert (piece.status, piece.left_s, piece.planned) == (Status.RUNNING, None, None)


def test_some_things_cannot_be_insisted_on(book: Journal) -> None:
    put(book, replace(STARTED, id="a"))
    for entry in (strike(9), strike(1), replace(FINISHED, id="a")):
        with pytest.raises(RefusedError):
            put(book, entry, accept=True)
    assert len(book.events()) == 2


# ---- repeats -----------------------------------------------------------------------------------------


def test_a_repeated_id_changes_nothing(book: Journal) -> None:
    said = replace(STARTED, id="scanner-1:17")
    put(book, said)
    before = book.events()
    again = book.record([said], LATE)[0]
    assert (again.repeat, again.event.seq) == (True, 2)
    late = book.record([replace(said, at_s=None)], LATE)[0]  # sent again by a client that lost the answer
    assert late.repeat
    assert book.events() == before


def test_an_id_cannot_be_used_for_something_else(book: Journal) -> None:
    put(book, replace(STARTED, id="17"))
    assert refused(book, replace(FINISHED, id="17")) == [
        "the id 17 belongs to No 2, which says something else; give another id"
    ]


def test_the_same_words_without_an_id_are_a_repeat_whoever_says_them(book: Journal) -> None:
    put(book, replace(STARTED, who="Ann"))
    assert put(book, replace(STARTED, who="Bo"))[0].repeat
    assert len(book.events()) == 2


def test_what_was_struck_out_may_be_said_again(book: Journal) -> None:
    put(book, STARTED, strike(2), STARTED, strike(4), STARTED)
    assert [event.kind for event in counting(book.events())[1:]].count(Kind.STARTED) == 1
    assert book.events()[-1].id.startswith(book.events()[1].id)


@settings(deadline=None, max_examples=60)
@given(st.data())
def test_recording_everything_twice_is_recording_it_once(data: st.DataObject) -> None:
    once, twice = journal(), journal()
    for number in range(data.draw(st.integers(1, 8))):
        entry = replace(data.draw(_possible()), id=f"id-{number}")
        for book, times in ((once, 1), (twice, 2)):
            for _ in range(times):
                book.record([entry], replace(LATE, accept=True))
    assert once.events() == twice.events()
    assert once.state() == twice.state()


def _possible() -> st.SearchStrategy[Entry]:
    keys = st.sampled_from([piece.key for piece in pieces()])
    kinds = st.sampled_from([Kind.STARTED, Kind.STOPPED, Kind.RESUMED, Kind.FINISHED])
    return st.builds(
        lambda kind, key, at: Entry(
            kind,
            at * MIN,
            order=key.order,
            machine=key.machine,
            piece=key.piece,
            data={"reason": "x"} if kind is Kind.STOPPED else {},
        ),
        kinds,
        keys,
        st.integers(0, 40),
    )


# ---- the rules against a plain reading of the whole journal -------------------------------------------


def _hangs_together(entries: list[Entry]) -> bool:
    """Whether entries with different times tell a possible story, read from the beginning each time."""
    spans: list[tuple[Key, int, float, float]] = []
    for key in {Key(e.order, e.machine, e.piece) for e in entries}:
        mine = sorted((e for e in entries if (e.order, e.machine, e.piece) == key), key=lambda e: e.at_s or 0)
        word = "".join(
            {"started": "a", "stopped": "b", "resumed": "c", "finished": "d"}[e.kind] for e in mine
        )
        if not re.fullmatch(r"a(bc)*(b?d?)", word):
            return False
        unit = next(piece.unit for piece in pieces() if piece.key == key)
        begun: float | None = None
        for entry in mine:
            if entry.kind in (Kind.STARTED, Kind.RESUMED):
                begun = entry.at_s or 0
            elif begun is not None:
                spans.append((key, unit, begun, entry.at_s or 0))
                begun = None
        if begun is not None:
            spans.append((key, unit, begun, float("inf")))
    for (one, unit, start, end), (other, unit2, start2, end2) in combinations(spans, 2):
        if one != other and start < end2 and start2 < end:
            if (one.machine, unit) == (other.machine, unit2):
                return False
            if one.order == other.order and one.machine != other.machine:
                return False
    return True


@settings(deadline=None, max_examples=150)
@given(st.lists(_possible(), max_size=14, unique_by=lambda entry: entry.at_s))
def test_an_entry_is_taken_exactly_if_the_whole_story_stays_possible(entries: list[Entry]) -> None:
    book, story = journal(), []
    for entry in entries:
        possible = _hangs_together([*story, entry])
        try:
            book.record([entry], LATE)
        except RefusedError:
            assert not possible, entry
        else:
            assert possible, entry
            story.append(entry)
    assert not book.state().odd
    assert len(book.events()) == 1 + len(story)


# ---- corrections -------------------------------------------------------------------------------------


def test_a_corrected_journal_stands_as_if_nobody_had_erred(book: Journal) -> None:
    put(book, work("started", "TQ-2", "CMM", 7))
    put(book, replace(work("started", "TQ-1", "WASH", 5), corrects=2), FINISHED)
    clean = journal()
    put(clean, STARTED, FINISHED)
    assert book.state() == clean.state()
    put(book, work("started", "TQ-2", "CMM", 7))  # the unit is free: the mistake holds nothing


def test_a_correction_keeps_its_place_among_entries_of_the_same_minute(book: Journal) -> None:
    stop = work("stopped", "TQ-1", "WASH", 10, reason="gauge")
    put(book, STARTED, stop, work("resumed", "TQ-1", "WASH", 10))
    put(book, replace(stop, data={"reason": "vice"}, corrects=3))
    piece = book.state().pieces[Key("TQ-1", "WASH")]
    assert (piece.status, [pause.reason for pause in piece.pauses]) == (Status.RUNNING, ["vice"])


def test_a_correction_can_be_corrected_and_struck_out(book: Journal) -> None:
    put(book, STARTED, replace(work("started", "TQ-1", "WASH", 6), corrects=2))
    put(book, replace(work("started", "TQ-1", "WASH", 7), corrects=3))
    assert book.state(20 * MIN).pieces[Key("TQ-1", "WASH")].start_s == 7 * MIN
    put(book, strike(4))
    assert book.state(20 * MIN).pieces[Key("TQ-1", "WASH")].start_s == 6 * MIN


def test_striking_out_a_strike_brings_the_entry_back_if_there_is_room(book: Journal) -> None:
    put(book, work("started", "TQ-1", "CMM", 5), strike(2), work("started", "TQ-2", "CMM", 9))
    assert refused(book, strike(3)) == [
        "CMM runs TQ-2 on CMM since 06:09; record first that it is finished or stopped"
    ]
    put(book, strike(4), strike(3))
    assert book.state(10 * MIN).pieces[Key("TQ-1", "CMM")].status is Status.RUNNING


def test_the_last_entry_of_a_person_is_found_for_undoing(book: Journal) -> None:
    put(book, replace(STARTED, who="Ann"), replace(machine("down", "CMM", 6, reason="x"), who="Bo"))
    assert (book.to_undo().seq, book.to_undo("Ann").seq) == (3, 2)
    put(book, strike(3))
    assert book.to_undo().seq == 2
    put(book, strike(2))
    assert book.to_undo() is None


# ---- time --------------------------------------------------------------------------------------------


def test_a_clock_set_back_a_little_never_makes_time_run_backwards(book: Journal) -> None:
    book.record([replace(STARTED, at_s=None)], Recorder(now_s=600))
    done = book.record([replace(FINISHED, at_s=None)], Recorder(now_s=560))[0]
    assert done.event.at_s == 600
    assert done.notes == ("this computer's clock went back by 40 s; the time of the last entry is taken",)


def test_a_clock_set_back_far_is_told_and_a_time_given_helps(book: Journal) -> None:
    book.record([replace(STARTED, at_s=None)], Recorder(now_s=3700))
    with pytest.raises(RefusedError) as caught:
        book.record([replace(FINISHED, at_s=None)], Recorder(now_s=120))
    assert str(caught.value) == (
        "this computer's clock shows 06:02, but the last entry was made at 07:01:40; set the clock right, or "
        "say when it happened"
    )
    book.record([replace(FINISHED, at_s=3720)], Recorder(now_s=3720))


def test_a_journal_does_not_take_the_next_day_for_its_shift(book: Journal) -> None:
    with pytest.raises(RefusedError) as caught:
        book.record([replace(STARTED, at_s=None)], Recorder(now_s=40 * 3600))
    assert str(caught.value) == (
        "Tue 22:00 is 32 h after the end of the shift; say when it happened, or choose the right journal"
    )


def test_a_plan_without_a_start_needs_a_time() -> None:
    book = journal(clock=Clock())
    with pytest.raises(EntryError) as caught:
        book.record([replace(STARTED, at_s=None)], Recorder())
    assert str(caught.value) == (
        "at '' is missing, and the plan has no start; give the time since then, as h:mm"
    )
    assert book.record([STARTED], Recorder())[0].event.at == "0:05:00"


# ---- many at once ------------------------------------------------------------------------------------


def test_entries_are_judged_in_order_of_time_and_returned_in_the_order_given(book: Journal) -> None:
    done = book.record([FINISHED, STARTED], LATE)
    assert [one.event.kind for one in done] == [Kind.FINISHED, Kind.STARTED]
    assert [event.kind for event in book.events()] == [Kind.ISSUED, Kind.STARTED, Kind.FINISHED]


def test_all_are_recorded_or_none_and_every_reason_is_told(book: Journal) -> None:
    bad = [work("started", "TQ-11", "WASH", 1), STARTED, machine("up", "CMM", 9)]
    with pytest.raises(RefusedError) as caught:
        book.record(bad, LATE)
    assert [(one.index, one.rule) for one in caught.value.refusals] == [(0, "order-unknown"), (2, "not-down")]
    assert len(book.events()) == 1


# ---- names, orders, plans ----------------------------------------------------------------------------


def test_names_are_found_whatever_their_case_and_kept_as_the_plan_spells_them(book: Journal) -> None:
    assert put(book, work("started", "tq-1", "wash", 5))[0].event.key == Key("TQ-1", "WASH")


def test_the_piece_that_must_be_meant_is_found(book: Journal) -> None:
    one, two = Key("TQ-3", "CMM", 1), Key("TQ-3", "CMM", 2)
    done = put(
        book,
        work("started", "TQ-3", "CMM", 0),
        work("finished", "TQ-3", "CMM", 20),
        work("started", "TQ-3", "CMM", 21),
        work("stopped", "TQ-3", "CMM", 25, reason="x"),
        work("resumed", "TQ-3", "CMM", 26),
        work("finished", "TQ-3", "CMM", 30),
    )
    assert [each.event.key for each in done] == [one, one, two, two, two, two]


def test_an_added_order_is_known_changed_and_cancelled(book: Journal) -> None:
    added = Entry(
        Kind.ADDED, 60, order="TQ-9", data={"operations": [("cmm", 1500), ("WASH", 600)], "due_s": 9000}
    )
    changed = Entry(Kind.CHANGED, 120, order="TQ-9", data={"operations": [("CMM", 1800), ("BENCH", 300)]})
    put(book, added, changed, Entry(Kind.CANCELLED, 180, order="TQ-9"))
    found = book.state()
    assert {key.machine: piece.total_s for key, piece in found.pieces.items() if key.order == "TQ-9"} == {
        "CMM": 1800,
        "WASH": 600,
        "BENCH": 300,
    }
    assert found.pieces[Key("TQ-9", "CMM")].status is Status.CANCELLED
    assert found.orders["TQ-9"].due_s == 9000


def test_a_change_names_one_of_several_pieces(book: Journal) -> None:
    put(book, Entry(Kind.CHANGED, 60, order="TQ-3", data={"operations": [("CMM:2", 1200)]}))
    assert book.state().pieces[Key("TQ-3", "CMM", 2)].total_s == 1200


@pytest.mark.parametrize("order", ["TQ-1", "TQ-3"])
def test_a_change_that_names_an_operation_twice_is_refused(book: Journal, order: str) -> None:
    name = "CMM" if order == "TQ-1" else "CMM:2"
    with pytest.raises(EntryError, match="operations 'CMM' is given twice; give each"):
        put(book, Entry(Kind.CHANGED, 60, order=order, data={"operations": [(name, 60), (name, 90)]}))


def test_a_change_of_a_piece_that_is_not_there_is_refused(book: Journal) -> None:
    change = Entry(Kind.CHANGED, 60, order="TQ-3", data={"operations": [("CMM:3", 60)]})
    assert refused(book, change) == ["TQ-3 has no piece 3 on CMM, only 1 to 2; correct the number"]


def test_an_added_order_may_visit_a_machine_twice(book: Journal) -> None:
    put(book, Entry(Kind.ADDED, 60, order="TQ-9", data={"operations": [("CMM", 60), ("CMM", 90)]}))
    found = book.state().pieces
    assert [found[Key("TQ-9", "CMM", number)].total_s for number in (1, 2)] == [60, 90]


def test_a_correction_means_the_piece_and_unit_of_what_it_corrects(book: Journal) -> None:
    put(book, work("started", "TQ-3", "CMM", 5), replace(work("started", "TQ-3", "CMM", 6), corrects=2))
    assert book.events()[-1].piece == 1
    put(book, work("started", "TQ-2", "BENCH", 5, unit=2))
    put(book, replace(work("started", "TQ-2", "BENCH", 6), corrects=4))
    assert book.events()[-1].unit == 2


@settings(deadline=None, max_examples=80)
@given(st.data())
def test_what_is_kept_beside_the_entries_is_what_the_entries_say(data: st.DataObject) -> None:
    book = journal()
    for _ in range(data.draw(st.integers(1, 14))):
        last = book.events()[-1].seq
        corrects = data.draw(st.sampled_from([0, *range(2, last + 1)]))
        entry = replace(data.draw(_possible()), corrects=corrects)
        if corrects and data.draw(st.booleans()):
            entry = strike(corrects)
        with contextlib.suppress(RefusedError):  # some cannot be insisted on
            put(book, entry, accept=True)
    events = book.events()
    standing = {event.seq for event in counting(events)}
    assert standing == {event.seq for event in events if book._lookup.counts(event.seq)}
    kept = sorted(book._connection.execute("SELECT order_id, machine, piece, unit, start_s, end_s FROM run"))
    runs = [
        (*key, run.unit, run.start_s, run.until(OPEN))
        for key, piece in book.state().pieces.items()
        for run in piece.runs
    ]
    assert kept == sorted(runs)


def test_another_plan_is_issued_into_the_same_shift(book: Journal) -> None:
    put(book, STARTED)
    row = ("TQ-1", "WASH", 1, 5, 40)
    plan = issued([row], sha256="1" * 64)
    done = book.issue(plan, Recorder(now_s=20 * MIN))
    assert (done.event.seq, done.event.at_s) == (3, 20 * MIN)
    assert book.issue(plan, Recorder(now_s=25 * MIN)).repeat
    assert book.plan().data["sha256"] == "1" * 64
    assert book.state(30 * MIN).pieces[Key("TQ-1", "WASH")].left_s == 10 * MIN


def test_a_wrong_time_is_told_alone_but_for_wrong_names(book: Journal) -> None:
    """What else contradicts the journal then may follow from it."""
    put(book, work("started", "TQ-1", "WASH", 5))
    early = work("started", "TQ-1", "CMM", -5)
    assert refused(book, early) == ["05:55 is before the start of the shift, 06:00; correct the time"]
    assert len(refused(book, work("started", "TQ-9", "CMM", -5))) == 2


def test_a_plan_of_another_shift_is_refused(book: Journal) -> None:
    other = issued(clock=Clock(CLOCK.start.replace(day=3)), sha256="1" * 64)
    with pytest.raises(JournalError) as caught:
        book.issue(other, LATE)
    assert str(caught.value) == (
        "cannot write memory: its shift starts 2026-03-02T06:00:00, the plan's 2026-03-03T06:00:00; open a "
        "new journal for it"
    )


@pytest.mark.parametrize(
    ("now", "at", "words"),
    [
        (100 * 86400, None, "is 99 days after the end of the shift; say when it happened"),
        (3600, 7200, "08:00 is in the future, it is 07:00 now; correct the time"),
    ],
)
def test_a_plan_takes_force_during_its_shift(book: Journal, now: int, at: int | None, words: str) -> None:
    with pytest.raises(RefusedError) as caught:
        book.issue(issued(sha256="1" * 64), Recorder(now_s=now), at_s=at)
    (why,) = caught.value.refusals
    assert why.final
    assert words in why.text()


def test_a_plan_of_another_time_zone_is_of_another_shift(book: Journal) -> None:
    with pytest.raises(JournalError) as caught:
        book.issue(issued(clock=replace(CLOCK, zone=ZoneInfo("Europe/London")), sha256="1" * 64), LATE)
    assert str(caught.value) == (
        "cannot write memory: its shift starts 2026-03-02T06:00:00, the plan's 2026-03-02T06:00:00 "
        "Europe/London; open a new journal for it"
    )


# ---- values ------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("entry", "message"),
    [
        (work("stopped", "TQ-1", "WASH", 5), "reason '' is missing; say why in a few words"),
        (machine("down", "WASH", 5), "reason '' is missing; say why in a few words"),
        (
            work("finished", "TQ-1", "WASH", 5, good=-1),
            "good '-1' is no whole number from 0 to 10,000,000; correct it",
        ),
        (work("started", "TQ-1", "WASH", 5, good=1), "good '1' says nothing for started; leave it out"),
        (work("started", "", "WASH", 5), "order '' is missing; give the order"),
        (work("down", "TQ-1", "WASH", 5, reason="x"), "order 'TQ-1' says nothing for down; leave it out"),
        (
            work("started", "TQ\x1b[2J", "WASH", 5),
            "order 'TQ?[2J' holds an invisible character (U+001B); delete it",
        ),
        (
            work("started", "A" * 81, "WASH", 5),
            f"order '{'A' * 40}…' has 81 characters, more than 80; shorten it",
        ),
        (Entry(Kind.CREW, 0), "heads '' is missing; give the number of people present"),
        (
            Entry(Kind.CREW, 0, data={"heads": 10_001}),
            "heads '10001' is no whole number from 0 to 10,000; correct it",
        ),
        (
            Entry(Kind.CHANGED, 0, order="TQ-1"),
            "order 'TQ-1' is not changed in any way; give what is to change",
        ),
        (
            Entry(Kind.ADDED, 0, order="TQ-9", data={"operations": [("CMM", 0)]}),
            "minutes '0' is no time above zero; write minutes, or h:mm",
        ),
        (
            Entry(Kind.CHANGED, 0, order="TQ-1", data={"priority": 0}),
            "priority '0' is no number above 0 and up to 1,000; correct it",
        ),
        (Entry(Kind.REMARK, 0), "text '' is missing; give the remark"),
        (
            work("started", "TQ-1", "WASH", 10**7),
            "at '600000000' is more than a year from the shift; check the date",
        ),
    ],
)
def test_unusable_values_are_told_in_exact_words(entry: Entry, message: str, book: Journal) -> None:
    with pytest.raises(EntryError) as caught:
        put(book, entry)
    assert str(caught.value) == message
    assert len(book.events()) == 1


def test_nobody_alters_or_deletes_an_entry(book: Journal) -> None:
    put(book, STARTED)
    for statement in (
        "UPDATE event SET at_s = 0",
        "DELETE FROM event",
        "DELETE FROM visit",
        "UPDATE visit SET unit = 2",
    ):
        with pytest.raises(sqlite3.IntegrityError, match="a journal is append-only"):
            book._connection.execute(statement)
