"""Splittable work: every operation may be cut, and the largest load decides.

T. Gonzalez and S. Sahni (J. ACM 23 (1976) 665-679) showed that an open shop whose operations may be cut
ends at the largest order or machine load. `kernel.decompose` holds the argument and makes few cuts;
`kernel.units` carries it over to groups and to a crew: max(order load, machine load, group load over its
units, all work over the crew).

A shortest piece takes that certainty away: a plan that needs no short piece is kept, else the times are
laid on a grid of that length, where every cut falls on the grid.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from shopfloor.kernel.decompose import Block, time_blocks
from shopfloor.kernel.units import UnitPiece, split_units
from shopfloor.model.calendar import duration
from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Ints, Shop
from shopfloor.openshop.crew_rounds import without_crews
from shopfloor.openshop.general import General
from shopfloor.openshop.method import Effort, why_not_plain
from shopfloor.openshop.round_order import order_rounds


@dataclass(frozen=True, slots=True)
class LotSplit:
    """Exact where every operation may be cut, with groups and one crew."""

    name: str = "split lots"
    reaches_bound: bool = True

    def accepts(self, shop: Shop) -> str | None:
        """Return None, or why the shop is no open shop of splittable work."""
        if not shop.has_splits:
            return "no operation may be cut"
        if not shop.operations.splittable.all():
            return "only some operations may be cut"
        if shop.operations.setup_s.any():
            return "every part would need its own set-up"
        return _why_not_one_crew(shop) or why_not_plain(without_crews(shop))

    def promise(self, shop: Shop) -> str:
        """Return the theorem in a sentence."""
        return (
            "every operation may be cut, so the largest load of an order, a machine, a group over its "
            "units or the crew is always enough (Gonzalez and Sahni 1976)"
        )

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Return a schedule that ends at the largest load; with a shortest piece, one that keeps it."""
        pieces = _pieces(shop)
        if effort.shortest_piece_s:
            return _without_short_pieces(shop, pieces, effort.shortest_piece_s, effort)
        if not shop.has_due:
            return Outcome(_schedule(pieces))
        return _in_good_order(shop, pieces)


def _why_not_one_crew(shop: Shop) -> str | None:
    """Return None when no crew limits the work, or one crew serves all of it alike."""
    machines = [shop.machines[index] for index in np.unique(shop.operations.machine).tolist()]
    used = {machine.crew for machine in machines}
    if used <= {None}:
        return None
    if len(used) > 1:
        return "not every operation takes its heads from the same crew"
    crew = next(crew for crew in shop.crews if crew.id in used)
    heads = shop.operations.heads
    if crew.levels or any(machine.set_up_only for machine in machines):
        return "the crew is not there, or not needed, all the time"
    if int(heads.min()) != int(heads.max()) or int(heads[0]) < 1 or crew.heads % int(heads[0]):
        # Heads that do not divide evenly leave some over that no bound sees; see `kernel.units`.
        return "the crew's heads do not divide evenly among the operations"
    return None


def _pieces(shop: Shop, seconds: Ints | None = None) -> list[UnitPiece]:
    operations = shop.operations
    crew = next((c for c in shop.crews if c.id == shop.machines[int(operations.machine[0])].crew), None)
    return split_units(
        operations.job,
        operations.machine,
        operations.seconds if seconds is None else seconds,
        units={index: machine.count for index, machine in enumerate(shop.machines)},
        crew=crew.heads // int(operations.heads[0]) if crew is not None else None,
    )


def _schedule(pieces: Sequence[UnitPiece]) -> Schedule:
    columns = np.array([(p.edge, p.start, p.end, p.unit + 1) for p in pieces], np.int64).reshape(-1, 4)
    edge, start, end, unit = columns.T
    return Schedule(edge, start, end, unit=unit)


# ---- due times --------------------------------------------------------------------------------------


