"""Which orders run this shift: choose, confirm with a plan, and give every carried order its reason."""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from shopfloor.errors import InputError, NoPlanError
from shopfloor.fit.budget import Budget, budget
from shopfloor.fit.flow import choose_operations
from shopfloor.fit.knapsack import Selection, choose_orders
from shopfloor.fit.value import PRIORITY_UNIT, worth
from shopfloor.model.results import Fault, Plan
from shopfloor.model.shop import Bools, Ints, Shop
from shopfloor.openshop.method import Progress
from shopfloor.pipeline import Options, plan

TRIES = 12  # choices put to the planner before single orders are taken out one by one


@dataclass(frozen=True, slots=True)
class Carried:
    """An order, or part of one, that waits for another shift, and why."""

    order: str
    reason: str


@dataclass(frozen=True, slots=True)
class Fit:
    """What fits.

    Attributes
    ----------
    chosen
        Which operations of `shop` run this shift.
    carried
        Why each order that does not (wholly) run waits, in file order.
    plan
        The audited plan of the chosen operations, which ends inside the shift.
    value, value_bound
        Priority chosen, and the most that any choice could have.
    relaxed
        What fractions of orders could be worth; None where single operations were chosen.
    proved
        Whether no choice is worth more.
    sentence
        Which kind of answer this is.
    """

    shop: Shop
    chosen: Bools
    carried: tuple[Carried, ...]
    plan: Plan
    value: float
    value_bound: float
    relaxed: float | None
    proved: bool
    sentence: str


def fit(
    shop: Shop,
    *,
    must: Sequence[str] = (),
    never: Sequence[str] = (),
    by: str = "orders",
    options: Options | None = None,
    report: Callable[[Progress], None] | None = None,
    stop: threading.Event | None = None,
) -> Fit:
    """Choose what the shift of `shop` can hold, worth most priority, orders already late first.

    Parameters
    ----------
    must, never
        Orders that have to run, and that must not.
    by
        ``orders``, whole ones only, or ``operations``, which may leave part of an order for later.

    Raises
    ------
    InputError
        If a pinned order is not in the shop or pinned both ways.
    NoPlanError
        If the shift's end is not known, or the pinned orders do not fit.
    """
    options = options or Options()
    pins = _pins(shop, must, never)
    limits = budget(shop)

    def attempt(chosen: Bools) -> Plan:
        return plan(shop.keep(chosen), options, report=report, stop=stop)

    if by == "operations":
        chosen = choose_operations(shop, limits, must=pins[0], never=pins[1])
        value = worth(shop)[shop.operations.job]
        best = float(value[chosen].sum()) / PRIORITY_UNIT
        sentence = (
            f"Guaranteed and proved best: no order and no machine has more than {limits.room} rounds, so "
            "everything chosen fits (König 1916), and no choice of operations is worth more "
            "(a flow of least cost)."
        )
        return Fit(
            shop,
            chosen,
            _reasons(shop, limits, chosen, pins[1]),
            attempt(chosen),
            best,
            best,
            None,
            True,
            sentence,
        )
    selection, made, first = _confirmed(shop, limits, pins, options, attempt)
    chosen = selection.orders[shop.operations.job]
    bound = first.value_bound
    proved = selection.proved and selection.value >= bound
    return Fit(
        shop,
        chosen,
        _reasons(shop, limits, chosen, pins[1]),
        made,
        selection.value / PRIORITY_UNIT,
        bound / PRIORITY_UNIT,
        first.relaxed / PRIORITY_UNIT,
        proved,
        _sentence(limits, proved),
    )


def _confirmed(
    shop: Shop, limits: Budget, pins: tuple[Bools, Bools], options: Options, attempt: Callable[[Bools], Plan]
) -> tuple[Selection, Plan, Selection]:
    """Choose until a plan of the choice ends inside the shift; the first choice carries the bound."""
    forbidden: list[Bools] = []
    first: Selection | None = None
    while True:
        selection = choose_orders(
            shop,
            limits,
            must=pins[0],
            never=pins[1],
            time_limit_s=options.time_limit_s,
            seed=options.seed,
            forbidden=forbidden,
        )
        first = first or selection
        made = attempt(selection.orders[shop.operations.job])
        if made.fits_shift:
            return selection, made, first
        if limits.enough:
            raise AssertionError("a choice within the limits of an exact method did not fit")
        forbidden.append(selection.orders)
        if len(forbidden) >= TRIES:
            return *_thinned(shop, selection, made, pins[0], attempt), first


