"""What moved between two plans, for the terminal and as plain data. Pure."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any

from shopfloor.model.calendar import duration
from shopfloor.render.text import cut, wrap

if TYPE_CHECKING:
    from shopfloor.replan.compare import Change, Comparison, MachineChange, OrderChange, Row, Side

Say = Callable[[int], str]
LISTED = 20  # moves and orders that the terminal lists; the page and --json have all
NAME = 24
KINDS = ("same", "moved", "added", "dropped", "passed")


# ---- sentences, for the terminal and the page ------------------------------------------------------


def side_line(side: Side, say: Say) -> str:
    """Return finish, bound and lateness of one plan as a clause."""
    bound = "proved earliest" if side.proved else f"nothing can end before {say(side.bound_s)}"
    line = f"ends {say(side.makespan_s)}, {bound}; {late_words(side)}"
    return line if side.fits is not False else f"{line}; overruns the shift"


def late_words(side: Side) -> str:
    """Say how many orders are late, and by how much together."""
    if not side.late:
        return "no order late"
    if len(side.late) == 1:
        return f"1 order late by {duration(side.late_s)}"
    return f"{len(side.late):,} orders late, {duration(side.late_s)} in all"


def verdict(found: Comparison, say: Say) -> str:
    """Say in a sentence or two what changed."""
    if found.identical:
        return "The two plans are the same."
    a, b = found.a, found.b
    later = b.makespan_s - a.makespan_s
    how = f"{duration(abs(later))} {'later' if later > 0 else 'earlier'}"
    first = f"B ends {how} than A" if later else f"Both end {say(b.makespan_s)}"
    count = found.counts.get
    moved, stayed = count("moved", 0), count("same", 0)
    said = [f"{moved:,} of {_operations(moved + stayed)} moved"]
    if found.resequenced:
        said[0] += f", {found.resequenced:,} of them resequenced"
    said += [f"{count(kind, 0):,} {kind}" for kind in ("added", "dropped") if count(kind, 0)]
    text = f"{first}; {'; '.join(said)}."
    if count("passed", 0):
        begun = f"{_operations(count('passed', 0))} had begun, or should have"
        text += f" {begun}, before B does at {say(b.from_s or 0)}."
    return text


def _operations(count: int) -> str:
    return "1 operation" if count == 1 else f"{count:,} operations"


def shift_words(seconds: int) -> str:
    """Write a shift in time: `+12 min`, `-1 h 05`, `+30 s`; nothing for none."""
    if not seconds:
        return ""
    return f"{'+' if seconds > 0 else '-'}{duration(abs(seconds))}"


def change_words(change: Change, say: Say) -> str:
    """Say from when to when, and what else changed."""
    before, after = change.before, change.after
    if before is None or after is None:
        row = change.row
        return f"{say(row.start_s)} – {say(row.end_s)}"
    text = f"{say(before.start_s)} → {say(after.start_s)}"
    longer = (after.end_s - after.start_s) - (before.end_s - before.start_s)
    marks = [shift_words(change.shift_s)] if change.shift_s else []
    marks += [f"takes {duration(abs(longer))} {'more' if longer > 0 else 'less'}"] if longer else []
    marks += [f"unit {before.unit} → {after.unit}"] if before.unit != after.unit else []
    marks += ["resequenced"] if change.resequenced else []
    return f"{text}  {', '.join(marks)}" if marks else text


# ---- the terminal ----------------------------------------------------------------------------------


def compare_lines(found: Comparison, say: Say) -> list[str]:
    """Return the comparison as lines of at most 80 columns."""
    lines = [
        wrap(f"{letter}  {cut(side.name, NAME)} {side.sha256[:8]}: {side_line(side, say)}.", 0)
        for letter, side in (("A", found.a), ("B", found.b))
    ]
    lines += ["", wrap(verdict(found, say))]
    return lines if found.identical else lines + moves_lines(found, say)


def moves_lines(found: Comparison, say: Say) -> list[str]:
    """Return what moved, by machine, by order and one by one, as lines of at most 80 columns."""
    lines: list[str] = []
    machines = [row for row in found.machines if _touched(row)]
    if machines:
        head = ("Machine", "same", "moved", "resequenced", "added", "dropped", "ends A", "ends B")
        lines += ["", _machine_line(head), *(_machine_line(machine_cells(row, say)) for row in machines)]
    if found.orders:
        lines += ["", f"{'Order':<24} {'ends A':>10} {'ends B':>10} {'change':>11}  lateness"]
        shown = sorted(found.orders, key=lambda row: (-_importance(row), row.order))[:LISTED]
        lines += [_order_line(row, say) for row in shown]
        lines += _more(len(found.orders) - len(shown), "orders")
    for kind, title in (("moved", "Moved"), ("added", "Added"), ("dropped", "Dropped")):
        changes = found.of(kind)
        if changes:
            lines += ["", title, *(_change_line(change, say) for change in changes[:LISTED])]
            lines += _more(len(changes) - LISTED, "operations")
    return lines


def _touched(row: MachineChange) -> bool:
    return bool(row.moved or row.added or row.dropped)


def machine_cells(row: MachineChange, say: Say) -> tuple[str, ...]:
    """Return the cells of a machine in the order of the table's head."""
    ends = ("–" if end is None else say(end) for end in (row.end_before_s, row.end_after_s))
    counts = (row.same, row.moved, row.resequenced, row.added, row.dropped)
    return (row.machine, *(f"{count:,}" if count else "·" for count in counts), *ends)


