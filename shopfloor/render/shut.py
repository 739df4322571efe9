"""When a machine is shut: the hall's breaks and its own closures laid over each other, with their reasons."""

from __future__ import annotations

from collections.abc import Iterable

from shopfloor.model.shop import Closure, Machine, Shop

NO_REASON = "closed"
HALL_BREAK = "break"


def closures_of(shop: Shop, machine: Machine) -> list[Closure]:
    """Return when `machine` is shut, in order of time and apart from each other; each has a reason.

    Breaks and closures that meet or overlap become one, which names every reason once.
    """
    if not machine.closed and not shop.breaks:
        return []
    breaks = (Closure(shut.start_s, shut.end_s, shut.reason or HALL_BREAK) for shut in shop.breaks)
    own = (Closure(shut.start_s, shut.end_s, shut.reason or NO_REASON) for shut in machine.closed)
    return _laid_over([*breaks, *own])


def closed_names(shuts: Iterable[Closure]) -> str:
    """Return the reasons of some closures, each once, in order of time."""
    return ", ".join(dict.fromkeys(shut.reason for shut in shuts if shut.reason))


def _laid_over(shuts: list[Closure]) -> list[Closure]:
    laid: list[list[Closure]] = []
    end = 0
    for shut in sorted(shuts, key=lambda shut: (shut.start_s, shut.end_s, shut.reason)):
        if laid and shut.start_s <= end:
            laid[-1].append(shut)
            end = max(end, shut.end_s)
        else:
            laid.append([shut])
            end = shut.end_s
    return [
        Closure(together[0].start_s, max(shut.end_s for shut in together), closed_names(together))
        for together in laid
    ]
