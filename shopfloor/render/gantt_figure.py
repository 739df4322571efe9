"""The Gantt chart as a plotly figure: vectors, for notebooks. Imported only when a figure is asked for."""

from __future__ import annotations

import html
from datetime import datetime
from typing import Any

import numpy as np
import plotly.graph_objects as go

from shopfloor.model.calendar import HOUR, elapsed
from shopfloor.render.gantt_view import GanttView
from shopfloor.render.html import clean

_PATTERNS = {"plain": "", "dots": ".", "stripes": "/", "back-stripes": "\\", "grid": "+", "upright": "|"}
_PATTERN = {"fgopacity": 0.35, "size": 6, "solidity": 0.2}
_DASHES = {"proved": "solid", "finish": "solid", "bound": "dash", "shift": "dot"}
_TICK_S = (300, 900, 1800, HOUR, 2 * HOUR, 6 * HOUR, 24 * HOUR, 168 * HOUR)
_TICKS = 16  # at most, on an axis of elapsed time


def figure_of(view: GanttView) -> go.Figure:
    """Return the figure that shows `view`: one trace of bars for each colour group in use."""
    axis = _Axis(view)
    figure = go.Figure(layout=_layout(view, axis))
    labels = np.array([_text(row.label) for row in view.rows], dtype=object)
    ids = np.array([_text(order) for order in view.orders.ids], dtype=object)
    bars = view.bars
    for index, group in enumerate(view.groups):
        mine = np.flatnonzero(bars.group == index)
        if not len(mine):
            continue
        figure.add_bar(
            name=group.name,
            orientation="h",
            y=labels[bars.row[mine]],
            base=axis.places(bars.start_s[mine]),
            x=axis.lengths(bars.end_s[mine] - bars.start_s[mine]),
            text=ids[bars.order[mine]],
            textposition="inside",
            insidetextanchor="middle",
            textfont_color=group.ink,
            marker={
                "color": group.fill,
                "line": {"color": "#10202f", "width": 1},
                "pattern": {"shape": _PATTERNS[group.pattern], "fillmode": "overlay"}
                | _PATTERN
                | {"fgcolor": group.ink},
            },
            customdata=np.column_stack([axis.said(bars.start_s[mine]), axis.said(bars.end_s[mine])]),
            hovertemplate="<b>%{text}</b><br>%{y}<br>%{customdata[0]} – %{customdata[1]}<extra></extra>",
        )
    _add_changeovers(figure, view, axis, labels)
    _add_closures(figure, view, axis, labels)
    for level, line in enumerate(view.lines):
        at = axis.place(line.at_s)
        figure.add_shape(
            type="line",
            x0=at,
            x1=at,
            y0=0,
            y1=1,
            yref="paper",
            line={"color": "#000000", "width": 2, "dash": _DASHES[line.kind]},
        )
        figure.add_annotation(
            x=at,
            y=0,
            yref="paper",
            yshift=-4 - 16 * level,  # each on a level of its own, so that labels never meet
            text=_text(line.short),
            showarrow=False,
            xanchor="right",
            yanchor="top",
        )
    return figure


def _add_changeovers(figure: go.Figure, view: GanttView, axis: _Axis, labels: Any) -> None:
    """Lower than runs and hollow."""
    changes = view.changeovers
    if not len(changes):
        return
    names = np.array([_text(family.name) or "no family" for family in view.families], dtype=object)
    figure.add_bar(
        name="changeover",
        orientation="h",
        y=labels[view.bars.row[changes.bar]],
        base=axis.places(changes.start_s),
        x=axis.lengths(changes.end_s - changes.start_s),
        width=0.4,
        marker={"color": "#ffffff", "line": {"color": "#10202f", "width": 1}}
        | {"pattern": {"shape": "\\", "fgcolor": "#5a6672", "size": 6, "solidity": 0.3}},
        customdata=np.column_stack(
            [
                axis.said(changes.start_s),
                axis.said(changes.end_s),
                names[changes.before],
                names[view.bars.family[changes.bar]],
            ]
        ),
        hovertemplate="<b>%{customdata[2]} to %{customdata[3]}</b><br>%{y}<br>"
        "%{customdata[0]} – %{customdata[1]}<extra></extra>",
    )


