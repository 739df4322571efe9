"""What a journal says: entries as sentences, the state of the shift, learned times. Pure."""

from __future__ import annotations

import csv
import io
from collections import Counter
from collections.abc import Callable, Iterable, Sequence
from typing import Any

from shopfloor.model.actuals import Event, Kind, PieceState, ShiftState, Status, Stretch
from shopfloor.model.clock import MINUTE, duration, minutes_text
from shopfloor.render.lines import cut, wrap

Say = Callable[[int], str]
NAME = 24  # characters of a name that a line has room for
LISTED = 12  # operations of one status that are listed


def work_name(event: Event) -> str:
    """Return how people call the operation an event is about."""
    piece = f" (piece {event.piece})" if event.piece > 1 else ""
    return f"{cut(event.order, NAME)} on {cut(event.machine, NAME)}{piece}"


def machine_name(machine: str, unit: int) -> str:
    """Return how people call a machine, or one unit of it."""
    return f"{cut(machine, NAME)} unit {unit}" if unit else cut(machine, NAME)


def sentence(event: Event, say: Say) -> str:
    """Return an entry as a sentence: what happened, when, and its marks."""
    text = _SENTENCES[event.kind](event, say(event.at_s), say)
    marks = [f"by {cut(event.who, NAME)}"] if event.who else []
    if event.corrects and event.kind is not Kind.WITHDRAWN:
        marks.append(f"instead of No {event.corrects}")
    if event.accepted:
        marks.append(f"accepted: {', '.join(event.accepted)}")
    return f"{text} [{'; '.join(marks)}]" if marks else text


def _reason(event: Event) -> str:
    reason = event.data.get("reason")
    return f": {cut(str(reason), 200)}" if reason else ""


def _left(event: Event) -> str:
    left = event.data.get("left_s")
    return f", {duration(left)} left" if left is not None else ""


def _counts(event: Event) -> str:
    said = [f"{name} {event.data[name]}" for name in ("good", "scrap") if name in event.data]
    return f": {', '.join(said)}" if said else ""


def _order(event: Event, say: Say) -> str:
    parts = [
        f"{cut(name, NAME)}{f' (piece {piece})' if piece > 1 else ''} {duration(seconds)}"
        for name, piece, seconds in event.data.get("operations", ())
    ]
    for name in ("release", "due"):
        if f"{name}_s" in event.data:
            parts.append(f"{name} {say(event.data[f'{name}_s'])}")
    if "priority" in event.data:
        parts.append(f"priority {event.data['priority']:g}")
    return f": {', '.join(parts)}" if parts else ""


def _remark(event: Event, at: str, say: Say) -> str:
    about = " ".join(cut(name, NAME) for name in (event.order, event.machine) if name)
    return f"Remark {at}{f' on {about}' if about else ''}: {cut(str(event.data.get('text', '')), 500)}"


_SENTENCES: dict[Kind, Callable[[Event, str, Say], str]] = {
    Kind.ISSUED: lambda e, at, say: (
        f"{cut(str(e.data.get('name', '')), NAME)} {str(e.data.get('sha256', ''))[:8]} in force from {at}"
    ),
    Kind.STARTED: lambda e, at, say: f"{work_name(e)} started {at}{_left(e)}",
    Kind.STOPPED: lambda e, at, say: f"{work_name(e)} stopped {at}{_left(e)}{_reason(e)}",
    Kind.RESUMED: lambda e, at, say: f"{work_name(e)} resumed {at}{_left(e)}",
    Kind.FINISHED: lambda e, at, say: f"{work_name(e)} finished {at}{_counts(e)}",
    Kind.LEFT: lambda e, at, say: f"{work_name(e)} at {at}{_left(e)}",
    Kind.DOWN: lambda e, at, say: f"{machine_name(e.machine, e.unit)} down {at}{_reason(e)}",
    Kind.UP: lambda e, at, say: f"{machine_name(e.machine, e.unit)} up {at}",
    Kind.CREW: lambda e, at, say: (
        f"{'Crew' if not e.data.get('pool') else cut(e.data['pool'], NAME)} {at}: {e.data['heads']} present"
    ),
    Kind.ADDED: lambda e, at, say: f"Order {cut(e.order, NAME)} added {at}{_order(e, say)}",
    Kind.CHANGED: lambda e, at, say: f"Order {cut(e.order, NAME)} changed {at}{_order(e, say)}",
    Kind.CANCELLED: lambda e, at, say: f"Order {cut(e.order, NAME)} cancelled {at}{_reason(e)}",
    Kind.REMARK: _remark,
    Kind.WITHDRAWN: lambda e, at, say: f"No {e.corrects} struck out {at}{_reason(e)}",
}


