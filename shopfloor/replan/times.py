"""What became of a unit's time: every second of it has one name. Pure.

The names are those of ISO 22400-2:2014 where it has one; see :mod:`shopfloor.replan.figures`.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from itertools import pairwise

from shopfloor.model.actuals import PieceState, ShiftState, Stretch
from shopfloor.model.shop import Shop

Spans = Sequence[tuple[int, int]]


@dataclass(frozen=True, slots=True)
class Times:
    """The seconds of a machine's units from the shift's start to a moment, by what became of them.

    Attributes
    ----------
    open_s
        While it was neither shut by a break nor by a closure of its own.
    work_s
        Orders were worked on, set-up included.
    held_s
        An order was on it, and it was down.
    stopped_s
        An order begun there was stopped, and no other ran.
    down_s
        It was down without an order on it.
    idle_s
        It was up, open, and nothing of all this.
    overrun_s
        Of the work, what was done while it should have been shut.
    """

    open_s: int = 0
    work_s: int = 0
    held_s: int = 0
    stopped_s: int = 0
    down_s: int = 0
    idle_s: int = 0
    overrun_s: int = 0

    def __add__(self, other: Times) -> Times:
        return Times(
            self.open_s + other.open_s,
            self.work_s + other.work_s,
            self.held_s + other.held_s,
            self.stopped_s + other.stopped_s,
            self.down_s + other.down_s,
            self.idle_s + other.idle_s,
            self.overrun_s + other.overrun_s,
        )


def machine_times(shop: Shop, machine: int, pieces: Iterable[PieceState], state: ShiftState) -> Times:
    """Return what became of the time of all units of a machine, until `state.at_s`.

    Parameters
    ----------
    pieces
        Those of that machine.

    Returns
    -------
    Times
        Work that is done while the machine is open, and all else, add up to `open_s`: exactly.
    """
    hall, until = shop.machines[machine], state.at_s
    known = state.machines.get(hall.id)
    outages = known.outages if known is not None else ()
    units = max(hall.count, known.units if known is not None else 1)
    shut = [(closure.start_s, closure.end_s) for closure in (*shop.breaks, *hall.closed)]
    listed = list(pieces)
    return sum(
        (
            _unit(
                until,
                runs=[run for piece in listed for run in piece.runs if run.unit == unit],
                pauses=[pause for piece in listed for pause in piece.pauses if pause.unit == unit],
                outages=[outage for outage in outages if outage.unit in (0, unit)],
                shut=shut,
                rests=hall.pauses,
            )
            for unit in range(1, units + 1)
        ),
        Times(),
    )


def _unit(
    until: int,
    *,
    runs: Sequence[Stretch],
    pauses: Sequence[Stretch],
    outages: Sequence[Stretch],
    shut: Spans,
    rests: bool,
) -> Times:
    """Return the times of one unit; `rests` tells that its work pauses while it is shut."""

    def spans(stretches: Sequence[Stretch]) -> Spans:
        return [(one.start_s, one.until(until)) for one in stretches]

    on, down = spans(runs), spans(outages)
    open_s, _ = shares(until, [shut])[::-1]
    if rests:
        _, held, work, stopped, out, idle = shares(until, [shut, _both(on, down), on, spans(pauses), down])
        return Times(open_s, work, held, stopped, out, idle)
    held, work, closed, stopped, out, idle = shares(until, [_both(on, down), on, shut, spans(pauses), down])
    shut_in_all = until - open_s
    in_shut = shut_in_all - closed  # work there, or an order held there
    held_open = shares(until, [shut, _both(on, down)])[1]
    return Times(open_s, work, held_open, stopped, out, idle, overrun_s=in_shut - (held - held_open))


def _both(some: Spans, others: Spans) -> Spans:
    """Return where spans of both lists overlap; O(n m), and both are few."""
    return [
        (max(start, begin), min(end, finish))
        for start, end in some
        for begin, finish in others
        if max(start, begin) < min(end, finish)
    ]


def shares(until: int, layers: Sequence[Spans]) -> list[int]:
    """Return how much of [0, until) is in the first layer, in the second but not the first, and so on.

    The last entry is what is in none; together they are `until`. Spans of a layer may overlap.
    O(n log n) for n spans.
    """
    turns = sorted(
        {
            0,
            max(until, 0),
            *(min(max(moment, 0), until) for spans in layers for span in spans for moment in span),
        }
    )
    place = {moment: index for index, moment in enumerate(turns)}
    change = [[0] * len(turns) for _ in layers]
    for layer, spans in zip(change, layers, strict=True):
        for start, end in spans:
            start, end = min(max(start, 0), until), min(max(end, 0), until)
            if start < end:
                layer[place[start]] += 1
                layer[place[end]] -= 1
    found = [0] * (len(layers) + 1)
    inside = [0] * len(layers)
    for index, (start, end) in enumerate(pairwise(turns)):
        for number, layer in enumerate(change):
            inside[number] += layer[index]
        first = next((number for number, depth in enumerate(inside) if depth), len(layers))
        found[first] += end - start
    return found
