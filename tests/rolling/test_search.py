"""Candidates and trades: the archive keeps what nothing beats; the choice and what is told of the others."""

from __future__ import annotations

from hypothesis import given
from hypothesis import strategies as st

from shopfloor.replan.movement import Moves
from shopfloor.rolling.archive import Archive, Candidate, limits_of, worse_than
from shopfloor.rolling.bench import Timed
from shopfloor.rolling.trade import Trade, sentences, trade_sentence, trades_of

MIN = 60
GOALS = ("makespan", "tardiness")


def candidate(finish: int, late: int, moved: int, resequenced: int = 0) -> Candidate:
    """A candidate that ends at `finish` minutes, is late by `late` weighted minutes, and moves so many."""
    value = (finish * MIN, late * MIN * 1000)
    return Candidate(Timed((), (), *value, value), Moves(moved, resequenced, 1000 * moved), "kept")


KEYS = st.tuples(st.integers(0, 3), st.integers(0, 3), st.integers(0, 3))


@given(st.lists(KEYS, min_size=1, max_size=12))
def test_the_archive_holds_exactly_what_nothing_beats(keys: list[tuple[int, int, int]]) -> None:
    archive = archive_of(keys)
    kept = {
        (one.timed.makespan_s // MIN, one.timed.tardiness // MIN // 1000, one.moves.moved)
        for one in archive.front
    }
    unbeaten = {
        key
        for key in keys
        if not any(other != key and all(a <= b for a, b in zip(other, key, strict=True)) for other in keys)
    }
    assert kept == unbeaten
    assert len(archive.front) == len(kept)


def test_the_best_ends_first_and_the_choice_moves_least_within_its_limits() -> None:
    archive = archive_of([(100, 0, 17), (102, 0, 3), (100, 5, 9), (130, 0, 0)])
    best = archive.best()
    assert (best.timed.makespan_s, best.moves.moved) == (100 * MIN, 17)
    assert archive.chosen(best.timed.value).moves.moved == 17
    assert archive.chosen((102 * MIN, 2 * MIN * 1000)).moves.moved == 3
    assert archive.chosen((100 * MIN, 5 * MIN * 1000)).moves.moved == 9


@given(st.lists(KEYS, min_size=1, max_size=12), st.lists(st.integers(0, 4), min_size=2, max_size=4))
def test_the_more_is_allowed_the_less_is_moved_and_never_more_is_paid(
    keys: list[tuple[int, int, int]], minutes: list[int]
) -> None:
    """Of one archive: what moves least within wider limits never moves more, and keeps to the limits."""
    archive = archive_of(keys)
    best = archive.best()
    chosen = [archive.chosen(limits_of(best, GOALS, allowed * MIN)) for allowed in sorted(minutes)]
    weights = [one.moves.weight for one in chosen]
    assert weights == sorted(weights, reverse=True)
    for one, allowed in zip(chosen, sorted(minutes), strict=True):
        assert all(seconds <= allowed * MIN for _, seconds in worse_than(one, best, GOALS))
    assert archive.chosen(limits_of(best, GOALS, 0)).timed.value == best.timed.value


@given(st.lists(KEYS, min_size=1, max_size=12), st.integers(0, 2))
def test_a_trade_is_what_would_be_chosen_for_its_stability(
    keys: list[tuple[int, int, int]], minutes: int
) -> None:
    archive = archive_of([(finish, late, 10 * moved) for finish, late, moved in keys])
    best = archive.best()
    chosen = archive.chosen(limits_of(best, GOALS, minutes * MIN))
    found = trades_of(chosen, best, archive, GOALS)
    for trade in found:
        then = archive.chosen(limits_of(best, GOALS, trade.stability_s))
        assert (trade.moves, trade.worse_s) == (then.moves, worse_than(then, chosen, GOALS))
        assert trade.stability_s > minutes * MIN
        assert max(seconds for _, seconds in trade.worse_s) > 0
    moved = [chosen.moves.moved, *(trade.moves.moved for trade in found)]
    assert moved == sorted(set(moved), reverse=True)


def archive_of(keys: list[tuple[int, int, int]]) -> Archive:
    archive = Archive()
    for key in keys:
        archive.offer(candidate(*key))
    return archive


def test_trades_are_the_cheapest_ways_to_move_clearly_less() -> None:
    archive = archive_of(
        [(100, 0, 20), (101, 0, 19), (102, 0, 12), (103, 1, 12), (110, 0, 3), (900, 0, 0)],
    )
    best = archive.best()
    found = trades_of(best, best, archive, GOALS)
    assert [(trade.moves.moved, trade.stability_s // MIN) for trade in found] == [(12, 2), (3, 10)]


def test_a_trade_is_told_with_what_it_takes() -> None:
    trade = Trade((("makespan", 2 * MIN), ("tardiness", 0)), Moves(3, 1, 0), 2 * MIN)
    assert trade_sentence(trade, Moves(17, 5, 0)) == "2 min later would move 3 instead of 17: --stability 2."
    mixed = Trade((("makespan", -60), ("tardiness", 130), ("changeovers", 30)), Moves(1, 0, 0), 3 * MIN)
    assert trade_sentence(mixed, Moves(4, 0, 0)) == (
        "1 min earlier and 3 min more weighted lateness and 30 s more changeover would move 1 instead of 4: "
        "--stability 3."
    )


def test_what_moved_and_what_patience_cost_are_said() -> None:
    best, chosen = candidate(100, 0, 17, 9), candidate(102, 0, 3, 1)
    assert sentences(chosen, best, Moves(40, 30, 0), []) == [
        "3 operations move, 1 of them to another place in their machine's sequence; planning from scratch "
        "would move 40.",
        "It ends 2 min later than the earliest plan found, which moves 17.",
    ]
    assert sentences(candidate(1, 0, 1), candidate(1, 0, 1), None, []) == [
        "1 operation moves, 0 of them to another place in their machine's sequence."
    ]
