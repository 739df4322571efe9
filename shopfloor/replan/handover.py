"""Planned against actual at the end of a shift: by machine, by order, and what carries over. Pure."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from shopfloor.model.actuals import Event, Piece, PieceState, ShiftState, Status
from shopfloor.model.shop import NO_DUE
from shopfloor.replan.compare import longest_in_order
from shopfloor.replan.current import Current, worked_s
from shopfloor.replan.figures import Elements
from shopfloor.replan.reasons import Reason, outage_reasons, reasons
from shopfloor.replan.remaining import MINIMUM_LEFT_S, Left, remaining, run_s
from shopfloor.replan.times import Times, machine_times
from shopfloor.replan.told import Told


@dataclass(frozen=True, slots=True)
class MachineReport:
    """One machine, planned against actual.

    Attributes
    ----------
    machine, name, units
        As in the shop.
    times, elements
        What became of its time; the same under ISO 22400-2's symbols, with the pieces reported.
    setup_s
        Of the work, what is taken for set-up.
    planned_s, planned, done
        Work that the plans wanted done by now, in how many operations, and how many were done well.
    outages, stops
        Why it was down, and why work on it was stopped, longest first.
    started, in_sequence
        Operations begun on it, and the most of them that kept the order in which their plans had them.
    """

    machine: str
    name: str
    units: int
    times: Times
    elements: Elements
    setup_s: int
    planned_s: int
    planned: int
    done: int
    outages: tuple[Reason, ...]
    stops: tuple[Reason, ...]
    started: int
    in_sequence: int


@dataclass(frozen=True, slots=True)
class OrderReport:
    """One order, planned against actual; times in seconds since the shift's start.

    Attributes
    ----------
    promised_s, planned_s
        Finish by the first plan that had it, and by the last.
    actual_s
        Its finish; None while something of it is left.
    due_s
        None without a due time.
    late_s, behind_s
        How much later than due, and than first planned, it was done; of an order not done, how long that
        time has passed.
    left
        How many operations are left.
    cancelled
        Whether it was cancelled.
    why
        What held it up, longest first.
    """

    order: str
    promised_s: int | None
    planned_s: int | None
    actual_s: int | None
    due_s: int | None
    late_s: int
    behind_s: int
    left: int
    cancelled: bool
    why: tuple[Reason, ...]


@dataclass(frozen=True)
class Handover:
    """How a shift went, until `at_s`.

    Attributes
    ----------
    now
        The shift's work.
    machines, orders
        In the order of the shop.
    left
        What carries over.
    remarks
        What was remarked, in order of time.
    plans
        The plans that were in force.
    odd
        Entries that contradict others, and were accepted.
    """

    at_s: int
    now: Current
    machines: tuple[MachineReport, ...]
    orders: tuple[OrderReport, ...]
    left: tuple[Left, ...]
    remarks: tuple[Event, ...]
    plans: tuple[Event, ...]
    odd: int = 0

    @property
    def elements(self) -> Elements:
        """The times of all machines together."""
        return sum((row.elements for row in self.machines), Elements())

    @property
    def started(self) -> int:
        """Operations begun."""
        return sum(row.started for row in self.machines)

    @property
    def in_sequence(self) -> int:
        """Of those, the most that kept to their machine's planned sequence."""
        return sum(row.in_sequence for row in self.machines)

    @property
    def done(self) -> int:
        """Operations done."""
        return sum(row.done for row in self.machines)


def handover(
    now: Current, state: ShiftState, told: Told, *, minimum_left_s: int = MINIMUM_LEFT_S
) -> Handover:
    """Return how the shift went until `state.at_s`; O(n log n) for n operations and entries."""
    left = remaining(now, state, told, minimum_left_s=minimum_left_s)
    by_machine: dict[int, list[tuple[int, PieceState]]] = defaultdict(list)
    by_order: dict[int, list[tuple[int, PieceState]]] = defaultdict(list)
    columns = now.shop.operations
    for index, pieces in enumerate(now.pieces):
        for piece in pieces:
            by_machine[int(columns.machine[index])].append((index, piece))
            by_order[int(columns.job[index])].append((index, piece))
    rows = _rows_by_machine(told)
    return Handover(
        at_s=state.at_s,
        now=now,
        machines=tuple(
            _machine(now, place, by_machine[place], rows, state, told)
            for place in range(len(now.shop.machines))
        ),
        orders=tuple(_orders(now, by_order, left, state, told)),
        left=left,
        remarks=told.remarks,
        plans=told.plans,
        odd=len(state.odd),
    )


