"""From the solver's values to places in seconds."""

from __future__ import annotations

from collections.abc import Callable

from ortools.sat.python import cp_model

from shopfloor.openshop.cpsat.floor.best import Best, Places
from shopfloor.openshop.cpsat.floor.variables import Model
from shopfloor.openshop.units import assign_units


def places_of(model: Model, value: Callable[[cp_model.IntVar], int]) -> Places:
    """Return where the solver put everything; what is not in the model stays."""
    unit_s, shop = model.grid.unit_s, model.shop
    start, end = model.places.start.copy(), model.places.end.copy()
    chosen: list[tuple[int, int]] = []
    for visit in model.visits:
        if not model.is_free(visit):
            continue
        at = value(visit.at)
        clock = visit.hours.clock
        start[visit.operation] = int(clock.start(at)) * unit_s
        end[visit.operation] = int(clock.end(at + visit.work)) * unit_s
        for place, literal in enumerate(visit.on_unit):
            if value(literal):
                chosen.append((visit.operation, place + 1))
    unit = assign_units(shop, start, end)
    kept = [machine for machine in range(len(shop.machines)) if model.has_units(machine)]
    for machine in kept:
        mine = shop.operations.machine == machine
        unit[mine] = model.places.unit[mine]
    for operation, which in chosen:
        unit[operation] = which
    return Places(start, end, unit)


def keep(model: Model, best: Best, value: Callable[[cp_model.IntVar], int]) -> None:
    """Offer a solution of the model."""
    best.offer(places_of(model, value))
