"""Generated floors: tiny shops with any mix of the rules a hall may have."""

from __future__ import annotations

from dataclasses import replace

from hypothesis import strategies as st

from shopfloor.errors import ShopError
from shopfloor.model.shop import Changeovers, Closure, Crew, Machine, Shop, Transport
from tests.strategies import shops

FAMILIES = ("red", "black")
RULES = ("breaks", "closures", "changeover", "crew", "transport", "pauses")


def spans(most: int = 2, latest: int = 10) -> st.SearchStrategy[tuple[Closure, ...]]:
    """Closures in order of time and apart, or touching."""
    edges = st.lists(st.integers(0, latest), min_size=0, max_size=2 * most, unique=True).map(sorted)
    return edges.map(lambda cuts: tuple(Closure(a, b) for a, b in zip(cuts[::2], cuts[1::2], strict=False)))


@st.composite
def between(draw: st.DrawFn, kind: type, names: tuple[str, ...]) -> Changeovers | Transport:
    """Times between names, uneven where no way round is shorter, else even."""
    even = draw(st.integers(0, 3))
    pairs = {(a, b): draw(st.integers(0, 4)) for a in names for b in names if a != b and draw(st.booleans())}
    try:
        return kind(even, pairs)
    except ShopError:
        return kind(even)


@st.composite
def floors(
    draw: st.DrawFn,
    *,
    max_operations: int = 5,
    max_machines: int = 3,
    most: int = 6,
    scarce: bool = False,
    dues: bool = True,
    parallel: bool = False,
) -> Shop:
    """Tiny shops with up to `most` of the rules; every one has a schedule unless heads may be `scarce`.

    An order visits no machine twice unless `parallel`: a plan does not tell such visits apart.
    """
    hall = draw(
        shops(
            max_orders=4, max_machines=max_machines, max_operations=max_operations, max_seconds=4,
            unit=draw(st.sampled_from([False, False, True])), groups=True, dues=dues, parallel=parallel,
        )
    )  # fmt: skip
    has = draw(st.sets(st.sampled_from(RULES), max_size=most))
    size = len(hall)
    numbers = st.integers
    machines = [Machine(m.id, count=min(m.count, 2)) for m in hall.machines]
    columns = hall.operations
    if "breaks" in has:
        hall = replace(hall, breaks=draw(spans(1)))
    if "closures" in has:
        machines = [replace(machine, closed=draw(spans())) for machine in machines]
    if "pauses" in has:
        machines = [replace(machine, pauses=draw(st.booleans())) for machine in machines]
    if "changeover" in has:
        columns = replace(columns, family=draw(st.lists(numbers(-1, 1), min_size=size, max_size=size)))
        hall = replace(
            hall,
            families=FAMILIES,
            changeovers={m.id: draw(between(Changeovers, FAMILIES)) for m in machines if draw(st.booleans())},
        )
        begin = st.sampled_from([None, "red", "black", "white"])
        machines = [replace(machine, family=draw(begin)) for machine in machines]
    if "crew" in has:
        set_up = [draw(numbers(0, length)) for length in columns.seconds.tolist()]
        columns = replace(
            columns,
            heads=draw(st.lists(numbers(0, 3 if scarce else 2), min_size=size, max_size=size)),
            setup_s=set_up,
        )
        levels = tuple((c.start_s, c.end_s, draw(numbers(0, 3))) for c in draw(spans()))
        hall = replace(hall, crews=(Crew("Blue", draw(numbers(1 if scarce else 2, 3)), levels),))
        machines = [
            replace(
                machine, crew=draw(st.sampled_from([None, "Blue", "Blue"])), set_up_only=draw(st.booleans())
            )
            for machine in machines
        ]
    if "transport" in has:
        hall = replace(hall, transport=draw(between(Transport, tuple(m.id for m in machines))))
    return replace(hall, machines=tuple(machines), operations=columns)
