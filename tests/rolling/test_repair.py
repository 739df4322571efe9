"""Repairs: a delay goes into a gap and the rest stays; what is undone leaves no trace; limits are kept."""

from __future__ import annotations

from random import Random

import numpy as np
import pytest

from shopfloor.journal.entries import Entry
from shopfloor.journal.events import Journal
from shopfloor.journal.state import counting
from shopfloor.model.actuals import Kind
from shopfloor.model.results import Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.replan.begin import begin
from shopfloor.replan.current import current
from shopfloor.replan.movement import Place, Reference
from shopfloor.replan.outlook import outlook
from shopfloor.replan.remaining import remaining
from shopfloor.replan.residual import residual
from shopfloor.replan.told import told
from shopfloor.rolling.archive import limits_of, within
from shopfloor.rolling.bench import Bench, Timed
from shopfloor.rolling.repair import Repair
from shopfloor.rolling.search import Search
from shopfloor.rolling.standing import Part, Standing
from tests.rolling.shifts import CLOCK, disrupt, hall, listed_plan, opened, play, put

MIN = 60
FAR = 10**9
GOALS = ("makespan", "tardiness", "changeovers")


def benched(shop: Shop, book: Journal, now_s: int) -> tuple[Bench, Reference]:
    """What a replan at a moment would work with."""
    here, said = book.state(now_s), told(counting(book.events()), now_s)
    now = current(shop, here, said)
    left = remaining(now, here, said)
    look = outlook(now, left, here, said)
    rest = residual(now, left, look, begin(now, left, look, said))
    was = {}
    for k, one in enumerate(rest.left):
        row = said.planned(one.key)
        if row is not None and row.start_s is not None and row.end_s is not None and k not in rest.pinned:
            was[k] = Place(row.start_s - rest.begin_s, row.end_s - rest.begin_s, row.unit)
    return Bench(rest, was, GOALS), Reference(was, rest.solve.operations.machine.tolist(), 0)


def ranks(bench: Bench, reference: Reference) -> dict[int, float]:
    """Old starts; what is new comes last."""
    size = len(bench.rest.solve)
    return {k: float(reference.was[k].start_s if k in reference.was else FAR) for k in range(size)}


def repair(bench: Bench, reference: Reference, limits: tuple[int, ...], *, strict: bool = True) -> Repair:
    return Repair(
        bench,
        reference,
        ranks(bench, reference),
        limits,
        strict=strict,
        bound_s=0,
        most=20_000,
        over=lambda: False,
    )


# ---- a delay on one machine ------------------------------------------------------------------------------


def row_of(minutes: int, count: int, *, spare: int) -> tuple[Shop, Plan]:
    """One machine with so many equal operations one after the other; the other ends `spare` minutes later."""
    ends = minutes * count
    lengths = [minutes] * count + [ends + spare]
    shop = Shop(
        machines=(Machine("A"), Machine("B")),
        orders=Orders(tuple(f"J{k}" for k in range(count + 1))),
        operations=Operations(np.arange(count + 1), np.array([0] * count + [1]), np.array(lengths) * MIN),
        clock=CLOCK,
    )
    start = np.array([minutes * k for k in range(count)] + [0]) * MIN
    schedule = Schedule(np.arange(count + 1), start, start + shop.operations.seconds)
    return shop, Plan(shop, schedule, (), Choice("list", "", {}))


@pytest.mark.parametrize(("spare", "moved"), [(60, 1), (20, 9)], ids=["a gap", "no gap"])
def test_a_delay_goes_into_a_gap_or_pushes_all_where_there_is_none(spare: int, moved: int) -> None:
    """Ten operations of half an hour; the first takes twenty minutes longer than planned.

    With an hour to spare one of them is run last and the others stay; with just twenty minutes all must wait.
    """
    shop, made = row_of(30, 10, spare=spare)
    book = opened(made)
    play(book, made, 0, 10 * MIN, 0)
    put(book, [Entry(Kind.LEFT, 10 * MIN, order="J0", machine="A", data={"left_s": 40 * MIN})])
    bench, reference = benched(shop, book, 10 * MIN)
    limits = ((300 + spare - 10) * MIN, 0, 0)
    built = list(repair(bench, reference, limits).build())
    best = repair(bench, reference, limits).mended(built[-1])
    assert best is not None
    assert within(best, limits)
    assert reference.moves(best.places).moved == moved


