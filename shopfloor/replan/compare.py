"""What moved between two plans. Pure: rows in, differences out.

A row of one plan and a row of the other are the same operation when order and machine agree. Where an order
visits a machine several times, rows that did not change are paired first, then those of equal length, then
the rest, each in order of time. A row that is in one plan only was dropped or added.

An operation is *resequenced* when it is not one of the most that keep their order on its machine: those
are a longest common subsequence, found as a longest non-decreasing subsequence (C. Schensted, Canad. J.
Math. 13 (1961) 179-191). O(n log n) for n rows.
"""

from __future__ import annotations

from bisect import bisect_right
from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import NamedTuple

from shopfloor.model.results import Lateness


class Row(NamedTuple):
    """One row of a plan."""

    order: str
    machine: str
    unit: int
    start_s: int
    end_s: int
    round: int | None = None


@dataclass(frozen=True, slots=True)
class Side:
    """One of the two plans: its rows, and what its file says of itself.

    Attributes
    ----------
    name, sha256
        Of its file.
    rows
        In any order, on the clock both plans share.
    makespan_s, bound_s
        Finish and lower bound, on that clock too.
    proved, fits
        Whether nothing can end earlier; whether it fits the shift, None when that is not known.
    late
        The orders that finish after their due time.
    method
        Name of the method that made it.
    from_s
        The moment from which a plan made during the shift goes; what lies before it is no longer its matter.
    begun
        (order, machine, start) of rows of the plan before it that were begun by then, ahead of their time.
    """

    name: str
    sha256: str
    rows: Sequence[Row]
    makespan_s: int = 0
    bound_s: int = 0
    proved: bool = False
    fits: bool | None = None
    late: tuple[Lateness, ...] = ()
    method: str = ""
    from_s: int | None = None
    begun: frozenset[tuple[str, str, int]] = frozenset()

    @property
    def late_s(self) -> int:
        """All lateness together."""
        return sum(row.late_s for row in self.late)


@dataclass(frozen=True, slots=True)
class Change:
    """One operation in both plans, or in one of them.

    `passed` tells that it began, or was to begin, before the second plan does: no matter of that plan.
    """

    before: Row | None
    after: Row | None
    resequenced: bool = False
    passed: bool = False

    @property
    def row(self) -> Row:
        """The row it has, the later one of two."""
        row = self.after or self.before
        assert row is not None
        return row

    @property
    def kind(self) -> str:
        """``same``, ``moved``, ``added``, ``dropped`` or ``passed``."""
        if self.passed:
            return "passed"
        if self.before is None:
            return "added"
        if self.after is None:
            return "dropped"
        return "same" if self.before == self.after else "moved"

    @property
    def shift_s(self) -> int:
        """How much later it starts; 0 for what is in one plan only."""
        return self.after.start_s - self.before.start_s if self.before and self.after else 0


@dataclass(frozen=True, slots=True)
class MachineChange:
    """What changed on one machine; counts of operations, and when it is done in each plan."""

    machine: str
    same: int = 0
    moved: int = 0
    added: int = 0
    dropped: int = 0
    passed: int = 0
    resequenced: int = 0
    end_before_s: int | None = None
    end_after_s: int | None = None


@dataclass(frozen=True, slots=True)
class OrderChange:
    """What changed for one order: its finish, its lateness, how many of its operations."""

    order: str
    end_before_s: int | None
    end_after_s: int | None
    late_before_s: int = 0
    late_after_s: int = 0
    moved: int = 0
    added: int = 0
    dropped: int = 0


@dataclass(frozen=True, slots=True)
class Comparison:
    """Everything that differs between two plans.

    Attributes
    ----------
    a, b
        The plans.
    changes
        Every operation of both, in order of the later start, then by name.
    machines
        Every machine, by name.
    orders
        The orders for which something changed, by name.
    """

    a: Side
    b: Side
    changes: tuple[Change, ...]
    machines: tuple[MachineChange, ...]
    orders: tuple[OrderChange, ...]
    counts: Mapping[str, int] = field(default_factory=dict)

    def of(self, *kinds: str) -> list[Change]:
        """Return the changes of these kinds."""
        return [change for change in self.changes if change.kind in kinds]

    @property
    def resequenced(self) -> int:
        """How many operations have another place in their machine's sequence."""
        return sum(change.resequenced for change in self.changes)

    @property
    def identical(self) -> bool:
        """Whether nothing differs."""
        return not self.counts.keys() - {"same"}


def compare(a: Side, b: Side, *, tolerance_s: int = 0) -> Comparison:
    """Return what differs between plans `a` and `b`.

    Parameters
    ----------
    a, b
        The plan before and the plan after, on one clock.
    tolerance_s
        An operation that starts and ends at most so much earlier or later, on its unit and not resequenced,
        counts as unmoved.
    """
    changes: list[Change] = []
    for machine_changes in _by_machine(_paired(a.rows, b.rows)).values():
        changes += _in_sequence(machine_changes)
    changes = [_settled(change, tolerance_s, b) for change in changes]
    changes.sort(key=lambda change: (change.row.start_s, change.row))
    counts: dict[str, int] = defaultdict(int)
    for change in changes:
        counts[change.kind] += 1
    return Comparison(
        a,
        b,
        tuple(changes),
        tuple(_machine(name, found) for name, found in sorted(_by_machine(changes).items())),
        tuple(_orders(changes, a, b)),
        dict(sorted(counts.items())),
    )


