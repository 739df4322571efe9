"""The Gantt page: one file that opens offline, and a plotly figure of the same for notebooks.

The page's time axis is plotly's; its bars are drawn on a canvas by the scripts in `page/`, because
thousands of bars as elements of a figure take seconds to light, zoom or turn. Building the page needs
only the text of plotly.js, so plotly itself, slow to import, stays out of the command line.
"""

from __future__ import annotations

from importlib.util import find_spec
from pathlib import Path
from string import Template
from typing import TYPE_CHECKING, Any

import numpy as np

from shopfloor.render.gantt_view import GanttView, gantt_view
from shopfloor.render.html import care_notice, document, escape, isolate, json_element, page_file

if TYPE_CHECKING:
    import plotly.graph_objects as go

    from shopfloor.model.results import Plan
    from shopfloor.model.shop import Ints

# One script in this order; each file holds one noun.
SCRIPTS = tuple(
    f"gantt-{noun}.js"
    for noun in ("data", "clock", "rows", "draw", "scene", "chart", "panels", "input", "print", "start")
)
# Fields of the view that stand on the page as text; all others travel as data, under their own names.
AS_TEXT = frozenset({"title", "subtitle", "stamp", "finish", "verdict", "summary", "about", "care"})

_DIGITS = np.frombuffer(b"0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz-_", dtype="S1")
_BITS = 5


def gantt_page(plan: Plan, *, stamp: str | None = None) -> str:
    """Return the Gantt page of `plan` as one HTML file that needs nothing else.

    Parameters
    ----------
    plan
        Any plan, also one without operations.
    stamp
        Time of printing as text; the page reads no clock.

    Returns
    -------
    str
        Equal plans and stamps give equal text. About 4.9 MB, nearly all of it plotly.js, plus some ten
        bytes an operation. Takes O(m log m) for m assignments: about a tenth of a second for 20,000.
    """
    return page_of(gantt_view(plan, stamp=stamp))


def page_of(view: GanttView) -> str:
    """Return the page that shows `view`."""
    body = Template(page_file("gantt-body.html")).substitute(
        title=escape(view.title),
        subtitle=escape(view.subtitle),
        stamp=f"; printed {escape(view.stamp)}" if view.stamp else "",
        finish=escape(view.finish),
        verdict=escape(view.verdict),
        summary=_pairs((line.label, line.text) for line in view.summary),
        about=_pairs(view.about),
        chart_label=escape(f"Gantt chart. Ends {view.finish}, {view.verdict}."),
        care=care_notice(),
        data=json_element("plan-data", page_data(view)),
    )
    code = "\n".join(page_file(name) for name in SCRIPTS)
    return document(
        title=f"{view.title}: Gantt chart",
        style=page_file("gantt.css"),
        body=body,
        scripts=(plotly_js(), f'(() => {{\n"use strict";\n{code}}})();'),
        any_style=True,  # plotly writes a style sheet of its own
    )


def _pairs(pairs: Any) -> str:
    return "\n".join(f"<dt>{escape(term)}</dt><dd>{isolate(text)}</dd>" for term, text in pairs)


def plotly_js() -> str:
    """Return the text of plotly.js from the installed plotly package, without importing it.

    Raises
    ------
    FileNotFoundError
        If the package is not installed whole.
    """
    spec = find_spec("plotly")
    if spec is None or spec.origin is None:
        raise FileNotFoundError("plotly is not installed")
    return (Path(spec.origin).parent / "package_data" / "plotly.min.js").read_text(encoding="utf-8")


# ---- the data inside the page --------------------------------------------------------------------


def page_data(view: GanttView) -> dict[str, Any]:
    """Return what the page's script reads: every field of the view that is not text, by its name."""
    return {
        "start": view.start,
        "clock_changes": view.clock_changes,
        "horizon_s": view.horizon_s,
        "window_s": view.window_s,
        "rows": [
            {"machine": row.machine, "unit": row.unit, "name": row.name, "binds": row.binds}
            for row in view.rows
        ],
        "orders": {
            "ids": view.orders.ids,
            "release_s": pack(view.orders.release_s),
            "due_s": pack(view.orders.due_s + 1),
            "binds": view.orders.binds,
        },
        "bars": _bars_data(view),
        "groups": [
            {"name": group.name, "fill": group.fill, "ink": group.ink, "pattern": group.pattern}
            for group in view.groups
        ],
        "lines": [
            {"kind": line.kind, "at_s": line.at_s, "text": line.text, "short": line.short}
            for line in view.lines
        ],
        "shift_end_s": view.shift_end_s,
        "rounds_s": view.rounds_s,
        "closures": [
            {"row": shut.row, "start_s": shut.start_s, "end_s": shut.end_s, "reason": shut.reason}
            for shut in view.closures
        ],
        "changeovers": [
            {"row": change.row, "start_s": change.start_s, "end_s": change.end_s, "text": change.text}
            for change in view.changeovers
        ],
        "now_s": view.now_s,
    }


def _bars_data(view: GanttView) -> dict[str, Any]:
    """Columns, times as steps in the longest unit that fits them all, notes by a list of distinct texts."""
    bars = view.bars
    tick = int(np.gcd.reduce(np.r_[bars.start_s, bars.end_s])) if len(bars) else 1
    noted = np.fromiter(bars.notes, dtype=np.int64, count=len(bars.notes))
    texts = {text: index for index, text in enumerate(dict.fromkeys(bars.notes.values()))}
    which = np.array([texts[text] for text in bars.notes.values()], dtype=np.int64)
    return {
        "size": len(bars),
        "tick_s": tick or 1,
        "start_steps": pack(np.diff(bars.start_s, prepend=0) // (tick or 1)),
        "lengths": pack((bars.end_s - bars.start_s) // (tick or 1)),
        "row": pack(bars.row),
        "order": pack(bars.order),
        "group": pack(bars.group),
        "round": pack(bars.round),
        "part": pack(bars.part),
        "parts": pack(bars.parts),
        "notes": {
            "size": len(bars.notes),
            "bar_steps": pack(np.diff(noted, prepend=0)),
            "text": pack(which),
            "texts": list(texts),
        },
    }


def pack(values: Ints) -> str | int:
    """Write a column of whole numbers, none negative, as text; a column of equal numbers as that number.

    Each number is written in base 32, least digit first, with 32 added to every digit that is not its
    last; so numbers below 32 take one letter and no commas are needed. Returns 0 for an empty column.

    Raises
    ------
    ValueError
        If a number is negative.
    """
    if not len(values):
        return 0
    least, most = int(values.min()), int(values.max())
    if least < 0:
        raise ValueError(f"only numbers from 0 can be packed, not {least}")
    if least == most:
        return least
    shifts = np.arange(0, max(1, most.bit_length()), _BITS)
    rest = values[:, None] >> shifts
    digits = (rest & 31) + 32 * (rest >> _BITS > 0)
    used = rest > 0
    used[:, 0] = True
    return _DIGITS[digits[used]].tobytes().decode("ascii")


# ---- the same as a figure -------------------------------------------------------------------------


def gantt_figure(plan: Plan) -> go.Figure:
    """Return the Gantt chart of `plan` as a plotly figure, for notebooks and reports.

    Bars are vectors and print sharply; beyond some 2,000 operations the page answers far faster.
    Machines are rows, colour and pattern tell lateness, and the finish, the bound and the shift's end are
    lines. The axis has dates where the shift's start is known, else seconds written as elapsed time.
    """
    from shopfloor.render.gantt_figure import figure_of  # plotly is slow to import: only when asked for

    return figure_of(gantt_view(plan))
