"""A hall written as shop.toml reads back the same."""

from __future__ import annotations

import json
from datetime import datetime
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from shopfloor.model.calendar import HOUR, MINUTE, Clock
from shopfloor.model.shop import Changeovers, Closure, Crew, Machine, Transport
from shopfloor.read.floor import Floor, load_floor
from shopfloor.read.orders import load
from shopfloor.render.tables import harmless
from tests.read.reading import patient

CLOCKS = (
    Clock(),
    Clock(datetime(2026, 3, 2, 6)),
    Clock(datetime(2026, 12, 31, 22, 15, 30), ZoneInfo("Europe/London")),
    Clock(datetime(2026, 3, 28, 22), ZoneInfo("Europe/London")),  # the night before the clocks go forward
)
PARTS = [
    "clock",
    "shift_end_s",
    "breaks",
    "machines",
    "crews",
    "changeovers",
    "transport",
    "heads",
    "setup_s",
]
_names = st.text(st.sampled_from("aZ7 .-_'\"\\#[]=é漢"), min_size=1, max_size=5).map(str.strip).filter(bool)
_reasons = st.sampled_from(["", "tea", 'a "long" one, # no remark'])


def _apart(draw: st.DrawFn, most: int) -> list[tuple[int, int]]:
    """Stretches in order of time and apart from each other, in whole minutes from the shift's start."""
    edges = sorted(draw(st.sets(st.integers(0, 40 * 60), max_size=2 * most)))
    return [(start * MINUTE, end * MINUTE) for start, end in zip(edges[::2], edges[1::2], strict=False)]


