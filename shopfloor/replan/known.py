"""The shop as far as a journal alone knows it: orders, machines and times, and nothing of the rest. Pure."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from shopfloor.model.actuals import Key, Piece, ShiftState
from shopfloor.model.calendar import Clock
from shopfloor.model.shop import Machine, Operations, Orders, Shop
from shopfloor.replan.told import Told


def known_shop(state: ShiftState, told: Told, clock: Clock, shift_end_s: int | None) -> Shop:
    """Return the shop of a journal's plans, for reports made without the orders file.

    It knows neither due times nor steps, families, set-ups, crews, breaks or closures. A machine has as many
    units as the journal names. Parts of a cut operation are operations of their own.
    """
    rows: Mapping[Key, Piece] = {
        piece.key: piece for plan in reversed(told.plans) for piece in plan.pieces
    }  # of several plans the first has the last word
    keys = sorted(rows, key=lambda key: (key.machine, key.order, key.piece))
    orders = tuple(dict.fromkeys(sorted(key.order for key in keys)))
    machines = tuple(dict.fromkeys(key.machine for key in keys))
    job = {name: index for index, name in enumerate(orders)}
    place = {name: index for index, name in enumerate(machines)}
    units = {name: each.units for name, each in state.machines.items()}
    return Shop(
        machines=tuple(Machine(name, count=units.get(name, 1)) for name in machines),
        orders=Orders(orders),
        operations=Operations(
            np.array([job[key.order] for key in keys], np.int64),
            np.array([place[key.machine] for key in keys], np.int64),
            np.array([max(1, rows[key].seconds) for key in keys], np.int64),
        ),
        clock=clock,
        shift_end_s=shift_end_s,
    )