def event_data(event: Event) -> dict[str, Any]:
    """Return an entry as plain data for ``--json``; a plan without its pieces and head."""
    data = {name: value for name, value in event.data.items() if name != "head"}
    return {
        "no": event.seq,
        "id": event.id,
        "event": event.kind.value,
        "at_s": event.at_s,
        "at": event.at,
        "who": event.who,
        "order": event.order or None,
        "machine": event.machine or None,
        "piece": event.piece or None,
        "unit": event.unit or None,
        "corrects": event.corrects or None,
        "entered": event.entered or None,
        "accepted": list(event.accepted),
        **data,
    }


# ---- the state of the shift --------------------------------------------------------------------------


def state_lines(state: ShiftState, say: Say) -> list[str]:
    """Return how the shift stands: counts, what runs, what is blocked, which machines are down."""
    counts = {status: len(state.of(status)) for status in Status}
    said = ", ".join(f"{count} {status}" for status, count in counts.items() if count) or "none"
    lines = [wrap(f"At {say(state.at_s)}: operations {said}. Good {state.good}, scrap {state.scrap}.")]
    if state.crew:
        present = ", ".join(
            f"{cut(name or 'the hall', NAME)} {heads}" if len(state.crew) > 1 or name else str(heads)
            for name, heads in state.crew.items()
        )
        lines.append(f"Crew present: {present}.")
    for status, line in ((Status.RUNNING, _running), (Status.BLOCKED, _blocked)):
        found = [piece for piece in state.of(status) if piece.touched]
        if found:
            lines += ["", status.value.capitalize()]
            lines += [line(piece, state.at_s, say) for piece in found[:LISTED]]
            if len(found) > LISTED:
                lines.append(f"  … and {len(found) - LISTED} more")
    down = [
        (machine.id, outage)
        for machine in state.machines.values()
        for outage in machine.outages
        if outage.end_s is None
    ]
    if down:
        waiting = Counter(piece.key.machine for piece in state.of(Status.BLOCKED) if not piece.touched)
        lines += ["", "Down", *(_down(machine, outage, waiting[machine], say) for machine, outage in down)]
    if state.odd:
        count = len(state.odd)
        noun = "1 entry does" if count == 1 else f"{count} entries do"
        lines += ["", wrap(f"{noun} not follow from what went before, and stand as accepted.")]
    return lines


def _name(piece: PieceState) -> str:
    number = f" (piece {piece.key.piece})" if piece.key.piece > 1 else ""
    return f"{cut(piece.key.machine, 14):<14} {cut(piece.key.order, NAME)}{number}"


def _running(piece: PieceState, at_s: int, say: Say) -> str:
    left = f", {duration(piece.left_s)} left, ends about {say(at_s + piece.left_s)}" if piece.left_s else ""
    return f"  {_name(piece)} since {say(piece.start_s or 0)}{left}"


def _blocked(piece: PieceState, at_s: int, say: Say) -> str:
    return wrap(f"{_name(piece)} since {say(piece.blocked_s or 0)}, {cut(piece.why, 200)}", 2)


def _down(machine: str, outage: Stretch, waiting: int, say: Say) -> str:
    since = f"{machine_name(machine, outage.unit)} since {say(outage.start_s)}: {cut(outage.reason, 200)}"
    noun = "1 operation waits" if waiting == 1 else f"{waiting} operations wait"
    return wrap(f"{since}; {noun} for it" if waiting else since, 2)