# ---- which row is which --------------------------------------------------------------------------


def _paired(before: Iterable[Row], after: Iterable[Row]) -> Iterator[Change]:
    visits: dict[tuple[str, str], tuple[list[Row], list[Row]]] = defaultdict(lambda: ([], []))
    for side, rows in enumerate((before, after)):
        for row in rows:
            visits[row.order, row.machine][side].append(row)
    for old, new in visits.values():
        if len(old) == len(new) == 1:
            yield Change(old[0], new[0])
        else:
            yield from _several(sorted(old, key=_time), sorted(new, key=_time))


def _time(row: Row) -> tuple[int, int, int]:
    return row.start_s, row.end_s, row.unit


def _several(old: list[Row], new: list[Row]) -> Iterator[Change]:
    """Pair the visits of one order to one machine: the unchanged, those as long, the rest."""
    for alike in (lambda row: row, lambda row: row.end_s - row.start_s, lambda row: None):
        waiting: dict[object, list[Row]] = defaultdict(list)
        for row in reversed(new):
            waiting[alike(row)].append(row)
        left: list[Row] = []
        for row in old:
            if waiting[alike(row)]:
                yield Change(row, waiting[alike(row)].pop())
            else:
                left.append(row)
        old = left
        new = sorted((row for rows in waiting.values() for row in rows), key=_time)
    yield from (Change(row, None) for row in old)
    yield from (Change(None, row) for row in new)


def _by_machine(changes: Iterable[Change]) -> dict[str, list[Change]]:
    found: dict[str, list[Change]] = defaultdict(list)
    for change in changes:
        found[change.row.machine].append(change)
    return found


# ---- what became of it ---------------------------------------------------------------------------


def _in_sequence(changes: list[Change]) -> list[Change]:
    """Mark the operations of one machine that are resequenced."""
    both = [change for change in changes if change.before and change.after]
    rest = [change for change in changes if not (change.before and change.after)]
    both.sort(key=lambda change: (_start(change.before), _start(change.after), change.row))
    kept = longest_in_order([_start(change.after) for change in both])
    return rest + [
        Change(change.before, change.after, resequenced=not stays)
        for change, stays in zip(both, kept, strict=True)
    ]


def _start(row: Row | None) -> int:
    assert row is not None
    return row.start_s


def longest_in_order(values: Sequence[int]) -> list[bool]:
    """Tell for each value whether it belongs to one longest non-decreasing subsequence. O(n log n)."""
    ends: list[int] = []  # the least last value of a subsequence of each length
    at: list[int] = []  # where it stands
    previous: list[int] = []
    for place, value in enumerate(values):
        length = bisect_right(ends, value)
        previous.append(at[length - 1] if length else -1)
        ends[length : length + 1] = [value]
        at[length : length + 1] = [place]
    kept = [False] * len(values)
    place = at[-1] if at else -1
    while place >= 0:
        kept[place] = True
        place = previous[place]
    return kept


def _settled(change: Change, tolerance_s: int, b: Side) -> Change:
    """Let a small move count as none, and what began before the second plan does as passed."""
    before, after = change.before, change.after
    if b.from_s is not None and change.row.start_s < b.from_s:
        return Change(before, after, passed=True)
    if after is None and before is not None and (before.order, before.machine, before.start_s) in b.begun:
        return Change(before, None, passed=True)
    if before is None or after is None:
        return change
    near = (
        abs(after.start_s - before.start_s) <= tolerance_s and abs(after.end_s - before.end_s) <= tolerance_s
    )
    # The number of a round alone is no move: a plan made during the shift counts its own rounds.
    same_place = after.unit == before.unit and not change.resequenced
    return Change(before, before) if near and same_place else change


def _machine(name: str, changes: Sequence[Change]) -> MachineChange:
    kinds = [change.kind for change in changes]
    same, moved, added, dropped, passed = (
        kinds.count(kind) for kind in ("same", "moved", "added", "dropped", "passed")
    )
    return MachineChange(
        name,
        same,
        moved,
        added,
        dropped,
        passed,
        resequenced=sum(change.resequenced for change in changes),
        end_before_s=_end(change.before for change in changes),
        end_after_s=_end(change.after for change in changes),
    )


def _end(rows: Iterable[Row | None]) -> int | None:
    return max((row.end_s for row in rows if row is not None), default=None)


def _orders(changes: Sequence[Change], a: Side, b: Side) -> Iterator[OrderChange]:
    by_order: dict[str, list[Change]] = defaultdict(list)
    for change in changes:
        by_order[change.row.order].append(change)
    late_a, late_b = ({row.order: row.late_s for row in side.late} for side in (a, b))
    for order, found in sorted(by_order.items()):
        kinds = [change.kind for change in found]
        late = late_a.get(order, 0), late_b.get(order, 0)
        if set(kinds) <= {"same", "passed"} and late[0] == late[1]:
            continue
        yield OrderChange(
            order,
            _end(change.before for change in found),
            _end(change.after for change in found),
            *late,
            *(kinds.count(kind) for kind in ("moved", "added", "dropped")),
        )