# ---- machines --------------------------------------------------------------------------------------


def _rows_by_machine(told: Told) -> Mapping[str, list[Piece]]:
    """Return the row that each operation had in the last plan that had it before it should have begun."""
    last: dict[object, Piece] = {}
    for plan in told.plans:
        for row in plan.pieces:
            last[row.key] = row
    found: dict[str, list[Piece]] = defaultdict(list)
    for row in last.values():
        found[row.key.machine].append(row)
    return found


def _machine(
    now: Current,
    place: int,
    mine: Sequence[tuple[int, PieceState]],
    rows: Mapping[str, Sequence[Piece]],
    state: ShiftState,
    told: Told,
) -> MachineReport:
    shop, until = now.shop, state.at_s
    hall = shop.machines[place]
    pieces = [piece for _, piece in mine]
    times = machine_times(shop, place, pieces, state)
    setup = min(
        times.work_s,
        sum(
            min(int(shop.operations.setup_s[index]), run_s(now, place, piece, state)) for index, piece in mine
        ),
    )
    wanted = [row for row in rows.get(hall.id, ()) if row.start_s is not None and row.start_s < until]
    known = state.machines.get(hall.id)
    started, in_sequence = _sequence(pieces, told)
    return MachineReport(
        machine=hall.id,
        name=hall.name,
        units=hall.count,
        times=times,
        elements=Elements(
            PBT=times.open_s,
            AUST=setup,
            APT=times.work_s - setup,
            ADET=times.held_s + times.stopped_s,
            ADOT=times.idle_s,
            GQ=sum(piece.good or 0 for piece in pieces),
            SQ=sum(piece.scrap or 0 for piece in pieces),
        ),
        setup_s=setup,
        planned_s=sum(worked_s(shop, place, row.start_s or 0, min(row.end_s or 0, until)) for row in wanted),
        planned=sum((row.end_s or 0) <= until for row in wanted),
        done=sum(piece.status is Status.DONE and not piece.failed for piece in pieces),
        outages=outage_reasons(known.outages if known is not None else (), until),
        stops=outage_reasons([pause for piece in pieces for pause in piece.pauses], until),
        started=started,
        in_sequence=in_sequence,
    )


def _sequence(pieces: Iterable[PieceState], told: Told) -> tuple[int, int]:
    """Return how many operations were begun, and the most of them that kept their planned order.

    Each is held against the plan in force when it began; one that no plan had is out of order.
    """
    begun = [piece for piece in pieces if piece.start_s is not None]
    planned = [
        (row.start_s or 0, piece.start_s or 0)
        for piece in begun
        if (row := told.planned(piece.key, piece.start_s)) is not None
    ]
    planned.sort()
    return len(begun), sum(longest_in_order([start for _, start in planned]))


# ---- orders ----------------------------------------------------------------------------------------


def _orders(
    now: Current,
    by_order: Mapping[int, Sequence[tuple[int, PieceState]]],
    left: Sequence[Left],
    state: ShiftState,
    told: Told,
) -> Iterable[OrderReport]:
    shop, until = now.shop, state.at_s
    open_: dict[int, int] = defaultdict(int)
    for one in left:
        open_[int(shop.operations.job[one.operation])] += 1
    for job, name in enumerate(shop.orders.ids):
        pieces = [piece for _, piece in by_order.get(job, ())]
        said = state.orders.get(name)
        cancelled = said is not None and said.cancelled_s is not None
        ends = [piece.end_s for piece in pieces if piece.end_s is not None and not piece.failed]
        done = max(ends, default=None) if not open_[job] and not cancelled else None
        due = int(shop.orders.due_s[job])
        known = None if due == NO_DUE else due
        reached = done if done is not None else until
        late = max(0, reached - due) if known is not None and not cancelled else 0
        promised = _latest(told.promised(piece.key) for piece in pieces)
        behind = max(0, reached - promised) if promised is not None and not cancelled else 0
        yield OrderReport(
            order=name,
            promised_s=promised,
            planned_s=_latest(told.planned(piece.key) for piece in pieces if not piece.failed),
            actual_s=done,
            due_s=known,
            late_s=late,
            behind_s=behind,
            left=open_[job],
            cancelled=cancelled,
            why=reasons(now, by_order.get(job, ()), state, told) if late or behind else (),
        )


def _latest(rows: Iterable[Piece | None]) -> int | None:
    return max((row.end_s for row in rows if row is not None and row.end_s is not None), default=None)
