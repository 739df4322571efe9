"""One shop to one plan: bounds, choose a method, solve, audit. The only place that joins the steps."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Sequence
from dataclasses import asdict, dataclass

from shopfloor.audit.schedule import audit
from shopfloor.bounds.catalogue import lower_bounds
from shopfloor.bounds.lateness import least_lateness
from shopfloor.bounds.levers import Lever, tie_sentence, what_would_help
from shopfloor.errors import AuditError, NoPlanError
from shopfloor.model.feasible import impossible, waits_for_good
from shopfloor.model.results import Bound, Choice, Outcome, Plan
from shopfloor.model.shop import Shop
from shopfloor.model.stated import state
from shopfloor.openshop.choose import choose
from shopfloor.openshop.method import Effort, Progress

WHY_S = 10.0  # to name the rules that clash when there is no plan
HELP_UP_TO = 50_000  # operations; beyond, taking the bounds twenty times more would take seconds


@dataclass(frozen=True, slots=True)
class Options:
    """What may change the schedule; written into plan.json."""

    time_limit_s: float = 30.0
    workers: int = 0
    seed: int = 0
    even: bool = False
    shortest_piece_s: int = 0
    objective: tuple[str, ...] = ("makespan", "tardiness")


@dataclass(frozen=True, slots=True)
class Forecast:
    """What can be said before planning.

    `reached` tells that the chosen method always ends exactly at the best bound, so that the bound
    is the makespan and the answer to whether the shift holds it is final. `levers` and `tie` say what
    would lower the bound.
    """

    shop: Shop
    bounds: tuple[Bound, ...]
    choice: Choice
    reached: bool
    levers: tuple[Lever, ...]
    tie: str

    @property
    def lower_bound_s(self) -> int:
        """The best bound; 0 for a shop without operations."""
        return self.bounds[0].value_s if self.bounds else 0

    @property
    def fits(self) -> bool | None:
        """Whether the shift can hold the work, as far as the bound tells; None without a shift end."""
        end = self.shop.shift_end_s
        return None if end is None else self.lower_bound_s <= end


def forecast(shop: Shop) -> Forecast:
    """Return bounds, method and what they say about the shift, without planning; near-linear time."""
    method, choice = choose(shop)
    bounds = lower_bounds(shop)
    levers, tie = _help(shop, bounds)
    return Forecast(shop, bounds, choice, method.reaches_bound, levers, tie)


def _help(shop: Shop, bounds: tuple[Bound, ...]) -> tuple[tuple[Lever, ...], str]:
    if len(shop) > HELP_UP_TO:
        return (), ""
    return what_would_help(shop, bounds), tie_sentence(shop, bounds)


def plan(
    shop: Shop,
    options: Options | None = None,
    *,
    inputs: Sequence[tuple[str, str]] = (),
    report: Callable[[Progress], None] | None = None,
    stop: threading.Event | None = None,
) -> Plan:
    """Plan a shop: the earliest finish that can be reached, beside the best bound that can be proved.

    Parameters
    ----------
    shop
        What is to be done.
    options
        Time limit, solver threads and seed.
    inputs
        Name and SHA-256 of each file the shop was read from, for the record.
    report
        Called with each :class:`Progress` of a search, from any thread.
    stop
        When set, the search ends and the best plan so far is handed on.

    Returns
    -------
    Plan
        Audited: it breaks no rule of the shop, and its bounds hold.

    Raises
    ------
    NoPlanError
        If no plan was found in the time given.
    AuditError
        If our own plan fails the audit, which is a bug.
    """
    options = options or Options()
    bounds = lower_bounds(shop)
    method, choice = choose(shop, options.objective)
    effort = Effort(
        bound_s=bounds[0].value_s if bounds else 0,
        least_late=lambda asked: least_lateness(asked).value,
        time_limit_s=options.time_limit_s,
        workers=options.workers,
        seed=options.seed,
        even=options.even,
        shortest_piece_s=options.shortest_piece_s,
        report=report or (lambda progress: None),
        stop=stop or threading.Event(),
    )
    outcome = method.solve(shop, effort)
    rows = outcome.schedule
    if rows is None or waits_for_good(shop, rows.operation, rows.end_s):
        raise NoPlanError(why_none(shop, options.time_limit_s, effort.stop))
    levers, tie = _help(shop, bounds)
    made = Plan(
        shop=shop,
        schedule=rows,
        bounds=_with_proven(bounds, outcome, shop),
        choice=choice,
        inputs=tuple(inputs),
        options=asdict(options),
        remarks=outcome.remarks,
        would_help=(*([tie] if tie else []), *(lever.sentence for lever in levers)),
        stopped=outcome.stopped,
        repeatable=outcome.repeatable,
    )
    violations = audit(shop, state(made))
    if violations:
        raise AuditError(violations)
    return made


def why_none(shop: Shop, time_limit_s: float, stop: threading.Event | None = None) -> str:
    """Return why no plan was found: an operation that no plan can hold, rules that clash, else the time.

    Parameters
    ----------
    time_limit_s
        The time in which none was found; to find out why takes at most ``WHY_S`` more, or little more.
    stop
        When set, nothing is proved any more.
    """
    for one in impossible(shop):
        operation = shop.operation(one.operation)
        return f"no plan can hold {operation.order} on {operation.machine_id}: it {one.problem}; {one.advice}"
    if stop is not None and stop.is_set():
        return "no plan was found before the search was stopped"
    from shopfloor.openshop.cpsat.clash import Clash, judge  # the solver is heavy to import

    until = time.monotonic() + WHY_S
    found = judge(shop, lambda: time.monotonic() > until or (stop is not None and stop.is_set()))
    if isinstance(found, Clash):
        return found.text()
    if found:
        return f"no plan was found in {time_limit_s:g} s, though there is one; allow more with --time-limit"
    return (
        f"neither a plan nor a proof that there is none was found in {time_limit_s:g} s; allow more with "
        "--time-limit"
    )


def _with_proven(bounds: tuple[Bound, ...], outcome: Outcome, shop: Shop) -> tuple[Bound, ...]:
    """Put the solver's own bound first where it beats every other."""
    if bounds and outcome.proven_s <= bounds[0].value_s:
        return bounds
    if not outcome.proven_s:
        return bounds
    finish = shop.clock.say(outcome.proven_s)
    proven = Bound(
        kind="solver",
        value_s=outcome.proven_s,
        witness={"solver": "CP-SAT"},
        sentence=f"The solver CP-SAT has proved that nothing can end before {finish}.",
    )
    return (proven, *bounds)
