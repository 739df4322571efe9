"""How much a plan moves: starts beyond a tolerance, places in a sequence, other units, sooner weighs more."""

from __future__ import annotations

from hypothesis import given
from hypothesis import strategies as st

from shopfloor.replan.movement import Moves, Place, Reference

HOUR = 3600
WAS = {0: Place(0, 600, 1), 1: Place(600, 1200, 1), 2: Place(HOUR, HOUR + 600, 1)}
LINE = Reference(WAS, [0, 0, 0, 0], 0)


def moved(*places: Place) -> Moves:
    """New work is operation 3."""
    return LINE.moves([*places, Place(0, 100, 1)])


def later(place: Place, seconds: int) -> Place:
    return Place(place.start_s + seconds, place.end_s + seconds, place.unit)


def test_what_stays_weighs_nothing() -> None:
    assert moved(*WAS.values()) == Moves(0, 0, 0)


def test_five_minutes_are_no_move_and_a_second_more_is() -> None:
    assert moved(WAS[0], WAS[1], later(WAS[2], 300)).moved == 0
    assert moved(WAS[0], WAS[1], later(WAS[2], 301)).moved == 1


def test_a_move_now_weighs_one_and_an_hour_ahead_a_half() -> None:
    assert moved(later(WAS[0], 301), WAS[1], WAS[2]) == Moves(1, 0, 1000)
    assert moved(WAS[0], WAS[1], later(WAS[2], 301)) == Moves(1, 0, 500)


def test_another_unit_is_a_move() -> None:
    assert moved(WAS[0], WAS[1], WAS[2]._replace(unit=2)) == Moves(1, 0, 500)


def test_an_exchange_of_two_resequences_one_of_them() -> None:
    found = moved(Place(600, 1200, 1), Place(0, 600, 1), WAS[2])
    assert (found.moved, found.resequenced) == (2, 1)


@given(st.lists(st.integers(0, 50).map(lambda k: k * 100), min_size=3, max_size=3))
def test_moves_are_counted_once_and_weigh_at_most_twice(starts: list[int]) -> None:
    found = moved(*(Place(start, start + 600, 1) for start in starts))
    assert found.resequenced <= found.moved <= 3
    assert found.weight <= 2 * sum(LINE.weight.values())
    assert (found.weight == 0) is (found.moved == 0)
