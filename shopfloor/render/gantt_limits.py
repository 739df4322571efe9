"""What keeps a Gantt page of any plan to some 8 MB, and readable: load over time, and what is left out."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from shopfloor.model.schedule import NO_ROUND
from shopfloor.model.shop import Bools, Ints
from shopfloor.render.gantt_view import BarColumns, Load

if TYPE_CHECKING:
    from shopfloor.render.runs import Runs

MANY = 50_000  # bars; from here on a page can show load in place of bars
DETAIL_BYTES = 2_600_000  # for bars and the orders they name, on a page of which plotly.js takes 4.8 MB
NOTE_BYTES = 250_000
ROWS, CLOSURES, GAPS, CREWS = 3_000, 6_000, 2_000, 5
CREW_STEPS = 2_000
_LOAD_STEPS, _LOAD_CELLS = 2_000, 200_000
_FULL = 31  # the greatest number that takes one letter on the page


@dataclass(frozen=True, eq=False)
class Detail:
    """Which runs have a bar, which orders they name, and up to when the page has every bar."""

    bars: Bools
    orders: Ints
    until_s: int
    rows: int


def detail(runs: Runs, horizon_s: int) -> Detail:
    """Return what of the plan has bars: all of it, or the runs that start first while there is room."""
    size = len(runs.schedule)
    rows = min(ROWS, int(sum(machine.count for machine in runs.shop.machines)))
    whole = int(np.searchsorted(np.cumsum(_bytes(runs, rows)), DETAIL_BYTES, side="right"))
    until = horizon_s if whole >= size else int(runs.schedule.start_s[whole])
    bars = (np.arange(size) < whole) & (runs.row < rows)
    orders = np.arange(len(runs.shop.orders)) if bars.all() else np.unique(runs.job[bars])
    return Detail(bars, orders, until, rows)


def _bytes(runs: Runs, rows: int) -> Ints:
    """About how much each run takes on the page: columns, changeover, and its order where it is new."""
    schedule = runs.schedule
    columns = 5 + _letters(rows) + _letters(len(runs.shop.orders))
    columns += 2 * bool(runs.set_up_s.any()) + 2 * bool(runs.way_s.any()) + bool(runs.heads.any())
    columns += bool(runs.changing) + bool(runs.worked_s.sum() < (schedule.end_s - schedule.start_s).sum())
    columns += 2 * bool((schedule.round != NO_ROUND).any()) + 2 * bool((schedule.parts > 1).any())
    cost = np.full(len(schedule), columns)
    cost[runs.changes.run] += 7
    job, first = np.unique(runs.job, return_index=True)
    names = runs.shop.orders.ids
    cost[first] += np.array([12 + _written(names[index]) for index in job.tolist()], np.int64)
    return cost


def _letters(size: int) -> int:
    """Letters that a packed index into so many things takes."""
    return max(1, -(-(size - 1).bit_length() // 5))


def _written(text: str) -> int:
    """About how long a text is inside the page's JSON."""
    return len(text.encode("ascii", "backslashreplace"))


def some_notes(notes: dict[int, str]) -> dict[int, str]:
    """Return the notes of the first bars, as many as there is room for; equal texts take room once."""
    kept: dict[int, str] = {}
    room, texts = NOTE_BYTES, set()
    for bar, note in notes.items():
        room -= 4 + (0 if note in texts else 4 + _written(note))
        if room < 0:
            break
        texts.add(note)
        kept[bar] = note
    return kept


def load(runs: Runs, rows: int, horizon_s: int) -> Load:
    """Return how busy the first `rows` rows are up to `horizon_s`; O(m log m) for m runs.

    At a step's edge a row has been busy for as long as all bars begun before it last, less what is still
    to come of the last of them: bars of one row do not overlap.
    """
    steps = max(1, min(_LOAD_STEPS, _LOAD_CELLS // max(1, rows)))
    step = -(-horizon_s // steps)
    step = -(-step // 60) * 60 if step > 60 else step  # whole minutes read better
    steps = -(-horizon_s // step)
    edges = np.arange(steps + 1) * step
    order = runs.by_unit
    start, end = runs.schedule.start_s[order], runs.schedule.end_s[order]
    begins = np.searchsorted(runs.row[order], np.arange(rows + 1))
    busy = np.zeros((rows, steps), np.int64)
    for row in np.flatnonzero(np.diff(begins)).tolist():
        here = slice(begins[row], begins[row + 1])
        starts, ends = start[here], end[here]
        done = np.r_[0, np.cumsum(ends - starts)]
        begun = np.searchsorted(starts, edges, side="left")
        last_end = np.r_[0, ends][begun]
        busy[row] = np.diff(done[begun] - np.maximum(0, last_end - edges))
    share = np.clip(-(-busy * (_FULL - 1) // step), 0, _FULL - 1)
    share[busy >= step] = _FULL
    return Load(step, steps, share.ravel())


def left_out(runs: Runs, shown: Detail, bars: BarColumns, notes: int, closures: int, said: str) -> str:
    """Return a sentence on what the page leaves out, empty where it leaves out nothing.

    Parameters
    ----------
    notes, closures
        How many there would have been.
    said
        The time up to which the page has every bar, in words.
    """
    rows = int(sum(machine.count for machine in runs.shop.machines))
    crews = len(runs.shop.crews)
    parts = "" if len(runs.schedule) == len(runs.shop) else " and parts"
    missing = [
        f"{left:,} of {whole:,} {what}"
        for left, whole, what in (
            (len(runs.schedule) - len(bars), len(runs.schedule), f"operations{parts}{said}"),
            (notes - len(bars.notes), notes, "notes"),
            (rows - shown.rows, rows, "machines and units"),
            (closures - CLOSURES, closures, "closures"),
            (crews - CREWS, crews, "crews"),
        )
        if left > 0
    ]
    if not missing:
        return ""
    text = f"{', '.join(missing[:-1])} and {missing[-1]}" if missing[1:] else missing[0]
    return f"This page leaves out {text}; plan.csv has every operation and every note."
