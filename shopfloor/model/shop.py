"""The shop: machines, orders and operations, frozen and checked when built.

A shop is made of what `hall` and `columns` define; import their names from here.
All times are whole seconds since the start of the shift.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from functools import cached_property
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from shopfloor.errors import ShopError
from shopfloor.model.calendar import Clock, WorkClock, united
from shopfloor.model.calendar import Ints as Ints
from shopfloor.model.columns import LEFT_OUT as LEFT_OUT
from shopfloor.model.columns import NO_DUE as NO_DUE
from shopfloor.model.columns import NO_FAMILY as NO_FAMILY
from shopfloor.model.columns import NO_STEP as NO_STEP
from shopfloor.model.columns import Bools as Bools
from shopfloor.model.columns import Floats as Floats
from shopfloor.model.columns import Job as Job
from shopfloor.model.columns import Operation as Operation
from shopfloor.model.columns import Operations as Operations
from shopfloor.model.columns import Orders as Orders
from shopfloor.model.hall import Changeovers as Changeovers
from shopfloor.model.hall import Closure as Closure
from shopfloor.model.hall import Crew as Crew
from shopfloor.model.hall import Machine as Machine
from shopfloor.model.hall import Transport as Transport

if TYPE_CHECKING:
    import networkx as nx
    import pandas as pd


@dataclass(frozen=True, eq=False)
class Shop:
    """Everything a plan is made from.

    Parameters
    ----------
    machines
        In the order in which pages and lists show them.
    orders, operations
        As columns.
    crews
        The pools that machines name.
    breaks
        When the whole hall pauses, in order of time and apart from each other.
    families
        Names of the setup families that operations point at.
    changeovers
        By machine id.
    transport
        Time an order needs between machines.
    clock
        Wall time of second zero, if known.
    shift_end_s
        End of the shift, or None when it is not known.
    unit_rounds
        True when the file gave no times, so that every operation is one round by declaration.

    Raises
    ------
    ShopError
        If an index points nowhere, a time is not positive, an order's due precedes its release, two
        orders or machines share an id, or the shift ends before it starts.
    """

    machines: tuple[Machine, ...]
    orders: Orders
    operations: Operations
    crews: tuple[Crew, ...] = ()
    breaks: tuple[Closure, ...] = ()
    families: tuple[str, ...] = ()
    changeovers: Mapping[str, Changeovers] = field(default_factory=dict)
    transport: Transport = field(default_factory=Transport)
    clock: Clock = field(default_factory=Clock)
    shift_end_s: int | None = None
    unit_rounds: bool = False

    def __post_init__(self) -> None:
        self._check_indices()
        operations, orders = self.operations, self.orders
        if len(operations) and int(operations.seconds.min()) < 1:
            index = int(operations.seconds.argmin())
            raise ShopError(f"operation {index}: time must be positive, not {operations.seconds[index]} s")
        # an order there from the start may have been due before it: late already, and legal
        early = (orders.due_s < orders.release_s) & (orders.release_s > 0)
        if bool(early.any()):
            index = int(early.argmax())
            raise ShopError(f"order {orders.ids[index]}: due before its release")
        if len(orders) and (int(orders.release_s.min()) < 0 or float(orders.priority.min()) <= 0):
            raise ShopError("releases must not be negative and priorities must be positive")
        if self.shift_end_s is not None and self.shift_end_s <= 0:
            raise ShopError("the shift ends before it starts")
        for what, closures in (
            ("breaks", self.breaks),
            *((f"closures of {m.id}", m.closed) for m in self.machines),
        ):
            if any(b.start_s < a.end_s for a, b in pairwise(closures)):
                raise ShopError(f"{what} must be in order of time and must not overlap")
        if len(operations) and bool(
            ((operations.setup_s < 0) | (operations.setup_s > operations.seconds)).any()
        ):
            raise ShopError("a set-up is part of its operation's time, and not negative")
        if len(operations) and int(operations.family.max()) >= len(self.families):
            raise ShopError("an operation names a family that is not in the shop")
        unknown = self.changeovers.keys() - {machine.id for machine in self.machines}
        if unknown:
            raise ShopError(f"changeovers name machine {min(unknown)}, which is not in the shop")
        for machine in self.machines:
            if machine.crew is not None and machine.crew not in {crew.id for crew in self.crews}:
                raise ShopError(f"machine {machine.id} names crew {machine.crew}, which is not in the shop")

    def _check_indices(self) -> None:
        for what, ids in (
            ("machine", [m.id for m in self.machines]),
            ("order", self.orders.ids),
            ("crew", [crew.id for crew in self.crews]),
        ):
            if len(set(ids)) != len(ids):
                raise ShopError(f"two {what}s share one id")
        for what, column, size in (
            ("order", self.operations.job, len(self.orders)),
            ("machine", self.operations.machine, len(self.machines)),
        ):
            if len(column) and (int(column.min()) < 0 or int(column.max()) >= size):
                raise ShopError(f"an operation names {what} {int(column.max())} of {size}")

    def __len__(self) -> int:
        """Return the number of operations."""
        return len(self.operations)

    # ---- rows as views -------------------------------------------------------------------------

    def operation(self, index: int) -> Operation:
        """Return a view of operation `index`."""
        columns = self.operations
        job, machine, step = int(columns.job[index]), int(columns.machine[index]), int(columns.step[index])
        return Operation(
            index=index,
            job=job,
            machine=machine,
            order=self.orders.ids[job],
            machine_id=self.machines[machine].id,
            seconds=int(columns.seconds[index]),
            step=None if step == NO_STEP else step,
            splittable=bool(columns.splittable[index]),
            heads=int(columns.heads[index]),
            family="" if columns.family[index] == NO_FAMILY else self.families[int(columns.family[index])],
            setup_s=int(columns.setup_s[index]),
            note=columns.notes.get(index, ""),
            row=int(columns.row[index]),
        )

    def __iter__(self) -> Iterator[Operation]:
        return (self.operation(index) for index in range(len(self)))

    def keep(self, chosen: Bools) -> Shop:
        """Return the shop of only the operations where `chosen` is true, and of the orders that have any."""
        columns, orders = self.operations, self.orders
        picked = np.flatnonzero(chosen)
        used, job = np.unique(columns.job[picked], return_inverse=True)
        place = {old: new for new, old in enumerate(picked.tolist())}
        return replace(
            self,
            orders=Orders(
                tuple(orders.ids[index] for index in used.tolist()),
                orders.release_s[used],
                orders.due_s[used],
                orders.priority[used],
            ),
            operations=Operations(
                job,
                columns.machine[picked],
                columns.seconds[picked],
                columns.step[picked],
                columns.splittable[picked],
                columns.heads[picked],
                columns.family[picked],
                columns.setup_s[picked],
                columns.row[picked],
                {place[old]: note for old, note in columns.notes.items() if old in place},
            ),
        )

    def with_crew(self, heads: int) -> Shop:
        """Return the shop with one crew of so many heads for every machine that has none of its own."""
        crew = Crew("crew", heads)
        machines = tuple(m if m.crew is not None else replace(m, crew=crew.id) for m in self.machines)
        return replace(self, machines=machines, crews=(*self.crews, crew))

    def with_splits(self) -> Shop:
        """Return the shop with every operation splittable."""
        columns = self.operations
        return replace(self, operations=replace(columns, splittable=np.ones(len(columns), np.int64)))

    # ---- sums that many parts need ------------------------------------------------------------

    @cached_property
    def job_load_s(self) -> Ints:
        """Total run time of each order."""
        return self._sum(self.operations.job, len(self.orders))

    @cached_property
    def machine_load_s(self) -> Ints:
        """Total run time of each machine or group, over all its units."""
        return self._sum(self.operations.machine, len(self.machines))

    def _sum(self, column: Ints, size: int) -> Ints:
        # bincount adds in floating point: exact below 2**53 seconds, some 285 million years
        return np.bincount(column, weights=self.operations.seconds, minlength=size).astype(np.int64)

    @cached_property
    def head_s(self) -> Ints:
        """Earliest start of each operation that its order alone allows: release and lower steps."""
        return self.orders.release_s[self.operations.job] + self._stepped[0]

    @cached_property
    def tail_s(self) -> Ints:
        """Least time of each operation's order after the operation's end: its higher steps."""
        return self._stepped[1]

    @cached_property
    def _stepped(self) -> tuple[Ints, Ints]:
        """Work of lower and of higher steps in the same order, an entry an operation."""
        operations = self.operations
        before, after = np.zeros(len(operations), np.int64), np.zeros(len(operations), np.int64)
        ranked = np.flatnonzero(operations.step != NO_STEP)
        if not len(ranked):
            return before, after
        order = ranked[np.lexsort((operations.step[ranked], operations.job[ranked]))]
        job, step, seconds = operations.job[order], operations.step[order], operations.seconds[order]
        new_job = np.r_[True, job[1:] != job[:-1]]
        new_step = new_job | np.r_[True, step[1:] != step[:-1]]
        total = np.r_[0, np.cumsum(seconds)]
        job_first, step_first = np.flatnonzero(new_job), np.flatnonzero(new_step)
        job_of, step_of = np.cumsum(new_job) - 1, np.cumsum(new_step) - 1
        job_end, step_end = np.r_[job_first[1:], len(order)], np.r_[step_first[1:], len(order)]
        before[order] = total[step_first[step_of]] - total[job_first[job_of]]
        after[order] = total[job_end[job_of]] - total[step_end[step_of]]
        return before, after

    @cached_property
    def work_clock(self) -> WorkClock:
        """The hall's clock with its breaks squeezed out."""
        return WorkClock((pause.start_s, pause.end_s) for pause in self.breaks)

    @cached_property
    def machine_clocks(self) -> tuple[WorkClock, ...]:
        """The clock of each machine with the hall's breaks and its own closures squeezed out."""
        return tuple(
            WorkClock(united((c.start_s, c.end_s) for c in (*self.breaks, *machine.closed)))
            if machine.closed
            else self.work_clock
            for machine in self.machines
        )

    @cached_property
    def has_steps(self) -> bool:
        """Whether any order fixes part of its route."""
        return bool(self.head_s.any() and self._stepped[0].any())

    @cached_property
    def has_splits(self) -> bool:
        """Whether any operation may be cut into parts."""
        return bool(self.operations.splittable.any())

    @cached_property
    def has_due(self) -> bool:
        """Whether any order has a due time."""
        return bool(len(self.orders)) and bool((self.orders.due_s != NO_DUE).any())

    # ---- to and from frames and graphs -------------------------------------------------------

    @classmethod
    def from_frame(
        cls, frame: pd.DataFrame, *, clock: Clock | None = None, shift_end_s: int | None = None
    ) -> Shop:
        """Build a shop from a clean table, one row an operation; the inverse of :meth:`to_frame`.

        Parameters
        ----------
        frame
            `order` and `machine`; `seconds` (whole) or `minutes`; optionally `release_s`, `due_s`,
            `priority`, `step`, `note`. A messy table belongs to `read_orders`, which lists every fault.
        clock, shift_end_s
            As in :class:`Shop`.

        Raises
        ------
        ShopError
            If a column is missing, a cell is not a number, a time is no whole number of seconds, or an
            order's rows disagree about its release, due or priority.
        """
        from shopfloor.model.frame import shop_from_frame  # pandas is heavy: only when asked for

        return shop_from_frame(frame, clock=clock or Clock(), shift_end_s=shift_end_s)

    def to_frame(self) -> pd.DataFrame:
        """Return the operations as a pandas table, one row an operation."""
        from shopfloor.model.frame import frame_from_shop

        return frame_from_shop(self)

    def to_networkx(self) -> nx.MultiGraph:
        """Return the bipartite multigraph of orders and machines; one edge an operation.

        Nodes are ``("order", id)`` and ``("machine", id)`` with the attribute `bipartite`; edges carry
        `operation` and `seconds`. A proper edge colouring of it is a schedule in unit rounds.
        """
        import networkx as nx

        graph = nx.MultiGraph()
        graph.add_nodes_from((("order", name) for name in self.orders.ids), bipartite=0)
        graph.add_nodes_from((("machine", machine.id) for machine in self.machines), bipartite=1)
        for row in self:
            graph.add_edge(
                ("order", row.order),
                ("machine", row.machine_id),
                key=row.index,
                operation=row.index,
                seconds=row.seconds,
            )
        return graph


def shop_of(matrix: Sequence[Sequence[int]]) -> Shop:
    """Return the shop of a table of whole seconds, orders by machines; zero means no visit.

    Meant for published instances and tests: orders are `J1, J2, …`, machines `M1, M2, …`.
    """
    times = np.asarray(matrix, dtype=np.int64)
    job, machine = np.nonzero(times)
    return Shop(
        machines=tuple(Machine(f"M{k + 1}") for k in range(times.shape[1])),
        orders=Orders(tuple(f"J{k + 1}" for k in range(times.shape[0]))),
        operations=Operations(job, machine, times[job, machine]),
    )
