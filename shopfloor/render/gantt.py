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

from shopfloor.render.gantt_data import page_data
from shopfloor.render.gantt_facts import gantt_view
from shopfloor.render.gantt_view import GanttView
from shopfloor.render.html import care_notice, document, escape, isolate, json_element, page_file

if TYPE_CHECKING:
    import plotly.graph_objects as go

    from shopfloor.model.results import Plan

# One script in this order; each file holds one noun.
SCRIPTS = tuple(
    f"gantt-{noun}.js"
    for noun in (
        *("data", "clock", "rows", "draw", "scene", "floor", "load", "chart"),
        *("panels", "details", "input", "print", "start"),
    )
)

LONG_FINISH = 9  # characters: `Tue 01:15` still has room at full size


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
        long=' class="long"' if len(view.finish) > LONG_FINISH else "",
        verdict=escape(view.verdict),
        summary=_pairs((line.label, line.text) for line in view.summary),
        about=_pairs(view.about),
        chart_label=escape(f"Gantt chart. Ends {view.finish}, {view.verdict}."),
        left_out=f'<p class="left-out">{isolate(view.left_out)}</p>\n' if view.left_out else "",
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


# ---- the same as a figure -------------------------------------------------------------------------


def gantt_figure(plan: Plan) -> go.Figure:
    """Return the Gantt chart of `plan` as a plotly figure, for notebooks and reports.

    Bars are vectors and print sharply; beyond some 2,000 operations the page answers far faster.
    Machines are rows, colour and pattern tell lateness, and the finish, the bound and the shift's end are
    lines. The axis has dates where the shift's start is known, else seconds written as elapsed time.
    """
    from shopfloor.render.gantt_figure import figure_of  # plotly is slow to import: only when asked for

    return figure_of(gantt_view(plan))
