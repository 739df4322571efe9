"""Derives every stated lower bound again from its witness, by arithmetic on the shop alone.

To add a kind: one function here, one line in ``KINDS``. A kind that arithmetic cannot check, such as what a
solver proved, has a line in ``CLAIMS`` instead: it is accepted as a claim, and the audit says so.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from shopfloor.audit.columns import run_starts, run_sums
from shopfloor.audit.shut import Shut
from shopfloor.audit.words import moment
from shopfloor.model.calendar import duration
from shopfloor.model.results import Bound, Violation
from shopfloor.model.shop import NO_STEP, Bools, Crew, Ints, Shop
from shopfloor.model.stated import StatedPlan


@dataclass(frozen=True, slots=True)
class Verdict:
    """What became of one stated bound.

    Attributes
    ----------
    value_s
        Derived from the witness; None where nothing could be derived.
    wrong
        The rule broken and why, or None.
    note
        What was accepted without proof, or empty.
    """

    bound: Bound
    value_s: int | None = None
    wrong: tuple[str, str] | None = None
    note: str = ""

    @property
    def holds(self) -> bool:
        """Whether a plan may lean on the bound."""
        return self.wrong is None


class _NoProofError(Exception):
    """The witness proves nothing; the message is the end of a sentence that begins with its name."""


class _Work:
    """The work of a shop, by order and by machine, with heads and tails; sums made when first needed."""

    def __init__(self, shop: Shop) -> None:
        self.shop = shop
        self.job, self.machine = shop.operations.job, shop.operations.machine
        self.seconds, self.step = shop.operations.seconds, shop.operations.step
        self.breaks = Shut(shop.breaks)

    def order(self, name: str) -> int:
        return _find(self._orders, name, "order")

    def machine_of(self, name: str) -> int:
        return _find(self._machines, name, "machine")

    def of_order(self, job: int) -> Ints:
        """Operations of one order."""
        return _slice(self._by_job, self.job, job)

    def on_machine(self, machine: int) -> Ints:
        """Operations on one machine."""
        return _slice(self._by_machine, self.machine, machine)

    def attended(self, name: str, begin: int) -> tuple[Crew, Ints]:
        """The crew of a name, and the operations it attends that cannot start before `begin`."""
        for crew in self.shop.crews:
            if crew.id == name:
                if crew.levels or crew.heads < 1:
                    raise _NoProofError(f"counts on the heads of crew {name}, which are not always there")
                theirs = np.array([machine.crew == name for machine in self.shop.machines], bool)
                return crew, self.from_on(np.flatnonzero(theirs[self.machine]), begin)
        raise _NoProofError(f"names crew {name!r}, which the shop does not have")

    def only_set_up(self, operations: Ints) -> Bools:
        """Whether each operation is attended only during its set-up."""
        only: Bools = np.array([machine.set_up_only for machine in self.shop.machines], bool)
        return only[self.machine[operations]]

    def from_on(self, operations: Ints, begin: int) -> Ints:
        """Those of the operations that their orders keep from starting before `begin`; at least one."""
        late = operations[self.heads_and_tails[0][operations] >= begin]
        if not len(late):
            raise _NoProofError(f"counts no operation: none must wait until {begin} s")
        return late

    def demand_rounds(self, operations: Ints, length: int, name: str) -> None:
        """Refuse operations that are not all of one length and whole, or none at all."""
        if not len(operations):
            raise _NoProofError(f"counts the visits of {name}, which has none")
        other = operations[self.seconds[operations] != length]
        if len(other):
            seconds = duration(int(self.seconds[other[0]]))
            raise _NoProofError(f"counts rounds of {duration(length)}, but {name} has a visit of {seconds}")
        if self.shop.operations.splittable[operations].any():
            raise _NoProofError(f"counts whole rounds, but visits of {name} may be split")

    @cached_property
    def heads_and_tails(self) -> tuple[Ints, Ints]:
        """Earliest start of each operation that its order allows, and the order's work after its end."""
        head = self.shop.orders.release_s[self.job].astype(np.int64)
        tail = np.zeros(len(self.job), np.int64)
        ranked = np.flatnonzero(self.step != NO_STEP)
        order = ranked[np.lexsort((self.step[ranked], self.job[ranked]))]
        if not len(order):
            return head, tail
        level = run_starts(self.job[order], self.step[order])  # a level: one step of one order
        work = run_sums(level, self.seconds[order])
        job = self.job[order][level]
        done = np.cumsum(work)
        orders = run_starts(job)
        before_order = (done - work)[orders][np.cumsum(orders) - 1]
        order_work = run_sums(orders, work)[np.cumsum(orders) - 1]
        lower = done - work - before_order
        place = np.cumsum(level) - 1
        head[order] += lower[place]
        tail[order] = (order_work - lower - work)[place]
        return head, tail

    @cached_property
    def _orders(self) -> dict[str, int]:
        return {name: index for index, name in enumerate(self.shop.orders.ids)}

    @cached_property
    def _machines(self) -> dict[str, int]:
        return {machine.id: index for index, machine in enumerate(self.shop.machines)}

    @cached_property
    def _by_job(self) -> Ints:
        return np.argsort(self.job, kind="stable")

    @cached_property
    def _by_machine(self) -> Ints:
        return np.argsort(self.machine, kind="stable")


