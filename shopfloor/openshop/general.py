"""The general method: lists first, then the exact model, one goal after the other.

Goals come in stages; each stage keeps what the stages before it reached. The makespan is lowered by

1. list schedules, which end the stage when they meet the lower bound;
2. on small shops without releases, steps or groups, provers and finders (``cpsat.bracket``); on others
   the model of intervals begun at the best list (``cpsat.stage``); on very large ones growing tails
   (``cpsat.windows``).

Weighted tardiness is lowered by lists for due times, then window by window, then by the model of
intervals, which may prove it least. The solver is imported only when a list has not settled the matter.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from shopfloor.model.calendar import duration
from shopfloor.model.results import Outcome
from shopfloor.model.schedule import Schedule
from shopfloor.model.shop import Shop
from shopfloor.openshop.incumbent import GOALS, MAKESPAN, TARDINESS, Incumbent, least_tardiness
from shopfloor.openshop.list_rule import list_schedules
from shopfloor.openshop.method import Effort, Progress
from shopfloor.openshop.round_order import PRIORITY_UNIT

PAIRS_MOST = 15_000  # pairs of operations on one line up to which provers and finders are used
MODEL_MOST = 5_000  # operations up to which the whole shop is put into one model
WINDOWS_FROM = 110  # operations from which windows are smaller than the shop
BRIEF_MOST = 300  # operations up to which one thread may settle a goal in a moment, and repeatably
FIRST_SHARE = 0.6  # of the time left goes to a goal that another one follows
AGAIN_S = 2.0  # with so much time left a goal that was broken off is taken up again
TELL_EVERY_S = 0.4
TRIED_SHARE = 0.5  # of a goal's time goes to windows before the whole model


@dataclass(frozen=True, slots=True)
class General:
    """Accepts what the exact methods refuse: releases, steps, groups, any times.

    Parameters
    ----------
    goals
        What counts first, and what then; see :data:`~shopfloor.openshop.incumbent.GOALS`.
    """

    goals: tuple[str, ...] = GOALS
    name: str = "general"
    reaches_bound: bool = False

    def accepts(self, shop: Shop) -> str | None:
        """Return None, or the first thing in the shop that the method does not know."""
        if shop.breaks or any(machine.closed for machine in shop.machines):
            return "some machines pause over breaks or closures and others do not"
        if any(machine.crew is not None for machine in shop.machines):
            return "a crew limits how much runs at once"
        if any(not changeover.none for changeover in shop.changeovers.values()):
            return "machines need changeovers between families"
        if not shop.transport.none:
            return "orders need time between machines"
        return None

    def promise(self, shop: Shop) -> str:
        """Return what the method guarantees: a legal plan, and an honest gap."""
        return (
            "nothing simpler fits this shop, so list schedules are improved by search; the plan is proved "
            "shortest where it meets a lower bound, the search's own or another, and shows its gap elsewhere"
        )

    def solve(self, shop: Shop, effort: Effort) -> Outcome:
        """Return the best schedule found in the time given, with the makespan bound proved by search."""
        if not len(shop):
            return Outcome(Schedule(*(np.zeros(0, np.int64),) * 3))
        return _Search(shop, effort, self.goals).run()


class _Search:
    """One run of the method; gathers what was found, what was proved, and whether it repeats."""

    def __init__(self, shop: Shop, effort: Effort, goals: tuple[str, ...]) -> None:
        self.shop, self.effort = shop, effort
        self.stages = tuple(goal for goal in goals if goal != TARDINESS or shop.has_due) or (MAKESPAN,)
        # a goal that was not asked for still decides between schedules that are equal otherwise
        self.goals = (*self.stages, *(goal for goal in GOALS if goal not in self.stages))
        self.incumbent = Incumbent(shop, self.goals)
        self.bound_s = effort.bound_s
        self.proven_s = 0  # the part of the bound that the solver proved
        self.least = least_tardiness(shop)
        self.asked = False  # whether for more than that
        self.proved: set[str] = set()
        self.complete = self.repeatable = True
        self.told = time.monotonic()
        self.listed: dict[str, int] = {}  # for which target a goal's lists were made

    def run(self) -> Outcome:
        stages: dict[str, Callable[[tuple[str, ...], float | None], None]] = {
            MAKESPAN: self._shorten,
            TARDINESS: self._serve,
        }
        while True:
            self.complete = True
            for number, goal in enumerate(self.stages):
                last = number == len(self.stages) - 1
                until = None if last else time.monotonic() + FIRST_SHARE * self.effort.left_s
                stages[goal](self.stages[:number], until)
            if self.complete or self.stages[0] in self.proved or self.effort.left_s < AGAIN_S:
                break  # else the first goal was broken off for a later one that did not need all its time
            if self.effort.stop.is_set():
                break
        stopped = "done"
        if not self.complete:
            stopped = "interrupted" if self.effort.stop.is_set() else "time limit"
        return Outcome(
            self.incumbent.schedule(),
            proven_s=self.proven_s,
            stopped=stopped,
            repeatable=self.repeatable,
            remarks=self._remarks(),
        )

    # ---- makespan --------------------------------------------------------------------------------

    def _shorten(self, kept: tuple[str, ...], until: float | None) -> None:
        if not kept:
            self._lists(MAKESPAN, self.effort.bound_s)
        self._tell("lists")
        if self._value(MAKESPAN) <= self.bound_s:
            self.proved.add(MAKESPAN)
            return
        if self._cut_off():
            return
        if not kept and self._suits_bracket():
            self._bracket(until)
        elif self._brief(MAKESPAN, kept, self.bound_s, until):
            return
        elif kept or len(self.shop) <= MODEL_MOST:
            self._model(MAKESPAN, kept, self.bound_s, until)
        else:
            from shopfloor.openshop.cpsat.windows import shorten_by_tails

            ended = shorten_by_tails(
                self.shop, self.incumbent, self.bound_s, self.effort, lambda: "shortening", until=until
            )
            self._note(ended, ended and self._alone())

    def _suits_bracket(self) -> bool:
        from shopfloor.openshop.cpsat.pairs import pair_count, reversible

        shop = self.shop
        single = all(machine.count == 1 for machine in shop.machines)
        return single and reversible(shop) and pair_count(shop) <= PAIRS_MOST

    def _bracket(self, until: float | None) -> None:
        from shopfloor.openshop.cpsat.bracket import Bracket

        bracket = Bracket(self.shop, self.incumbent, self.bound_s, self.effort)
        bracket.run(until)
        self._raise_bound(bracket.bound_s)
        self._note(bracket.closed, bracket.repeatable)
        if bracket.closed:
            self.proved.add(MAKESPAN)

    # ---- due times ---------------------------------------------------------------------------------

    def _serve(self, kept: tuple[str, ...], until: float | None) -> None:
        deadline = self._value(MAKESPAN) if kept else self.effort.bound_s
        self._lists(TARDINESS, deadline)
        self._tell(self._late())
        if self._value(TARDINESS) > self.least and not self.asked:
            self.asked = True  # once is enough: it holds for every plan, whatever is kept
            self.least = max(self.least, self.effort.least_late(self.shop))
        if self._value(TARDINESS) <= self.least:
            self.proved.add(TARDINESS)
            return
        if self._cut_off():
            return
        if self._brief(TARDINESS, kept, self.least, until):
            return
        whole = len(self.shop) <= MODEL_MOST
        if len(self.shop) > WINDOWS_FROM:
            self._windows(kept, until, whole)
        if self._value(TARDINESS) <= self.least:
            self.proved.add(TARDINESS)
        elif whole and not self._cut_off():
            self._model(TARDINESS, kept, self.least, until)

    def _windows(self, kept: tuple[str, ...], until: float | None, whole: bool) -> None:
        from shopfloor.openshop.cpsat.stage import whole_horizon_s
        from shopfloor.openshop.cpsat.windows import serve_due_times

        latest_s = self._value(MAKESPAN) if kept else whole_horizon_s(self.shop)
        now = time.monotonic()
        left = self.effort.left_s if until is None else max(0.0, until - now)
        ended = serve_due_times(
            self.shop,
            self.incumbent,
            latest_s,
            self.bound_s,
            self.effort,
            self._late,
            until=now + (TRIED_SHARE if whole else 1.0) * left,
        )
        self._note(ended or whole, ended and self._alone())

    def _late(self) -> str:
        hours = self._value(TARDINESS) / PRIORITY_UNIT / 3600
        return f"late orders, {hours:.2f} weighted hours"

    # ---- what both need ------------------------------------------------------------------------

    def _value(self, goal: str) -> int:
        return self.incumbent.value(goal)

    def _lists(self, goal: str, target: int) -> None:
        if self.listed.get(goal) == target:
            return
        self.listed[goal] = target
        complete = list_schedules(
            self.shop, self.incumbent, goal, target, seed=self.effort.seed, over=self._tell_and_ask
        )
        self._note(complete, complete)

    def _brief(self, goal: str, kept: tuple[str, ...], least: int, until: float | None) -> bool:
        """Give a small shop to one thread for a short while; tell whether that settled the goal."""
        if len(self.shop) > BRIEF_MOST:
            return False
        self._model(goal, kept, least, until, brief=True)
        return goal in self.proved or self._cut_off()

    def _model(
        self, goal: str, kept: tuple[str, ...], least: int, until: float | None, *, brief: bool = False
    ) -> None:
        from shopfloor.openshop.cpsat.stage import improve

        words = (lambda: "shortening") if goal == MAKESPAN else self._late
        result = improve(
            self.shop,
            self.incumbent,
            goal,
            kept,
            least,
            self.effort,
            words,
            bound_s=self.bound_s,
            until=until,
            brief=brief,
        )
        self._note(result.ended, result.repeatable)
        if result.bound >= self._value(goal):
            self.proved.add(goal)
        if goal == MAKESPAN and not kept:
            self._raise_bound(result.bound)
        if goal == TARDINESS and (not kept or kept == (MAKESPAN,)):
            self.least = max(self.least, result.bound)

    def _raise_bound(self, bound_s: int) -> None:
        if bound_s > self.bound_s:
            self.bound_s = self.proven_s = bound_s

    def _note(self, complete: bool, repeatable: bool) -> None:
        self.complete &= complete
        self.repeatable &= repeatable

    def _alone(self) -> bool:
        from shopfloor.openshop.cpsat.solve import threads

        return threads(self.effort.workers) == 1

    def _cut_off(self) -> bool:
        """Tell whether time is up or a stop was asked for, and remember that it cut something off."""
        if self.effort.over:
            self._note(complete=False, repeatable=False)
            return True
        return False

    def _tell_and_ask(self) -> bool:
        """Tell of a list schedule, unless one was told of just now; return whether to stop."""
        if time.monotonic() - self.told >= TELL_EVERY_S:
            self._tell("lists")
        return self.effort.over

    def _tell(self, stage: str) -> None:
        self.told = time.monotonic()
        self.effort.report(Progress(stage, self.incumbent.makespan_s, self.bound_s, self.effort.left_s))

    def _remarks(self) -> tuple[str, ...]:
        remarks: list[str] = []
        exact = self.shop.orders.priority * PRIORITY_UNIT
        if self.shop.has_due:
            remarks.append(self._about_lateness())
            if float(np.abs(exact - np.rint(exact)).max(initial=0.0)) > 1e-6:
                remarks.append("Priorities were taken to three decimals.")
        return tuple(remarks)

    def _about_lateness(self) -> str:
        """Say how late it is, and what is proved about that: nothing is called near that is not."""
        value = self._value(TARDINESS)
        if not value:
            return "Nothing is late."
        kind = "plan of this makespan" if self.goals[0] == MAKESPAN else "plan"
        said = f"Weighted lateness is {duration(value // PRIORITY_UNIT)} (priority × time late, summed)"
        if TARDINESS in self.proved:
            return f"{said}; no {kind} has less."
        if not self.least:
            return f"{said}; whether a {kind} could have less is not known."
        least = duration(self.least // PRIORITY_UNIT)
        return f"{said}; all that is proved is that every {kind} has {least} or more."
