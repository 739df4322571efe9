"""Lines of a terminal: folded to 80 columns, names cut short, faults listed. Loads nothing heavy."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable
from typing import TYPE_CHECKING

from shopfloor.settings import MAX_FAULTS_SHOWN

if TYPE_CHECKING:
    from shopfloor.model.results import Fault

WIDTH = 80


def wrap(text: str, indent: int = 0) -> str:
    """Fold a sentence to the width of the terminal, further lines indented by two more."""
    return textwrap.fill(
        text,
        WIDTH,
        initial_indent=" " * indent,
        subsequent_indent=" " * (indent + 2),
        break_on_hyphens=False,
    )


def cut(text: str, width: int) -> str:
    """Shorten a name to `width` characters; control characters never reach the terminal."""
    clean = "".join(c if c.isprintable() else "?" for c in text)
    return clean if len(clean) <= width else clean[: width - 1] + "…"


def fault_lines(faults: Iterable[Fault]) -> list[str]:
    """Return every fault on lines of its own, and how many were left out when there are very many."""
    listed = list(faults)
    lines = [wrap(cut(fault.text(), 2_000)) for fault in listed[:MAX_FAULTS_SHOWN]]
    if len(listed) > MAX_FAULTS_SHOWN:
        lines.append(f"… and {len(listed) - MAX_FAULTS_SHOWN:,} more.")
    return lines
