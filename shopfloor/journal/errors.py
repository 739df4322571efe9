"""What can go wrong with a journal: the file itself, an entry that says nothing sound, one that cannot be."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from shopfloor.errors import ShopfloorError


class JournalError(ShopfloorError):
    """Raised when a journal cannot be opened, read or written; what it held before is untouched."""


class EntryError(ShopfloorError):
    """Raised when a value of an entry cannot be used at all, such as a negative count.

    Attributes
    ----------
    field
        Which value: ``at``, ``order``, ``reason`` and so on.
    value
        What stood there.
    rule, problem, advice
        As in :class:`~shopfloor.model.results.Fault`.
    """

    def __init__(self, field: str, value: str, rule: str, problem: str, advice: str) -> None:
        self.field, self.value, self.rule, self.problem, self.advice = field, value, rule, problem, advice
        super().__init__(f"{field} {value!r} {problem}; {advice}")


@dataclass(frozen=True, slots=True)
class Refusal:
    """Why one entry cannot be.

    Attributes
    ----------
    index
        Which of the entries handed over, from 0.
    rule
        A short stable code such as ``not-started``.
    problem, advice
        A whole clause each: what contradicts it, what to do.
    final
        Whether it is refused even when the recorder insists.
    """

    index: int
    rule: str
    problem: str
    advice: str
    final: bool = False

    def text(self) -> str:
        """Problem and advice in one line."""
        return f"{self.problem}; {self.advice}"


class RefusedError(JournalError):
    """Raised when entries contradict the journal; carries every reason. Nothing was recorded."""

    def __init__(self, refusals: Sequence[Refusal]) -> None:
        self.refusals = tuple(refusals)
        more = f" (and {len(refusals) - 1} more)" if len(refusals) > 1 else ""
        super().__init__(f"{refusals[0].text()}{more}")
