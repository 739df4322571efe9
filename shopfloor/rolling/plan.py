"""Replan: from a shop and its journal to an audited plan of what is left, and what it moves."""

from __future__ import annotations

import threading
import time
from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from dataclasses import asdict, dataclass, replace
from itertools import count
from typing import Any

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.bounds.levers import tie_sentence, what_would_help
from shopfloor.errors import AuditError, NoPlanError
from shopfloor.journal.state import counting, state
from shopfloor.model.actuals import Event, ShiftState
from shopfloor.model.feasible import impossible
from shopfloor.model.results import Bound, Choice, Plan
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.model.stated import state as stated
from shopfloor.openshop.method import Progress
from shopfloor.pipeline import HELP_UP_TO, Options
from shopfloor.pipeline import plan as plan_fresh
from shopfloor.replan.begin import begin
from shopfloor.replan.compare import Comparison, Row, compare
from shopfloor.replan.current import Current, current
from shopfloor.replan.frozen import audit_frozen
from shopfloor.replan.movement import MOVED_S, Moves, Place, Reference
from shopfloor.replan.outlook import OUTAGE_S, outlook
from shopfloor.replan.remaining import MINIMUM_LEFT_S, remaining
from shopfloor.replan.residual import Residual, residual
from shopfloor.replan.told import Told, told
from shopfloor.rolling.archive import Candidate, worse_than
from shopfloor.rolling.bench import Bench, Timed
from shopfloor.rolling.mend import mended
from shopfloor.rolling.search import Search
from shopfloor.rolling.sides import after_side, before_side
from shopfloor.rolling.trade import Trade, sentences, trades_of

