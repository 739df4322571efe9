"""What held an order up: stops, outages, work that took longer, scrap, late starts. Pure.

Each reason has a length, so that the longest comes first; lengths may overlap and need not add up.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass

from shopfloor.model.actuals import PieceState, ShiftState, Status, Stretch
from shopfloor.replan.current import Current, planned_s
from shopfloor.replan.remaining import is_running, run_s
from shopfloor.replan.told import Told

SLIGHT_S = 120  # what is shorter holds nothing up that anybody would name
MOST = 4  # reasons an order


@dataclass(frozen=True, slots=True)
class Reason:
    """What held something up, where, for how long; `kind` is a stable word for programs.

    Kinds: ``down``, ``stopped``, ``longer``, ``scrapped``, ``late-start``, ``not-started``, ``running``.
    """

    kind: str
    machine: str
    seconds: int
    text: str = ""


def outage_reasons(stretches: Iterable[Stretch], until_s: int) -> tuple[Reason, ...]:
    """Return why something was down or stopped, like reasons together, longest first."""
    lengths: dict[str, int] = defaultdict(int)
    for stretch in stretches:
        lengths[stretch.reason] += max(0, stretch.until(until_s) - stretch.start_s)
    found = (Reason("down", "", seconds, text) for text, seconds in lengths.items())
    return tuple(sorted(found, key=lambda one: (-one.seconds, one.text)))


def reasons(
    now: Current, pieces: Sequence[tuple[int, PieceState]], state: ShiftState, told: Told
) -> tuple[Reason, ...]:
    """Return what held up the order of these pieces (operation, piece), longest first, ``MOST`` at most."""
    causes = [cause for index, piece in pieces for cause in _causes(now, index, piece, state, told)]
    if not causes:
        causes = [late for _, piece in pieces for late in _late_start(piece, told)]
    causes.sort(key=lambda one: (-one.seconds, one.machine, one.kind))
    standing = [how for _, piece in pieces for how in _standing(piece, state)]
    return tuple([*causes, *standing][:MOST])


def _causes(now: Current, index: int, piece: PieceState, state: ShiftState, told: Told) -> Iterator[Reason]:
    machine, until = piece.key.machine, state.at_s
    for pause in piece.pauses:
        length = pause.until(until) - pause.start_s
        if length >= SLIGHT_S:
            yield Reason("stopped", machine, length, pause.reason)
    known = state.machines.get(machine)
    row = told.promised(piece.key)
    wanted = row.start_s if row is not None else None
    spans = [(run.start_s, run.until(until)) for run in piece.runs]
    if wanted is not None:  # it waited for its machine from when it should have begun
        begun = piece.start_s if piece.start_s is not None else until
        spans.append((min(wanted, begun), begun))
    for outage in known.outages if known is not None else ():
        if outage.unit and piece.unit and outage.unit != piece.unit:
            continue
        length = sum(
            max(0, min(end, outage.until(until)) - max(start, outage.start_s)) for start, end in spans
        )
        if length >= SLIGHT_S:
            yield Reason("down", machine, length, outage.reason)
    place = int(now.shop.operations.machine[index])
    if piece.failed:
        yield Reason("scrapped", machine, run_s(now, place, piece, state), f"{piece.scrap} lost")
    elif piece.runs:
        longer = run_s(now, place, piece, state) - (planned_s(now.shop, place, piece, told) or 0)
        if longer >= SLIGHT_S and told.promised(piece.key) is not None:
            yield Reason("longer", machine, longer)


def _late_start(piece: PieceState, told: Told) -> Iterator[Reason]:
    row = told.promised(piece.key)
    if row is not None and row.start_s is not None and piece.start_s is not None:
        late = piece.start_s - row.start_s
        if late >= SLIGHT_S:
            yield Reason("late-start", piece.key.machine, late)


def _standing(piece: PieceState, state: ShiftState) -> Iterator[Reason]:
    """Say of what is not done how it stands; what was stopped has its stop as a cause."""
    if piece.status is Status.WAITING or (piece.status is Status.BLOCKED and not piece.touched):
        yield Reason("not-started", piece.key.machine, 0)
    elif is_running(piece):
        yield Reason("running", piece.key.machine, piece.left_s or 0)
