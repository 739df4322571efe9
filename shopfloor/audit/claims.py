"""Rules about what a plan claims of itself: makespan, bounds, proof, whether the shift holds it.

Each claim is held against what the rows and the witnesses say, never against another claim.
"""

from __future__ import annotations

from collections.abc import Callable

from shopfloor.audit.reading import Breaches, Reading, breaches, claim
from shopfloor.model.calendar import duration


def makespan(reading: Reading) -> Breaches:
    """The stated makespan is the end of the last row."""
    stated, true = reading.stated.makespan_s, reading.latest_end_s

    def say(row: int) -> str:
        assert stated is not None
        last = f"the last to end is {reading.visit(row)}" if row >= 0 else "it has no rows"
        return f"The plan states that everything ends at {reading.at(stated)}, but {last}."

    return breaches(say, [reading.latest_row] if stated is not None and stated != true else [])


def _bounds(rule: str) -> Callable[[Reading], Breaches]:
    def check(reading: Reading) -> Breaches:
        wrong = {k: v.wrong[1] for k, v in enumerate(reading.verdicts) if v.wrong and v.wrong[0] == rule}
        return breaches(lambda k: wrong[k], list(wrong), are_rows=False)

    return check


unknown_bounds = _bounds("bound-unknown")
witnesses = _bounds("bound-witness")
bound_values = _bounds("bound-value")


def lower_bound(reading: Reading) -> Breaches:
    """The stated lower bound is the largest of the stated bounds that hold."""
    stated, best = reading.stated.lower_bound_s, reading.supported_s

    def say() -> str:
        assert stated is not None
        proof = f"the best that holds is {reading.at(best)}" if best else "none holds"
        return f"The plan states the lower bound {reading.at(stated)}, but of the bounds in it {proof}."

    return claim(stated is not None and stated != best, say)


def bound_above(reading: Reading) -> Breaches:
    """No bound that holds lies above the end of the last row: something would end too early to be true."""

    def say() -> str:
        return (
            f"A bound says that nothing can end before {reading.at(reading.supported_s)}, but the plan ends "
            f"at {reading.at(reading.latest_end_s)}: the plan leaves work out, or the bound is false."
        )

    any_holds = any(verdict.holds for verdict in reading.verdicts)
    return claim(any_holds and reading.supported_s > reading.latest_end_s, say)


def optimality(reading: Reading) -> Breaches:
    """Optimality is claimed only where the last row ends at the best bound that holds."""

    def say() -> str:
        gap = reading.latest_end_s - reading.supported_s
        return (
            f"The plan claims that nothing can end earlier than {reading.at(reading.latest_end_s)}, but the "
            f"best bound that holds is {reading.at(reading.supported_s)}, {duration(abs(gap))} away."
        )

    return claim(reading.stated.proved_optimal is True and reading.latest_end_s != reading.supported_s, say)


def shift_end(reading: Reading) -> Breaches:
    """Whether the shift holds the plan is stated as the end of the last row and of the shift tell."""
    stated, end = reading.stated.fits_shift, reading.shop.shift_end_s
    true = None if end is None else reading.latest_end_s <= end

    def say() -> str:
        if end is None:
            return "The plan states whether it fits the shift, but the shift's end is not known."
        says = "fits" if stated else "does not fit"
        return (
            f"The plan states that it {says} the shift, but its last row ends at "
            f"{reading.at(reading.latest_end_s)} and the shift at {reading.at(end)}."
        )

    return claim(stated is not None and stated != true, say)
