"""What the floor's rules make of each run: held against the audit and against counting minute by minute."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from shopfloor.audit.schedule import audit
from shopfloor.model.calendar import HOUR, MINUTE, WorkClock
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Changeovers, Closure, Crew, Machine, Operations, Orders, Shop
from shopfloor.model.stated import state
from shopfloor.render.heads import CrewUse, crew_use, head_time_s, heads_there
from shopfloor.render.runs import NONE_BEFORE, Runs
from shopfloor.render.shut import closures_of
from tests.render.floor import floor_plan
from tests.render.plans import hall_plan, many_plan

PLANS = [floor_plan(), *(floor_plan(8, seed=seed) for seed in range(3))]


def by_hand(shop: Shop, rows: list[tuple[int, int, int]]) -> Runs:
    """The runs of a schedule in minutes: operation, start, end."""
    operation, start, end = np.array(rows).T
    schedule = Schedule(operation, start * MINUTE, end * MINUTE)
    return Runs(Plan(shop, schedule, (), Choice("by hand", "it is a test", {})))


def booth(*, closed=(), family=None, families=(0, 1, 1), pauses=False, cut=False) -> Shop:
    """A booth with two colours, a quarter of an hour between them; three operations of half an hour."""
    return Shop(
        machines=(Machine("Booth", closed=closed, family=family, pauses=pauses),),
        orders=Orders(("TQ-1", "TQ-2", "TQ-3")),
        operations=Operations(
            [0, 1, 2], [0, 0, 0], [1800] * 3, family=families, setup_s=[600] * 3, splittable=[int(cut)] * 3
        ),
        families=("grey", "red"),
        changeovers={"Booth": Changeovers(900, {("red", "grey"): 1200})},
    )


@pytest.mark.parametrize("plan", PLANS)
def test_the_drawn_plans_break_no_rule_of_the_floor(plan):
    claims = {"makespan_s": None, "lower_bound_s": None, "proved_optimal": None, "fits_shift": None}
    assert audit(plan.shop, replace(state(plan), bounds=(), **claims)) == []


# ---- changeovers -----------------------------------------------------------------------------------


@pytest.mark.parametrize("plan", PLANS)
def test_changeovers_take_the_open_time_right_before_their_run(plan):
    runs, shop = Runs(plan), plan.shop
    changes, found = runs.changes, {}
    for place in range(len(changes)):
        run = int(changes.run[place])
        clock, before = shop.machine_clocks[runs.machine[run]], int(runs.before_on_unit[run])
        start, end, seconds = (
            int(column[place]) for column in (changes.start_s, changes.end_s, changes.seconds)
        )
        assert clock.worked(end) - clock.worked(start) == seconds
        assert clock.worked(plan.schedule.start_s[run]) == clock.worked(end)
        assert start >= (0 if before == NONE_BEFORE else plan.schedule.end_s[before])
        found[run] = (runs.families[changes.before[place]], seconds)
    expected = {}
    for machine, hall in enumerate(shop.machines):
        for unit in range(1, hall.count + 1):
            here = [i for i in range(len(plan.schedule))
                    if runs.machine[i] == machine and plan.schedule.unit[i] == unit]  # fmt: skip
            old = hall.family
            for run in sorted(here, key=lambda run: plan.schedule.start_s[run]):
                new = shop.operation(int(plan.schedule.operation[run])).family
                seconds = shop.changeovers[hall.id].seconds(old, new) if hall.id in shop.changeovers else 0
                if old is not None and seconds:
                    expected[run] = (old, seconds)
                old = new
    assert found == expected


def test_a_changeover_is_as_late_as_can_be_and_leaves_a_closure_out():
    """The booth is shut from 0:50 to 1:00; five minutes of the change to red lie before, ten after it."""
    changes = by_hand(booth(closed=(Closure(3000, 3600),)), [(0, 0, 30), (1, 70, 100), (2, 100, 130)]).changes
    assert [column.tolist() for column in (changes.run, changes.start_s, changes.end_s)] == [
        [1],
        [2700],
        [4200],
    ]
    assert (changes.seconds.tolist(), changes.before.tolist()) == ([900], [0])


def test_a_changeover_that_ends_at_a_closure_ends_before_it():
    changes = by_hand(booth(closed=(Closure(3000, 3600),)), [(0, 0, 30), (1, 60, 90), (2, 90, 120)]).changes
    assert (changes.start_s.tolist(), changes.end_s.tolist()) == ([2100], [3000])


def test_the_family_at_the_start_counts_where_it_is_known():
    rows = [(0, 20, 50), (1, 65, 95), (2, 95, 125)]
    assert by_hand(booth(), rows).changes.run.tolist() == [1]
    known = by_hand(booth(family="red"), rows)
    assert known.changes.run.tolist() == [0, 1]
    assert (known.changes.start_s[0], known.changes.end_s[0]) == (0, 1200)
    assert known.families[known.changes.before[0]] == "red"
    strange = by_hand(booth(family="white"), rows)
    assert strange.families == ("grey", "red", "white", "")
    assert strange.families[strange.changes.before[0]] == "white"


def test_no_family_is_a_family_of_its_own():
    runs = by_hand(booth(families=(-1, -1, 1)), [(0, 0, 30), (1, 30, 60), (2, 75, 105)])
    assert runs.changes.run.tolist() == [2]
    assert runs.families[runs.changes.before[0]] == ""
    assert runs.change_s.tolist() == [0, 0, 900]


# ---- work, set-up and idle time --------------------------------------------------------------------


@pytest.mark.parametrize("plan", PLANS)
def test_work_and_set_up_add_up_to_what_the_operations_ask(plan):
    runs, operations = Runs(plan), plan.shop.operations
    for values, asked in ((runs.worked_s, operations.seconds), (runs.set_up_s, operations.setup_s)):
        total = np.bincount(plan.schedule.operation, weights=values, minlength=len(operations))
        assert total.tolist() == asked.tolist()
    for run in range(len(plan.schedule)):
        clock: WorkClock = plan.shop.machine_clocks[runs.machine[run]]
        start, ready = int(plan.schedule.start_s[run]), int(runs.set_up_end_s[run])
        assert clock.worked(ready) - clock.worked(start) == runs.set_up_s[run]
        assert start <= ready <= plan.schedule.end_s[run]


def test_set_up_pauses_with_its_machine_and_spans_parts():
    """Ten minutes of set-up: around a closure in one case, over two parts in the other."""
    shut = booth(closed=(Closure(300, 900),), pauses=True)
    assert by_hand(shut, [(0, 0, 40), (1, 60, 90), (2, 90, 120)]).set_up_end_s.tolist() == [1200, 4200, 6000]
    parts = by_hand(booth(cut=True), [(0, 0, 5), (0, 10, 35), (1, 60, 90), (2, 90, 120)])
    assert parts.set_up_s.tolist() == [300, 300, 600, 600]
    assert parts.set_up_end_s.tolist() == [300, 900, 4200, 6000]


@pytest.mark.parametrize("plan", PLANS)
def test_runs_changeovers_gaps_and_closures_fill_every_row_to_its_last_run(plan):
    runs, shop = Runs(plan), plan.shop
    for machine, clock in enumerate(shop.machine_clocks):
        gaps = runs.gaps(machine)
        for unit in range(shop.machines[machine].count):
            row = runs.first_row[machine] + unit
            here = np.flatnonzero(runs.row == row)
            if not len(here):
                continue
            last = int(plan.schedule.end_s[here].max())
            idle = int(gaps.seconds[gaps.row == row].sum())
            assert runs.worked_s[here].sum() + runs.change_s[here].sum() + idle == clock.worked(last)
        for start, end, seconds in zip(gaps.start_s, gaps.end_s, gaps.seconds, strict=True):
            assert clock.worked(end) - clock.worked(start) == seconds > 0


# ---- ways ------------------------------------------------------------------------------------------


@pytest.mark.parametrize("plan", PLANS)
def test_ways_lead_to_the_next_stop_of_the_order(plan):
    runs, shop = Runs(plan), plan.shop
    for job in range(len(shop.orders)):
        route = sorted(np.flatnonzero(runs.job == job), key=lambda run: plan.schedule.start_s[run])
        for here, after in pairwise(route):
            one, two = (shop.machines[runs.machine[run]].id for run in (here, after))
            assert runs.way_s[here] == shop.transport.seconds(one, two)
            assert plan.schedule.start_s[after] >= plan.schedule.end_s[here] + runs.way_s[here]
        assert runs.way_s[route[-1]] == 0


def test_a_plain_hall_has_none_of_it():
    runs = Runs(hall_plan(200))
    assert not any(values.any() for values in (runs.set_up_s, runs.change_s, runs.heads, runs.way_s))
    assert (runs.changing, len(runs.changes)) == ((), 0)
    assert (runs.worked_s == runs.schedule.end_s - runs.schedule.start_s).all()


def test_an_empty_plan_has_no_runs():
    shop = Shop((Machine("Wash"),), Orders(()), Operations([], [], []), crews=(Crew("all", 2),))
    runs = Runs(Plan(shop, Schedule([], [], []), (), Choice("none", "nothing", {})))
    empty = (runs.row, runs.worked_s, runs.set_up_end_s, runs.family, runs.change_s, runs.heads, runs.way_s)
    assert all(len(values) == 0 for values in empty)
    assert len(runs.gaps(0).row) == 0
    assert crew_use(runs, HOUR)[0].used.tolist() == [0, 0]


# ---- crews -----------------------------------------------------------------------------------------


def minutes_used(plan: Plan, crew: Crew, until: int) -> list[int]:
    """Heads at work in each minute, counted."""
    used, shop, set_up_left = [0] * (until // MINUTE), plan.shop, plan.shop.operations.setup_s.tolist()
    for piece in plan.schedule:
        operation = shop.operation(piece.operation)
        machine, clock = shop.machines[operation.machine], shop.machine_clocks[operation.machine]
        for minute in range(piece.start_s // MINUTE, piece.end_s // MINUTE):
            if clock.worked(60 * minute + 60) == clock.worked(60 * minute):
                continue
            attended = not machine.set_up_only or set_up_left[piece.operation] > 0
            set_up_left[piece.operation] -= MINUTE
            used[minute] += operation.heads if machine.crew == crew.id and attended else 0
    return used


def sampled(use: CrewUse, values: np.ndarray, until: int) -> list[int]:
    at = np.searchsorted(use.at_s, np.arange(0, until, MINUTE), side="right") - 1
    return values[at].tolist()


@pytest.mark.parametrize("plan", PLANS)
def test_heads_at_work_are_what_counting_finds(plan):
    until = plan.makespan_s // MINUTE * MINUTE
    for use in crew_use(Runs(plan), until):
        assert sampled(use, use.used, until) == minutes_used(plan, use.crew, until)
        assert sampled(use, use.there, until) == heads_there(use.crew, np.arange(0, until, MINUTE)).tolist()
        assert (use.used <= use.there).all()
        assert use.work_s == 60 * sum(minutes_used(plan, use.crew, until))
        assert (np.diff(use.at_s) > 0).all()


def test_coarse_steps_keep_the_most_heads_and_the_fewest_there():
    use = crew_use(Runs(floor_plan()), 8 * HOUR)[0]
    for steps in (1, 7, 16):
        coarse = use.coarse(steps)
        assert len(coarse.at_s) == steps + 1
        for place in range(steps):
            minutes = np.arange(coarse.at_s[place], coarse.at_s[place + 1])
            at = np.searchsorted(use.at_s, minutes, side="right") - 1
            assert coarse.used[place] == use.used[at].max()
            assert coarse.there[place] == use.there[at].min()
    assert use.coarse(10_000) is use


def test_head_time_leaves_out_the_breaks_of_the_hall():
    shop = floor_plan().shop  # three heads, two from 12:00 on; 45 min of breaks, 15 of them after that
    assert head_time_s(shop, shop.crews[0], 8 * HOUR) == 3 * (6 * HOUR - 30 * MINUTE) + 2 * (
        2 * HOUR - 15 * MINUTE
    )


# ---- closures --------------------------------------------------------------------------------------


def test_closures_that_meet_or_overlap_are_told_as_one():
    own = (Closure(0, 10, "not open"), Closure(50, 60, "repair"), Closure(80, 90))
    shop = Shop(
        (Machine("CMM", closed=own), Machine("Wash")),
        Orders(()),
        Operations([], [], []),
        breaks=(Closure(10, 20, "tea"), Closure(55, 70, ""), Closure(95, 99, "tea")),
    )
    assert [(shut.start_s, shut.end_s, shut.reason) for shut in closures_of(shop, shop.machines[0])] == [
        (0, 20, "not open, tea"),
        (50, 70, "repair, break"),
        (80, 90, "closed"),
        (95, 99, "tea"),
    ]
    assert [shut.reason for shut in closures_of(shop, shop.machines[1])] == ["tea", "break", "tea"]


def test_very_many_runs_take_no_loop_over_them():
    """Every rule in use, 96,000 runs: each family change and each way is found."""
    plan = many_plan(96_000, floor=True)
    runs = Runs(plan)
    follows = runs.before_on_unit != NONE_BEFORE
    changed = runs.family != runs.family[np.where(follows, runs.before_on_unit, 0)]
    first = runs.family != 0  # every unit starts in the first family
    assert runs.changes.run.tolist() == np.flatnonzero(np.where(follows, changed, first)).tolist()
    assert (runs.way_s > 0).sum() == len(plan.schedule) - len(plan.shop.orders)
