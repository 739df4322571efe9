"""Shops and schedules to and from pandas tables. The only module of the model that imports pandas."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
import pandas as pd

from shopfloor.errors import ShopError
from shopfloor.model.calendar import MINUTE, Clock
from shopfloor.model.shop import NO_DUE, NO_STEP, Machine, Operations, Orders, Shop

if TYPE_CHECKING:
    from shopfloor.model.schedule import Schedule


def shop_from_frame(frame: pd.DataFrame, *, clock: Clock, shift_end_s: int | None) -> Shop:
    """Build a shop from a clean table; see :meth:`Shop.from_frame`."""
    for needed in ("order", "machine"):
        if needed not in frame.columns:
            raise ShopError(
                f"the table has no column {needed!r}; it has {', '.join(map(str, frame.columns))}"
            )
    job, order_ids = pd.factorize(frame["order"].astype(str))
    machine, machine_ids = pd.factorize(frame["machine"].astype(str))
    steps = _numbers(frame, "step", NO_STEP)
    notes = frame["note"].fillna("").astype(str).tolist() if "note" in frame.columns else []
    return Shop(
        machines=tuple(Machine(name) for name in machine_ids),
        orders=Orders(
            tuple(order_ids),
            release_s=_per_order(frame, "release_s", job, len(order_ids), 0),
            due_s=_per_order(frame, "due_s", job, len(order_ids), NO_DUE),
            priority=_per_order(frame, "priority", job, len(order_ids), 1.0),
        ),
        operations=Operations(
            job,
            machine,
            _seconds(frame),
            step=steps,
            notes={index: note for index, note in enumerate(notes) if note},
        ),
        clock=clock,
        shift_end_s=shift_end_s,
    )


def frame_from_shop(shop: Shop) -> pd.DataFrame:
    """Return the operations of `shop`, one row each; see :meth:`Shop.to_frame`."""
    operations, orders = shop.operations, shop.orders
    due = pd.Series(orders.due_s[operations.job])
    step = pd.Series(operations.step)
    return pd.DataFrame(
        {
            "order": np.array(orders.ids, dtype=object)[operations.job],
            "machine": np.array([machine.id for machine in shop.machines], dtype=object)[operations.machine],
            "seconds": operations.seconds,
            "release_s": orders.release_s[operations.job],
            "due_s": due.astype("Int64").mask(due == NO_DUE),
            "priority": orders.priority[operations.job],
            "step": step.astype("Int64").mask(step == NO_STEP),
            "note": [operations.notes.get(index, "") for index in range(len(operations))],
        }
    )


def frame_from_schedule(shop: Shop, schedule: Schedule) -> pd.DataFrame:
    """Return the assignments of `schedule`, one row each; times in seconds and as the clock writes them."""
    rows = list(schedule)
    operations = [shop.operation(row.operation) for row in rows]
    return pd.DataFrame(
        {
            "order": [operation.order for operation in operations],
            "machine": [operation.machine_id for operation in operations],
            "unit": [row.unit for row in rows],
            "start": [shop.clock.write(row.start_s) for row in rows],
            "end": [shop.clock.write(row.end_s) for row in rows],
            "start_s": [row.start_s for row in rows],
            "end_s": [row.end_s for row in rows],
            "round": pd.array([row.round for row in rows], dtype="Int64"),
            "part": [row.part for row in rows],
            "parts": [row.parts for row in rows],
            "note": [operation.note for operation in operations],
        }
    )


def _numbers(frame: pd.DataFrame, column: str, blank: float) -> Any:
    if column not in frame.columns:
        return np.full(len(frame), blank)
    values = pd.to_numeric(frame[column], errors="coerce")
    bad = values.isna() & frame[column].notna()
    if bad.any():
        row = int(bad.to_numpy().argmax())
        raise ShopError(f"row {row}: {column} must be a number, not {frame[column].iloc[row]!r}")
    return values.fillna(blank).to_numpy()


def _seconds(frame: pd.DataFrame) -> Any:
    if "seconds" in frame.columns:
        seconds = _numbers(frame, "seconds", np.nan)
    elif "minutes" in frame.columns:
        seconds = _numbers(frame, "minutes", np.nan) * MINUTE
    else:
        raise ShopError("the table has neither 'seconds' nor 'minutes'")
    bad = ~(np.isfinite(seconds) & (np.abs(seconds - np.rint(seconds)) < 1e-6))
    if bad.any():
        row = int(bad.argmax())
        raise ShopError(f"row {row}: the time must be a whole number of seconds, not {seconds[row]} s")
    return np.rint(seconds).astype(np.int64)


def _per_order(frame: pd.DataFrame, column: str, job: Any, size: int, blank: float) -> Any:
    """One value an order; rows that leave it blank follow the rows that give it."""
    if column not in frame.columns:
        return None
    given = frame[column].notna().to_numpy()
    values = _numbers(frame, column, blank)
    out = np.full(size, blank, dtype=np.float64 if column == "priority" else np.int64)
    out[job[given]] = values[given]
    differ = given & (out[job] != values)
    if differ.any():
        row = int(differ.argmax())
        raise ShopError(
            f"row {row}: {column} of order {frame['order'].iloc[row]} differs from its other rows"
        )
    return out
