"""plan.ics: the plan as a calendar (RFC 5545), an event an assignment.

Only where the shift has a start. The only module that imports icalendar; import it only when asked for.
"""

from __future__ import annotations

import re
import uuid
from collections.abc import Iterable
from datetime import UTC, datetime
from typing import TYPE_CHECKING

from icalendar import Calendar, Event, vText

from shopfloor import __version__
from shopfloor.errors import SaveError
from shopfloor.model.calendar import minutes_text
from shopfloor.render.html import CARE_NOTICE, clean

if TYPE_CHECKING:
    from shopfloor.model.calendar import Clock
    from shopfloor.model.results import Plan

# Any fixed value serves: it keeps our identifiers apart from those others make from the same words.
_OURS = uuid.UUID("5a0f7a52-0d0c-5c3c-9f0e-2f6d0f6a7a11")


def plan_ics(plan: Plan) -> bytes:
    """Return one calendar with every assignment.

    With a time zone, times are written in UTC, so that every calendar shows them right; without one they
    float, and every calendar shows the hall's own wall time. An event keeps its identifier when the plan
    changes, as long as shift, order, machine and part stay, so that reading a new plan moves it. The
    time stamp that the format asks of each event is the shift's start: equal plans give equal bytes.

    Raises
    ------
    SaveError
        If the clock starts at zero.
    """
    _require_start(plan)
    name = f"Plan of {plan.shop.clock.write(0)[:10]}"
    return _calendar(plan, name, range(len(plan.schedule)))


def machine_calendars(plan: Plan) -> dict[str, bytes]:
    """Return a calendar a machine that has work, file name to content; otherwise as :func:`plan_ics`."""
    _require_start(plan)
    place = plan.shop.operations.machine[plan.schedule.operation].tolist()
    rows: dict[int, list[int]] = {}
    for index, machine in enumerate(place):
        rows.setdefault(machine, []).append(index)
    return {
        _file_name(number, plan.shop.machines[number].id): _calendar(
            plan, plan.shop.machines[number].id, rows[number]
        )
        for number in sorted(rows)
    }


def _require_start(plan: Plan) -> None:
    if not plan.shop.clock.running:
        raise SaveError("a calendar needs to know when the shift starts; give --start")


def _file_name(number: int, machine: str) -> str:
    """A name that every disk takes; the number keeps two machines apart whatever their names become."""
    plain = re.sub(r"[^A-Za-z0-9]+", "-", machine).strip("-")[:40]
    return f"machine-{number + 1:03d}{'-' if plain else ''}{plain}.ics"


def _calendar(plan: Plan, name: str, rows: Iterable[int]) -> bytes:
    calendar = Calendar()
    calendar.add("prodid", f"-//shopfloor//{__version__}//EN")
    calendar.add("version", "2.0")
    calendar.add("method", "PUBLISH")
    calendar.add("name", vText(clean(name)))  # the library does not know NAME for text
    calendar.add("description", CARE_NOTICE)
    twins = _twins(plan)
    for index in rows:
        calendar.add_component(_event(plan, index, twins))
    return bytes(calendar.to_ical())


def _twins(plan: Plan) -> list[int]:
    """Number the operations that share order and machine, so that each has an identifier of its own."""
    seen: dict[tuple[int, int], int] = {}
    numbers = []
    for pair in zip(plan.shop.operations.job.tolist(), plan.shop.operations.machine.tolist(), strict=True):
        seen[pair] = seen.get(pair, 0) + 1
        numbers.append(seen[pair])
    return numbers


def _event(plan: Plan, index: int, twins: list[int]) -> Event:
    row, clock = plan.schedule[index], plan.shop.clock
    operation = plan.shop.operation(row.operation)
    machine = plan.shop.machines[operation.machine]
    where = f"{machine.id} unit {row.unit}" if machine.count > 1 else machine.id
    facts = [f"{minutes_text(operation.seconds)} min of work"]
    facts += [f"part {row.part} of {row.parts} of it"] if row.parts > 1 else []
    facts += [f"round {row.round}"] if row.round is not None else []
    facts += [operation.note] if operation.note else []
    known = (clock.write(0), operation.order, machine.id, str(twins[row.operation]), str(row.part))
    event = Event()
    event.add("uid", str(uuid.uuid5(_OURS, "\0".join(known))))
    event.add("dtstamp", _utc(clock, 0))
    event.add("dtstart", _moment(clock, row.start_s))
    event.add("dtend", _moment(clock, row.end_s))
    event.add("summary", clean(f"{operation.order} on {where}"))
    event.add("location", clean(where))
    event.add("description", clean("\n".join([*facts, CARE_NOTICE])))
    return event


def _moment(clock: Clock, seconds: int) -> datetime:
    return clock.moment(seconds) if clock.zone is None else _utc(clock, seconds)


def _utc(clock: Clock, seconds: int) -> datetime:
    """The moment in UTC; a clock without time zone is taken to tell UTC, which only the stamp needs."""
    moment = clock.moment(seconds)
    return moment.replace(tzinfo=clock.zone or UTC).astimezone(UTC)
