"""From a shift under way to the shop that is left to plan. Pure: no file, no method, no bound.

Finished work is gone. Running work stays where it is: nothing else gets its unit, its order or its people
before it is expected to be done. Nothing new starts before *begin*: now, or in unit rounds the next round.
All of that is said in the words any shop has, so that every method and the audit work unchanged:

- ``shop``, on the shift's own clock, is what a plan is written for: what runs is an operation from its true
  start on, and every other order is released when it can go on.
- ``solve`` is the same work on a clock that starts at *begin*, and stricter: a changeover needs its time from
  *begin* on. There the exact methods find no past that they would have to refuse.
- ``fresh`` is `solve` for methods that cannot be told where an operation stands: what runs on a machine of
  one unit is a closure there instead. On a group it is left free, which is never harder.

Operation k of `shop` and of `solve` is one and the same.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from shopfloor.model.calendar import Clock
from shopfloor.model.shop import NO_DUE, NO_STEP, Closure, Crew, Ints, Machine, Operations, Orders, Shop
from shopfloor.replan.begin import Begin
from shopfloor.replan.current import Current
from shopfloor.replan.holding import (
    heads_ahead,
    heads_in_rows,
    holdings,
    kept_out,
    merged,
    row_seconds,
)
from shopfloor.replan.machines import machines_ahead, moved
from shopfloor.replan.outlook import Outlook, Running, future
from shopfloor.replan.people import Held, change, crew_from, crew_of
from shopfloor.replan.remaining import Left


@dataclass(frozen=True)
class Residual:
    """What is left to plan; see the module.

    Attributes
    ----------
    begin
        When the rest begins, and whether it goes on in rounds.
    look
        What is known of the time that follows.
    shop, solve, fresh
        The rest as a shop, three times.
    left
        What each operation of `shop` is.
    pinned
        Operation of `shop` to where it runs. What runs and is no operation of `shop` is in `held`.
    held
        Running work that no plan row can tell of: it overruns into a break, goes on in its own round, or
        contradicts other work that the journal has running.
    from_fresh
        For each operation of `fresh`, which of `shop` it is.
    exact
        Whether `fresh` asks no more than `shop` does: an order on its way, or running, is released there by
        the longest way it may take, and that may be longer than the one it takes.
    remarks
        What was assumed.
    """

    begin: Begin
    look: Outlook
    shop: Shop
    solve: Shop
    fresh: Shop
    left: tuple[Left, ...]
    pinned: Mapping[int, Running]
    held: tuple[Running, ...]
    from_fresh: Ints
    exact: bool
    remarks: tuple[str, ...]

    @property
    def now_s(self) -> int:
        """The moment."""
        return self.look.now_s

    @property
    def begin_s(self) -> int:
        """When the rest begins."""
        return self.begin.at_s


def residual(now: Current, left: Sequence[Left], look: Outlook, begin: Begin) -> Residual:
    """Return what is left to plan; O(n log n) for n operations left.

    Parameters
    ----------
    now, left, look, begin
        The shift's work, what is left of it, what is known of the time that follows, and when the rest
        begins: each as the module of that name returns it.
    """
    build = _Builder(now, left, look, begin)
    shop, solve = build.shop(), build.solve()
    loose = np.array([k for k in range(len(solve)) if k not in build.fixed], np.int64)
    return Residual(
        begin=begin,
        look=look,
        shop=shop,
        solve=solve,
        fresh=build.fresh(solve, loose),
        left=tuple(left[place] for place in build.places),
        pinned=build.pinned,
        held=tuple(build.held),
        from_fresh=loose,
        exact=build.exact(),
        remarks=(*look.remarks, *begin.remarks, *build.remarks),
    )


class _Builder:
    """Puts the three shops together from what they share."""

    def __init__(self, now: Current, left: Sequence[Left], look: Outlook, begin: Begin) -> None:
        self.base, self.left, self.look, self.begin = now.shop, left, look, begin
        self.now_s, self.begin_s = look.now_s, begin.at_s
        self.columns = self.base.operations
        self.held = [
            one
            for one in look.running
            if begin.rounds is not None or kept_out(self.base, look, one) or self._at_odds(one)
        ]
        held = {one.place for one in self.held}
        self.places = [place for place in range(len(left)) if place not in held]
        runs = {one.place: one for one in look.running}
        self.pinned = {k: runs[place] for k, place in enumerate(self.places) if place in runs}
        # what a closure can stand for: running work on a machine of one unit
        self.fixed = {k for k, one in self.pinned.items() if self.base.machines[one.machine].count == 1}
        self.operation = np.array([left[place].operation for place in self.places], np.int64)
        self.used, self.job = np.unique(self.columns.job[self.operation], return_inverse=True)
        self.crews, said = heads_ahead(self.base, look, self.held, left)
        self.remarks = said

    def _at_odds(self, one: Running) -> bool:
        """Whether its order runs elsewhere too, or its unit runs something else: a journal may say so."""
        job = self.columns.job[self.left[one.place].operation]
        return any(
            other is not one
            and (
                self.columns.job[self.left[other.place].operation] == job
                or (other.machine, other.unit) == (one.machine, one.unit)
            )
            for other in self.look.running
        )

    # ---- the three shops ----------------------------------------------------------------------------

    def shop(self) -> Shop:
        """What a plan is written for, on the shift's clock."""
        in_rounds = self.begin.rounds is not None and self.begin_s > 0
        breaks = future(self.base.breaks, self.begin_s if in_rounds else self.now_s)
        if in_rounds:
            past = f"before {self.base.clock.say(self.begin_s)}"
            breaks = merged([Closure(0, self.begin_s, past), *breaks])
        seconds = [
            row_seconds(self.base, self.look, self.pinned[k])
            if k in self.pinned
            else self.left[place].seconds
            for k, place in enumerate(self.places)
        ]
        rows = [(one, int(self.columns.heads[self.operation[k]])) for k, one in self.pinned.items()]
        release, due = self.base.orders.release_s[self.used], self.base.orders.due_s[self.used]
        free = self._free()
        since = {int(self.job[k]): one.since_s for k, one in self.pinned.items()}
        if not in_rounds:
            release = np.array(
                [
                    since.get(order, max(int(first), self.now_s, free[order]))
                    for order, first in enumerate(release.tolist())
                ],
                np.int64,
            )
        release = np.where((due < release) & (release > 0), np.maximum(due, 0), release)
        return self._assembled(
            np.array(seconds, np.int64),
            {k: int(self.columns.setup_s[self.operation[k]]) for k in self.pinned},
            Orders(self._names(), release, due, self.base.orders.priority[self.used]),
            self._machines(self.now_s, 0, whole_rows=True),
            breaks=breaks,
            crews=tuple(
                crew_of(name, heads_in_rows(self.base, self.look, name, heads, rows))
                for name, heads in self.crews.items()
            ),
            clock=self.base.clock,
            end_s=self.base.shift_end_s,
            step=self._after_running(),
            notes=True,
        )

    def solve(self) -> Shop:
        """The same on a clock that starts at begin; what runs has its remaining time."""
        origin = self.begin_s
        start = self.base.clock.moment(origin) if self.base.clock.running else None
        running = {int(self.job[k]): one.resumes_s for k, one in self.pinned.items()}
        release = np.array(
            [
                max(0, running.get(order, max(int(first), free)) - origin)
                for order, (first, free) in enumerate(
                    zip(self.base.orders.release_s[self.used].tolist(), self._free(), strict=True)
                )
            ],
            np.int64,
        )
        end = self.base.shift_end_s
        return self._assembled(
            np.array([self.left[place].seconds for place in self.places], np.int64),
            {k: self.left[self.places[k]].setup_s for k in self.pinned},
            Orders(self._names(), release, self._due(release), self.base.orders.priority[self.used]),
            self._machines(origin, origin),
            breaks=moved(future(self.base.breaks, origin), origin),
            crews=tuple(crew_from(name, heads, origin) for name, heads in self.crews.items()),
            clock=Clock(start, self.base.clock.zone),
            end_s=None if end is None or end <= origin else end - origin,
        )

    def fresh(self, solve: Shop, loose: Ints) -> Shop:
        """`solve` without what runs on machines of one unit, which are closed for so long."""
        if not self.fixed:
            return solve
        machines = list(solve.machines)
        busy: dict[int, int] = {}
        held: dict[str, list[Held]] = {}
        for k in sorted(self.fixed):
            one = self.pinned[k]
            ends = one.ends_s - self.begin_s
            hall = machines[one.machine]
            running = Closure(0, ends, f"running {self.left[one.place].key.order}")
            machines[one.machine] = replace(hall, closed=merged([running, *hall.closed]))
            ways = (
                solve.transport.seconds(hall.id, machines[other].id)
                for other in solve.operations.machine[loose][self.job[loose] == self.job[k]].tolist()
            )
            busy[int(self.job[k])] = ends + max(ways, default=0)
            for name, spans in holdings(self.base, self.look, [one], self.left).items():
                held.setdefault(name, []).extend(spans)
        crews = tuple(
            crew_from(
                name,
                change(heads, held.get(name, ()), lambda level, taken: max(0, level - taken)),
                self.begin_s,
            )
            for name, heads in self.crews.items()
        )
        release = solve.orders.release_s.copy()
        for order, moment in busy.items():
            release[order] = max(int(release[order]), moment)
        orders = Orders(solve.orders.ids, release, self._due(release), solve.orders.priority)
        keep = np.zeros(len(solve), np.bool_)
        keep[loose] = True
        return replace(solve, machines=tuple(machines), crews=crews, orders=orders).keep(keep)

    def exact(self) -> bool:
        """Whether all ways that an order may take from where it is are equally long."""
        ways: dict[int, set[int]] = {}
        for one in self.look.running:
            here = self.base.machines[one.machine].id
            job = int(self.columns.job[self.left[one.place].operation])
            mine = [
                k for k in range(len(self.places)) if k not in self.pinned and self.used[self.job[k]] == job
            ]
            ways[one.place] = {
                self.base.transport.seconds(here, self.base.machines[other].id)
                for other in self.columns.machine[self.operation[mine]].tolist()
            }
        return self.look.even and all(len(each) < 2 for each in ways.values())

    # ---- parts --------------------------------------------------------------------------------------

    def _assembled(
        self,
        seconds: Ints,
        setup: Mapping[int, int],
        orders: Orders,
        machines: tuple[Machine, ...],
        *,
        breaks: tuple[Closure, ...],
        crews: tuple[Crew, ...],
        clock: Clock,
        end_s: int | None,
        step: Ints | None = None,
        notes: bool = False,
    ) -> Shop:
        columns, operation = self.columns, self.operation
        pinned = np.zeros(len(operation), np.bool_)
        pinned[list(self.pinned)] = True
        if step is None:
            step = np.where(pinned, NO_STEP, columns.step[operation])
        set_up = np.array([self.left[place].setup_s for place in self.places], np.int64)
        for k, length in setup.items():
            set_up[k] = length
        return replace(
            self.base,
            machines=machines,
            orders=orders,
            operations=Operations(
                self.job,
                columns.machine[operation],
                seconds,
                step,
                np.where(pinned, 0, columns.splittable[operation]),
                columns.heads[operation],
                columns.family[operation],
                np.minimum(set_up, seconds),
                columns.row[operation],
                self._notes() if notes else {},
            ),
            crews=crews,
            breaks=breaks,
            clock=clock,
            shift_end_s=end_s,
            unit_rounds=self.base.unit_rounds and self.begin.rounds is not None,
        )

    def _after_running(self) -> Ints:
        """Return steps in which what runs of an order comes first, so that bounds count from its end.

        An order without steps gets two of them; where some of its work has steps, the rest keeps none.
        """
        step = self.columns.step[self.operation].copy()
        for k in self.pinned:
            mine = (self.job == self.job[k]) & (np.arange(len(step)) != k)
            ranked = mine & (step != NO_STEP)
            step[ranked] += 1
            if not ranked.any():
                step[mine] = 1
            step[k] = 0
        return step

    def _names(self) -> tuple[str, ...]:
        return tuple(self.base.orders.ids[job] for job in self.used.tolist())

    def _notes(self) -> dict[int, str]:
        found = {}
        for k, place in enumerate(self.places):
            one = self.left[place]
            note = self.columns.notes.get(one.operation, "")
            said = "to be run again" if one.repeats else ""
            text = "; ".join(part for part in (note, said, one.why) if part)
            if text:
                found[k] = text
        return found

    def _free(self) -> list[int]:
        """Return when each order can go on: it has arrived, and what runs of it and is no row has ended."""
        free = [self.look.ready.get(job, 0) for job in self.used.tolist()]
        place = {job: order for order, job in enumerate(self.used.tolist())}
        for one in self.held:
            order = place.get(int(self.columns.job[self.left[one.place].operation]))
            if order is not None:
                here = self.base.machines[one.machine].id
                ways = (
                    self.base.transport.seconds(here, self.base.machines[other].id)
                    for other in self.columns.machine[self.operation][self.job == order].tolist()
                )
                free[order] = max(free[order], one.ends_s + max(ways, default=0))
        return free

    def _due(self, release: Ints) -> Ints:
        """Return due times from begin on; one that no order can meet any more is its release.

        That adds a constant to an order's lateness, so that no comparison of plans changes.
        """
        due = self.base.orders.due_s[self.used]
        moved = np.where(due == NO_DUE, NO_DUE, due - self.begin_s)
        return np.where((moved < release) & (release > 0), release, moved)

    def _machines(self, from_s: int, origin: int, *, whole_rows: bool = False) -> tuple[Machine, ...]:
        return tuple(
            machines_ahead(
                self.base,
                self.look,
                self.left,
                self.pinned.values(),
                self.held,
                from_s=from_s,
                origin=origin,
                whole_rows=whole_rows,
            )
        )