def state_data(state: ShiftState) -> dict[str, Any]:
    """Return the state as plain data for ``--json``; seconds count from the shift's start."""
    return {
        "at_s": state.at_s,
        "counts": {status.value: len(state.of(status)) for status in Status},
        "good": state.good,
        "scrap": state.scrap,
        "crew": dict(state.crew),
        "operations": [_piece_data(piece) for piece in state.pieces.values()],
        "machines": [
            {
                "machine": machine.id,
                "units": machine.units,
                "up": machine.up,
                "outages": [_stretch_data(outage) for outage in machine.outages],
            }
            for machine in state.machines.values()
        ],
        "orders": [
            {
                "order": order.order,
                "added_s": order.added_s,
                "cancelled_s": order.cancelled_s,
                "release_s": order.release_s,
                "due_s": order.due_s,
                "priority": order.priority,
                "reason": order.reason,
            }
            for order in state.orders.values()
        ],
        "odd": [{"no": odd.place, "rule": odd.rule} for odd in state.odd],
    }


def _stretch_data(stretch: Stretch) -> dict[str, Any]:
    return {
        "unit": stretch.unit or None,
        "start_s": stretch.start_s,
        "end_s": stretch.end_s,
        "reason": stretch.reason,
    }


def _piece_data(piece: PieceState) -> dict[str, Any]:
    planned = piece.planned
    return {
        "order": piece.key.order,
        "machine": piece.key.machine,
        "piece": piece.key.piece,
        "status": piece.status.value,
        "planned_start_s": planned.start_s if planned else None,
        "planned_end_s": planned.end_s if planned else None,
        "total_s": piece.total_s,
        "unit": piece.unit or None,
        "start_s": piece.start_s,
        "end_s": piece.end_s,
        "run_s": piece.run_s,
        "left_s": piece.left_s,
        "good": piece.good,
        "scrap": piece.scrap,
        "why": piece.why,
        "pauses": [_stretch_data(pause) for pause in piece.pauses],
    }


# ---- learned times -----------------------------------------------------------------------------------


def times_lines(rows: Sequence[Any]) -> list[str]:
    """Return planned against actual minutes as a table; `rows` as from `journal.times.learned`."""
    if not rows:
        return ["No operation has both a planned time and a recorded start and finish."]
    head = ("machine", "family", "done", "planned", "actual", "quartiles", "ratio")
    table = [head] + [
        (
            cut(row.machine, 14),
            cut(row.family, 12),
            str(row.count),
            _minutes(row.planned_s),
            _minutes(row.actual_s),
            f"{_minutes(row.low_s)} – {_minutes(row.high_s)}",
            f"{row.ratio:.2f}",
        )
        for row in rows
    ]
    lines = [
        f"{row[0]:<14} {row[1]:<12} {row[2]:>5} {row[3]:>8} {row[4]:>8} {row[5]:>15} {row[6]:>6}"
        for row in table
    ]
    note = "Minutes; medians, and the quartiles of what was actual. Nothing of this is applied by itself."
    return [*lines, wrap(note)]


def times_csv(rows: Iterable[Any], harmless: Callable[[str], str]) -> str:
    """Return suggested minutes as CSV; `harmless` keeps a spreadsheet from running a name."""
    out = io.StringIO(newline="")
    writer = csv.writer(out, lineterminator="\r\n")
    writer.writerow(
        [
            "machine",
            "family",
            "operations",
            "planned_minutes",
            "actual_low",
            "actual_high",
            "ratio",
            "minutes",
        ]
    )
    for row in rows:
        numbers = [_minutes(row.planned_s), _minutes(row.low_s), _minutes(row.high_s), f"{row.ratio:.3f}"]
        names = [harmless(row.machine), harmless(row.family), row.count]
        writer.writerow([*names, *numbers, _minutes(row.actual_s)])
    return "\ufeff" + out.getvalue()


def _minutes(seconds: float) -> str:
    """Write minutes to a tenth."""
    return minutes_text(round(seconds * 10 / MINUTE) * MINUTE // 10)
