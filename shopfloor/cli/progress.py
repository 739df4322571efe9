"""One line that says where a search stands, and Ctrl-C that ends it with the best plan so far."""

from __future__ import annotations

import signal
import sys
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

from shopfloor.model.clock import Clock, duration

if TYPE_CHECKING:
    from shopfloor.openshop.method import Progress

QUIET_FOR_S = 2.0  # nothing that ends sooner prints progress
EVERY_S = {True: 0.5, False: 10.0}  # on a terminal the line is redrawn; in a log file lines are few


class Reporter:
    """Prints :class:`Progress` on standard error; safe to call from any thread."""

    def __init__(self, clock: Clock, quiet: bool) -> None:
        self._clock, self._quiet = clock, quiet
        self._began = self._last = time.monotonic()
        self._terminal = sys.stderr.isatty()
        self._lock = threading.Lock()
        self._width = 0

    def __call__(self, progress: Progress) -> None:
        """Print where the search stands, unless that was done a moment ago."""
        now = time.monotonic()
        with self._lock:
            if self._quiet or now - self._began < QUIET_FOR_S:
                return
            if now - self._last < EVERY_S[self._terminal] and self._width:
                return
            self._last = now
            line = self._line(progress)
            end = "\r" if self._terminal else "\n"
            print(line.ljust(self._width), end=end, file=sys.stderr, flush=True)
            self._width = len(line)

    def _line(self, progress: Progress) -> str:
        bound = f"bound {self._clock.say(progress.bound_s)}"
        left = f"{progress.left_s:.0f} s left"
        if progress.best_s is None:
            return f"{progress.stage}: no plan yet, {bound}, {left}"
        gap = progress.best_s - progress.bound_s
        share = f" ({gap / progress.bound_s:.1%})" if progress.bound_s else ""
        best = f"best {self._clock.say(progress.best_s)}"
        return f"{progress.stage}: {best}, {bound}, gap {duration(gap)}{share}, {left}"

    def close(self) -> None:
        """End a line that is being redrawn."""
        if self._terminal and self._width:
            print(" " * self._width, end="\r", file=sys.stderr, flush=True)


@contextmanager
def stopping() -> Iterator[threading.Event]:
    """Give an event that the first Ctrl-C sets; a second one ends the program as usual."""
    stop = threading.Event()

    def on_interrupt(number: int, frame: Any) -> None:
        if stop.is_set():
            raise KeyboardInterrupt
        stop.set()
        print("\nStopping; keeping the best plan so far.", file=sys.stderr, flush=True)

    before = signal.signal(signal.SIGINT, on_interrupt)
    try:
        yield stop
    finally:
        signal.signal(signal.SIGINT, before)