def _in_good_order(shop: Shop, pieces: list[UnitPiece]) -> Outcome:
    """Put the stretches in which the same operations run in a good order for the due times.

    Stretches that stay neighbours are joined again, so that only what is pulled apart is cut.
    """
    blocks = time_blocks((piece.edge, piece.start, piece.end) for piece in pieces)
    inside = np.repeat(np.arange(len(blocks)), [len(block.edges) for block in blocks])
    edges = np.array([edge for block in blocks for edge in block.edges], np.int64)
    orders = shop.orders
    order = order_rounds(
        inside,
        shop.operations.job[edges],
        np.array([block.end - block.start for block in blocks]),
        lambda length: length,  # some critical line works all the time: there is no idle stretch
        orders.due_s,
        orders.priority,
    )
    remark = order.about("blocks of the plan")
    return Outcome(_schedule(_permuted(pieces, blocks, order.position)), remarks=(remark,))


def _permuted(pieces: list[UnitPiece], blocks: list[Block], position: Ints) -> list[UnitPiece]:
    """Return the pieces of the blocks in their new order, those that touch joined again."""
    by_edge: dict[int, list[UnitPiece]] = {}
    for piece in pieces:
        by_edge.setdefault(piece.edge, []).append(piece)
    out: dict[tuple[int, int, int], UnitPiece] = {}  # by edge, unit and end: what a next piece may prolong
    moment = 0
    for block in (blocks[index] for index in np.argsort(position).tolist()):
        until = moment + block.end - block.start
        for edge in block.edges:
            unit = next(p.unit for p in by_edge[edge] if p.start <= block.start < p.end)
            before = out.pop((edge, unit, moment), None)
            out[edge, unit, until] = UnitPiece(edge, unit, before.start if before else moment, until)
        moment = until
    return list(out.values())


# ---- a shortest piece ---------------------------------------------------------------------------------


def _without_short_pieces(shop: Shop, pieces: list[UnitPiece], least: int, effort: Effort) -> Outcome:
    """Return the best plan found in which no operation is cut into a piece shorter than `least`."""
    said = f"No operation is cut into pieces shorter than {duration(least)}"
    if _short(pieces, least) is None:
        return Outcome(_schedule(pieces), remarks=(f"{said}, and none had to be: still exact.",))
    found = []
    gridded = _on_a_grid(shop, least)
    if _short(gridded, least) is None:
        found.append(_schedule(gridded))
    whole = replace(shop, operations=replace(shop.operations, splittable=np.zeros(len(shop), np.int64)))
    uncut = General().solve(whole, effort)
    if uncut.schedule is not None:
        found.append(uncut.schedule)
    best = min(found, key=lambda schedule: schedule.makespan_s)
    remark = f"{said}; with that limit the bound may be out of reach, so this need not be the shortest plan."
    return replace(uncut, schedule=best, proven_s=0, remarks=(remark,))


def _short(pieces: list[UnitPiece], least: int) -> UnitPiece | None:
    """Return a piece of a cut operation that is shorter than `least`, if there is one."""
    parts = Counter(piece.edge for piece in pieces)
    return next((p for p in pieces if parts[p.edge] > 1 and p.end - p.start < least), None)


def _on_a_grid(shop: Shop, least: int) -> list[UnitPiece]:
    """Return a plan whose cuts fall on multiples of `least`, surplus time taken off the longest piece."""
    seconds = shop.operations.seconds
    slots = -(-seconds // least)
    pieces = [
        UnitPiece(p.edge, p.unit, p.start * least, p.end * least) for p in _pieces(shop, slots)
    ]  # on the grid
    longest: dict[int, int] = {}
    for index, piece in enumerate(pieces):
        held = longest.setdefault(piece.edge, index)
        if piece.end - piece.start > pieces[held].end - pieces[held].start:
            longest[piece.edge] = index
    for edge, index in longest.items():
        surplus = int(slots[edge]) * least - int(seconds[edge])
        pieces[index] = pieces[index]._replace(end=pieces[index].end - surplus)
    return pieces
