"""A plan as a journal keeps it: its rows numbered, so that each has a name, and the rest of plan.json."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import TYPE_CHECKING, Any
from zoneinfo import ZoneInfo

from shopfloor.journal.numbering import Row, row_numbers
from shopfloor.model.actuals import Key, Piece, PieceState
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

    @property
    def parent(self) -> str:
        """The SHA-256 of the plan that it was made to follow; empty for a plan of the whole shift."""
        options = self.head.get("options")
        return str(options.get("parent", "")) if isinstance(options, Mapping) else ""


def issued_plan(
    stated: StatedPlan,
    head: Mapping[str, Any],
    *,
    sha256: str,
    name: str = "plan.json",
    known: Iterable[PieceState] = (),
    numbers: Sequence[int] | None = None,
) -> IssuedPlan:
    """Return a stated plan as one to be issued.

    Parameters
    ----------
    stated
        The rows of plan.json.
    head
        plan.json as read; `assignments` is left out.
    known
        How each operation stood when the plan was made (see :func:`made_at`), so that a plan made during the
        shift calls the same work by the same number.
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
    pieces = tuple(numbered(stated, known, numbers, made_s=made_at(head)))
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


def made_at(head: Mapping[str, Any]) -> int | None:
    """Return when a plan was made of what was left of its shift then; None for a plan of the whole shift."""
    options = head.get("options")
    moment = options.get("now_s") if isinstance(options, Mapping) else None
    return moment if type(moment) is int else None


def numbered(
    stated: StatedPlan,
    known: Iterable[PieceState] = (),
    given: Sequence[int] | None = None,
    *,
    made_s: int | None = None,
) -> list[Piece]:
    """Number the rows of a plan by order and machine.

    The rows of one order on one machine count 1, 2, … by start, then end, then unit; in a plan made during
    the shift, of which `known` tells how its operations stood, each keeps the number of the work it goes on
    with: see :func:`shopfloor.journal.numbering.row_numbers`. O(n log n).
    """
    rows: dict[tuple[str, str], list[Row]] = defaultdict(list)
    part, parts, rounds = stated.part.tolist(), stated.parts.tolist(), stated.round.tolist()
    columns = (stated.start_s.tolist(), stated.end_s.tolist(), stated.unit.tolist())
    for index, (start, end, unit) in enumerate(zip(*columns, strict=True)):
        rows[stated.order[index], stated.machine[index]].append(Row(start, end, unit, index, part[index]))
    pieces: dict[tuple[str, str], list[PieceState]] = defaultdict(list)
    if not given:
        for piece in sorted(known, key=lambda piece: piece.key):
            pieces[piece.key.order, piece.key.machine].append(piece)
    found: list[Piece] = []
    for (order, machine), listed in rows.items():
        listed.sort()
        counted: Mapping[int, int] | Sequence[int]
        counted = given or row_numbers(listed, pieces.get((order, machine), ()), made_s)
        for row in listed:
            key = Key(order, machine, counted[row.place])
            rank = None if rounds[row.place] == NO_ROUND else rounds[row.place]
            found.append(
                Piece(key, row.length_s, row.unit, row.start_s, row.end_s, rank, row.part, parts[row.place])
            )
    return sorted(found, key=lambda piece: (piece.start_s or 0, piece.key))
