"""Orders as the CSV that the reader takes: chosen and carried orders, with the reason beside each."""

from __future__ import annotations

import csv
import io
from collections.abc import Mapping

import numpy as np

from shopfloor.model.calendar import minutes_exact
from shopfloor.model.shop import NO_DUE, NO_STEP, Bools, Shop
from shopfloor.render.tables import harmless

COLUMNS = (
    "order",
    "machine",
    "minutes",
    "release",
    "due",
    "priority",
    "step",
    "splittable",
    "heads",
    "family",
    "setup_minutes",
    "note",
)


def orders_csv(shop: Shop, chosen: Bools, reasons: Mapping[str, str] | None = None) -> str:
    """Return the chosen operations as an orders file; with `reasons`, a last column says why each waits.

    Columns that no row uses are left out, so that a file without times stays one of rounds.
    """
    rows = [_row(shop, index) for index in np.flatnonzero(chosen).tolist()]
    if reasons is not None:
        rows = [{**row, "reason": reasons.get(row["order"], "")} for row in rows]
    used = [
        name
        for name in (*COLUMNS, "reason")
        if name in ("order", "machine") or any(row.get(name) for row in rows)
    ]
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(used)
    writer.writerows([harmless(row[name]) for name in used] for row in rows)
    return out.getvalue()


def _row(shop: Shop, index: int) -> dict[str, str]:
    operation, columns = shop.operation(index), shop.operations
    job = shop.orders[operation.job]
    machine = shop.machines[operation.machine]
    return {
        "order": operation.order,
        "machine": operation.machine_id,
        "minutes": "" if shop.unit_rounds else minutes_exact(operation.seconds - operation.setup_s),
        "release": shop.clock.write(job.release_s) if job.release_s else "",
        "due": "" if int(shop.orders.due_s[operation.job]) == NO_DUE else shop.clock.write(job.due_s or 0),
        "priority": "" if job.priority == 1 else f"{job.priority:g}",
        "step": "" if columns.step[index] == NO_STEP else str(operation.step),
        "splittable": "yes" if operation.splittable else "",
        # Written even when 0 or 1, since a blank means the machine's own default.
        "heads": str(operation.heads) if machine.crew is not None else "",
        "family": operation.family,
        "setup_minutes": minutes_exact(operation.setup_s) if shop.operations.setup_s.any() else "",
        "note": operation.note,
    }
