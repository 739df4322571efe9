"""The state of a shift: any events give one, arrival does not matter, and corrections leave no trace."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from shopfloor.journal.entries import Entry
from shopfloor.journal.state import state
from shopfloor.model.actuals import Event, Key, Kind, ShiftState, Status
from tests.journal.floor import MIN, event, machine, pieces, plan_event, strike, work

KEYS = [piece.key for piece in pieces()]
patient = settings(deadline=None)


@st.composite
def entries(draw: st.DrawFn) -> Entry:
    """Any entry that names things of the floor, possible or not; times in whole minutes."""
    kind = draw(st.sampled_from([kind for kind in Kind if kind not in (Kind.ISSUED, Kind.WITHDRAWN)]))
    key = draw(st.sampled_from(KEYS))
    at = draw(st.integers(-5, 120))
    if kind in (Kind.DOWN, Kind.UP):
        return machine(kind, key.machine, at, draw(st.integers(0, 2)), reason="seal")
    if kind is Kind.CREW:
        return Entry(kind, at * MIN, data={"heads": draw(st.integers(0, 5))})
    if kind is Kind.REMARK:
        return Entry(kind, at * MIN, data={"text": "word"})
    if kind in (Kind.ADDED, Kind.CHANGED, Kind.CANCELLED):
        return Entry(kind, at * MIN, order=key.order, data={"due_s": 3600 * draw(st.integers(0, 5))})
    data = {
        Kind.STOPPED: {"reason": "gauge"},
        Kind.FINISHED: {"good": draw(st.integers(0, 9)), "scrap": draw(st.integers(0, 2))},
        Kind.LEFT: {"left_s": draw(st.integers(0, 50)) * MIN},
    }.get(kind, {})
    unit = draw(st.integers(0, 2)) if kind in (Kind.STARTED, Kind.RESUMED) else 0
    return Entry(kind, at * MIN, order=key.order, machine=key.machine, piece=key.piece, unit=unit, data=data)


def recorded(listed: list[Entry]) -> list[Event]:
    """Return a journal of these entries, in this order, its plan first."""
    return [plan_event(), *(event(seq, entry) for seq, entry in enumerate(listed, 2))]


def without_places(found: ShiftState) -> tuple[ShiftState, list[str]]:
    """Return a state whose oddities are told by their rules alone."""
    return replace(found, odd=()), sorted(odd.rule for odd in found.odd)


@patient
@given(st.lists(entries(), max_size=25), st.integers(-10, 200))
def test_every_prefix_has_a_state_that_hangs_together(listed: list[Entry], minute: int) -> None:
    events = recorded(listed)
    for count in range(len(events) + 1):
        found = state(events[:count], minute * MIN)
        assert set(found.pieces) >= (set(KEYS) if count and minute >= 0 else set())
        for piece in found.pieces.values():
            over = piece.status in (Status.DONE, Status.CANCELLED)
            assert piece.left_s == 0 if over else piece.left_s is None or piece.left_s >= 60
            assert (piece.end_s is not None) == (piece.status is Status.DONE)
            assert 0 <= piece.run_s <= sum(run.until(found.at_s) - run.start_s for run in piece.runs)
            assert all(run.end_s is not None for run in piece.runs[:-1])
            assert all(a.until(found.at_s) <= b.start_s for a, b in pairwise(piece.runs))
            assert bool(piece.why or piece.status is not Status.BLOCKED)


@patient
@given(
    st.lists(entries(), max_size=12, unique_by=lambda entry: entry.at_s), st.randoms(use_true_random=False)
)
def test_the_order_of_arrival_does_not_matter_where_times_differ(listed: list[Entry], random: object) -> None:
    shuffled = list(listed)
    random.shuffle(shuffled)
    for minute in (None, 30, 60, 130):
        at_s = None if minute is None else minute * MIN
        assert without_places(state(recorded(listed), at_s)) == without_places(
            state(recorded(shuffled), at_s)
        )


@patient
@given(st.lists(entries(), min_size=1, max_size=10), entries(), st.data())
def test_a_correction_equals_never_having_erred(
    listed: list[Entry], wrong: Entry, data: st.DataObject
) -> None:
    right = recorded(listed)
    place = data.draw(st.integers(1, len(listed)), label="which entry was wrong")
    erred = list(right)
    erred[place] = event(place + 1, wrong)
    correction = event(len(right) + 1, replace(listed[place - 1], corrects=place + 1), place=place + 1)
    for minute in (None, 40, 130):
        at_s = None if minute is None else minute * MIN
        assert state([*erred, correction], at_s) == state(right, at_s)


@patient
@given(st.lists(entries(), min_size=1, max_size=10), entries(), st.integers(0, 10), st.integers(0, 130))
def test_striking_out_equals_never_having_recorded_and_striking_that_out_brings_it_back(
    listed: list[Entry], wrong: Entry, index: int, minute: int
) -> None:
    index = min(index, len(listed))
    without = recorded(listed)
    seqs = [one for one in range(2, len(listed) + 3) if one != index + 2]
    apart = [without[0], *(event(seq, entry) for seq, entry in zip(seqs, listed, strict=True))]
    error, last = event(index + 2, wrong), len(listed) + 3
    struck = event(last, strike(error.seq))
    back = event(last + 1, strike(last))
    at_s = minute * MIN
    assert state([*apart, error, struck], at_s) == state(apart, at_s)
    assert state([*apart, error, struck, back], at_s) == state([*apart, error], at_s)


@st.composite
def histories(draw: st.DrawFn) -> tuple[list[Entry], dict[Key, set[int]], int]:
    """Possible histories: entries, the seconds each operation ran while its machine was up, and now."""
    moment = st.integers(0, 240)
    now = draw(st.integers(0, 260))
    down: dict[str, list[tuple[int, int]]] = {}
    listed: list[Entry] = []
    for name in ("WASH", "CMM", "BENCH"):
        times = sorted(draw(st.lists(moment, max_size=6, unique=True)))
        for index, at in enumerate(times):
            kind = Kind.UP if index % 2 else Kind.DOWN
            listed.append(Entry(kind, at, machine=name, data={"reason": "seal"} if kind is Kind.DOWN else {}))
        ends = [*times, 10**6] if len(times) % 2 else times
        down[name] = list(zip(ends[::2], ends[1::2], strict=True))
    ran: dict[Key, set[int]] = {}
    for key in KEYS:
        times = sorted(draw(st.lists(moment, max_size=7, unique=True)))
        kinds = [Kind.STARTED, *([Kind.STOPPED, Kind.RESUMED] * 3)][: len(times)]
        if len(kinds) > 1 and draw(st.booleans()):
            kinds[-1] = Kind.FINISHED
        for kind, at in zip(kinds, times, strict=True):
            data = {"reason": "gauge"} if kind is Kind.STOPPED else {}
            listed.append(Entry(kind, at, order=key.order, machine=key.machine, piece=key.piece, data=data))
        ends = [*times, now] if kinds and kinds[-1] in (Kind.STARTED, Kind.RESUMED) else times
        spans = zip(ends[::2], ends[1::2], strict=False)
        seconds = {second for start, end in spans for second in range(start, min(end, now))}
        seconds -= {s for start, end in down[key.machine] for s in range(start, min(end, now))}
        ran[key] = seconds
    return listed, ran, now


@patient
@given(histories())
def test_run_and_left_agree_with_counting_second_by_second(
    history: tuple[list[Entry], dict[Key, set[int]], int],
) -> None:
    listed, ran, now = history
    found = state(recorded(listed), now)
    assert not found.odd
    for piece in pieces():
        stands = found.pieces[piece.key]
        assert stands.run_s == len(ran[piece.key])
        if stands.status is not Status.DONE:
            assert stands.left_s == max(60, piece.seconds - len(ran[piece.key]))


# ---- by example --------------------------------------------------------------------------------------


def at(minute: float, *listed: Entry) -> ShiftState:
    return state(recorded(list(listed)), round(minute * MIN))


WASH, CMM = Key("TQ-1", "WASH"), Key("TQ-2", "CMM")
STARTED = work("started", "TQ-1", "WASH", 5)


def test_work_that_runs_has_the_rest_of_its_plan_left_and_never_less_than_a_minute() -> None:
    for minute, left in ((5, 30), (25, 10), (34, 1), (90, 1)):
        piece = at(minute, STARTED).pieces[WASH]
        assert (piece.status, piece.left_s) == (Status.RUNNING, left * MIN)
    found = state(recorded([STARTED]), 90 * MIN, minimum_left_s=300)
    assert found.pieces[WASH].left_s == 300


def test_what_is_reported_left_counts_from_then_on() -> None:
    report = work("left", "TQ-1", "WASH", 10, left_s=50 * MIN)
    assert at(9, STARTED, report).pieces[WASH].left_s == 26 * MIN
    assert at(20, STARTED, report).pieces[WASH].left_s == 40 * MIN


def test_stopped_work_is_blocked_keeps_what_is_left_and_says_why() -> None:
    stopped = work("stopped", "TQ-1", "WASH", 15, reason="no gauge")
    piece = at(60, STARTED, stopped).pieces[WASH]
    assert (piece.status, piece.left_s, piece.why, piece.blocked_s) == (
        Status.BLOCKED,
        20 * MIN,
        "stopped: no gauge",
        15 * MIN,
    )
    piece = at(70, STARTED, stopped, work("resumed", "TQ-1", "WASH", 60)).pieces[WASH]
    assert (piece.status, piece.run_s, piece.left_s) == (Status.RUNNING, 20 * MIN, 10 * MIN)


def test_a_machine_down_blocks_what_runs_and_what_waits_and_stops_the_count() -> None:
    down, up = machine("down", "WASH", 10, reason="seal"), machine("up", "WASH", 40)
    found = at(30, STARTED, down)
    assert (found.pieces[WASH].status, found.pieces[WASH].left_s) == (Status.BLOCKED, 25 * MIN)
    assert not found.machines["WASH"].up
    assert at(30, down).pieces[WASH].why == "machine down: seal"
    assert at(45, STARTED, down, up).pieces[WASH].left_s == 20 * MIN
    assert at(45, STARTED, down, up).machines["WASH"].up


def test_one_unit_down_blocks_only_what_runs_there() -> None:
    two, three = work("started", "TQ-2", "BENCH", 1, unit=1), work("started", "TQ-3", "BENCH", 1, unit=2)
    found = at(20, two, three, machine("down", "BENCH", 10, 2, reason="vice"))
    assert found.pieces[Key("TQ-2", "BENCH")].status is Status.RUNNING
    assert found.pieces[Key("TQ-3", "BENCH")].status is Status.BLOCKED
    assert found.machines["BENCH"].up
    waiting = at(20, machine("down", "BENCH", 10, 2, reason="vice"))
    assert waiting.pieces[Key("TQ-3", "BENCH")].status is Status.WAITING


def test_only_outages_of_its_own_unit_and_of_the_whole_machine_hold_work_up() -> None:
    three = work("started", "TQ-3", "BENCH", 0, unit=2)
    outages = (
        machine("down", "BENCH", 2, 1, reason="vice"),  # the other unit
        machine("down", "BENCH", 5, 2, reason="vice"),
        machine("down", "BENCH", 8, reason="power"),
        machine("up", "BENCH", 10, 2),
        machine("up", "BENCH", 15),
    )
    assert at(20, three, *outages).pieces[Key("TQ-3", "BENCH")].run_s == 10 * MIN


def test_finished_work_counts_good_and_scrap() -> None:
    found = at(60, STARTED, work("finished", "TQ-1", "WASH", 33, good=9, scrap=1))
    piece = found.pieces[WASH]
    assert (piece.status, piece.start_s, piece.end_s, piece.left_s) == (Status.DONE, 5 * MIN, 33 * MIN, 0)
    assert (found.good, found.scrap) == (9, 1)


def test_a_cancelled_order_is_cancelled_where_it_does_not_run() -> None:
    cancel = Entry(Kind.CANCELLED, 20 * MIN, order="TQ-1", data={"reason": "customer"})
    found = at(30, STARTED, cancel)
    assert found.pieces[WASH].status is Status.RUNNING
    assert found.pieces[Key("TQ-1", "CMM")].status is Status.CANCELLED
    assert found.orders["TQ-1"].cancelled_s == 20 * MIN


def test_crew_is_as_last_said_by_pool() -> None:
    said = [Entry(Kind.CREW, 0, data={"heads": 4}), Entry(Kind.CREW, 60, data={"heads": 2, "pool": "weld"})]
    assert at(0.5, *said).crew == {"": 4}
    assert at(2, *said, Entry(Kind.CREW, 90, data={"heads": 3})).crew == {"": 3, "weld": 2}


def test_an_order_added_waits_with_its_own_times_and_a_change_is_taken_over() -> None:
    key = Key("TQ-9", "CMM")
    added = event(2, Entry(Kind.ADDED, 60, order="TQ-9", data={"due_s": 7200}), pieces=(_rest(key, 25),))
    changed = event(
        3, Entry(Kind.CHANGED, 120, order="TQ-9", data={"priority": 5.0}), pieces=(_rest(key, 30),)
    )
    events = [plan_event(), added, changed]
    assert key not in state(events, 0).pieces
    assert state(events, 60).pieces[key].left_s == 25 * MIN
    found = state(events, 120)
    assert (found.pieces[key].left_s, found.pieces[key].planned) == (30 * MIN, None)
    order = found.orders["TQ-9"]
    assert (order.added_s, order.due_s, order.priority) == (60, 7200, 5.0)


def _rest(key: Key, minutes: int) -> object:
    return replace(pieces()[0], key=key, seconds=minutes * MIN, start_s=None, end_s=None)


def test_a_plan_issued_while_work_is_under_way_says_what_is_left_of_it() -> None:
    row = replace(pieces()[0], start_s=5 * MIN, end_s=50 * MIN, seconds=45 * MIN)
    again = Event(seq=3, id="again", kind=Kind.ISSUED, at_s=20 * MIN, place=3, pieces=(row,))
    events = [plan_event(), event(2, STARTED), again]
    assert state(events, 19 * MIN).pieces[WASH].left_s == 16 * MIN
    found = state(events, 25 * MIN)
    assert found.plan == 3
    assert found.pieces[WASH].left_s == 25 * MIN
    assert found.pieces[WASH].total_s == 30 * MIN  # what it was to take when it started
    assert CMM not in found.pieces  # no longer planned, and never begun


@pytest.mark.parametrize(
    ("listed", "rules", "status"),
    [
        ([work("finished", "TQ-1", "WASH", 9)], ["not-started"], Status.DONE),
        ([work("stopped", "TQ-1", "WASH", 9, reason="x")], ["not-started"], Status.WAITING),
        ([STARTED, STARTED], ["already-running"], Status.RUNNING),
        (
            [STARTED, work("finished", "TQ-1", "WASH", 9), work("started", "TQ-1", "WASH", 20)],
            ["already-finished"],
            Status.RUNNING,
        ),
        ([machine("up", "WASH", 3)], ["not-down"], Status.WAITING),
    ],
)
def test_what_cannot_be_is_listed_and_taken_in_the_likeliest_sense(
    listed: list[Entry], rules: list[str], status: Status
) -> None:
    found = at(60, *listed)
    assert [odd.rule for odd in found.odd] == rules
    assert found.pieces[WASH].status is status
