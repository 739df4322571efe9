"""The errors a caller may meet, under one base class.

Only these become a one-line message and an exit code at the command line.
Anything else is a bug and keeps its traceback.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Sequence

    from shopfloor.model.results import Fault, Violation


class ShopfloorError(Exception):
    """Base of every error that a user can cause or must be told about."""


class InputError(ShopfloorError):
    """Raised when files or options cannot be used; carries the complete list of faults.

    Parameters
    ----------
    faults
        Every fault found, in file order; never empty.
    notices
        What was noticed on the way and is no fault.
    """

    def __init__(self, faults: Sequence[Fault], notices: Sequence[Fault] = ()) -> None:
        self.faults = tuple(faults)
        self.notices = tuple(notices)
        more = f" (and {len(self.faults) - 1} more)" if len(self.faults) > 1 else ""
        super().__init__(f"{self.faults[0].text()}{more}")


class ShopError(ShopfloorError, ValueError):
    """Raised when the parts of a shop contradict each other; the message names the part."""


class NoPlanError(ShopfloorError):
    """Raised when no plan was found in the time given, or none can exist; the message says which."""


class SaveError(ShopfloorError):
    """Raised when an output file could not be written; what stood there before is untouched."""


class AuditError(Exception):
    """Raised when our own plan fails our own audit: always a bug, never the user's doing.

    Not a :class:`ShopfloorError`, so that it keeps its traceback.
    """

    def __init__(self, violations: Sequence[Violation]) -> None:
        self.violations = tuple(violations)
        lines = "\n".join(f"  {violation.sentence}" for violation in self.violations[:20])
        super().__init__(f"the plan just made breaks {len(self.violations)} rule(s):\n{lines}")
