"""What would help: the new bound if the lead could change one thing, best first.

A lever is pulled on a copy of the shop and the bounds are taken again; nothing is planned. So each
answer is what the change makes *possible*, not a promise. Where several bounds tie, one lever alone
changes nothing, and saying so is the most useful answer; then the same lever on all of them is shown.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.model.calendar import HOUR, duration
from shopfloor.model.results import Bound
from shopfloor.model.shop import Machine, Operations, Orders, Shop

ORDERS_TRIED = 8  # orders with most work on what binds
LEVERS_SHOWN = 6


@dataclass(frozen=True, slots=True)
class Lever:
    """One change, the bound after it, and the sentence. `gain_s` is how much earlier the bound ends."""

    kind: str
    what: str
    value_s: int
    gain_s: int
    sentence: str


def what_would_help(shop: Shop, bounds: tuple[Bound, ...] | None = None) -> tuple[Lever, ...]:
    """Return levers that lower the best bound, most gain first; empty when nothing tried helps.

    Running time is that of a dozen or so rounds of `lower_bounds`.
    """
    bounds = bounds if bounds is not None else lower_bounds(shop)
    if not bounds:
        return ()
    best = bounds[0].value_s
    machines, crews, orders = _binding(shop, bounds)
    pulled: list[tuple[str, str, int, str]] = []
    for name in machines:
        pulled.append(
            (
                "hour",
                name,
                _hour_more(shop, bounds, {name}),
                f"One hour of {name}'s work done outside the shift",
            )
        )
        pulled.append(("unit", name, _bound(_more_units(shop, {name})), f"One more unit of {name}"))
    for name in crews:
        pulled.append(("head", name, _bound(_more_heads(shop, {name})), f"One more head in crew {name}"))
    for job in orders:
        name = shop.orders.ids[job]
        pulled.append(
            ("split order", name, _bound(_in_two_lots(shop, job)), f"Splitting order {name} into two lots")
        )
    for job in _heaviest(shop, machines, orders):
        name = shop.orders.ids[job]
        rest = _bound(shop.keep(shop.operations.job != job))
        pulled.append(("carry over", name, rest, f"Carrying order {name} over"))
    if len(machines) > 1:
        all_of = " and ".join(machines) if len(machines) < 4 else f"all {len(machines)} that tie"
        together = _hour_more(shop, bounds, set(machines))
        pulled.append(("hour", all_of, together, f"One hour of work of {all_of} each done outside the shift"))
        pulled.append(
            ("unit", all_of, _bound(_more_units(shop, set(machines))), f"One more unit of {all_of} each")
        )
    levers = [_lever(shop, best, *each) for each in pulled if each[2] < best]
    # One lever of a kind that gains the same as another says nothing new: keep the first.
    shown: dict[tuple[str, int], Lever] = {}
    for lever in sorted(levers, key=lambda lever: (-lever.gain_s, lever.kind)):
        shown.setdefault((lever.kind, lever.gain_s), lever)
    return tuple(shown.values())[:LEVERS_SHOWN]


def tie_sentence(shop: Shop, bounds: tuple[Bound, ...]) -> str:
    """Say which things bind together, so that one lever alone changes nothing; empty when one binds alone."""
    machines, crews, orders = _binding(shop, bounds)
    names = [
        *machines,
        *(f"crew {name}" for name in crews),
        *(f"order {shop.orders.ids[job]}" for job in orders),
    ]
    if len(names) < 2:
        return ""
    listed = f"{', '.join(names[:3])} and {len(names) - 3} more" if len(names) > 4 else _and(names)
    when = shop.clock.say(bounds[0].value_s)
    return f"{listed} bind together at {when}: a lever on one of them alone changes nothing."


def _lever(shop: Shop, best: int, kind: str, what: str, value: int, text: str) -> Lever:
    gain = best - value
    say = shop.clock.say
    return Lever(
        kind,
        what,
        value,
        gain,
        f"{text}: nothing before {say(value)} instead of {say(best)}, {duration(gain)} earlier.",
    )


def _binding(shop: Shop, bounds: tuple[Bound, ...]) -> tuple[list[str], list[str], list[int]]:
    """Return the machines, crews and orders whose bounds are the best one."""
    place = {name: job for job, name in enumerate(shop.orders.ids)}
    machines: dict[str, None] = {}
    crews: dict[str, None] = {}
    orders: dict[int, None] = {}
    for bound in bounds:
        if bound.value_s < bounds[0].value_s:
            break
        witness = bound.witness
        if "crew" in witness:
            crews[witness["crew"]] = None
        elif "machine" in witness:
            machines[witness["machine"]] = None
        elif witness.get("node") == "machine":
            machines[witness["id"]] = None
        elif "order" in witness or witness.get("node") == "order":
            orders[place[witness.get("order", witness.get("id"))]] = None
    return list(machines), list(crews), list(orders)


def _bound(shop: Shop) -> int:
    bounds = lower_bounds(shop)
    return bounds[0].value_s if bounds else 0


def _hour_more(shop: Shop, bounds: tuple[Bound, ...], names: set[str]) -> int:
    """Return the bound if an hour of each named machine's work were done outside the shift."""
    values = [0]
    for bound in bounds:
        mine = bound.witness.get("machine") or (
            bound.witness.get("id") if bound.witness.get("node") == "machine" else ""
        )
        values.append(bound.value_s - HOUR if mine in names else bound.value_s)
    return max(values)


