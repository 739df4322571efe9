"""Replan: from a shop and its journal to an audited plan of what is left, and what it moves."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import asdict, dataclass, replace

from shopfloor.errors import NoPlanError
from shopfloor.journal.state import counting, state
from shopfloor.model.actuals import Event
from shopfloor.model.results import Plan
from shopfloor.model.shop import Shop
from shopfloor.openshop.method import Progress
from shopfloor.pipeline import Options, why_none
from shopfloor.pipeline import plan as plan_fresh
from shopfloor.replan.begin import begin
from shopfloor.replan.compare import Comparison, Row, compare
from shopfloor.replan.current import current
from shopfloor.replan.movement import MOVED_S, Moves, Place, Reference
from shopfloor.replan.outlook import OUTAGE_S, outlook
from shopfloor.replan.remaining import MINIMUM_LEFT_S, remaining
from shopfloor.replan.residual import Residual, residual
from shopfloor.replan.told import Told, told
from shopfloor.rolling.archive import worse_than
from shopfloor.rolling.bench import Bench, Timed
from shopfloor.rolling.check import check
from shopfloor.rolling.mend import mended
from shopfloor.rolling.search import Search
from shopfloor.rolling.sides import after_side, before_side
from shopfloor.rolling.trade import Trade, sentences, trades_of
from shopfloor.rolling.written import begun_early, numbers, parent, written

SEARCH_SHARE = 0.5  # of the time for a fresh plan; the other half goes into moving less

Report = Callable[[Progress], None]


@dataclass(frozen=True)
class Replan:
    """What a replan found.

    Attributes
    ----------
    plan
        Of what is left and what runs; audited against the residual shop and the journal.
    comparison
        The plan in force before, and this one.
    moves, scratch
        What it moves, and what planning from scratch would move; None where no fresh plan was found.
    worse_s
        By goal, how many (weighted) seconds it is worse than the best plan this run found.
    trades
        What moving less would cost.
    rest
        The residual shop.
    numbers
        What the journal calls each assignment of the plan: the number of its piece.
    """

    plan: Plan
    comparison: Comparison
    moves: Moves
    scratch: Moves | None
    worse_s: tuple[tuple[str, int], ...]
    trades: tuple[Trade, ...]
    rest: Residual
    numbers: tuple[int, ...]


def replan(
    shop: Shop,
    events: Sequence[Event],
    now_s: int,
    *,
    options: Options | None = None,
    stability_s: int = 0,
    back: Mapping[tuple[str, int], int] | None = None,
    outage_s: int = OUTAGE_S,
    minimum_left_s: int = MINIMUM_LEFT_S,
    inputs: Sequence[tuple[str, str]] = (),
    report: Report | None = None,
    stop: threading.Event | None = None,
) -> Replan:
    """Plan what is left of a shift: the best finish and lateness that are found, then the least movement.

    Parameters
    ----------
    shop
        What the shift's first plan was made from.
    events
        All entries of its journal; those after `now_s` do not count.
    now_s
        The moment, in seconds since the shift's start.
    options
        As for :func:`shopfloor.pipeline.plan`; its goals count before movement.
    stability_s
        How much worse the plan may be in every goal, to move less: how much later it may end, how much more
        weighted lateness and changeover it may have.
    back, outage_s
        As in :func:`shopfloor.replan.outlook.outlook`.
    minimum_left_s
        As in :func:`shopfloor.replan.remaining.remaining`.
    inputs
        Name and SHA-256 of each file the shop was read from, for the record.
    report
        Called with each :class:`Progress` of the whole, from any thread; times from the shift's start.
    stop
        When set, the search ends and the best plan so far is handed on.

    Raises
    ------
    ShopError
        If journal and shop do not belong together.
    NoPlanError
        If no plan was found in the time given.
    AuditError
        If our own plan fails an audit, which is a bug.
    """
    options, stop = options or Options(), stop or threading.Event()
    began = time.monotonic()

    def over() -> bool:
        return stop.is_set() or time.monotonic() - began > options.time_limit_s

    here, said = state(events, now_s, minimum_left_s=minimum_left_s), told(counting(events), now_s)
    now = current(shop, here, said)
    left = remaining(now, here, said, minimum_left_s=minimum_left_s)
    look = outlook(now, left, here, said, back=back, outage_s=outage_s)
    rest = residual(now, left, look, begin(now, left, look, said))
    rows = _rows(rest, said)
    was = {
        k: Place(row.start_s - rest.begin_s, row.end_s - rest.begin_s, row.unit)
        for k, row in rows.items()
        if k not in rest.pinned
    }
    bench = Bench(rest, was, options.objective)
    reference = Reference(was, rest.solve.operations.machine.tolist(), now_s - rest.begin_s)
    tell = _whole(report or (lambda progress: None), began + options.time_limit_s, rest.begin_s)
    search = Search(bench, reference, over, tell, seed=options.seed)
    search.kept()
    fresh = _fresh(rest, replace(options, time_limit_s=options.time_limit_s * SEARCH_SHARE), tell, stop)
    scratch = _offer_fresh(search, bench, fresh, rows)
    if not search.archive.front:
        raise NoPlanError(why_none(rest.solve, options.time_limit_s, stop))
    search.sharpen(0 if fresh is None else fresh.lower_bound_s)
    best, chosen = search.settled(stability_s)
    made = written(
        rest,
        bench,
        chosen,
        fresh,
        inputs=(*inputs, *parent(said)),
        options={
            **asdict(options),
            "parent": str(said.plans[-1].data.get("sha256", "")) if said.plans else "",
            "now_s": now_s,
            "stability_s": stability_s,
            "minimum_left_s": minimum_left_s,
            "begun": begun_early(said, here, now_s),
        },
        repeatable=search.complete and (fresh is None or fresh.repeatable),
        stopped="interrupted" if stop.is_set() else "done",
    )
    trades = tuple(trades_of(chosen, best, search.archive, bench.goals))
    said_of_moves = sentences(chosen, best, scratch, trades)
    made = replace(made, remarks=(*made.remarks, *_overdue(rest, rows), *said_of_moves))
    check(rest, bench, chosen, made, now, here)
    called = tuple(numbers(rest, made, here))
    return Replan(
        plan=made,
        comparison=_comparison(made, said, now_s),
        moves=chosen.moves,
        scratch=scratch,
        worse_s=worse_than(chosen, best, bench.goals),
        trades=trades,
        rest=rest,
        numbers=called,
    )


# ---- candidates ------------------------------------------------------------------------------------


def _rows(rest: Residual, said: Told) -> dict[int, Row]:
    """Return the row that each operation of the rest has in the last plan."""
    found = {}
    for k, one in enumerate(rest.left):
        row = said.planned(one.key)
        if row is not None and row.start_s is not None and row.end_s is not None:
            found[k] = Row(one.key.order, one.key.machine, row.unit, row.start_s, row.end_s, row.round)
    return found


def _overdue(rest: Residual, rows: Mapping[int, Row]) -> tuple[str, ...]:
    """Say how much should have begun by now and is not recorded: perhaps somebody forgot to."""
    late = [
        k
        for k, row in rows.items()
        if k not in rest.pinned and not rest.left[k].why and row.start_s < rest.now_s - MOVED_S
    ]
    if not late:
        return ()
    noun = "1 operation was" if len(late) == 1 else f"{len(late):,} operations were"
    return (
        f"{noun} to begin before {rest.shop.clock.say(rest.now_s)} and nothing is recorded of them; they are "
        "planned as not begun.",
    )


def _whole(report: Report, until: float, begin_s: int) -> Report:
    """Return a report that tells of the whole replan: the time left for all of it, on the shift's clock."""

    def passed_on(progress: Progress) -> None:
        best = None if progress.best_s is None else progress.best_s + begin_s
        left = max(0.0, until - time.monotonic())
        report(replace(progress, best_s=best, bound_s=progress.bound_s + begin_s, left_s=left))

    return passed_on


