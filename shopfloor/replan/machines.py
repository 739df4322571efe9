"""The machines of what is left, with everything that shuts them ahead. Pure."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import replace

from shopfloor.model.shop import Closure, Machine, Shop
from shopfloor.replan.holding import merged, outside
from shopfloor.replan.outlook import Outlook, Running, future
from shopfloor.replan.remaining import Left


def machines_ahead(
    shop: Shop,
    look: Outlook,
    left: Sequence[Left],
    rows: Iterable[Running],
    held: Sequence[Running],
    *,
    from_s: int,
    origin: int = 0,
    whole_rows: bool = False,
) -> Iterator[Machine]:
    """Yield the machines of `shop` as they are from a moment on.

    Parameters
    ----------
    look, left
        What is known of the time ahead, and what is left of the shift's work.
    rows, held
        Running work that rows of a plan tell of, and that which none can: closures tell of it.
    from_s
        The moment.
    origin
        Where the clock of the result starts.
    whole_rows
        Whether a row of running work begins at its true start, else where the work goes on.
    """
    spans: dict[int, tuple[int, int]] = {}  # machines of one unit that do not pause: when their row runs
    for one in rows:
        hall = shop.machines[one.machine]
        if hall.count == 1 and not hall.pauses:
            spans[one.machine] = (from_s if whole_rows else one.resumes_s), one.ends_s
    for place, hall in enumerate(shop.machines):
        closed = list(future(hall.closed, from_s))
        closed += [
            Closure(from_s, out.until_s, out.reason)
            for out in look.outs
            if out.machine == place and not out.unit and out.until_s > from_s
        ]
        if place in spans:
            closed = list(outside(closed, *spans[place]))
        if hall.count == 1:
            closed += [
                Closure(from_s, one.ends_s, f"running {left[one.place].key.order}")
                for one in held
                if one.machine == place and one.ends_s > from_s
            ]
            closed += [
                Closure(from_s, one.until_s, f"changing over to {one.family or 'no family'}")
                for one in look.changing
                if one.machine == place and one.until_s > from_s
            ]
        yield replace(hall, closed=moved(merged(closed), origin), family=_family(shop, look, place))


def moved(closures: Iterable[Closure], origin: int) -> tuple[Closure, ...]:
    """Return closures on a clock that starts at `origin`."""
    return tuple(Closure(one.start_s - origin, one.end_s - origin, one.reason) for one in closures)


def _family(shop: Shop, look: Outlook, place: int) -> str | None:
    """Return the family that all units of a machine are set up for, if it is one."""
    hall = shop.machines[place]
    if hall.id not in shop.changeovers:
        return hall.family
    names = {look.families.get((place, unit), hall.family) for unit in range(1, hall.count + 1)}
    return names.pop() if len(names) == 1 else None
