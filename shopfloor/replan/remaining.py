"""What is left to do of a shift, operation by operation, with running work re-estimated. Pure.

An operation is done when a piece of it was finished and something good came out; what was scrapped whole is
run again. Of an operation that was cut, the parts that are done count by their planned length.

What is left of work under way is the last report of it, or its time less what it has run, never less than a
stated minimum. Time is working time: stops, outages and, where work pauses, closures do not count.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import count

from shopfloor.model.actuals import Key, PieceState, ShiftState, Status, Stretch
from shopfloor.replan.current import Current, planned_s, worked_s
from shopfloor.replan.told import Told

MINIMUM_LEFT_S = 60  # as the journal's own estimate


@dataclass(frozen=True, slots=True)
class Left:
    """Work that is left of one operation, in one piece.

    Attributes
    ----------
    operation
        Index into the current shop.
    key
        What the journal calls it; a number not used yet for work to be repeated.
    seconds, setup_s
        Working time left, at least 1, and how much of its beginning is set-up.
    running
        Whether it is under way on a machine, even one that is down. Then `unit` and `since_s` are where and
        since when, and it may not be moved.
    repeats
        Whether it is scrapped work to be done again.
    why
        What happened to it: why it stands still, what was scrapped; empty for plain waiting work.
    """

    operation: int
    key: Key
    seconds: int
    setup_s: int = 0
    running: bool = False
    unit: int = 0
    since_s: int | None = None
    repeats: bool = False
    why: str = ""


def remaining(
    now: Current, state: ShiftState, told: Told, *, minimum_left_s: int = MINIMUM_LEFT_S
) -> tuple[Left, ...]:
    """Return what is left at `state.at_s`, in the order of the operations; O(n) for n pieces.

    Work of cancelled orders is not left, unless it is running.
    """
    cancelled = {name for name, order in state.orders.items() if order.cancelled_s is not None}
    taken = set(state.pieces)
    found: list[Left] = []
    for index, pieces in enumerate(now.pieces):
        job = int(now.shop.operations.job[index])
        lost = now.shop.orders.ids[job] in cancelled
        for left in _of(now, index, pieces, state, told, max(1, minimum_left_s), taken):
            if left.running or not lost:
                found.append(left)
    return tuple(found)


def _of(
    now: Current,
    index: int,
    pieces: Sequence[PieceState],
    state: ShiftState,
    told: Told,
    least: int,
    taken: set[Key],
) -> Iterator[Left]:
    """Yield what is left of one operation."""
    columns = now.shop.operations
    total, setup = int(columns.seconds[index]), int(columns.setup_s[index])
    machine = int(columns.machine[index])
    sound = [piece for piece in pieces if not piece.failed]
    good = [piece for piece in sound if piece.status is Status.DONE]
    whole = not columns.splittable[index] or all(p.planned is None or p.planned.parts == 1 for p in pieces)
    if whole and good:
        return
    begun = sorted((piece for piece in sound if piece.touched), key=lambda piece: piece.start_s or 0)

    def share(piece: PieceState) -> int:
        """How long a piece was to take; of an operation in one piece, what goes on with it takes the rest."""
        planned = planned_s(now.shop, machine, piece, told) or total
        return total if whole and piece is begun[0] else min(total, planned)

    def left(piece: PieceState) -> int:
        return max(least, estimate(now, machine, piece, state, told, share(piece)))

    set_up = max(0, setup - sum(run_s(now, machine, piece, state) for piece in begun))
    running = [piece for piece in begun if is_running(piece)]
    for piece in running:
        seconds = left(piece)
        yield Left(
            operation=index,
            key=piece.key,
            seconds=seconds,
            setup_s=min(seconds, set_up),
            running=True,
            unit=piece.runs[-1].unit,
            since_s=piece.start_s,
            why=piece.why,
        )
    stopped = [piece for piece in begun if is_stopped(piece)]
    if whole:
        rest = 0 if running else left(stopped[-1]) if stopped else total
    else:
        rest = total - sum(map(share, [*good, *running]))
        rest += sum(left(piece) - share(piece) for piece in stopped)
    if rest <= 0:
        return
    scrapped = [piece for piece in pieces if piece.failed]
    waiting = [piece for piece in sound if not piece.touched]
    names = now.shop.orders.ids[int(columns.job[index])], now.shop.machines[machine].id
    first = [*stopped[-1:], *waiting]
    key = first[0].key if first else _fresh(*names, taken)
    why = stopped[-1].why if stopped else ""
    if scrapped and not stopped:
        why = f"scrapped, {scrapped[-1].scrap} lost"
    yield Left(index, key, rest, min(rest, set_up), repeats=bool(scrapped) and not stopped, why=why)


def _fresh(order: str, machine: str, taken: set[Key]) -> Key:
    """Return the first number that no piece of this order on this machine has, and take it."""
    key = next(key for number in count(1) if (key := Key(order, machine, number)) not in taken)
    taken.add(key)
    return key


# ---- one piece -------------------------------------------------------------------------------------


def is_running(piece: PieceState) -> bool:
    """Whether it is on its machine, be that up or down."""
    return bool(piece.runs) and piece.runs[-1].end_s is None


def is_stopped(piece: PieceState) -> bool:
    """Whether it was begun, stopped, and neither resumed nor finished."""
    return piece.touched and piece.status is Status.BLOCKED and not is_running(piece)


def up_spans(state: ShiftState, machine: str, run: Stretch, until_s: int) -> list[tuple[int, int]]:
    """Return the parts of a run in which its unit was up."""
    spans: list[tuple[int, int]] = []
    start, end = run.start_s, run.until(until_s)
    outages = state.machines[machine].outages if machine in state.machines else ()
    for hole in sorted(outages, key=lambda one: one.start_s):
        if hole.unit not in (0, run.unit) or hole.start_s >= end:
            continue
        if hole.start_s > start:
            spans.append((start, hole.start_s))
        start = max(start, hole.until(until_s))
    return [*spans, (start, end)] if start < end else spans


def run_s(now: Current, machine: int, piece: PieceState, state: ShiftState, since_s: int = 0) -> int:
    """Return how long a piece was worked on, from `since_s` on."""
    name = now.shop.machines[machine].id
    return sum(
        worked_s(now.shop, machine, max(start, since_s), end)
        for run in piece.runs
        for start, end in up_spans(state, name, run, state.at_s)
        if end > since_s
    )


def estimate(
    now: Current, machine: int, piece: PieceState, state: ShiftState, told: Told, total_s: int
) -> int:
    """Return how long a piece under way will be worked on still: as last reported, or by the plan."""
    report = told.left.get(piece.key)
    if report is None:
        return total_s - run_s(now, machine, piece, state)
    at_s, left_s = report
    return left_s - run_s(now, machine, piece, state, at_s)
