"""The audit of a replan against the journal: frozen work unmoved, nothing before now, nothing lost or undone.

Like the audit of plans it shares nothing with what made the plan: it looks at the rows and at the journal's
state, not at the residual shop. What is left of each order on each machine is counted here again, by visits.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator, Mapping
from functools import cached_property

from shopfloor.model.actuals import PieceState, ShiftState, Status
from shopfloor.model.calendar import Clock
from shopfloor.model.results import Violation
from shopfloor.model.stated import StatedPlan

Pair = tuple[str, str]
Found = Iterator[tuple[str, str, tuple[int, ...]]]


def audit_frozen(
    stated: StatedPlan,
    state: ShiftState,
    wanted: Mapping[Pair, int],
    clock: Clock,
    back: Mapping[tuple[str, int], int] | None = None,
) -> list[Violation]:
    """Return where a plan made at `state.at_s` contradicts what has happened by then.

    Parameters
    ----------
    stated
        The plan.
    state
        The journal's.
    wanted
        How many operations the shift's orders have by order and machine; those that may be cut are left out.
    clock
        To write moments with.
    back
        (machine, unit), unit 0 for all of it, to when a machine that is down is expected back.
    """
    look = _Look(stated, state, wanted, clock, back or {})
    rules = (look.begun, look.unmoved, look.alone, look.counted, look.not_cancelled, look.not_down)
    found = [
        Violation(code, sentence, tuple(int(stated.row[k]) for k in at))
        for rule in rules
        for code, sentence, at in rule()
    ]
    return sorted(found, key=lambda one: (one.rule, one.rows, one.sentence))


class _Look:
    """A plan beside a journal; one method a rule, each yielding code, sentence and rows of what breaks it."""

    def __init__(
        self,
        stated: StatedPlan,
        state: ShiftState,
        wanted: Mapping[Pair, int],
        clock: Clock,
        back: Mapping[tuple[str, int], int],
    ) -> None:
        self.stated, self.state, self.wanted, self.clock, self.back = stated, state, wanted, clock, back
        self.start = stated.start_s.tolist()
        self.unit = stated.unit.tolist()
        self.running: list[PieceState] = [
            piece for piece in state.pieces.values() if piece.runs and piece.runs[-1].end_s is None
        ]
        self.lost = {name for name, order in state.orders.items() if order.cancelled_s is not None}

    @cached_property
    def rows(self) -> Mapping[Pair, list[int]]:
        """The rows of each order on each machine."""
        found: dict[Pair, list[int]] = defaultdict(list)
        for row, pair in enumerate(zip(self.stated.order, self.stated.machine, strict=True)):
            found[pair].append(row)
        return found

    @cached_property
    def frozen(self) -> Mapping[int, PieceState]:
        """The rows that tell of running work: same order, machine and start."""
        known = {(piece.key.order, piece.key.machine, piece.start_s): piece for piece in self.running}
        named = enumerate(zip(self.stated.order, self.stated.machine, self.start, strict=True))
        return {row: known[name] for row, name in named if name in known}

    def name(self, row: int) -> str:
        """What a row says."""
        return f"{self.stated.order[row]} on {self.stated.machine[row]}"

    def at(self, row: int) -> str:
        """When a row starts."""
        return self.clock.say(self.start[row])

    # ---- the rules ---------------------------------------------------------------------------------

    def begun(self) -> Found:
        """Nothing starts before now but what is running."""
        now = self.state.at_s
        for row, start in enumerate(self.start):
            if start < now and row not in self.frozen:
                yield (
                    "before-now",
                    f"{self.name(row)} starts at {self.at(row)}, but it is {self.clock.say(now)}.",
                    (row,),
                )

    def unmoved(self) -> Found:
        """What runs and has a row stays on its unit."""
        for row, piece in self.frozen.items():
            unit = piece.runs[-1].unit
            if self.unit[row] != unit:
                text = f"{self.name(row)} runs on unit {unit}, but is planned on unit {self.unit[row]}."
                yield "frozen-moved", text, (row,)

    def alone(self) -> Found:
        """No other row has the unit or the order of what runs before that is done."""
        ends = {piece.key: int(self.stated.end_s[row]) for row, piece in self.frozen.items()}
        for piece in self.running:
            until, place = ends.get(piece.key, self.state.at_s + 1), piece.runs[-1].unit
            for row, start in enumerate(self.start):
                if start >= until or self.frozen.get(row) is piece:
                    continue
                same_unit = self.stated.machine[row] == piece.key.machine and self.unit[row] == place
                if same_unit or self.stated.order[row] == piece.key.order:
                    what = "its unit" if same_unit else "its order"
                    yield (
                        "frozen-crossed",
                        f"{piece.key.order} on {piece.key.machine} runs until {self.clock.say(until)}, but "
                        f"{self.name(row)} takes {what} at {self.at(row)}.",
                        (row,),
                    )

    def counted(self) -> Found:
        """Each visit that an order needs is done, running or planned, and only once."""
        done: Counter[Pair] = Counter()
        for piece in self.state.pieces.values():
            if piece.status is Status.DONE and (piece.good or not piece.scrap):
                done[piece.key.order, piece.key.machine] += 1
        runs = Counter((piece.key.order, piece.key.machine) for piece in self.running)
        for pair, need in self.wanted.items():
            ahead = sum(row not in self.frozen for row in self.rows.get(pair, ()))
            have = done[pair] + runs[pair] + ahead
            if have == need or (pair[0] in self.lost and have < need):
                continue
            yield (
                "visit-lost" if have < need else "visit-again",
                f"{pair[0]} needs {pair[1]} {need} times: {done[pair]} done, {runs[pair]} running, {ahead} "
                "planned.",
                tuple(self.rows.get(pair, ())),
            )

    def not_cancelled(self) -> Found:
        """No order that was cancelled is planned, but for what runs of it."""
        for row, order in enumerate(self.stated.order):
            if order in self.lost and row not in self.frozen:
                yield "cancelled", f"{self.name(row)} is planned at {self.at(row)}, but cancelled.", (row,)

    def not_down(self) -> Found:
        """Nothing new starts on a machine that is down before it is back."""
        if not self.back:
            return
        for row, start in enumerate(self.start):
            machine = self.stated.machine[row]
            for unit in (0, self.unit[row]):
                until = self.back.get((machine, unit), start)
                if start < until and row not in self.frozen:
                    text = f"{self.name(row)} starts at {self.at(row)}, but {machine} is down until "
                    yield "machine-down", f"{text}{self.clock.say(until)}.", (row,)