def _machine_line(cells: Sequence[str]) -> str:
    widths = (6, 6, 12, 6, 8, 10, 10)
    return f"{cut(cells[0], 15):<15}" + "".join(
        f" {cell:>{width}}" for cell, width in zip(cells[1:], widths, strict=True)
    )


def _importance(row: OrderChange) -> int:
    """How much an order's lead cares: lateness first, then how far its finish moves."""
    ends = (row.end_after_s or 0) - (row.end_before_s or 0) if row.end_before_s and row.end_after_s else 0
    return abs(row.late_after_s - row.late_before_s) * 1_000 + abs(ends)


def order_cells(row: OrderChange, say: Say) -> tuple[str, str, str, str, str]:
    """Return order, finish in A, finish in B, change, lateness."""
    before, after = row.end_before_s, row.end_after_s
    change = shift_words(after - before) if before is not None and after is not None else ""
    if before is None:
        change = "added"
    elif after is None:
        change = "dropped" if row.dropped else "begun"
    ends = ["–" if end is None else say(end) for end in (before, after)]
    return row.order, ends[0], ends[1], change or "·", lateness_words(row)


def lateness_words(row: OrderChange) -> str:
    """Say what became of an order's lateness."""
    before, after = row.late_before_s, row.late_after_s
    if before == after:
        return f"late by {duration(after)}" if after else ""
    if not before:
        return f"now late by {duration(after)}"
    if not after:
        return f"no longer late (was {duration(before)})"
    return f"late by {duration(after)}, was {duration(before)}"


def _order_line(row: OrderChange, say: Say) -> str:
    order, before, after, change, late = order_cells(row, say)
    return f"{cut(order, NAME):<24} {before:>10} {after:>10} {change:>11}  {late}".rstrip()


def _change_line(change: Change, say: Say) -> str:
    row = change.row
    return wrap(f"{cut(row.machine, 12):<12} {cut(row.order, NAME):<14} {change_words(change, say)}", 2)


def _more(count: int, noun: str) -> list[str]:
    return [f"  … and {count:,} more {noun}"] if count > 0 else []


# ---- plain data ------------------------------------------------------------------------------------


def compare_data(found: Comparison) -> dict[str, Any]:
    """Return the comparison as plain data for ``--json``; what is the same is only counted.

    Seconds count from the start of A's shift.
    """
    return {
        "ok": True,
        "a": _side_data(found.a),
        "b": _side_data(found.b),
        "makespan_change_s": found.b.makespan_s - found.a.makespan_s,
        "lower_bound_change_s": found.b.bound_s - found.a.bound_s,
        "late_change_s": found.b.late_s - found.a.late_s,
        "counts": {
            kind: found.counts.get(kind, 0) for kind in ("same", "moved", "added", "dropped", "passed")
        },
        "resequenced": found.resequenced,
        "machines": [
            {
                "machine": row.machine,
                "same": row.same,
                "moved": row.moved,
                "resequenced": row.resequenced,
                "added": row.added,
                "dropped": row.dropped,
                "passed": row.passed,
                "end_a_s": row.end_before_s,
                "end_b_s": row.end_after_s,
            }
            for row in found.machines
        ],
        "orders": [
            {
                "order": row.order,
                "end_a_s": row.end_before_s,
                "end_b_s": row.end_after_s,
                "late_a_s": row.late_before_s,
                "late_b_s": row.late_after_s,
                "moved": row.moved,
                "added": row.added,
                "dropped": row.dropped,
            }
            for row in found.orders
        ],
        "changes": [_change_data(change) for change in found.changes if change.kind != "same"],
    }


def _side_data(side: Side) -> dict[str, Any]:
    return {
        "name": side.name,
        "sha256": side.sha256,
        "operations": len(side.rows),
        "method": side.method,
        "makespan_s": side.makespan_s,
        "lower_bound_s": side.bound_s,
        "proved_optimal": side.proved,
        "fits_shift": side.fits,
        "late_orders": len(side.late),
        "late_s": side.late_s,
        "from_s": side.from_s,
    }


def _change_data(change: Change) -> dict[str, Any]:
    return {
        "kind": change.kind,
        "order": change.row.order,
        "machine": change.row.machine,
        "shift_s": change.shift_s,
        "resequenced": change.resequenced,
        "a": _row_data(change.before),
        "b": _row_data(change.after),
    }


def _row_data(row: Row | None) -> dict[str, Any] | None:
    if row is None:
        return None
    return {"unit": row.unit, "start_s": row.start_s, "end_s": row.end_s, "round": row.round}
