"""Replans of shifts that go wrong: legal, true to the journal, exact where that can be, and moving little.

Every call of `replan` audits its plan three times, sharing nothing with what made it: against the shop that
is left, as it is written, and against the journal. A violation is an error, so a test that gets an answer has
been judged; what follows checks what the audits do not.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.errors import NoPlanError
from shopfloor.journal.entries import Entry
from shopfloor.journal.events import Journal
from shopfloor.journal.state import counting
from shopfloor.model.actuals import Kind, Status
from shopfloor.model.results import Plan
from shopfloor.model.shop import Shop
from shopfloor.openshop.choose import choose
from shopfloor.openshop.floor.plan import floor_plan
from shopfloor.openshop.method import Effort, Progress
from shopfloor.pipeline import Options, plan
from shopfloor.render.tables import plan_json
from shopfloor.replan.current import current
from shopfloor.replan.remaining import remaining
from shopfloor.replan.told import told
from shopfloor.rolling.plan import Replan, replan
from tests.rolling.shifts import disrupt, hall, issue, listed_plan, opened, play, put, rounds_hall

QUICK = Options(time_limit_s=2)
AMPLE = Options(time_limit_s=3600)  # never used up by a count of steps


def anew(shop: Shop, book: Journal, now_s: int, options: Options = QUICK, **more: object) -> Replan:
    return replan(shop, book.events(), now_s, options=options, **more)  # type: ignore[arg-type]


def by_steps(shop: Shop, options: Options | None = None, **more: object) -> Plan:
    """A plan that is the same on any machine: by an exact method, else by a count of steps and no clock."""
    method, choice = choose(shop)
    if method.reaches_bound:
        return plan(shop, options, **more)  # type: ignore[arg-type]
    found = floor_plan(shop, effort=Effort(time_limit_s=AMPLE.time_limit_s), rounds=1)
    assert found.schedule is not None
    return Plan(shop, found.schedule, lower_bounds(shop), choice, repeatable=found.repeatable)


@pytest.fixture
def without_clock(monkeypatch: pytest.MonkeyPatch) -> None:
    """Fresh plans within a replan take a count of steps, too, so that two replans can be compared."""
    monkeypatch.setattr("shopfloor.rolling.plan.plan_fresh", by_steps)


@pytest.mark.parametrize("seed", range(30))
def test_a_shift_that_goes_wrong_again_and_again_is_replanned_each_time(seed: int) -> None:
    shop = hall(seed)
    made = listed_plan(shop, seed)
    assert made is not None
    book, now_s = opened(made), 0
    step = max(60, made.makespan_s // 4 // 60 * 60)
    for number in range(3):
        play(book, made, now_s, now_s + step, seed + number, wobble=0.15)
        now_s += step
        disrupt(book, shop, now_s, seed * 10 + number)
        found = anew(shop, book, now_s)
        assert found.plan.lower_bound_s <= found.plan.makespan_s
        issue(book, found, now_s)
        made = found.plan
    assert accounted_for(shop, book, now_s)


def accounted_for(shop: Shop, book: Journal, now_s: int) -> bool:
    """Whether each operation of the shift is done, left, or cancelled."""
    here, said = book.state(now_s), told(counting(book.events()), now_s)
    now = current(shop, here, said)
    left = {one.operation for one in remaining(now, here, said)}
    lost = {name for name, order in here.orders.items() if order.cancelled_s is not None}
    return all(
        index in left
        or any(piece.status is Status.DONE and not piece.failed for piece in pieces)
        or now.shop.orders.ids[int(now.shop.operations.job[index])] in lost
        for index, pieces in enumerate(now.pieces)
    )


@pytest.mark.parametrize("seed", range(12))
def test_where_all_goes_as_planned_nothing_moves_and_it_ends_no_later(seed: int) -> None:
    """The old sequence is always among what is chosen from, however little time there is."""
    shop = hall(seed)
    made = by_steps(shop)
    book, now_s = opened(made), made.makespan_s // 3 // 60 * 60
    play(book, made, 0, now_s, 0)
    found = anew(shop, book, now_s)
    assert found.plan.makespan_s <= made.makespan_s
    if found.plan.makespan_s == made.makespan_s and found.plan.late_orders() == made.late_orders():
        assert found.moves.moved == 0
        assert found.comparison.counts.keys() <= {"same", "passed"}


def test_the_old_sequence_is_timed_even_if_there_is_no_time() -> None:
    shop = hall(3)
    made = by_steps(shop)
    book = opened(made)
    play(book, made, 0, 1800, 0)
    found = anew(shop, book, 1800, Options(time_limit_s=1e-9))
    assert found.plan.makespan_s <= made.makespan_s
    assert not found.plan.repeatable


def test_progress_is_that_of_the_whole_replan_on_the_clock_of_the_shift(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    """A search within tells of its own time and of a clock that starts at begin; the lead sees neither."""

    def fresh(shop: Shop, options: Options, report: Callable[[Progress], None], **more: object) -> Plan:
        report(Progress("lists", 7200, 3600, options.time_limit_s))
        return by_steps(shop)

    monkeypatch.setattr("shopfloor.rolling.plan.plan_fresh", fresh)
    shop, said = hall(5), list[Progress]()
    made = by_steps(shop)
    book = opened(made)
    play(book, made, 0, 1800, 3, wobble=0.2)
    found = anew(shop, book, 1800, AMPLE, report=said.append)
    assert found.rest.begin_s == 1800
    assert (said[0].stage, said[0].best_s, said[0].bound_s) == ("lists", 9000, 5400)
    left = [progress.left_s for progress in said]
    assert left == sorted(left, reverse=True)
    assert AMPLE.time_limit_s / 2 < left[0] <= AMPLE.time_limit_s
    moves = [progress.best_s for progress in said if progress.stage == "moves"]
    assert moves[-1] == found.plan.makespan_s


@pytest.mark.usefixtures("without_clock")
@pytest.mark.parametrize("seed", [0, 5])
def test_the_same_journal_gives_the_same_bytes(seed: int) -> None:
    shop = hall(seed)
    made = by_steps(shop)
    book = opened(made)
    play(book, made, 0, 3000, 1, wobble=0.1)
    disrupt(book, shop, 3000, 7)
    one, two = (anew(shop, book, 3000, AMPLE).plan for _ in range(2))
    assert one.repeatable
    assert plan_json(one) == plan_json(two)


# ---- rounds ------------------------------------------------------------------------------------------


def degree(shop: Shop) -> int:
    """The fewest rounds of a unit shop, by König's theorem."""
    units = np.array([machine.count for machine in shop.machines])
    machine = -(-np.bincount(shop.operations.machine, minlength=len(units)) // units)
    return int(max(np.bincount(shop.operations.job).max(), machine.max())) if len(shop) else 0


@pytest.mark.parametrize("seed", range(8))
@pytest.mark.parametrize("groups", [False, True], ids=["single", "groups"])
def test_rounds_go_on_in_the_fewest_that_can_hold_the_rest(seed: int, groups: bool) -> None:
    shop = rounds_hall(seed, groups=groups)
    made = plan(shop, QUICK)
    book = opened(made)
    play(book, made, 0, 3600, seed)
    put(book, [Entry(Kind.ADDED, 3600, order="HOT", data={"operations": [("M0", 1800), ("M1", 1800)]})])
    found = anew(shop, book, 3600)
    assert found.plan.proved_optimal
    assert found.plan.makespan_s == 3600 + 1800 * degree(found.rest.shop)
    assert (found.plan.schedule.round >= 3).all()
    assert found.scratch is not None
    assert found.moves.weight <= found.scratch.weight


@pytest.mark.parametrize("seed", range(4))
def test_rounds_under_a_crew_stay_within_it(seed: int) -> None:
    shop = rounds_hall(seed, crew=2)
    made = plan(shop, QUICK)
    book = opened(made)
    play(book, made, 0, 3600, seed)
    found = anew(shop, book, 3600)
    assert found.plan.proved_optimal
    rest = found.rest.shop
    assert found.plan.makespan_s == 3600 + 1800 * max(degree(rest), -(-len(rest) // 2))


def test_one_missed_operation_moves_few_others_in_mended_rounds() -> None:
    """An operation that was not run in its round is put in by exchanges of two rounds along one path."""
    shop = rounds_hall(3)
    made = plan(shop, QUICK)
    book = opened(made)
    play(book, made, 0, 1800, 0)
    first = next(e for e in book.events() if e.kind is Kind.STARTED)
    put(book, [Entry(Kind.WITHDRAWN, corrects=e.seq) for e in reversed(book.events()) if e.key == first.key])
    found = anew(shop, book, 1800)
    assert found.scratch is not None
    assert found.moves.moved < found.scratch.moved
    assert found.plan.proved_optimal


def test_work_across_the_next_round_ends_exactness_and_says_so() -> None:
    shop = rounds_hall(1)
    made = plan(shop, QUICK)
    book = opened(made)
    play(book, made, 0, 2400, 0)
    running = next(piece for piece in book.state(2400).pieces.values() if piece.start_s == 1800)
    left = Entry(Kind.LEFT, 2400, order=running.key.order, machine=running.key.machine, data={"left_s": 3000})
    put(book, [left])
    found = anew(shop, book, 2400)
    assert found.rest.begin_s == 2400
    said = [remark for remark in found.plan.remarks if "no longer goes in rounds" in remark]
    assert said == [
        "The rest no longer goes in rounds, for which the fewest are proved: "
        f"{running.key.order} on {running.key.machine} runs until 07:30, across the start of the next round "
        "at 07:00."
    ]


def test_a_round_begins_a_little_later_for_work_that_overruns() -> None:
    shop = rounds_hall(1)
    made = plan(shop, QUICK)
    book = opened(made)
    play(book, made, 0, 2400, 0)
    running = next(piece for piece in book.state(2400).pieces.values() if piece.start_s == 1800)
    left = Entry(Kind.LEFT, 2400, order=running.key.order, machine=running.key.machine, data={"left_s": 1380})
    put(book, [left])
    found = anew(shop, book, 2400)
    assert found.rest.begin_s == 3780
    assert found.plan.proved_optimal
    assert int(found.plan.schedule.round.min()) == 3


# ---- stability ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("minutes", [0, 10, 60])
def test_a_plan_is_no_worse_than_the_best_its_own_search_found_by_more_than_it_may(minutes: int) -> None:
    """What a search finds depends on its machine; what it makes of that does not."""
    shop = hall(17)
    made = by_steps(shop)
    book = opened(made)
    play(book, made, 0, 1800, 3, wobble=0.2)
    put(book, [Entry(Kind.ADDED, 1800, order="HOT", data={"operations": [("M0", 1800)], "due_s": 4000})])
    found = anew(shop, book, 1800, stability_s=minutes * 60)
    assert all(seconds <= minutes * 60 for _, seconds in found.worse_s)
    if not minutes:
        assert not any(seconds for _, seconds in found.worse_s)
    for trade in found.trades:
        assert trade.moves.moved < found.moves.moved
        assert trade.moves.weight < found.moves.weight
        assert minutes * 60 < trade.stability_s


def test_what_should_have_begun_and_is_not_recorded_is_told_of() -> None:
    shop = rounds_hall(2)
    made = plan(shop, QUICK)
    found = anew(shop, opened(made), 1800)
    missing = int((made.schedule.start_s == 0).sum())
    assert (
        f"{missing} operations were to begin before 06:30 and nothing is recorded of them; they are planned "
        "as not begun." in found.plan.remarks
    )


def test_what_no_plan_can_hold_is_named() -> None:
    shop = hall(0).with_crew(2)
    machines = tuple(replace(machine, crew="crew", set_up_only=False) for machine in shop.machines)
    heads = np.full(len(shop), 2)
    shop = replace(
        shop, machines=machines, operations=replace(shop.operations, heads=heads), shift_end_s=None
    )
    made = listed_plan(shop, 0)
    assert made is not None
    book = opened(made)
    put(book, [Entry(Kind.CREW, 0, data={"heads": 1, "pool": "crew"})])
    with pytest.raises(NoPlanError, match="needs 2 heads of crew crew, which never has more than 1"):
        anew(shop, book, 60)
