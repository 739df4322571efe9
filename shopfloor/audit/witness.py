"""Derives every stated lower bound again from its witness, by arithmetic on the shop alone.

To add a kind: one function here, one line in ``KINDS``. A kind that arithmetic cannot check, such as what a
solver proved, has a line in ``CLAIMS`` instead: it is accepted as a claim, and the audit says so.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from shopfloor.audit.arrivals import earliest_done
from shopfloor.audit.figures import Figures, NoProofError, per_unit
from shopfloor.audit.words import moment
from shopfloor.model.results import Bound, Violation
from shopfloor.model.shop import Shop
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


# ---- one function a kind --------------------------------------------------------------------------


def _order(figures: Figures, witness: Mapping[str, Any]) -> int:
    """An order is in one place at a time: its release, then all its figures."""
    job = figures.order(_name(witness, "order"))
    load = int(figures.seconds[figures.of_order(job)].sum())
    return figures.breaks.finish(int(figures.shop.orders.release_s[job]), load)


def _machine(figures: Figures, witness: Mapping[str, Any]) -> int:
    """What cannot reach a machine before `from_s` takes its load over the units, and leaves a tail.

    The changeovers that its families force come on top of the load.
    """
    machine, begin = figures.machine_of(_name(witness, "machine")), _whole(witness, "from_s")
    operations = figures.from_on(figures.on_machine(machine), begin)
    load = int(figures.seconds[operations].sum())
    least = int(figures.heads_and_tails[1][operations].min())
    _agree(witness, "load_s", load, "the load is")
    _agree(witness, "tail_s", least, "the least work afterwards is")
    change = _whole(witness, "changeover_s") if "changeover_s" in witness else 0
    forced = figures.forced_changeover(machine, operations, begin) if change else 0
    if change > forced:
        raise NoProofError(f"states changeover_s {change}, but the families force {forced}")
    return figures.after(machine, begin, load + change, least)


def _window(figures: Figures, witness: Mapping[str, Any]) -> int:
    """What cannot reach a machine before `from_s` and leaves at least `tail_s` to do must lie between."""
    machine, begin = figures.machine_of(_name(witness, "machine")), _whole(witness, "from_s")
    tail = _whole(witness, "tail_s")
    operations = figures.from_on(figures.on_machine(machine), begin)
    operations = operations[figures.heads_and_tails[1][operations] >= tail]
    if not len(operations):
        raise NoProofError(f"counts no operation: none leaves {tail} s to do")
    load = int(figures.seconds[operations].sum())
    _agree(witness, "load_s", load, "the load is")
    return figures.after(machine, begin, load, tail)


def _runs(figures: Figures, witness: Mapping[str, Any]) -> int:
    """One unit does all of its work as it arrives, and changes over between families as it must.

    Work counts as there from the last multiple of `grid_s` on, in the machine's open time.
    """
    machine, grid_s = figures.machine_of(_name(witness, "machine")), _whole(witness, "grid_s")
    hall, operations = figures.shop.machines[machine], figures.on_machine(machine)
    rule = figures.shop.changeovers.get(hall.id)
    if rule is None or hall.count > 1 or not grid_s:
        raise NoProofError(f"counts on {hall.id} changing over as one unit, on a grid of a second or more")
    _agree(witness, "load_s", int(figures.seconds[operations].sum()), "the load is")
    done = earliest_done(figures.arrivals(machine, grid_s), rule, hall.family)
    if done is None:
        raise NoProofError("needs more steps than are taken")
    return figures.after(machine, 0, done, 0)


def _rounds(figures: Figures, witness: Mapping[str, Any]) -> int:
    """With d equal, whole operations on k units, one unit runs at least ⌈d/k⌉, none across a break."""
    node, name, length = _name(witness, "node"), _name(witness, "id"), _whole(witness, "round_s")
    if node == "order":
        operations, count = figures.of_order(figures.order(name)), 1
    elif node == "machine":
        machine = figures.machine_of(name)
        operations, count = figures.on_machine(machine), figures.shop.machines[machine].count
    else:
        raise NoProofError(f"has the node {node!r}, which is neither order nor machine")
    figures.demand_rounds(operations, length, name)
    _agree(witness, "operations", len(operations), f"the visits of {name} are")
    rounds = per_unit(len(operations), count)
    if any(figures.shop.machines[machine].pauses for machine in set(figures.machine[operations].tolist())):
        return figures.breaks.finish(0, rounds * length)
    return figures.breaks.finish_pieces(0, length, rounds)


def _longest(figures: Figures, witness: Mapping[str, Any]) -> int:
    """No plan ends before its longest operation, begun as soon as its order is released."""
    job, machine = figures.order(_name(witness, "order")), figures.machine_of(_name(witness, "machine"))
    operations = figures.of_order(job)
    operations = operations[figures.machine[operations] == machine]
    if not len(operations):
        raise NoProofError(f"names a visit that order {witness['order']} does not make")
    return figures.breaks.finish(
        int(figures.shop.orders.release_s[job]), int(figures.seconds[operations].max())
    )


def _crew(figures: Figures, witness: Mapping[str, Any]) -> int:
    """What a crew cannot attend before `from_s` takes its head-seconds over the heads that are there.

    Each of these leaves at least `tail_s` to do: its run, where only the set-up is attended, and what its
    order has to do after it.
    """
    begin = _whole(witness, "from_s")
    tail = _whole(witness, "tail_s") if "tail_s" in witness else 0
    crew, operations = figures.attended(_name(witness, "crew"), begin)
    setup, whole = figures.shop.operations.setup_s[operations], figures.seconds[operations]
    seconds = np.where(figures.only_set_up(operations), setup, whole)
    leaving = figures.heads_and_tails[1][operations] + whole - seconds >= tail
    if not leaving.any():
        raise NoProofError(f"counts no operation: none leaves {tail} s to do")
    load = int((seconds * figures.shop.operations.heads[operations])[leaving].sum())
    _agree(witness, "head_seconds", load, "the crew's work is")
    return figures.breaks.finish(figures.attended_until(crew, begin, load), tail)


def _crew_rounds(figures: Figures, witness: Mapping[str, Any]) -> int:
    """With c heads for equal, whole operations of h heads each, ⌊c/h⌋ run at once.

    They can then be dealt to ⌊c/h⌋ imagined units without two at once on any (intervals of which at most
    k overlap can be coloured with k colours), and one of these runs its share of them.
    """
    begin, length = _whole(witness, "from_s"), _whole(witness, "round_s")
    crew, operations = figures.attended(_name(witness, "crew"), begin)
    if crew.levels:
        raise NoProofError(f"counts on the heads of crew {crew.id}, which are not always there")
    figures.demand_rounds(operations, length, f"crew {crew.id}")
    if figures.only_set_up(operations).any():
        raise NoProofError("counts whole rounds, but some are attended only while they are set up")
    heads = sorted(set(figures.shop.operations.heads[operations].tolist()))
    if len(heads) > 1 or heads[0] < 1:
        raise NoProofError(f"counts rounds, but its operations take {heads[0]} to {heads[-1]} heads")
    at_once = max(1, crew.heads // heads[0])
    _agree(witness, "at_once", at_once, "the operations at once are")
    _agree(witness, "operations", len(operations), f"the operations of crew {crew.id} are")
    return figures.breaks.finish(begin, per_unit(len(operations), at_once) * length)


KINDS: dict[str, Callable[[Figures, Mapping[str, Any]], int]] = {
    "order": _order,
    "machine": _machine,
    "window": _window,
    "runs": _runs,
    "rounds": _rounds,
    "longest": _longest,
    "crew": _crew,
    "crew rounds": _crew_rounds,
}

CLAIMS: dict[str, str] = {
    "solver": "was proved by a solver's search and cannot be derived again by arithmetic",
}


# ---- reading a witness ----------------------------------------------------------------------------


def _name(witness: Mapping[str, Any], key: str) -> str:
    value = _entry(witness, key)
    if not isinstance(value, str):
        raise NoProofError(f"has {key} {value!r}, which is no name")
    return value


def _whole(witness: Mapping[str, Any], key: str) -> int:
    value = _entry(witness, key)
    if isinstance(value, bool) or not isinstance(value, int) or value < 0:
        raise NoProofError(f"has {key} {value!r}, which is no whole number from 0")
    return value


def _entry(witness: Mapping[str, Any], key: str) -> Any:
    if key not in witness:
        raise NoProofError(f"lacks {key}")
    return witness[key]


def _agree(witness: Mapping[str, Any], key: str, value: int, what: str) -> None:
    stated = _whole(witness, key)
    if stated != value:
        raise NoProofError(f"states {key} {stated}, but {what} {value}")


# ---- verdicts --------------------------------------------------------------------------------------


def rederive(shop: Shop, bound: Bound) -> int | str:
    """Return the value that the witness of `bound` proves, in seconds, or a sentence on why it proves none.

    `bound.value_s` is not looked at. O(m log m) for m operations.
    """
    return _rederive(Figures(shop), bound)


def _rederive(figures: Figures, bound: Bound) -> int | str:
    if bound.kind in CLAIMS:
        return f"The {bound.kind} bound {CLAIMS[bound.kind]}."
    if bound.kind not in KINDS:
        return f"A bound of the kind {bound.kind!r} is unknown, so nothing can be derived from it."
    try:
        return KINDS[bound.kind](figures, bound.witness)
    except NoProofError as reason:
        return f"The witness of the {bound.kind} bound {reason}."


def judge(shop: Shop, bounds: Sequence[Bound]) -> list[Verdict]:
    """Return what becomes of each bound when derived again; O((m + b) log m) plus the witnesses' figures."""
    figures = Figures(shop)
    return [_verdict(figures, bound) for bound in bounds]


def _verdict(figures: Figures, bound: Bound) -> Verdict:
    value = _rederive(figures, bound)
    if bound.kind in CLAIMS:
        stated = moment(figures.shop.clock, bound.value_s)
        note = f"That nothing can end before {stated} {CLAIMS[bound.kind]}; it is accepted as a claim."
        return Verdict(bound, note=note)
    if isinstance(value, str):
        return Verdict(bound, wrong=("bound-witness" if bound.kind in KINDS else "bound-unknown", value))
    if value != bound.value_s:
        clock = figures.shop.clock
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
