"""The tables of a handover: machines, orders, and the orders file of the next shift. Pure."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from shopfloor.model.calendar import minutes_exact
from shopfloor.render import handover_words as words
from shopfloor.render.orders_file import orders_csv
from shopfloor.render.tables import harmless

if TYPE_CHECKING:
    from shopfloor.model.calendar import Clock
    from shopfloor.model.shop import Shop
    from shopfloor.replan.handover import Handover


def carry_csv(shop: Shop, *, set_up: bool) -> str:
    """Return what carries over as an orders file.

    Parameters
    ----------
    shop
        What is left, as :func:`shopfloor.replan.carry.carry_shop` returns it.
    set_up
        Whether machines of this hall have set-ups. Then work that is set up already says 0, since a blank
        would mean its machine's own set-up once more.
    """
    text = orders_csv(shop, np.ones(len(shop), np.bool_))
    if not set_up or shop.operations.setup_s.any():
        return text
    head, *rows = csv.reader(io.StringIO(text))
    return _table([*head, "setup_minutes"], ([*row, "0"] for row in rows), harmless_already=True)


def machines_csv(found: Handover, figures: Any) -> str:
    """Return the machines as a table, times in minutes; figures of ISO 22400-2 under the standard's names."""
    head = [
        "machine", "units", "open", "planned", "worked", "set_up", "stopped", "down", "idle", "overrun",
        "operations_planned", "operations_done", "operations_begun", "in_sequence", "good", "scrap",
        "why_down", *figures.TIMES, *figures.FIGURES,
    ]  # fmt: skip
    rows = []
    for row in found.machines:
        times, elements = row.times, row.elements
        spans = (
            times.open_s, row.planned_s, times.work_s, row.setup_s, times.stopped_s,
            times.held_s + times.down_s, times.idle_s, times.overrun_s,
        )  # fmt: skip
        values = (figure.of(elements) for figure in figures.FIGURES.values())
        rows.append(
            [
                row.machine,
                row.units,
                *map(minutes_exact, spans),
                *(row.planned, row.done, row.started, row.in_sequence, elements.GQ, elements.SQ),
                "; ".join(words.why_down(row)),
                *(minutes_exact(getattr(elements, symbol)) for symbol in figures.TIMES),
                *("" if value is None else f"{value:.4f}" for value in values),
            ]
        )
    return _table(head, rows)


def order_reports_csv(found: Handover, clock: Clock) -> str:
    """Return the orders as a table: planned and actual finish, due, lateness in minutes, why."""
    head = ["order", "first_plan", "last_plan", "done", "due", "late", "operations_left", "cancelled", "why"]

    def moment(seconds: int | None) -> str:
        return "" if seconds is None else clock.write(seconds)

    rows = (
        [
            row.order,
            *map(moment, (row.promised_s, row.planned_s, row.actual_s, row.due_s)),
            minutes_exact(row.late_s) if row.late_s else "",
            row.left,
            "yes" if row.cancelled else "",
            words.why(row.why),
        ]
        for row in found.orders
    )
    return _table(head, rows)


def _table(head: Sequence[str], rows: Iterable[Sequence[Any]], *, harmless_already: bool = False) -> str:
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(head)
    for row in rows:
        writer.writerow(
            [harmless(cell) if isinstance(cell, str) and not harmless_already else cell for cell in row]
        )
    text = out.getvalue()
    return text if text.isascii() else "\ufeff" + text