def _find(index: Mapping[str, int], name: str, what: str) -> int:
    if name not in index:
        raise _NoProofError(f"names {what} {name!r}, which the shop does not have")
    return index[name]


def _slice(sorter: Ints, column: Ints, value: int) -> Ints:
    left = np.searchsorted(column, value, "left", sorter=sorter)
    return sorter[left : np.searchsorted(column, value, "right", sorter=sorter)]


# ---- one function a kind --------------------------------------------------------------------------


def _order(work: _Work, witness: Mapping[str, Any]) -> int:
    """An order is in one place at a time: its release, then all its work."""
    job = work.order(_name(witness, "order"))
    load = int(work.seconds[work.of_order(job)].sum())
    return work.breaks.finish(int(work.shop.orders.release_s[job]), load)


def _machine(work: _Work, witness: Mapping[str, Any]) -> int:
    """What cannot reach a machine before `from_s` takes its load over the units, and leaves a tail."""
    machine = work.machine_of(_name(witness, "machine"))
    begin = _whole(witness, "from_s")
    operations = work.from_on(work.on_machine(machine), begin)
    load = int(work.seconds[operations].sum())
    least = int(work.heads_and_tails[1][operations].min())
    _agree(witness, "load_s", load, "the load is")
    _agree(witness, "tail_s", least, "the least work afterwards is")
    return work.breaks.finish(begin, _up(load, work.shop.machines[machine].count) + least)


def _rounds(work: _Work, witness: Mapping[str, Any]) -> int:
    """With d equal, whole operations on k units, one unit runs at least ⌈d/k⌉, none across a break."""
    node, name, length = _name(witness, "node"), _name(witness, "id"), _whole(witness, "round_s")
    if node == "order":
        operations, count = work.of_order(work.order(name)), 1
    elif node == "machine":
        machine = work.machine_of(name)
        operations, count = work.on_machine(machine), work.shop.machines[machine].count
    else:
        raise _NoProofError(f"has the node {node!r}, which is neither order nor machine")
    work.demand_rounds(operations, length, name)
    _agree(witness, "operations", len(operations), f"the visits of {name} are")
    rounds = _up(len(operations), count)
    if any(work.shop.machines[machine].pauses for machine in set(work.machine[operations].tolist())):
        return work.breaks.finish(0, rounds * length)
    return work.breaks.finish_pieces(0, length, rounds)


def _longest(work: _Work, witness: Mapping[str, Any]) -> int:
    """No plan ends before its longest operation, begun as soon as its order is released."""
    job, machine = work.order(_name(witness, "order")), work.machine_of(_name(witness, "machine"))
    operations = work.of_order(job)
    operations = operations[work.machine[operations] == machine]
    if not len(operations):
        raise _NoProofError(f"names a visit that order {witness['order']} does not make")
    return work.breaks.finish(int(work.shop.orders.release_s[job]), int(work.seconds[operations].max()))


def _crew(work: _Work, witness: Mapping[str, Any]) -> int:
    """What a crew cannot attend before `from_s` takes its head-seconds over the crew's heads."""
    begin = _whole(witness, "from_s")
    crew, operations = work.attended(_name(witness, "crew"), begin)
    seconds = np.where(
        work.only_set_up(operations), work.shop.operations.setup_s[operations], work.seconds[operations]
    )
    load = int((seconds * work.shop.operations.heads[operations]).sum())
    _agree(witness, "head_seconds", load, "the crew's work is")
    return work.breaks.finish(begin, _up(load, crew.heads))