SEARCH_SHARE = 0.5  # of the time for a fresh plan; the other half goes into moving less


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
    report: Callable[[Progress], None] | None = None,
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
    search = Search(bench, reference, over, seed=options.seed)
    search.kept()
    fresh = _fresh(rest, replace(options, time_limit_s=options.time_limit_s * SEARCH_SHARE), report, stop)
    scratch = _offer_fresh(search, bench, fresh, rows)
    if not search.archive.front:
        raise NoPlanError(_why_none(rest, options))
    search.sharpen(0 if fresh is None else fresh.lower_bound_s)
    best, chosen = search.settled(stability_s)
    made = _plan(
        rest,
        bench,
        chosen,
        fresh,
        inputs=(*inputs, *_parent(said)),
        options={
            **asdict(options),
            "parent": str(said.plans[-1].data.get("sha256", "")) if said.plans else "",
            "now_s": now_s,
            "stability_s": stability_s,
            "minimum_left_s": minimum_left_s,
            "begun": _begun_early(said, here, now_s),
        },
        repeatable=search.complete and (fresh is None or fresh.repeatable),
        stopped="interrupted" if stop.is_set() else "done",
    )
    trades = tuple(trades_of(chosen, best, search.archive, bench.goals))
    said_of_moves = sentences(chosen, best, scratch, trades)
    made = replace(made, remarks=(*made.remarks, *_overdue(rest, rows), *said_of_moves))
    _check(rest, bench, chosen, made, now, here)
    numbers = tuple(_numbers(rest, made, here))
    return Replan(
        plan=made,
        comparison=_comparison(made, said, now_s),
        moves=chosen.moves,
        scratch=scratch,
        worse_s=worse_than(chosen, best, bench.goals),
        trades=trades,
        rest=rest,
        numbers=numbers,
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


def _fresh(
    rest: Residual,
    options: Options,
    report: Callable[[Progress], None] | None,
    stop: threading.Event,
) -> Plan | None:
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


def _why_none(rest: Residual, options: Options) -> str:
    """Say why no plan was found: what no plan can hold, if there is any, else the time."""
    for one in impossible(rest.solve):
        operation = rest.solve.operation(one.operation)
        return f"no plan can hold {operation.order} on {operation.machine_id}: it {one.problem}; {one.advice}"
    return f"no plan was found in {options.time_limit_s:g} s; allow more with --time-limit"


# ---- the plan --------------------------------------------------------------------------------------


def _plan(
    rest: Residual,
    bench: Bench,
    chosen: Candidate,
    fresh: Plan | None,
    *,
    inputs: tuple[tuple[str, str], ...],
    options: Mapping[str, Any],
    repeatable: bool,
    stopped: str,
) -> Plan:
    shop = rest.shop
    schedule = bench.schedules(chosen.timed)[1]
    bounds = _bounds(rest, schedule, fresh)
    helps: tuple[str, ...] = ()
    if len(shop) <= HELP_UP_TO:
        tie = tie_sentence(shop, bounds)
        levers = (lever.sentence for lever in what_would_help(shop, bounds))
        helps = (*([tie] if tie else []), *levers)
    return Plan(
        shop=shop,
        schedule=schedule,
        bounds=bounds,
        choice=_choice(chosen, fresh),
        inputs=inputs,
        options=options,
        remarks=rest.remarks,
        would_help=helps,
        stopped=stopped,
        repeatable=repeatable,
    )


def _bounds(rest: Residual, schedule: Schedule, fresh: Plan | None) -> tuple[Bound, ...]:
    """Return the bounds of the rest; what a solver proved of it counts where it was asked the same."""
    bounds = lower_bounds(rest.shop)
    for bound in fresh.bounds if fresh is not None and rest.exact else ():
        value = bound.value_s + rest.begin_s
        if bound.kind == "solver" and value > (bounds[0].value_s if bounds else 0):
            finish = rest.shop.clock.say(value)
            sentence = f"The solver CP-SAT has proved that nothing can end before {finish}."
            if value <= schedule.makespan_s:
                bounds = (Bound("solver", value, bound.witness, sentence), *bounds)
    return bounds


def _choice(chosen: Candidate, fresh: Plan | None) -> Choice:
    method = "" if fresh is None else fresh.choice.name
    others = {} if fresh is None else dict(fresh.choice.others)
    match chosen.origin:
        case "kept":
            why = (
                "every machine goes on in its old sequence as early as it can, and nothing found ends earlier"
            )
            return Choice("kept sequence", why, others)
        case "mended":
            why = (
                "the old rounds were mended along paths of two rounds each, in the fewest rounds that can "
                "hold what is left (König 1916)"
            )
            return Choice("mended rounds", why, others)
        case "repaired":
            why = (
                f"a fresh plan ({method}) was taken back towards the old one as far as its finish and "
                "lateness allow"
            )
            return Choice("repaired sequence", why, others)
        case _:
            assert fresh is not None
            return Choice(method, f"planned anew: {fresh.choice.why}", others)


def _parent(said: Told) -> tuple[tuple[str, str], ...]:
    """Return name and hash of the plan in force."""
    if not said.plans:
        return ()
    data = said.plans[-1].data
    return ((f"parent {data.get('name', 'plan.json')}", str(data.get("sha256", ""))),)


def _numbers(rest: Residual, made: Plan, here: ShiftState) -> list[int]:
    """Return the number of each assignment: its operation's own, and free ones for further parts."""
    taken = {*here.pieces, *(one.key for one in rest.left)}
    found = []
    for row in made.schedule:
        key = rest.left[row.operation].key
        if row.part > 1:
            key = next(key for n in count(1) if (key := key._replace(piece=n)) not in taken)
            taken.add(key)
        found.append(key.piece)
    return found


def _begun_early(said: Told, here: ShiftState, now_s: int) -> list[list[Any]]:
    """Return order, machine and planned start of what the last plan has from now on, and is begun already."""
    rows = said.plans[-1].pieces if said.plans else ()
    return [
        [row.key.order, row.key.machine, row.start_s]
        for row in rows
        if row.start_s is not None
        and row.start_s >= now_s
        and row.key in here.pieces
        and here.pieces[row.key].touched
    ]


# ---- checks and comparison -------------------------------------------------------------------------


def _check(
    rest: Residual, bench: Bench, chosen: Candidate, made: Plan, now: Current, here: ShiftState
) -> None:
    """Audit the plan three times: strictly from begin on, as it is written, and against the journal."""
    strict = bench.schedules(chosen.timed)[0]
    blank = Choice("", "", {})
    violations = audit(rest.solve, stated(Plan(rest.solve, strict, (), blank)))
    violations += audit(made.shop, stated(made))
    columns = now.shop.operations
    wanted: Counter[tuple[str, str]] = Counter()
    cut = set()
    for job, machine, splittable in zip(
        columns.job.tolist(), columns.machine.tolist(), columns.splittable.tolist(), strict=True
    ):
        pair = now.shop.orders.ids[job], now.shop.machines[machine].id
        wanted[pair] += 1
        if splittable:
            cut.add(pair)
    out = {(now.shop.machines[out.machine].id, out.unit): out.until_s for out in rest.look.outs}
    whole = {pair: need for pair, need in wanted.items() if pair not in cut}
    violations += audit_frozen(stated(made), here, whole, now.shop.clock, out)
    if violations:
        raise AuditError(violations)


def _comparison(made: Plan, said: Told, now_s: int) -> Comparison:
    return compare(before_side(said), after_side(made, now_s), tolerance_s=MOVED_S)