# ---- any hall --------------------------------------------------------------------------------------------


def disturbed(seed: int) -> tuple[Bench, Reference, Timed]:
    """A hall in which things have gone wrong, and the old sequence timed."""
    shop = hall(seed)
    made = listed_plan(shop, seed)
    assert made is not None
    book, now_s = opened(made), max(60, made.makespan_s // 4 // 60 * 60)
    play(book, made, 0, now_s, seed, wobble=0.15)
    disrupt(book, shop, now_s, seed)
    bench, reference = benched(shop, book, now_s)
    rank = ranks(bench, reference)
    kept = bench.time(sorted(bench.movable, key=lambda k: (rank[k], k)))
    assert kept is not None
    return bench, reference, kept


@pytest.mark.parametrize("seed", range(12))
def test_whatever_is_tried_what_stands_is_measured_as_a_whole_would_be(seed: int) -> None:
    bench, reference, kept = disturbed(seed)
    standing = Standing(bench, reference, ranks(bench, reference), kept.value, strict=True)
    assert standing.load(kept)
    random = Random(seed)
    for _ in range(60 if bench.movable else 0):
        drawn = random.sample(bench.movable, min(4, len(bench.movable)))
        before = standing.key
        standing.attempt(Part(drawn[2:], first=drawn[:1], last=drawn[1:2], push=random.random() < 0.5))
        assert standing.key <= before
        whole = standing.timed()
        assert whole.value == standing.value
        assert list(whole.places) == standing.places
        assert reference.moves(whole.places).weight == sum(standing.weights.values())


@pytest.mark.parametrize("seed", range(12))
@pytest.mark.parametrize("strict", [True, False], ids=["goals first", "moves first"])
def test_a_timetable_mended_within_limits_keeps_them_and_moves_no_more(seed: int, strict: bool) -> None:
    bench, reference, kept = disturbed(seed)
    limits = kept.value if strict else tuple(value + 600_000 for value in kept.value)
    found = repair(bench, reference, limits, strict=strict).mended(kept, shakes=50, seed=seed)
    assert found is not None
    assert within(found, limits)
    weights = reference.moves(found.places).weight, reference.moves(kept.places).weight
    if strict:
        assert (*found.value, weights[0]) <= (*kept.value, weights[1])
    else:
        assert weights[0] <= weights[1]


@pytest.mark.parametrize("seed", range(6))
def test_where_nothing_limits_whoever_can_stays_at_home(seed: int) -> None:
    """Built without limits, at most those move that no longer can be where they were."""
    bench, reference, kept = disturbed(seed)
    first = next(iter(repair(bench, reference, (FAR * 10**6,) * 3).build()), None)
    assert first is not None
    assert reference.moves(first.places).moved <= max(reference.moves(kept.places).moved, 1)


@pytest.mark.parametrize("seed", [1, 4, 8])
def test_one_search_moves_no_more_the_more_is_allowed_and_keeps_to_it(seed: int) -> None:
    bench, reference, _ = disturbed(seed)
    search = Search(bench, reference, lambda: False)
    search.kept()
    allowances = (0, 10 * MIN, 60 * MIN)
    for allowed_s in allowances:
        best, chosen = search.settled(allowed_s)
        assert within(chosen.timed, limits_of(best, GOALS, allowed_s))
        assert best.timed.value <= chosen.timed.value
    limits = [limits_of(search.archive.best(), GOALS, allowed_s) for allowed_s in allowances]
    weights = [search.archive.chosen(each).moves.weight for each in limits]
    assert weights == sorted(weights, reverse=True)
    assert search.complete
