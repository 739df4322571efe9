"""The hall: machines, crews and closures, and the times between one thing and the next."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from itertools import pairwise, product

from shopfloor.errors import ShopError


@dataclass(frozen=True, slots=True)
class Closure:
    """A time when a machine, or the whole hall, is shut: from `start_s` up to, not including, `end_s`."""

    start_s: int
    end_s: int
    reason: str = ""

    def __post_init__(self) -> None:
        if self.end_s <= self.start_s:
            raise ShopError(f"closure {self.reason or 'without reason'}: it must end after it starts")


@dataclass(frozen=True, slots=True)
class Machine:
    """One machine, or a group of `count` identical units that share a queue.

    `pauses` says that its work may stop for a break or closure and go on afterwards; `crew` names the
    pool of people its operations take heads from, if any: while they run, or with `set_up_only` only
    during their set-up. `closed` are its own closures, beside the hall's breaks. `family` is the setup
    family it starts the shift in, None when its first operation needs no changeover.
    """

    id: str
    name: str = ""
    count: int = 1
    pauses: bool = False
    crew: str | None = None
    set_up_only: bool = False
    closed: tuple[Closure, ...] = ()
    family: str | None = None

    def __post_init__(self) -> None:
        if self.count < 1:
            raise ShopError(f"machine {self.id}: count must be at least 1, not {self.count}")


@dataclass(frozen=True, slots=True)
class Crew:
    """A pool of `heads` people; each operation takes its heads while it is attended.

    `levels` are stretches (start, end, heads) in which another number of people is there.
    """

    id: str
    heads: int
    levels: tuple[tuple[int, int, int], ...] = ()

    def __post_init__(self) -> None:
        if self.heads < 0 or any(heads < 0 for _, _, heads in self.levels):
            raise ShopError(f"crew {self.id}: heads must not be negative")
        if any(end <= start for start, end, _ in self.levels):
            raise ShopError(f"crew {self.id}: a level must end after it starts")
        if any(b[0] < a[1] for a, b in pairwise(self.levels)):
            raise ShopError(f"crew {self.id}: levels must be in order of time and must not overlap")


@dataclass(frozen=True)
class _Between:
    """Seconds from one thing to another: `pairs` as listed, else `between`; 0 to itself.

    No way round is shorter (checked when built), so only neighbours in a sequence need be compared.
    """

    between: int = 0
    pairs: Mapping[tuple[str, str], int] = field(default_factory=dict)

    def __post_init__(self) -> None:
        what, other = self._words()
        if self.between < 0 or any(value < 0 for value in self.pairs.values()):
            raise ShopError(f"{what} times must not be negative")
        names = [*sorted({name for pair in self.pairs for name in pair}), ""]  # "" is any name not listed
        for a, b in product(names, repeat=2):
            for c in names if a != b else ():
                if self.seconds(a, b) > self.seconds(a, c) + self.seconds(c, b):
                    raise ShopError(
                        f"{what} from {a or other} to {b or other} takes longer than by way of {c or other}; "
                        "give the shorter time"
                    )

    def _words(self) -> tuple[str, str]:
        raise AssertionError("only its children are built")

    @property
    def none(self) -> bool:
        """Whether it never takes any time."""
        return not self.between and not any(self.pairs.values())

    def seconds(self, before: str, after: str) -> int:
        """Return the time from one to the other; 0 from a thing to itself."""
        return 0 if before == after else self.pairs.get((before, after), self.between)


@dataclass(frozen=True)
class Changeovers(_Between):
    """Time to change one machine from one family to another, in seconds of its open time.

    It takes no crew and never happens in a closure or break.
    """

    def _words(self) -> tuple[str, str]:
        return "changeover", "another family"


@dataclass(frozen=True)
class Transport(_Between):
    """Time an order needs from one machine to another, in elapsed seconds; it runs through breaks."""

    def _words(self) -> tuple[str, str]:
        return "transport", "another machine"
