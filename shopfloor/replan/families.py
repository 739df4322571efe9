"""Which family each unit is set up for, and which it is being changed to. Pure.

A journal has no entries for changeovers. So an idle unit whose next operation in the plan in force is of
another family is taken to have been changed towards it since it was free, as the plan wanted; what is left of
that is finished first. A unit that was down in the meantime gets no such credit.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

from shopfloor.model.actuals import Key, ShiftState
from shopfloor.model.shop import NO_FAMILY, Shop
from shopfloor.replan.current import Current
from shopfloor.replan.remaining import Left
from shopfloor.replan.told import Told

Unit = tuple[int, int]  # machine and unit, from 1


class Changing(NamedTuple):
    """A unit that is being changed to `family` until `until_s`."""

    machine: int
    unit: int
    until_s: int
    family: str


def families(
    now: Current, left: Sequence[Left], state: ShiftState, told: Told
) -> tuple[Mapping[Unit, str], tuple[Changing, ...]]:
    """Return the family of each unit of machines with changeovers, and what is being changed.

    A unit that is being changed, or has been, is of the family it is changed to. Units that ran nothing and
    have no family to begin with are left out.
    """
    shop = now.shop
    last = _last(now)
    following = _following(now, left, told)
    found: dict[Unit, str] = {}
    changing: list[Changing] = []
    for machine, hall in enumerate(shop.machines):
        rule = shop.changeovers.get(hall.id)
        if rule is None:
            continue
        for unit in range(1, hall.count + 1):
            place = machine, unit
            ended, family = last.get(place, (0, hall.family))
            if family is None:
                continue
            found[place] = family
            if ended is None or place not in following or _was_down(state, hall.id, unit, ended):
                continue
            seconds = rule.seconds(family, following[place])
            if seconds:
                found[place] = following[place]
                until = shop.machine_clocks[machine].finish(ended, seconds)
                if until > state.at_s:
                    changing.append(Changing(machine, unit, until, following[place]))
    return found, tuple(changing)


def _name(shop: Shop, operation: int) -> str:
    family = int(shop.operations.family[operation])
    return "" if family == NO_FAMILY else shop.families[family]


def _last(now: Current) -> dict[Unit, tuple[int | None, str]]:
    """Return when each unit was last free, None while it runs, and the family of what ran there last."""
    columns = now.shop.operations
    found: dict[Unit, tuple[int, int | None, str]] = {}
    for index, pieces in enumerate(now.pieces):
        for run in (run for piece in pieces for run in piece.runs):
            unit = int(columns.machine[index]), run.unit
            if unit not in found or found[unit][0] < run.start_s:
                found[unit] = run.start_s, run.end_s, _name(now.shop, index)
    return {unit: (end, name) for unit, (_, end, name) in found.items()}


def _following(now: Current, left: Sequence[Left], told: Told) -> dict[Unit, str]:
    """Return the family of what the plan in force has next on each unit, of work not begun."""
    waiting: Mapping[Key, int] = {one.key: one.operation for one in left if not one.running}
    place = {hall.id: index for index, hall in enumerate(now.shop.machines)}
    found: dict[Unit, tuple[int, str]] = {}
    for row in told.plans[-1].pieces if told.plans else ():
        if row.key in waiting and row.start_s is not None:
            unit = place[row.key.machine], row.unit
            if unit not in found or row.start_s < found[unit][0]:
                found[unit] = row.start_s, _name(now.shop, waiting[row.key])
    return {unit: name for unit, (_, name) in found.items()}


def _was_down(state: ShiftState, machine: str, unit: int, since_s: int) -> bool:
    known = state.machines.get(machine)
    return known is not None and any(
        outage.unit in (0, unit) and outage.until(state.at_s + 1) > since_s for outage in known.outages
    )
