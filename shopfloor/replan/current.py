"""The shift's work as it stands: the orders as planned, with what was added and changed since. Pure."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from shopfloor.errors import ShopError
from shopfloor.model.actuals import OrderState, PieceState, ShiftState
from shopfloor.model.shop import NO_DUE, NO_FAMILY, NO_STEP, Operations, Orders, Shop
from shopfloor.replan.told import Told

Pair = tuple[str, str]
_NAMES = 5  # of what does not fit together, so many are named


@dataclass(frozen=True)
class Current:
    """All work of the shift, done or not.

    Attributes
    ----------
    shop
        The orders as planned, then operations and orders added.
    pieces
        For each operation, the pieces of the journal that are parts or repeats of it, by number.
    """

    shop: Shop
    pieces: tuple[tuple[PieceState, ...], ...]


def current(shop: Shop, state: ShiftState, told: Told) -> Current:
    """Return the shift's work as the journal has it.

    Parameters
    ----------
    shop
        What the first plan was made from.
    state, told
        The journal's, of one moment.

    Returns
    -------
    Current
        Operations of `shop` keep their places. An order added takes heads and set-up as most operations of
        its machines do, is of no family and goes any way. O(n log n) for n operations and pieces together.

    Raises
    ------
    ShopError
        If the journal has operations that `shop` has not, or an order added needs a machine it has not.
    """
    further = set(told.further)
    pairs: dict[Pair, list[PieceState]] = defaultdict(list)
    fresh: list[PieceState] = []
    for piece in state.pieces.values():
        if piece.key in further:
            fresh.append(piece)
        else:
            pairs[piece.key.order, piece.key.machine].append(piece)
    operations = _by_pair(shop)
    repeats = {(key.order, key.machine) for key in further} - operations.keys()
    _refuse_strangers(pairs.keys() - operations.keys() - repeats)
    dealt: list[tuple[PieceState, ...]] = [()] * len(shop)
    seconds = shop.operations.seconds.copy()
    for pair, pieces in pairs.items():
        if pair in repeats:
            continue
        pieces.sort(key=lambda piece: piece.key.piece)
        for index, mine in _deal(shop, operations[pair], pieces, told).items():
            dealt[index] = tuple(mine)
            said = [told.seconds[piece.key] for piece in mine if piece.key in told.seconds]
            if said:
                seconds[index] = said[-1]
    fresh.sort(key=lambda piece: piece.key)
    grown = _with_orders(_with_seconds(shop, seconds), fresh, told)
    added = [[piece] for piece in fresh]
    for piece in (piece for pair in sorted(repeats) for piece in pairs[pair]):
        alike = [mine for mine in added if mine[0].key[:2] == piece.key[:2]]
        next((mine for mine in alike if mine[-1].failed), alike[0]).append(piece)
    return Current(_amended(grown, state.orders), (*dealt, *map(tuple, added)))


def _by_pair(shop: Shop) -> dict[Pair, list[int]]:
    found: dict[Pair, list[int]] = defaultdict(list)
    jobs, machines = shop.operations.job.tolist(), shop.operations.machine.tolist()
    names = [machine.id for machine in shop.machines]
    for index, (job, machine) in enumerate(zip(jobs, machines, strict=True)):
        found[shop.orders.ids[job], names[machine]].append(index)
    return found


def _refuse_strangers(pairs: Iterable[Pair]) -> None:
    listed = sorted(pairs)
    if not listed:
        return
    named = ", ".join(f"{order} on {machine}" for order, machine in listed[:_NAMES])
    more = f" and {len(listed) - _NAMES:,} more" if len(listed) > _NAMES else ""
    raise ShopError(
        f"the journal has work that these orders have not: {named}{more}; give the orders, and the "
        "shop.toml, that the shift's first plan was made from"
    )


# ---- which piece is which operation -----------------------------------------------------------------


def planned_s(shop: Shop, machine: int, piece: PieceState, told: Told) -> int | None:
    """Return the working time a piece was to take by the plan in force when it began, else by the last."""
    row = told.planned(piece.key, piece.start_s)
    if row is None or row.start_s is None or row.end_s is None:
        return piece.total_s
    return worked_s(shop, machine, row.start_s, row.end_s)


def worked_s(shop: Shop, machine: int, start_s: int, end_s: int) -> int:
    """Return the working time from start to end on a machine: without closures, where its work pauses."""
    if not shop.machines[machine].pauses:
        return end_s - start_s
    clock = shop.machine_clocks[machine]
    return int(clock.worked(end_s)) - int(clock.worked(start_s))


def _deal(
    shop: Shop, operations: Sequence[int], pieces: Sequence[PieceState], told: Told
) -> dict[int, list[PieceState]]:
    """Deal the pieces of one order on one machine out to its operations there.

    With several operations a piece goes to one that is as long and not yet filled, the lowest step first;
    else to the nearest length. What was scrapped does not fill its operation.
    """
    if len(operations) == 1:
        return {operations[0]: list(pieces)}
    steps, seconds = shop.operations.step, shop.operations.seconds
    machine = int(shop.operations.machine[operations[0]])
    ranked = sorted(operations, key=lambda index: (int(steps[index]), index))
    room = {index: int(seconds[index]) for index in ranked}
    found: dict[int, list[PieceState]] = {index: [] for index in ranked}
    for piece in pieces:
        length = planned_s(shop, machine, piece, told) or 0
        open_ = [index for index in ranked if room[index] > 0] or ranked
        index = min(open_, key=lambda index: abs(room[index] - length))  # of equals the first
        found[index].append(piece)
        if not piece.failed:
            room[index] -= length
    return found


# ---- what was added and changed --------------------------------------------------------------------


def _with_seconds(shop: Shop, seconds: np.ndarray) -> Shop:
    if (seconds == shop.operations.seconds).all():
        return shop
    setup = np.minimum(shop.operations.setup_s, seconds)
    operations = replace(shop.operations, seconds=seconds, setup_s=setup)
    return replace(shop, operations=operations, unit_rounds=False)


def _with_orders(shop: Shop, fresh: Sequence[PieceState], told: Told) -> Shop:
    """Return the shop with further operations, and the orders that they bring."""
    if not fresh:
        return shop
    known = set(shop.orders.ids)
    ids = dict.fromkeys(piece.key.order for piece in fresh if piece.key.order not in known)
    job = {name: index for index, name in enumerate((*shop.orders.ids, *ids))}
    machine = {each.id: index for index, each in enumerate(shop.machines)}
    missing = sorted({piece.key.machine for piece in fresh} - machine.keys())
    if missing:
        raise ShopError(
            f"an order added needs machine {missing[0]}, which is not in the shop; give the shop.toml"
        )
    orders, columns, more = shop.orders, shop.operations, len(ids)
    places = [machine[piece.key.machine] for piece in fresh]
    seconds = [told.seconds[piece.key] for piece in fresh]
    usual = [_usual(shop, place) for place in places]
    added = {
        "job": [job[piece.key.order] for piece in fresh],
        "machine": places,
        "seconds": seconds,
        "step": [NO_STEP] * len(fresh),
        "splittable": [0] * len(fresh),
        "heads": [heads for heads, _ in usual],
        "family": [NO_FAMILY] * len(fresh),
        "setup_s": [min(setup, length) for (_, setup), length in zip(usual, seconds, strict=True)],
        "row": [0] * len(fresh),
    }
    return replace(
        shop,
        orders=Orders(
            (*orders.ids, *ids),
            np.r_[orders.release_s, np.zeros(more, np.int64)],
            np.r_[orders.due_s, np.full(more, NO_DUE)],
            np.r_[orders.priority, np.ones(more)],
        ),
        operations=Operations(
            **{name: np.r_[getattr(columns, name), values] for name, values in added.items()},
            notes=columns.notes,
        ),
        unit_rounds=False,
    )


def _usual(shop: Shop, machine: int) -> tuple[int, int]:
    """Return the heads and the set-up that most operations of a machine take; of equals the least."""
    mine = np.flatnonzero(shop.operations.machine == machine)
    if not len(mine):
        return 1, 0
    heads, setup = (
        min(Counter(column[mine].tolist()).items(), key=lambda pair: (-pair[1], pair[0]))[0]
        for column in (shop.operations.heads, shop.operations.setup_s)
    )
    return heads, setup


def _amended(shop: Shop, said: Mapping[str, OrderState]) -> Shop:
    """Return the shop with releases, due times and priorities as last said."""
    release, due = shop.orders.release_s.copy(), shop.orders.due_s.copy()
    priority = shop.orders.priority.copy()
    for job, name in enumerate(shop.orders.ids):
        order = said.get(name)
        if order is None:
            continue
        if order.release_s is not None:
            release[job] = max(0, order.release_s)
        if order.due_s is not None:
            due[job] = order.due_s
        if order.priority is not None:
            priority[job] = order.priority
    release = np.where((due < release) & (release > 0), np.maximum(due, 0), release)
    return replace(shop, orders=Orders(shop.orders.ids, release, due, priority))