def _fresh(rest: Residual, options: Options, report: Report, stop: threading.Event) -> Plan | None:
    """Plan the rest as if there had been no plan; None if that finds none in time."""
    try:
        return plan_fresh(rest.fresh, options, report=report, stop=stop)
    except NoPlanError:
        return None


def _offer_fresh(search: Search, bench: Bench, fresh: Plan | None, rows: Mapping[int, Row]) -> Moves | None:
    """Offer a fresh plan, what lies between it and the old one, and mended rounds; return what it moves."""
    if fresh is None:
        return None
    timed: Timed | None
    if bench.free_units:
        timed = bench.of_fresh(fresh.schedule)
    else:
        operation = bench.rest.from_fresh[fresh.schedule.operation].tolist()
        sequence = list(dict.fromkeys(k for k in operation if k not in bench.rest.pinned))
        timed = bench.time(sequence)
    found = search.offer(timed, "fresh")
    before = bench.rest.begin.rounds
    if before is not None:
        rounds = {k: (row.round or 0) - before for k, row in rows.items()}
        search.offer(mended(bench, fresh, {k: rank for k, rank in rounds.items() if rank > 0}), "mended")
    if timed is not None:
        search.between(timed)
    return None if found is None else found.moves


def _comparison(made: Plan, said: Told, now_s: int) -> Comparison:
    return compare(before_side(said), after_side(made, now_s), tolerance_s=MOVED_S)
