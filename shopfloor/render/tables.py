"""A plan as data: plan.json, the whole truth, and plan.csv, for spreadsheets. Pure: text in memory.

`data/plan.schema.json` describes plan.json to other programs; a test holds the two together.
"""

from __future__ import annotations

import hashlib
import json
import re
from collections.abc import Mapping
from functools import cache
from typing import TYPE_CHECKING, Any

import numpy as np

from shopfloor import __version__
from shopfloor.model.results import PLAN_SCHEMA
from shopfloor.model.schedule import NO_ROUND
from shopfloor.settings import default

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from shopfloor.model.results import Plan

CSV_COLUMNS = ("order", "machine", "unit", "start", "end", "round", "part", "parts", "note")

# What a spreadsheet may run as a formula. Apostrophes in front count too, so that taking one off
# again gives back every text exactly: "-5" is written "'-5", and "'-5" is written "''-5".
_FORMULA = re.compile(r"'*[=+\-@\t\r\n＝＋－＠]")
_QUOTED = re.compile(r'[",;\t\r\n]|^\s|\s$')


def harmless(text: str) -> str:
    """Return `text` so that no spreadsheet takes it for a formula: with an apostrophe where needed.

    A reader gets the text back by dropping one apostrophe from a cell of apostrophes followed by one of
    ``= + - @``, their full-width twins, a tab or a line end.
    """
    return f"'{text}" if _FORMULA.match(text) else text


# ---- plan.json ---------------------------------------------------------------------------------


def summary(plan: Plan) -> dict[str, Any]:
    """Return everything plan.json says, but the assignments, as plain values.

    Names and units as in `data/plan.schema.json`; seconds count from the shift's start. Nothing in it
    depends on how long the search took, so equal plans give equal summaries.
    """
    shop, clock = plan.shop, plan.shop.clock
    end = shop.shift_end_s
    return {
        "schema": PLAN_SCHEMA,
        "tool_version": __version__,
        "inputs": [{"name": name, "sha256": digest} for name, digest in plan.inputs],
        "shift_start": clock.write(0) if clock.running else None,
        "shift_end": clock.write(end) if clock.running and end is not None else None,
        "shift_end_s": end,
        "time_zone": None if clock.zone is None else str(clock.zone),
        "method": {
            "name": plan.choice.name,
            "why": plan.choice.why,
            "others": dict(plan.choice.others),
        },
        "makespan_s": plan.makespan_s,
        "lower_bound_s": plan.lower_bound_s,
        "gap_s": plan.gap_s,
        "proved_optimal": plan.proved_optimal,
        "fits_shift": plan.fits_shift,
        "stopped": plan.stopped,
        "repeatable": plan.repeatable,
        "remarks": list(plan.remarks),
        "would_help": list(plan.would_help),
        "bounds": [
            {
                "kind": bound.kind,
                "value_s": int(bound.value_s),
                "witness": _plain(bound.witness),
                "sentence": bound.sentence,
            }
            for bound in plan.bounds
        ],
        "late": [
            {"order": row.order, "due_s": row.due_s, "finish_s": row.finish_s, "late_s": row.late_s}
            for row in plan.late_orders()
        ],
        "options": _plain(plan.options),
        "seed": _plain(plan.options.get("seed", default("seed"))),
    }


def plan_json(plan: Plan) -> str:
    """Return the content of plan.json: one assignment, bound or input a line, so that it can be compared.

    Time is linear in the number of assignments. Equal plans give equal text.
    """
    lines = [f"  {_text(name)}: {_block(value)}" for name, value in summary(plan).items()]
    lines.append(f'  "assignments": {_lines(list(_assignment_lines(plan)))}')
    return "{\n" + ",\n".join(lines) + "\n}\n"


def plan_id(text: str) -> str:
    """Return the short name of a plan: how the SHA-256 of its plan.json, given as `text`, begins."""
    return hashlib.sha256(text.encode("utf-8")).hexdigest()[:8]