def _thinned(
    shop: Shop, selection: Selection, made: Plan, must: Bools, attempt: Callable[[Bools], Plan]
) -> tuple[Selection, Plan]:
    """Take out the cheapest order that ends too late, again and again, until the rest fits."""
    orders, value = selection.orders.copy(), worth(shop)
    name_of = {name: index for index, name in enumerate(shop.orders.ids)}
    while not made.fits_shift:
        assert shop.shift_end_s is not None
        finish = made.schedule.completion_s(made.shop.operations.job, len(made.shop.orders))
        over = [name_of[made.shop.orders.ids[j]] for j in np.flatnonzero(finish > shop.shift_end_s).tolist()]
        free = [index for index in over if not must[index]]
        if not free:
            raise NoPlanError("no plan was found in which the orders given with --must end inside the shift")
        orders[min(free, key=lambda index: (int(value[index]), index))] = False
        made = attempt(orders[shop.operations.job])
    return Selection(orders, int(value[orders].sum()), selection.value_bound, selection.relaxed, False), made


def _sentence(limits: Budget, proved: bool) -> str:
    if limits.enough:
        best = "no choice of whole orders is worth more" if proved else "a choice worth more may exist"
        return (
            f"Guaranteed: no order and no machine has more than {limits.room_text()}, so everything chosen "
            f"fits, since {limits.theorem}; {best}."
        )
    best = (
        "and by the load limits no choice is worth more"
        if proved
        else "but a choice worth more may exist, since load limits alone do not decide this shop"
    )
    return f"Confirmed by the plan itself, {best}."


def _pins(shop: Shop, must: Sequence[str], never: Sequence[str]) -> tuple[Bools, Bools]:
    known = {name: index for index, name in enumerate(shop.orders.ids)}
    faults = [
        Fault("command line", 0, option, name, "order-unknown", "is not among the orders", "check the number")
        for option, names in (("--must", must), ("--not", never))
        for name in names
        if name not in known
    ]
    faults += [
        Fault(
            "command line",
            0,
            "--must",
            name,
            "order-pinned-twice",
            "is also given with --not",
            "drop one of the two",
        )
        for name in sorted(set(must) & set(never))
    ]
    if faults:
        raise InputError(faults)
    pinned = np.zeros((2, len(shop.orders)), bool)
    for row, names in zip(pinned, (must, never), strict=True):
        row[[known[name] for name in names]] = True
    return pinned[0], pinned[1]


def _reasons(shop: Shop, limits: Budget, chosen: Bools, never: Bools) -> tuple[Carried, ...]:
    """Say of each order that waits which machine, crew or the order itself leaves no room for it."""
    job = shop.operations.job
    used = [int(limit.weight[limit.operations][chosen[limit.operations]].sum()) for limit in limits.limits]
    carried = []
    for index in np.unique(job[~chosen]).tolist():
        waiting = np.flatnonzero((job == index) & ~chosen)
        carried.append(
            Carried(shop.orders.ids[index], _reason(limits, used, waiting, index, bool(never[index])))
        )
    return tuple(carried)


def _reason(limits: Budget, used: list[int], waiting: Ints, index: int, never: bool) -> str:
    if never:
        return "taken out with --not"
    if int(limits.cost[waiting].sum()) > int(limits.order_room[index]):
        return f"the order alone needs more than the {limits.room_text()} it has in this shift"
    tight = []
    for limit, taken in zip(limits.limits, used, strict=True):
        need = int(limit.weight[np.intersect1d(waiting, limit.operations)].sum())
        short = taken + need - limit.room
        if need and short > 0:
            tight.append((short, limit.name))
    if not tight:
        return "no plan was found that holds it too"
    names = list(dict.fromkeys(name for _, name in sorted(tight, key=lambda pair: (-pair[0], pair[1]))))
    listed = names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"
    return f"{listed} {'is' if len(names) == 1 else 'are'} full"
