"""A plan as a journal keeps it: its rows numbered, so that each has a name, and the rest of plan.json."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import TYPE_CHECKING, Any
from zoneinfo import ZoneInfo

from shopfloor.model.actuals import Key, Piece
from shopfloor.model.clock import Clock

if TYPE_CHECKING:
    from shopfloor.model.stated import StatedPlan

NO_ROUND = -1  # what a stated plan has outside unit rounds


@dataclass(frozen=True, slots=True)
class IssuedPlan:
    """A plan to be carried out.

    Attributes
    ----------
    sha256
        Of the bytes of plan.json: the plan's identity.
    name
        Of the file.
    clock, shift_end_s
        The shift it is for.
    pieces
        Its rows, numbered.
    head
        The rest of plan.json as plain values: everything but the assignments.
    """

    sha256: str
    name: str
    clock: Clock
    shift_end_s: int | None
    pieces: tuple[Piece, ...]
    head: Mapping[str, Any] = field(default_factory=dict)

    @property
    def last_s(self) -> int:
        """The end of the shift or of the plan, whichever is later."""
        ends = (piece.end_s or 0 for piece in self.pieces)
        return max(self.shift_end_s or 0, max(ends, default=0))


def issued_plan(
    stated: StatedPlan,
    head: Mapping[str, Any],
    *,
    sha256: str,
    name: str = "plan.json",
    begun: Mapping[Key, int] | None = None,
    numbers: Sequence[int] | None = None,
) -> IssuedPlan:
    """Return a stated plan as one to be issued.

    Parameters
    ----------
    stated
        The rows of plan.json.
    head
        plan.json as read; `assignments` is left out.
    begun
        Actual start of each operation under way or done, so that a plan made during the shift calls the same
        work by the same number: see :func:`numbered`.
    numbers
        The number of each row, for a caller that knows better.

    Raises
    ------
    ValueError
        If the start of the shift or its time zone cannot be read; the message is a clause.
    """
    clock = clock_of(head)
    end = head.get("shift_end_s")
    kept = {key: value for key, value in head.items() if key != "assignments"}
    pieces = tuple(numbered(stated, begun or {}, numbers))
    return IssuedPlan(sha256, name, clock, None if end is None else int(end), pieces, kept)


def clock_of(head: Mapping[str, Any]) -> Clock:
    """Return the clock of a plan.

    Raises
    ------
    ValueError
        If the start of the shift or its time zone cannot be read.
    """
    start, zone = head.get("shift_start"), head.get("time_zone")
    if start is None:
        return Clock()
    try:
        moment = datetime.fromisoformat(start)
    except (TypeError, ValueError):
        raise ValueError(f"shift_start {str(start)[:40]!r} is no date and time") from None
    if moment.tzinfo is not None:
        raise ValueError(f"shift_start {str(start)[:40]!r} has an offset from UTC")
    try:
        return Clock(moment, None if zone is None else ZoneInfo(zone))
    except (TypeError, ValueError, KeyError, OSError):
        raise ValueError(f"time_zone {str(zone)[:40]!r} is no time zone known here") from None


def numbered(
    stated: StatedPlan, begun: Mapping[Key, int], numbers: Sequence[int] | None = None
) -> list[Piece]:
    """Number the rows of a plan by order and machine.

    The rows of one order on one machine count 1, 2, … by start, then end, then unit. In a plan made during
    the shift a row that starts when an operation in `begun` did is that operation and keeps its number; the
    others take the numbers of those not begun, by start. O(n log n).
    """
    rows: dict[tuple[str, str], list[tuple[int, int, int, int]]] = defaultdict(list)
    columns = (stated.start_s.tolist(), stated.end_s.tolist(), stated.unit.tolist())
    for index, (start, end, unit) in enumerate(zip(*columns, strict=True)):
        rows[stated.order[index], stated.machine[index]].append((start, end, unit, index))
    starts: dict[tuple[str, str], dict[int, int]] = defaultdict(dict)
    for key, moment in begun.items():
        starts[key.order, key.machine][key.piece] = moment
    part, parts, rounds = stated.part.tolist(), stated.parts.tolist(), stated.round.tolist()
    found: list[Piece] = []
    for (order, machine), listed in rows.items():
        listed.sort()
        known = starts.get((order, machine), {})
        counted = _count([start for start, *_ in listed], known) if numbers is None else ()
        for place, (start, end, unit, index) in enumerate(listed):
            key = Key(order, machine, counted[place] if numbers is None else numbers[index])
            rank = None if rounds[index] == NO_ROUND else rounds[index]
            found.append(Piece(key, end - start, unit, start, end, rank, part[index], parts[index]))
    return sorted(found, key=lambda piece: (piece.start_s or 0, piece.key))


def _count(starts: Sequence[int], begun: Mapping[int, int]) -> list[int]:
    """Return the number of each row, given its start and when the numbers in use began."""
    left = sorted(begun.items())
    found: list[int] = []
    for start in starts:
        same = next((pair for pair in left if pair[1] == start), None)
        found.append(same[0] if same else 0)
        if same:
            left.remove(same)
    fresh = iter(number for number in range(1, len(starts) + len(begun) + 1) if number not in begun)
    return [number or next(fresh) for number in found]