def _more_units(shop: Shop, names: set[str]) -> Shop:
    def more(machine: Machine) -> Machine:
        return replace(machine, count=machine.count + 1) if machine.id in names else machine

    return replace(shop, machines=tuple(more(machine) for machine in shop.machines))


def _more_heads(shop: Shop, names: set[str]) -> Shop:
    crews = tuple(replace(crew, heads=crew.heads + 1) if crew.id in names else crew for crew in shop.crews)
    return replace(shop, crews=crews)


def _in_two_lots(shop: Shop, job: int) -> Shop:
    """Return the shop with half of each operation of one order given to a second lot of it."""
    columns, orders = shop.operations, shop.orders
    name = next(
        f"{orders.ids[job]} lot {k}"
        for k in range(2, len(orders) + 3)
        if f"{orders.ids[job]} lot {k}" not in orders.ids
    )
    halves = np.flatnonzero((columns.job == job) & (columns.seconds > 1))
    seconds = columns.seconds.copy()
    second_half = seconds[halves] // 2
    seconds[halves] -= second_half
    return replace(
        shop,
        orders=Orders(
            (*orders.ids, name),
            np.r_[orders.release_s, orders.release_s[job]],
            np.r_[orders.due_s, orders.due_s[job]],
            np.r_[orders.priority, orders.priority[job]],
        ),
        operations=Operations(
            np.r_[columns.job, np.full(len(halves), len(orders))],
            np.r_[columns.machine, columns.machine[halves]],
            np.r_[seconds, second_half],
            np.r_[columns.step, columns.step[halves]],
            np.r_[columns.splittable, columns.splittable[halves]],
            np.r_[columns.heads, columns.heads[halves]],
            np.r_[columns.family, columns.family[halves]],
            np.r_[np.minimum(columns.setup_s, seconds), np.minimum(columns.setup_s[halves], second_half)],
        ),
    )


def _heaviest(shop: Shop, machines: list[str], orders: list[int]) -> list[int]:
    """Return the binding orders and those with most work on the binding machines."""
    columns = shop.operations
    binding = np.array([machine.id in machines for machine in shop.machines], bool)
    on = binding[columns.machine]
    work = np.bincount(columns.job[on], columns.seconds[on], len(shop.orders))
    heavy = [int(j) for j in np.lexsort((np.arange(len(work)), -work))[:ORDERS_TRIED] if work[j]]
    return list(dict.fromkeys([*orders, *heavy]))


def _and(names: list[str]) -> str:
    return f"{', '.join(names[:-1])} and {names[-1]}"
