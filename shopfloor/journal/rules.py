"""What cannot be: every rule an entry can break, in one table, and the judge that finds them.

A judge looks twice: before the entry is in the journal, at what it names; and after, at what it makes of the
entries around it. Only what the entry itself brings about is held against it, so that an oddity once accepted
does not stand in the way for ever.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any, NamedTuple

from shopfloor.journal import moments
from shopfloor.journal.entries import Entry
from shopfloor.journal.errors import Refusal
from shopfloor.journal.lookup import Clash, Lookup
from shopfloor.journal.migrations import OPEN
from shopfloor.journal.walk import WORK, walk
from shopfloor.model.actuals import Event, Key, Kind
from shopfloor.model.clock import DAY, HOUR, MINUTE, Clock, duration

FUTURE_SLACK_S = MINUTE  # a time is typed to the minute, and clocks differ
BACK_SLACK_S = 5 * MINUTE  # a clock set right by less than this needs nobody's attention
AFTER_S = 12 * HOUR  # later than this after the shift it is rather the wrong journal


class Rule(NamedTuple):
    """The words of one rule; a final one is kept even if the recorder insists."""

    problem: str
    advice: str
    final: bool = False


RULES: dict[str, Rule] = {
    "time-future": Rule("{at} is in the future, it is {now} now{midnight}", "correct the time"),
    "time-before-shift": Rule("{at} is before the start of the shift, {start}", "correct the time"),
    "time-after-shift": Rule(
        "{at} is {away} after the end of the shift{midnight}",
        "say when it happened, or choose the right journal",
    ),
    "clock-back": Rule(
        "this computer's clock shows {now}, but the last entry was made at {last}",
        "set the clock right, or say when it happened",
    ),
    "order-unknown": Rule(
        "there is no order {order} in this shift{nearest}", "correct it, or add the order first"
    ),
    "visit-unknown": Rule("{order} does not visit {machine}; it visits {machines}", "correct the machine"),
    "piece-unknown": Rule(
        "{order} has no piece {piece} on {machine}, only 1 to {last}", "correct the number"
    ),
    "machine-unknown": Rule("there is no machine {machine} in this shift{nearest}", "correct it"),
    "unit-unknown": Rule("{machine} has no unit {unit}, only 1 to {last}", "correct the number"),
    "not-started": Rule("{work} has not been started", "record its start first"),
    "already-running": Rule("{work} is running since {since}", "undo that start if it is wrong"),
    "already-started": Rule("{work} was started and is stopped since {since}", "record that it is resumed"),
    "already-stopped": Rule("{work} is stopped since {since}", "undo that stop if it is wrong"),
    "already-finished": Rule("{work} was finished at {since}", "undo that entry if it is wrong"),
    "unit-busy": Rule("{unit} runs {other} {times}", "record first that it is finished or stopped{free}"),
    "order-elsewhere": Rule(
        "{order} runs on {machine} {times}", "record first that it is finished or stopped there"
    ),
    "machine-down": Rule("{machine} is down since {since} ({reason})", "record first that it is up"),
    "already-down": Rule("{machine} is down since {since} ({reason})", "undo that entry if it is wrong"),
    "not-down": Rule("{machine} is not down at {at}{units}", "record first that it went down"),
    "order-cancelled": Rule("{order} was cancelled at {since}", "undo that entry if it is wrong"),
    "order-known": Rule("order {order} is in this shift already", "change it instead"),
    "worked-since": Rule("{order} was worked on at {since}", "correct the one time or the other"),
    "later-entry": Rule("No {seq} ({what}, {since}) would contradict it", "undo or correct that entry first"),
    "in-use": Rule("{order} has entries of its own, the first is No {seq}", "undo those first", final=True),
    "piece-needed": Rule(
        "{order} has {last} pieces on {machine}", "say which, as in {machine}:2=30", final=True
    ),
    "id-used": Rule(
        "the id {id} belongs to No {seq}, which says something else", "give another id", final=True
    ),
    "no-such-entry": Rule("there is no entry No {seq}", "look it up with: shopfloor log show", final=True),
    "corrected-already": Rule("No {seq} was corrected by No {by}", "correct that one instead", final=True),
    "other-kind": Rule("No {seq} says {was}, not {kind}", "undo it, then record what happened", final=True),
    "plan-stays": Rule("No {seq} issued a plan", "issue another plan instead", final=True),
    "nothing-to-undo": Rule(
        "there is nothing to undo{whose}", "look it up with: shopfloor log show", final=True
    ),
}


def refusal(index: int, rule: str, **words: Any) -> Refusal:
    """Return a refusal in the words of its rule."""
    text = RULES[rule]
    return Refusal(index, rule, text.problem.format(**words), text.advice.format(**words), text.final)


def work_name(key: Key, of: int = 1) -> str:
    """Return how messages call an operation; `of` is how many there are of that order and machine."""
    return f"{key.order} on {key.machine}" + (f" (piece {key.piece})" if max(of, key.piece) > 1 else "")


@dataclass(frozen=True)
class Before:
    """What was odd already around the entries that a new one touches."""

    odd: frozenset[tuple[Key, int, str]]
    clashes: frozenset[tuple[Key, str, Key]]
    outages: frozenset[tuple[int, str]]


class Judge:
    """Finds what an entry contradicts. Asks only indexed questions."""

    def __init__(self, lookup: Lookup, clock: Clock, last_s: int, now_s: int | None) -> None:
        self.lookup, self.clock, self.last_s, self.now_s = lookup, clock, last_s, now_s

    def say(self, seconds: int) -> str:
        """Write a moment for a message."""
        return moments.say(self.clock, seconds)

    # ---- what an entry names ----------------------------------------------------------------------

    def times(self, index: int, at_s: int) -> list[Refusal]:
        """Judge the time by itself."""
        at = self.say(at_s)
        midnight = self._past_midnight(at_s)
        if self.now_s is not None and at_s > self.now_s + FUTURE_SLACK_S:
            return [refusal(index, "time-future", at=at, now=self.say(self.now_s), midnight=midnight)]
        if at_s < 0:
            return [refusal(index, "time-before-shift", at=at, start=self.say(0))]
        if at_s > self.last_s + AFTER_S:
            days, rest = divmod(at_s - self.last_s, DAY)
            away = f"{days} days" if days > 1 else duration(days * DAY + rest // MINUTE * MINUTE)
            return [refusal(index, "time-after-shift", at=at, away=away, midnight=midnight)]
        return []

    def _past_midnight(self, at_s: int) -> str:
        """Return a hint for who typed a time of day before the shift's start."""
        start = self.clock.start
        if start is None:
            return ""
        moment = self.clock.moment(at_s)
        if (moment.date() - start.date()).days != 1 or moment.time() >= start.time():
            return ""
        return f" (a time of day before {self.say(0)} is taken as past midnight)"

    def names(self, index: int, entry: Entry) -> list[Refusal]:
        """Judge whether order, machine, piece and unit exist."""
        found: list[Refusal] = []
        order, machine = entry.order, entry.machine
        visits = self.lookup.visits(order) if order else {}
        if entry.kind is Kind.ADDED:
            if self.lookup.brought(order) - {entry.corrects}:
                found.append(refusal(index, "order-known", order=order))
        elif order and not visits:
            near = self._nearest(order, "order_id", "machine")
            found.append(refusal(index, "order-unknown", order=order, nearest=near))
        if machine and not self._machine_known(machine):
            near = self._nearest(machine, "machine", "order_id")
            found.append(refusal(index, "machine-unknown", machine=machine, nearest=near))
        elif entry.kind in WORK and visits:
            found += self._visit(index, entry, list(visits))
        if machine and entry.unit and not found and entry.unit > (units := self.lookup.units(machine)):
            found.append(refusal(index, "unit-unknown", machine=machine, unit=entry.unit, last=units))
        for name, _, _ in entry.data.get("operations", ()):
            if not self._machine_known(name):
                near = self._nearest(name, "machine", "order_id")
                found.append(refusal(index, "machine-unknown", machine=name, nearest=near))
        return found

    def _machine_known(self, machine: str) -> bool:
        return self.lookup.machine_named(machine) == machine

    def _visit(self, index: int, entry: Entry, visits: list[Key]) -> list[Refusal]:
        numbers = [key.piece for key in visits if key.machine == entry.machine]
        if not numbers:
            machines = ", ".join(sorted({key.machine for key in visits}))
            return [
                refusal(index, "visit-unknown", order=entry.order, machine=entry.machine, machines=machines)
            ]
        if entry.piece not in numbers:
            words = {"order": entry.order, "machine": entry.machine, "piece": entry.piece}
            return [refusal(index, "piece-unknown", last=max(numbers), **words)]
        return []

    def _nearest(self, name: str, column: str, other: str) -> str:
        """Return the name that may have been meant, as a clause; also one of the other kind."""
        names = {candidate.casefold(): candidate for candidate in self.lookup.names(column)}
        close = difflib.get_close_matches(name.casefold(), names, 1, 0.6)
        if close:
            return f"; {names[close[0]]} is the nearest"
        if name.casefold() in {candidate.casefold() for candidate in self.lookup.names(other)}:
            return "; the order comes first, then the machine"
        return ""

    def circumstances(self, index: int, entry: Entry, moment: tuple[int, int]) -> list[Refusal]:
        """Judge what must hold at that time: the machine is up, the order is not cancelled."""
        found: list[Refusal] = []
        at_s = moment[0]
        if entry.kind in (Kind.STARTED, Kind.RESUMED):
            for unit in sorted({0, entry.unit}):
                last = self.lookup.outage_before(entry.machine, unit, moment)
                if last is not None and last.kind is Kind.DOWN:
                    found.append(self._down(index, "machine-down", last))
                    break
        if entry.kind in (Kind.STARTED, Kind.RESUMED, Kind.CHANGED, Kind.CANCELLED):
            cancelled = [e for e in self.lookup.on_order(entry.order, Kind.CANCELLED) if e.moment < moment]
            if cancelled and cancelled[0].seq != entry.corrects:
                since = self.say(cancelled[0].at_s)
                found.append(refusal(index, "order-cancelled", order=entry.order, since=since))
        if entry.kind is Kind.CANCELLED:
            begun = self.lookup.on_order(entry.order, Kind.STARTED, Kind.RESUMED)
            late = next((event for event in begun if event.at_s > at_s), None)
            if late is not None:
                found.append(refusal(index, "worked-since", order=entry.order, since=self.say(late.at_s)))
        return found

    def _down(self, index: int, rule: str, event: Event) -> Refusal:
        since, reason = self.say(event.at_s), event.data.get("reason", "")
        return refusal(index, rule, machine=_unit_name(event.machine, event.unit), since=since, reason=reason)

    # ---- what it makes of the entries around it ---------------------------------------------------

    def look(self, chain: Iterable[Event]) -> Before:
        """Return what is odd around the entries of `chain` as the journal stands."""
        keys = {event.key for event in chain if event.kind in WORK}
        return Before(
            odd=frozenset(
                (key, odd.place, odd.rule) for key in keys for odd in walk(self.lookup.work(key)).odd
            ),
            clashes=frozenset(
                (key, clash.rule, clash.key) for key in keys for clash in self.lookup.clashes(key)
            ),
            outages=frozenset(
                (later.seq, rule)
                for event in chain
                if event.kind in (Kind.DOWN, Kind.UP)
                for _, later, rule in self._turns(event)
            ),
        )

    def _turns(self, event: Event) -> list[tuple[Event | None, Event, str]]:
        """Return the pairs of outage entries around one that do not alternate, and the rule broken."""
        track = event.machine, event.unit
        around = [self.lookup.outage_before(*track, event.moment)]
        if self.lookup.by_seq(event.seq) is not None and self.lookup.counts(event.seq):
            around.append(event)
        around.append(self.lookup.outage_after(*track, event.moment))
        found: list[tuple[Event | None, Event, str]] = []
        before = around[0]
        for one in around[1:]:
            if one is None:
                continue
            if one.kind is (Kind.UP if before is None else before.kind):
                found.append((before, one, "not-down" if one.kind is Kind.UP else "already-down"))
            before = one
        return found

    def aftermath(self, index: int, event: Event, chain: list[Event], before: Before) -> list[Refusal]:
        """Judge what a new entry, now in the journal, makes of the entries around it."""
        found: list[Refusal] = []
        for key in sorted({one.key for one in chain if one.kind in WORK}):
            found += self._odd_work(index, event, key, before)
            for clash in self.lookup.clashes(key):
                if (key, clash.rule, clash.key) not in before.clashes:
                    found.append(self._clash(index, key, clash))
        for one in chain:
            if one.kind in (Kind.DOWN, Kind.UP):
                found += self._odd_outages(index, event, one, before)
            elif one.kind in (Kind.ADDED, Kind.CHANGED):
                found += self._orders(index, event, one)
        return found

    def _odd_work(self, index: int, event: Event, key: Key, before: Before) -> list[Refusal]:
        events = self.lookup.work(key)
        found: list[Refusal] = []
        for odd in walk(events).odd:
            if (key, odd.place, odd.rule) in before.odd:
                continue
            that = next(one for one in events if one.place == odd.place)
            if that.seq == event.seq:
                so_far = walk(one for one in events if one.moment < that.moment)
                many = len(self.lookup.visits(key.order, key.machine))
                since = self.say(so_far.since_s)
                found.append(refusal(index, odd.rule, work=work_name(key, many), since=since))
            else:
                found.append(self._later(index, that))
                break  # the rest follows from this one
        return found

    def _later(self, index: int, that: Event) -> Refusal:
        return refusal(index, "later-entry", seq=that.seq, what=that.kind, since=self.say(that.at_s))

    def _clash(self, index: int, key: Key, clash: Clash) -> Refusal:
        times = f"since {self.say(clash.start_s)}"
        if clash.end_s < OPEN:
            times = f"from {self.say(clash.start_s)} to {self.say(clash.end_s)}"
        if clash.rule == "order-elsewhere":
            return refusal(index, clash.rule, order=key.order, machine=clash.key.machine, times=times)
        runs = walk(self.lookup.work(key)).runs
        unit = runs[-1].unit if runs else 1
        units = self.lookup.units(key.machine)
        name = _unit_name(key.machine, unit if units > 1 else 0)
        free = f", or name another of its {units} units" if units > 1 else ""
        return refusal(index, clash.rule, unit=name, other=work_name(clash.key), times=times, free=free)

    def _odd_outages(self, index: int, event: Event, one: Event, before: Before) -> list[Refusal]:
        found: list[Refusal] = []
        for earlier, later, rule in self._turns(one):
            if (later.seq, rule) in before.outages:
                continue
            if later.seq != event.seq:
                found.append(self._later(index, later))
            elif rule == "already-down" and earlier is not None:
                found.append(self._down(index, rule, earlier))
            else:
                at = self.say(event.at_s)
                name = _unit_name(event.machine, event.unit)
                found.append(refusal(index, rule, machine=name, at=at, units=self._other_tracks(event)))
        return found

    def _other_tracks(self, event: Event) -> str:
        """Name what else of the machine is down: it is put up again as it went down."""
        down = [
            unit
            for unit in range(self.lookup.units(event.machine) + 1)
            if (last := self.lookup.outage_before(event.machine, unit, event.moment))
            and last.kind is Kind.DOWN
        ]
        if not down:
            return ""
        return f"; {_unit_name(event.machine, down[0])} is" if down[0] else f"; all of {event.machine} is"

    def _orders(self, index: int, event: Event, one: Event) -> list[Refusal]:
        visits = self.lookup.visits(one.order)
        if one.seq == event.seq:
            return []
        lost = [piece.key for piece in self.lookup.pieces(one.seq) if piece.key not in visits]
        entries = [entry for key in lost for entry in self.lookup.work(key)]
        if not visits:
            entries += self.lookup.on_order(one.order, Kind.CHANGED, Kind.CANCELLED)
        if entries:
            first = min(entries, key=lambda entry: entry.seq)
            return [refusal(index, "in-use", order=one.order, seq=first.seq)]
        return []


def _unit_name(machine: str, unit: int) -> str:
    return f"{machine} unit {unit}" if unit else machine
