"""How the audit says a time that may be absurd: a plan by hand can state any."""

from __future__ import annotations

from shopfloor.model.calendar import Clock, elapsed


def moment(clock: Clock, seconds: int) -> str:
    """Say a moment as the clock does, or as elapsed time where no calendar reaches that far."""
    try:
        return clock.say(seconds)
    except (OverflowError, ValueError):  # before year 1, after year 9999
        return elapsed(seconds)