def _between(draw: st.DrawFn, names: list[str]) -> tuple[int, dict[tuple[str, str], int]]:
    """Times of which no two together are less than any one, so that no way round is shorter."""
    between = draw(st.integers(0, 60)) * 30
    pairs = draw(st.sets(st.tuples(st.sampled_from(names), st.sampled_from(names)), max_size=5))
    return between, {
        (one, two): between + 3 * draw(st.integers(0, between // 3))
        for one, two in sorted(pairs)
        if one != two
    }


@st.composite
def floors(draw: st.DrawFn) -> Floor:
    """Any hall that can be written with minutes of a half or a whole, or twentieths."""
    ids = draw(st.lists(_names, min_size=1, max_size=3, unique=True))
    crew_ids = draw(st.lists(_names, max_size=2, unique=True))
    families = draw(st.lists(_names, min_size=1, max_size=3, unique=True))
    machines = tuple(
        Machine(
            name,
            draw(st.one_of(st.just(""), _names)),
            count=draw(st.integers(1, 3)),
            pauses=draw(st.booleans()),
            crew=draw(st.sampled_from([None, *crew_ids])),
            set_up_only=draw(st.booleans()),
            closed=tuple(Closure(*span, draw(_reasons)) for span in _apart(draw, 2)),
            family=draw(st.sampled_from([None, *families])),
        )
        for name in ids
    )
    changed = draw(st.lists(st.sampled_from(ids), unique=True))
    return Floor(
        clock=draw(st.sampled_from(CLOCKS)),
        shift_end_s=draw(st.sampled_from([None, 8 * HOUR])),
        breaks=tuple(Closure(*span, draw(_reasons)) for span in _apart(draw, 2)),
        machines=machines,
        crews=tuple(
            Crew(
                name,
                draw(st.integers(0, 9)),
                tuple((*span, draw(st.integers(0, 9))) for span in _apart(draw, 2)),
            )
            for name in crew_ids
        ),
        changeovers={name: Changeovers(*_between(draw, families)) for name in changed},
        transport=Transport(*_between(draw, ids)),
        heads={name: draw(st.integers(0, 5)) for name in ids},
        setup_s={name: draw(st.integers(0, 60)) * 15 for name in ids},
    )


# ---- writing ----------------------------------------------------------------------------------------


def quoted(text: str) -> str:
    """A text as TOML writes it: JSON's rules will do for what is drawn here."""
    return json.dumps(text, ensure_ascii=False)


def minutes(seconds: int) -> str:
    return f"{seconds / MINUTE:.12g}"


def stretch(clock: Clock, start_s: int, end_s: int, more: str = "") -> str:
    return f'{{ from = "{clock.write(start_s)}", to = "{clock.write(end_s)}"{more} }}'


def shut(clock: Clock, closed: tuple[Closure, ...]) -> str:
    entries = (stretch(clock, c.start_s, c.end_s, f", reason = {quoted(c.reason)}") for c in closed)
    return f"[{', '.join(entries)}]"


def times_between(times: Changeovers | Transport) -> str:
    pairs = ",\n  ".join(
        f"{{ from = {quoted(one)}, to = {quoted(two)}, minutes = {minutes(seconds)} }}"
        for (one, two), seconds in times.pairs.items()
    )
    return f"between = {minutes(times.between)}\npairs = [\n  {pairs}\n]\n"


def written(floor: Floor) -> str:
    clock = floor.clock
    lines = ["[shift]", f"breaks = {shut(clock, floor.breaks)}"]
    if clock.start is not None:
        lines.append(f"start = {clock.start.isoformat()}")
    if clock.zone is not None:
        lines.append(f'zone = "{clock.zone.key}"')
    if floor.shift_end_s is not None:
        lines.append(f'end = "{clock.write(floor.shift_end_s)}"')
    for machine in floor.machines:
        lines += [
            "[[machine]]",
            f"id = {quoted(machine.id)}",
            f"name = {quoted(machine.name)}",
            f"count = {machine.count}",
            f"pauses = {str(machine.pauses).lower()}",
            f"closed = {shut(clock, machine.closed)}",
            f'attended = "{"set-up" if machine.set_up_only else "always"}"',
            f"heads = {floor.heads[machine.id]}",
            f"setup_minutes = {minutes(floor.setup_s[machine.id])}",
        ]
        lines += [f"crew = {quoted(machine.crew)}"] if machine.crew else []
        lines += [f"family = {quoted(machine.family)}"] if machine.family else []
    for crew in floor.crews:
        levels = (stretch(clock, start, end, f", heads = {heads}") for start, end, heads in crew.levels)
        lines += [
            "[[crew]]",
            f"id = {quoted(crew.id)}",
            f"heads = {crew.heads}",
            f"levels = [{', '.join(levels)}]",
        ]
    for name, times in floor.changeovers.items():
        lines += [f"[changeover.{quoted(name)}]", times_between(times)]
    return "\n".join([*lines, "[transport]", times_between(floor.transport)])


@patient
@given(floors())
def test_a_floor_that_is_written_reads_back_the_same(floor: Floor) -> None:
    read = load_floor(written(floor).encode())
    for name in PARTS:
        assert getattr(read, name) == getattr(floor, name), name
    assert read.setup_s == floor.setup_s


@patient
@given(floors())
def test_a_floor_read_before_serves_as_well_as_its_file(floor: Floor) -> None:
    name = harmless(floor.machines[0].id).replace('"', '""')  # as a spreadsheet holds it
    orders = f'order;machine;minutes;heads\nA;"{name}";5;0\n'
    text = written(floor).encode()
    one, two = load(orders.encode(), shop=text), load(orders.encode(), shop=load_floor(text))
    assert (one.shop.machines, one.shop.crews, one.shop.breaks) == (
        two.shop.machines,
        two.shop.crews,
        two.shop.breaks,
    )
    assert (one.shop.changeovers, one.shop.transport) == (two.shop.changeovers, two.shop.transport)
    assert [n.text() for n in one.notices] == [n.text() for n in two.notices]


@pytest.mark.parametrize("start", ["2026-03-02T05:00", "2026-03-02T09:00"])
def test_a_floor_read_before_follows_another_start(start: str) -> None:
    text = b"""
[shift]
start = "2026-03-02T06:00"
[[machine]]
id = "M"
closed = [{ from = "10:00", to = "11:00" }]
"""
    orders = b"order,machine,minutes\nA,M,5\n"
    hours = 10 - int(start[11:13])
    for shop in (text, load_floor(text)):
        found = load(orders, shop=shop, start=start).shop.machines[0]
        assert found.closed == (Closure(hours * HOUR, (hours + 1) * HOUR),)