def _assignment_lines(plan: Plan) -> Iterator[str]:
    shop, schedule = plan.shop, plan.schedule
    orders = [_text(name) for name in shop.orders.ids]
    machines = [_text(machine.id) for machine in shop.machines]
    columns = (
        shop.operations.job[schedule.operation],
        shop.operations.machine[schedule.operation],
        schedule.unit,
        schedule.start_s,
        schedule.end_s,
        schedule.round,
        schedule.part,
        schedule.parts,
    )
    for order, machine, unit, start, end, rank, part, parts in zip(
        *(column.tolist() for column in columns), strict=True
    ):
        round_text = "null" if rank == NO_ROUND else rank
        yield (
            f'{{"order": {orders[order]}, "machine": {machines[machine]}, "unit": {unit}, '
            f'"start_s": {start}, "end_s": {end}, "round": {round_text}, "part": {part}, "parts": {parts}}}'
        )


def _text(value: Any) -> str:
    # allow_nan: a bound that is no number is a bug, and must not become JSON that others cannot read
    return json.dumps(value, ensure_ascii=False, allow_nan=False)


def _block(value: Any) -> str:
    """A list of records one a line, anything else on one line."""
    if isinstance(value, list) and value:
        return _lines([_text(item) for item in value])
    return _text(value)


def _lines(items: Sequence[str]) -> str:
    if not items:
        return "[]"
    return "[\n    " + ",\n    ".join(items) + "\n  ]"


def _plain(value: Any) -> Any:
    """Turn NumPy numbers, arrays, tuples and mappings into what JSON knows; key order is kept."""
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, np.ndarray):
        return value.tolist()
    if isinstance(value, np.generic):
        return value.item()
    if isinstance(value, (list, tuple)):
        return [_plain(item) for item in value]
    if isinstance(value, (set, frozenset)):
        return sorted(_plain(item) for item in value)
    return value


# ---- plan.csv ----------------------------------------------------------------------------------


def plan_csv(plan: Plan) -> str:
    """Return the content of plan.csv, one assignment a row in the order of plan.json.

    Lines end in LF, which every spreadsheet reads and which compares well. A byte order mark stands
    first only when some text is not plain ASCII: without it Excel guesses the local code page and
    spoils such text, and plain text does not need it. Cells that a spreadsheet would run as a formula
    are made :func:`harmless`. Time is linear in the number of assignments.
    """
    shop, schedule = plan.shop, plan.schedule
    orders = [_cell(name) for name in shop.orders.ids]
    machines = [_cell(machine.id) for machine in shop.machines]
    notes = {index: _cell(note) for index, note in shop.operations.notes.items()}
    write = cache(shop.clock.write)
    columns = zip(
        schedule.operation.tolist(),
        shop.operations.job[schedule.operation].tolist(),
        shop.operations.machine[schedule.operation].tolist(),
        schedule.unit.tolist(),
        map(write, schedule.start_s.tolist()),
        map(write, schedule.end_s.tolist()),
        ("" if rank == NO_ROUND else rank for rank in schedule.round.tolist()),
        schedule.part.tolist(),
        schedule.parts.tolist(),
        strict=True,
    )
    rows = [
        f"{orders[job]},{machines[machine]},{unit},{start},{end},{rank},{part},{parts},{notes.get(index, '')}"
        for index, job, machine, unit, start, end, rank, part, parts in columns
    ]
    text = "\n".join([",".join(CSV_COLUMNS), *rows, ""])
    return text if text.isascii() else "\ufeff" + text


def _cell(text: str) -> str:
    """Quote where RFC 4180 asks for it, and where a program may guess another separator.

    Not left to the csv module: before Python 3.13 it writes a lone carriage return bare.
    """
    text = harmless(text)
    return '"' + text.replace('"', '""') + '"' if _QUOTED.search(text) else text
