"""What became of a machine's time: every second has one name; the figures follow their formulas."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.journal.events import Journal
from shopfloor.model.actuals import Key, MachineState, PieceState, ShiftState, Status, Stretch
from shopfloor.model.shop import Shop
from shopfloor.replan.figures import FIGURES, Elements
from shopfloor.replan.times import Times, machine_times, shares
from tests.replan.floor import MIN, book, hall, machine, stand, work

RIG, CMM, BENCH = range(3)


def times(opened: Journal, at: float, place: int, shop: Shop | None = None) -> Times:
    """The times of one machine, in minutes."""
    here = stand(opened, at, shop)
    name = here.now.shop.machines[place].id
    pieces = [piece for piece in here.state.pieces.values() if piece.key.machine == name]
    found = machine_times(here.now.shop, place, pieces, here.state)
    return Times(*(getattr(found, slot) / MIN for slot in Times.__slots__))  # type: ignore[arg-type]


def test_a_machine_nobody_used_was_idle_while_it_was_open() -> None:
    """By 100 min: the break 60–75 and the closure 90–100 are no open time; the CMM has two units."""
    assert times(book(), 100, RIG) == Times(open_s=75, idle_s=75)
    assert times(book(), 100, CMM) == Times(open_s=170, idle_s=170)


def test_work_pauses_over_a_break_where_the_machine_pauses() -> None:
    opened = book(work("started", "TQ-2", "BENCH", 40), work("finished", "TQ-2", "BENCH", 115))
    assert times(opened, 120, BENCH) == Times(open_s=105, work_s=60, idle_s=45)


def test_work_that_runs_on_into_a_break_is_an_overrun() -> None:
    opened = book(work("started", "TQ-1", "RIG", 40), work("finished", "TQ-1", "RIG", 66))
    assert times(opened, 80, RIG) == Times(open_s=65, work_s=26, idle_s=45, overrun_s=6)


def test_an_outage_with_an_order_on_the_machine_is_told_from_one_without() -> None:
    opened = book(
        machine("down", "RIG", 0, reason="seal"),
        machine("up", "RIG", 5),
        work("started", "TQ-1", "RIG", 5),
        machine("down", "RIG", 15, reason="seal"),
        machine("up", "RIG", 25),
        work("finished", "TQ-1", "RIG", 45),
    )
    assert times(opened, 50, RIG) == Times(open_s=50, work_s=30, held_s=10, down_s=5, idle_s=5)


def test_a_stop_counts_while_nothing_else_runs_there() -> None:
    opened = book(
        work("started", "TQ-1", "RIG", 0),
        work("stopped", "TQ-1", "RIG", 10, reason="no gasket"),
        work("started", "TQ-3", "RIG", 15),
        work("finished", "TQ-3", "RIG", 35),
        work("resumed", "TQ-1", "RIG", 40),
    )
    assert times(opened, 50, RIG) == Times(open_s=50, work_s=40, stopped_s=10)


def test_one_unit_down_leaves_the_other_idle() -> None:
    assert times(book(machine("down", "CMM", 10, 2, reason="probe")), 40, CMM) == Times(
        80, down_s=30, idle_s=50
    )


# ---- by property -------------------------------------------------------------------------------------

SPANS = st.lists(
    st.tuples(st.integers(-5, 40), st.integers(0, 15)).map(lambda pair: (pair[0], pair[0] + pair[1])),
    max_size=5,
)


@given(st.integers(0, 30), st.lists(SPANS, max_size=4))
def test_shares_are_what_counting_every_second_gives(until: int, layers: list[list[tuple[int, int]]]) -> None:
    expected = [0] * (len(layers) + 1)
    for second in range(until):
        inside = [any(start <= second < end for start, end in spans) for spans in layers]
        expected[inside.index(True) if True in inside else len(layers)] += 1
    assert shares(until, layers) == expected


@given(st.data(), st.sampled_from([RIG, CMM, BENCH]))
def test_every_open_second_has_one_name(data: st.DataObject, place: int) -> None:
    shop = hall()
    name = shop.machines[place].id
    until = data.draw(st.integers(0, 150)) * MIN

    def stretches(units: range) -> list[Stretch]:
        found = []
        for unit in units:
            cuts = sorted(data.draw(st.lists(st.integers(0, 150), max_size=6, unique=True)))
            found += [Stretch(unit, a * MIN, b * MIN) for a, b in zip(cuts[::2], cuts[1::2], strict=False)]
        return found

    units = range(1, shop.machines[place].count + 1)
    runs, pauses, outages = (
        stretches(units),
        stretches(units),
        stretches(range(shop.machines[place].count + 1)),
    )
    piece = PieceState(Key("TQ-1", name), Status.RUNNING, runs=tuple(runs), pauses=tuple(pauses))
    state = ShiftState(until, machines={name: MachineState(name, len(units), tuple(outages))})
    found = machine_times(shop, place, [piece], state)
    named = found.work_s - found.overrun_s + found.held_s + found.stopped_s + found.down_s + found.idle_s
    assert named == found.open_s
    assert min(found.work_s, found.held_s, found.stopped_s, found.down_s, found.idle_s, found.overrun_s) >= 0
    clock = shop.machine_clocks[place]
    assert found.open_s == int(clock.worked(until)) * len(units)


# ---- figures -----------------------------------------------------------------------------------------

DAY = Elements(PBT=400, AUST=30, APT=270, ADET=20, ADOT=60, GQ=95, SQ=5)


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("availability", 270 / 400),
        ("allocation_efficiency", 320 / 400),
        ("utilization_efficiency", 270 / 320),
        ("setup_ratio", 30 / 300),
        ("technical_efficiency", 270 / 290),
        ("scrap_ratio", 5 / 100),
    ],
)
def test_figures_of_iso_22400_2(name: str, value: float) -> None:
    """Formulas as remembered from ISO 22400-2:2014; not quoted."""
    assert FIGURES[name].of(DAY) == pytest.approx(value)
    assert FIGURES[name].of(Elements()) is None


def test_elements_of_machines_add_up() -> None:
    twice = DAY + DAY
    assert twice == Elements(800, 60, 540, 40, 120, 190, 10)
    assert replace(DAY, ADET=0).AUBT == DAY.AUPT == 300
