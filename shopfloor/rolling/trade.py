"""What moving less costs, and what it spares."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from shopfloor.model.calendar import HOUR, MINUTE, duration
from shopfloor.replan.movement import Moves
from shopfloor.rolling.archive import Archive, Candidate, limits_of, worse_than

TRADES = 3  # so many alternatives are told
DEAREST_S = HOUR  # what costs more than that in finish or lateness is no alternative
LEAST_SPARED = 2  # moves, and a tenth of them: less is not worth a word


@dataclass(frozen=True, slots=True)
class Trade:
    """What more patience buys: a plan that is worse in some goal, and moves less.

    `worse_s` is how much worse by goal than the plan chosen, in (weighted) seconds; less than zero is better.
    `stability_s` is what has to be allowed to get it.
    """

    worse_s: tuple[tuple[str, int], ...]
    moves: Moves
    stability_s: int


def trades_of(chosen: Candidate, best: Candidate, archive: Archive, goals: Sequence[str]) -> list[Trade]:
    """Return the cheapest ways to move less than the plan chosen does, ``TRADES`` at most.

    Each is what the archive would have chosen, had the stability of the trade been allowed: no promise is
    made that this very search could not have kept.

    Parameters
    ----------
    best
        What stability is counted from.
    archive
        Everything that nothing beats.
    """
    found: list[Trade] = []
    fewest = chosen.moves.moved
    for stability_s in sorted({_stability(one, best, goals) for one in archive.front}):
        if not 0 < stability_s <= DEAREST_S:
            continue
        one = archive.chosen(limits_of(best, goals, stability_s))
        worse = worse_than(one, chosen, goals)
        clearly = one.moves.moved <= fewest - max(LEAST_SPARED, fewest // 10)
        if clearly and one.moves.weight < chosen.moves.weight and any(seconds > 0 for _, seconds in worse):
            found.append(Trade(worse, one.moves, stability_s))
            fewest = one.moves.moved
    return found[:TRADES]


def _stability(one: Candidate, best: Candidate, goals: Sequence[str]) -> int:
    """Return what has to be allowed for a plan to be among those chosen from, in whole minutes' seconds."""
    most = max(seconds for _, seconds in worse_than(one, best, goals))
    return -(-max(0, most) // MINUTE) * MINUTE


_WORSE = {
    "makespan": ("later", "earlier"),
    "tardiness": ("more weighted lateness", "less weighted lateness"),
    "changeovers": ("more changeover", "less changeover"),
}


def trade_sentence(trade: Trade, moves: Moves) -> str:
    """Say what a trade costs and spares, and how to get it."""
    parts = [
        f"{_rounded(abs(seconds))} {_WORSE[goal][seconds < 0]}" for goal, seconds in trade.worse_s if seconds
    ]
    return (
        f"{' and '.join(parts)} would move {trade.moves.moved:,} instead of {moves.moved:,}: "
        f"--stability {trade.stability_s // MINUTE}."
    )


def _rounded(seconds: int) -> str:
    """Write a length of a minute or more in whole minutes, rounded up."""
    return duration(-(-seconds // MINUTE) * MINUTE if seconds > MINUTE else seconds)


def sentences(
    chosen: Candidate, best: Candidate, scratch: Moves | None, trades: Sequence[Trade]
) -> list[str]:
    """Say what a plan moves, what that costs, and what moving less would cost."""
    moves = chosen.moves
    noun = "1 operation moves" if moves.moved == 1 else f"{moves.moved:,} operations move"
    text = f"{noun}, {moves.resequenced:,} of them to another place in their machine's sequence"
    if scratch is not None and scratch.moved > moves.moved:
        text += f"; planning from scratch would move {scratch.moved:,}"
    lines = [f"{text}."]
    later = chosen.timed.makespan_s - best.timed.makespan_s
    if later > 0:
        lines.append(
            f"It ends {duration(later)} later than the earliest plan found, which moves {best.moves.moved:,}."
        )
    return lines + [trade_sentence(trade, moves) for trade in trades]