def _crew_rounds(work: _Work, witness: Mapping[str, Any]) -> int:
    """With c heads for equal, whole operations of h heads each, ⌊c/h⌋ run at once.

    They can then be dealt to ⌊c/h⌋ imagined units without two at once on any (intervals of which at most
    k overlap can be coloured with k colours), and one of these runs its share of them.
    """
    begin, length = _whole(witness, "from_s"), _whole(witness, "round_s")
    crew, operations = work.attended(_name(witness, "crew"), begin)
    work.demand_rounds(operations, length, f"crew {crew.id}")
    if work.only_set_up(operations).any():
        raise _NoProofError("counts whole rounds, but some are attended only while they are set up")
    heads = sorted(set(work.shop.operations.heads[operations].tolist()))
    if len(heads) > 1 or heads[0] < 1:
        raise _NoProofError(f"counts rounds, but its operations take {heads[0]} to {heads[-1]} heads")
    at_once = max(1, crew.heads // heads[0])
    _agree(witness, "at_once", at_once, "the operations at once are")
    _agree(witness, "operations", len(operations), f"the operations of crew {crew.id} are")
    return work.breaks.finish(begin, _up(len(operations), at_once) * length)


KINDS: dict[str, Callable[[_Work, Mapping[str, Any]], int]] = {
    "order": _order,
    "machine": _machine,
    "rounds": _rounds,
    "longest": _longest,
    "crew": _crew,
    "crew rounds": _crew_rounds,
}

CLAIMS: dict[str, str] = {
    "solver": "was proved by a solver's search and cannot be derived again by arithmetic",
}


def _up(load: int, count: int) -> int:
    return -(-load // count)


# ---- reading a witness ----------------------------------------------------------------------------


def _name(witness: Mapping[str, Any], key: str) -> str:
    value = _entry(witness, key)
    if not isinstance(value, str):
        raise _NoProofError(f"has {key} {value!r}, which is no name")
    return value


def _whole(witness: Mapping[str, Any], key: str) -> int:
    value = _entry(witness, key)
    if isinstance(value, bool) or not isinstance(value, int) or value < 0:
        raise _NoProofError(f"has {key} {value!r}, which is no whole number from 0")
    return value


def _entry(witness: Mapping[str, Any], key: str) -> Any:
    if key not in witness:
        raise _NoProofError(f"lacks {key}")
    return witness[key]


def _agree(witness: Mapping[str, Any], key: str, value: int, what: str) -> None:
    stated = _whole(witness, key)
    if stated != value:
        raise _NoProofError(f"states {key} {stated}, but {what} {value}")


# ---- verdicts --------------------------------------------------------------------------------------


def rederive(shop: Shop, bound: Bound) -> int | str:
    """Return the value that the witness of `bound` proves, in seconds, or a sentence on why it proves none.

    `bound.value_s` is not looked at. O(m log m) for m operations.
    """
    return _rederive(_Work(shop), bound)


def _rederive(work: _Work, bound: Bound) -> int | str:
    if bound.kind in CLAIMS:
        return f"The {bound.kind} bound {CLAIMS[bound.kind]}."
    if bound.kind not in KINDS:
        return f"A bound of the kind {bound.kind!r} is unknown, so nothing can be derived from it."
    try:
        return KINDS[bound.kind](work, bound.witness)
    except _NoProofError as reason:
        return f"The witness of the {bound.kind} bound {reason}."


def judge(shop: Shop, bounds: Sequence[Bound]) -> list[Verdict]:
    """Return what becomes of each bound when derived again; O((m + b) log m) plus the witnesses' work."""
    work = _Work(shop)
    return [_verdict(work, bound) for bound in bounds]


def _verdict(work: _Work, bound: Bound) -> Verdict:
    value = _rederive(work, bound)
    if bound.kind in CLAIMS:
        stated = moment(work.shop.clock, bound.value_s)
        note = f"That nothing can end before {stated} {CLAIMS[bound.kind]}; it is accepted as a claim."
        return Verdict(bound, note=note)
    if isinstance(value, str):
        return Verdict(bound, wrong=("bound-witness" if bound.kind in KINDS else "bound-unknown", value))
    if value != bound.value_s:
        clock = work.shop.clock
        sentence = (
            f"The {bound.kind} bound states {moment(clock, bound.value_s)}, but its witness proves "
            f"{moment(clock, value)} ({bound.value_s} s against {value} s)."
        )
        return Verdict(bound, value, ("bound-value", sentence))
    return Verdict(bound, value)


def audit_bounds(shop: Shop, stated: StatedPlan) -> tuple[list[Violation], list[str]]:
    """Derive every bound that a plan states again.

    Returns
    -------
    violations, notes
        A violation for each bound that its witness does not prove; a sentence for each that was accepted
        as a claim, because arithmetic cannot check it.
    """
    verdicts = judge(shop, stated.bounds)
    return (
        [Violation(*verdict.wrong) for verdict in verdicts if verdict.wrong],
        [verdict.note for verdict in verdicts if verdict.note],
    )
