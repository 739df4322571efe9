"""What the printed sheets show, as plain values: machine lists, travellers and round sheets.

Every text is ready to print but not escaped. `render/dispatch_sheets.py` makes the values from a plan,
`render/dispatch.py` lays them out.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Move:
    """Where an order is before or after a run, when that stop ends or starts, and how far it is.

    `way` is how long the order is on its way there; empty for the stop before, and where it needs no time.
    """

    machine: str
    time: str
    way: str


@dataclass(frozen=True, slots=True)
class Aside:
    """What stands in sequence between runs: a closure with its reason, or a changeover.

    `what` names it, `unit` is as in :class:`Run`, 0 for the whole machine.
    """

    what: str
    unit: int
    start: str
    end: str
    minutes: str
    changeover: bool


@dataclass(frozen=True, slots=True)
class Run:
    """One line of a machine's list.

    `unit` is 0 on a machine of one unit. `minutes` count work, not the breaks in it; `set_up` of them are
    set-up, empty where none are. `family` is empty on machines that need no changeover, `heads` where no
    crew attends or all runs of the machine take alike. `remarks` tell of parts, breaks inside the run and a
    finish past the shift's end. `before` and `after` are None at the order's first and last stop. `asides`
    come before the run.
    """

    number: int
    order: str
    unit: int
    start: str
    end: str
    minutes: str
    set_up: str
    family: str
    heads: str
    remarks: tuple[str, ...]
    note: str
    before: Move | None
    after: Move | None
    asides: tuple[Aside, ...]


@dataclass(frozen=True, slots=True)
class MachineList:
    """What one machine, or one group of units, runs in sequence; never empty.

    `changes` is the open time of all its changeovers and `crew` who attends it; both may be empty.
    """

    machine: str
    name: str
    units: int
    work: str
    changes: str
    crew: str
    first: str
    last: str
    runs: tuple[Run, ...]


@dataclass(frozen=True, slots=True)
class Stop:
    """One stop of an order; the words as in :class:`Run`.

    `remarks` tell here of set-up, family, changeover and heads too; `way` is how long the order is then on
    its way to the next machine, empty where it needs no time.
    """

    number: int
    machine: str
    unit: int
    start: str
    end: str
    minutes: str
    remarks: tuple[str, ...]
    note: str
    way: str


@dataclass(frozen=True, slots=True)
class Strip:
    """One order's traveller, or one piece of it when the route is too long for one strip.

    `release`, `due` and `late` are empty where they say nothing.
    """

    order: str
    strip: int
    strips: int
    release: str
    due: str
    late: str
    finish: str
    stops: tuple[Stop, ...]


@dataclass(frozen=True, slots=True)
class RoundRow:
    """One round: who is on each machine of the sheet; an empty text is an idle machine."""

    number: int
    start: str
    end: str
    orders: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class RoundSheet:
    """Rounds down, machines across: as many machines as one sheet of paper holds."""

    sheet: int
    sheets: int
    machines: tuple[str, ...]
    rows: tuple[RoundRow, ...]


@dataclass(frozen=True, slots=True)
class DispatchView:
    """Everything on the sheets.

    Attributes
    ----------
    plan
        Short name of the plan; see :func:`shopfloor.render.tables.plan_id`.
    shift
        Which shift, or that time counts from 0:00.
    breaks
        When the hall pauses; empty when it does not.
    finish
        When all ends, whether that is proved, and by how much the shift is overrun.
    idle
        Machines that have nothing to run and so no sheet.
    stamp
        When it was printed, if somebody said so.
    """

    plan: str
    shift: str
    breaks: str
    finish: str
    stamp: str
    machines: tuple[MachineList, ...]
    idle: tuple[str, ...]
    strips: tuple[Strip, ...]
    round_sheets: tuple[RoundSheet, ...]
