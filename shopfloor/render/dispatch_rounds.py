"""Who is where: rounds down, machines across, cut into sheets of paper."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from functools import cache
from typing import TYPE_CHECKING

from shopfloor.model.schedule import NO_ROUND
from shopfloor.render.dispatch_view import RoundRow, RoundSheet

if TYPE_CHECKING:
    from shopfloor.model.results import Plan

# Millimetres, safe on A4 and on Letter: a round sheet without its first column, the least and greatest width
# of a column, its padding, and a letter of an order and of a machine as the style sheet sets them.
_SHEET_MM, _COLUMN_MM, _PADDING_MM = 152.0, (16.0, 50.0), 3.5
_ORDER_LETTER_MM, _MACHINE_LETTER_MM = 2.75, 2.3


def round_sheets(plan: Plan) -> tuple[RoundSheet, ...]:
    """Return the grids of a plan in unit rounds; none for any other plan."""
    shop, schedule = plan.shop, plan.schedule
    if not len(schedule) or bool((schedule.round == NO_ROUND).any()):
        return ()
    say = cache(shop.clock.say)
    job = shop.operations.job[schedule.operation].tolist()
    machine = shop.operations.machine[schedule.operation].tolist()
    cells: dict[int, dict[tuple[int, int], str]] = {}
    times: dict[int, tuple[int, int]] = {}
    for rank, order, place, unit, start, end in zip(
        schedule.round.tolist(),
        job,
        machine,
        schedule.unit.tolist(),
        schedule.start_s.tolist(),
        schedule.end_s.tolist(),
        strict=True,
    ):
        cells.setdefault(rank, {})[place, unit] = shop.orders.ids[order]
        first, last = times.get(rank, (start, end))
        times[rank] = min(first, start), max(last, end)
    used = sorted({place for row in cells.values() for place in row})
    heads = {
        (place, unit): shop.machines[place].id + (f" unit {unit}" if shop.machines[place].count > 1 else "")
        for place, unit in used
    }
    blocks = _blocks(used, _column_mm(shop.orders.ids, heads.values()))
    return tuple(
        RoundSheet(
            sheet=number,
            sheets=len(blocks),
            machines=tuple(heads[column] for column in block),
            rows=tuple(
                RoundRow(
                    number=rank,
                    start=say(times[rank][0]),
                    end=say(times[rank][1]),
                    orders=tuple(cells[rank].get(column, "") for column in block),
                )
                for rank in sorted(cells)
            ),
        )
        for number, block in enumerate(blocks, 1)
    )


def _column_mm(orders: Iterable[str], machines: Iterable[str]) -> float:
    """Return the width that the longest order, and the longest word of a machine, ask for."""
    order = max((len(name) for name in orders), default=0)
    machine = max((len(word) for name in machines for word in re.split(r"[\s-]", name)), default=0)
    needed = max(order * _ORDER_LETTER_MM, machine * _MACHINE_LETTER_MM) + _PADDING_MM
    return min(max(needed, _COLUMN_MM[0]), _COLUMN_MM[1])


def _blocks(columns: Sequence[tuple[int, int]], width_mm: float) -> list[Sequence[tuple[int, int]]]:
    """Cut the columns into as few sheets as their width allows, evenly filled."""
    sheets = -(-len(columns) // int(_SHEET_MM // width_mm))
    size, larger = divmod(len(columns), sheets)
    blocks, first = [], 0
    for sheet in range(sheets):
        last = first + size + (sheet < larger)
        blocks.append(columns[first:last])
        first = last
    return blocks