def _add_closures(figure: go.Figure, view: GanttView, axis: _Axis, labels: Any) -> None:
    """Over the bars, on the rows that are shut: a bar that shows through is work that pauses."""
    shuts = [
        (row, shut)
        for shut in view.closures
        for row in (range(len(view.rows)) if shut.row is None else [shut.row])
    ]
    if not shuts:
        return
    start = np.array([shut.start_s for _, shut in shuts])
    end = np.array([min(shut.end_s, view.horizon_s) for _, shut in shuts])
    figure.add_bar(
        name="closed",
        orientation="h",
        y=labels[[row for row, _ in shuts]],
        base=axis.places(start),
        x=axis.lengths(np.maximum(end - start, 0)),
        opacity=0.75,
        marker={"color": "#ffffff", "line": {"color": "#bcc5cd", "width": 1}}
        | {"pattern": {"shape": "x", "fgcolor": "#9aa5af", "size": 8, "solidity": 0.2}},
        text=[_text(shut.reason) for _, shut in shuts],
        textposition="none",
        customdata=np.column_stack([axis.said(start), axis.said(end)]),
        hovertemplate="<b>%{text}</b><br>%{y}<br>%{customdata[0]} – %{customdata[1]}<extra></extra>",
    )


class _Axis:
    """Seconds as the axis has them: wall time on a date axis, or elapsed seconds on a plain one."""

    def __init__(self, view: GanttView) -> None:
        self.start = None if view.start is None else np.datetime64(datetime.fromisoformat(view.start), "s")
        self.changes = view.clock_changes

    def places(self, seconds: Any) -> Any:
        """Return where moments lie: even steps of time, so that no bar shrinks when clocks change."""
        return seconds if self.start is None else self.start + seconds.astype("timedelta64[s]")

    def place(self, seconds: int) -> Any:
        """Return where one moment lies."""
        return seconds if self.start is None else str(self.start + np.timedelta64(seconds, "s"))

    def lengths(self, seconds: Any) -> Any:
        """Return how long bars are, in the unit of the axis."""
        return seconds if self.start is None else seconds * 1000

    def said(self, seconds: Any) -> Any:
        """Return moments as people read them."""
        if self.start is None:
            return np.array([elapsed(value) for value in seconds.tolist()], dtype=object)
        froms, offsets = np.array(self.changes).T
        ahead = offsets[np.searchsorted(froms, seconds, side="right") - 1]
        wall = self.start + (seconds + ahead).astype("timedelta64[s]")
        return np.array([text.replace("T", " ")[:16] for text in np.datetime_as_string(wall).tolist()])


def _layout(view: GanttView, axis: _Axis) -> dict[str, Any]:
    begin, end = view.window_s
    time: dict[str, Any] = {"type": "linear" if axis.start is None else "date", "side": "top"}
    time["range"] = [axis.place(begin), axis.place(end)]
    if axis.start is None:
        step = next((size for size in _TICK_S if size * _TICKS >= end - begin), _TICK_S[-1])
        times = range(0, view.horizon_s + step, step)
        time |= {"tickmode": "array", "tickvals": [*times], "ticktext": [elapsed(at) for at in times]}
    return {
        "template": "none",
        "title": {"text": _text(f"{view.title}: ends {view.finish}, {view.verdict}")},
        "barmode": "overlay",
        "xaxis": time | {"showgrid": True, "gridcolor": "#dfe5ea", "zeroline": False},
        "yaxis": {
            "autorange": "reversed",
            "categoryorder": "array",
            "categoryarray": [_text(row.label) for row in view.rows],
            "automargin": True,
            "type": "category",
        },
        "height": max(320, 140 + 34 * len(view.rows)),
        "margin": {"t": 100, "r": 20, "b": 20 + 16 * len(view.lines)},
    }


def _text(name: str) -> str:
    """Escape a name for plotly, which reads a little markup in every text it shows."""
    return html.escape(" ".join(clean(name).split()), quote=False)  # plotly keeps &quot; as it stands
