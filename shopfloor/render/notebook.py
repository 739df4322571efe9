"""A plan as a cell of a notebook shows it: a few sentences and a small drawing, without scripts.

The whole page is `gantt_page`, an interactive figure `gantt_figure`; this is what one sees without asking.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from shopfloor.model.calendar import HOUR
from shopfloor.render import gantt_limits as limits
from shopfloor.render.gantt_colours import INK
from shopfloor.render.gantt_facts import gantt_view
from shopfloor.render.gantt_view import GanttView
from shopfloor.render.html import care_notice, escape, isolate
from shopfloor.render.runs import Runs

if TYPE_CHECKING:
    from shopfloor.model.results import Plan

MOST_BARS = 1_500  # beyond, a cell shows load: its drawing is text, and every bar some 200 letters of it
MOST_ROWS = 30
_LEFT, _RIGHT, _ROW, _HEAD = 130, 950, 22, 24
_LETTERS = 17  # of a row's name
_BLOCKS = 48  # of load across the drawing
_TICK_S = (300, 600, 900, 1800, HOUR, 2 * HOUR, 4 * HOUR, 12 * HOUR, 24 * HOUR, 168 * HOUR, 672 * HOUR)
_TICKS, _LONG_TICKS = 10, 6  # as many as fit where days have no names, and where they do


def plan_html(plan: Plan) -> str:
    """Return `plan` as HTML for one cell of a notebook: finish, bound, a drawing, and the care notice.

    Small enough for any notebook: at most ``MOST_ROWS`` rows, and beyond ``MOST_BARS`` operations blocks
    as high as each machine is busy. Names are text wherever they stand; equal plans give equal text.
    """
    view = gantt_view(plan)
    facts = "".join(f"<br><b>{escape(line.label)}</b> {isolate(line.text)}" for line in view.summary)
    rest = len(view.rows) - MOST_ROWS
    more = f"<p>and {rest:,} more machines and units</p>" if rest > 0 else ""
    return (
        f"<div><p><b>{escape(view.title)}</b>: ends <b>{escape(view.finish)}</b>, {escape(view.verdict)} "
        f"({isolate(view.subtitle)}){facts}</p>{_Drawing(plan, view).svg()}{more}{care_notice()}</div>"
    )


class _Drawing:
    """Rows down, time across; what the page draws, without patterns and names in bars."""

    def __init__(self, plan: Plan, view: GanttView) -> None:
        self.plan, self.view, self.say = plan, view, plan.shop.clock.say
        self.rows = view.rows[:MOST_ROWS]
        self.foot = _HEAD + _ROW * len(self.rows)

    def x(self, seconds: int) -> float:
        share = min(max(seconds / self.view.horizon_s, 0), 1)
        return round(_LEFT + share * (_RIGHT - _LEFT), 1)

    def svg(self) -> str:
        many = len(self.plan.schedule) > MOST_BARS
        work = self.load() if many else self.bars()
        parts = [*self.ground(), *work, *self.closures(), *self.lines()]
        label = escape(f"Gantt chart, ends {self.view.finish}")
        return (
            f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 960 {self.foot + 6}" role="img" '
            f'aria-label="{label}" style="max-width:960px;background:#fff;font:12px sans-serif">'
            f"{''.join(parts)}</svg>"
        )

    def box(self, start: int, end: int, row: int, look: str, title: str = "", low: float = 0) -> str:
        """A box from `start` to `end` on a row, `low` of its height cut off at the top."""
        x, y = self.x(start), _HEAD + _ROW * row + 2 + low * (_ROW - 4)
        size = f'width="{self.x(end) - x:.1f}" height="{(1 - low) * (_ROW - 4):.1f}"'
        said = f"<title>{escape(title)}</title>" if title else ""
        return f'<rect x="{x}" y="{y:.1f}" {size} {look}>{said}</rect>'

    def ground(self) -> Iterator[str]:
        most = _TICKS if self.view.horizon_s <= 24 * HOUR else _LONG_TICKS
        step = next((size for size in _TICK_S if size * most >= self.view.horizon_s), _TICK_S[-1])
        for at in range(0, self.view.horizon_s + 1, step):
            x = self.x(at)
            yield f'<path d="M{x} {_HEAD - 4}V{self.foot}" stroke="#dfe5ea"/>'
            yield f'<text x="{x}" y="12" text-anchor="middle">{escape(self.say(at))}</text>'
        for row, machine in enumerate(self.rows):
            name = machine.label if len(machine.label) <= _LETTERS else f"{machine.label[: _LETTERS - 1]}…"
            weight = "bold" if machine.binds else "normal"
            y = _HEAD + _ROW * row + 15
            yield f'<text x="4" y="{y}" font-weight="{weight}">{escape(name)}</text>'

    def closures(self) -> Iterator[str]:
        """Over the bars: one that shows through is work that pauses."""
        for shut in self.view.closures:
            title = f"{shut.reason} {self.say(shut.start_s)} – {self.say(shut.end_s)}"
            for row in range(len(self.rows)) if shut.row is None else [shut.row]:
                if row < len(self.rows):
                    yield self.box(shut.start_s, shut.end_s, row, 'fill="#d5dbe1" fill-opacity="0.75"', title)

    def bars(self) -> Iterator[str]:
        view, bars = self.view, self.view.bars
        for bar in range(len(bars)):
            row, group = int(bars.row[bar]), view.groups[int(bars.group[bar])]
            start, end = int(bars.start_s[bar]), int(bars.end_s[bar])
            if row < len(self.rows):
                order = view.orders.ids[int(bars.order[bar])]
                title = (
                    f"{order} on {view.rows[row].label}: {self.say(start)} – {self.say(end)}, {group.name}"
                )
                yield self.box(
                    start, end, row, f'fill="{group.fill}" stroke="{INK}" stroke-width="0.7"', title
                )
        changes = view.changeovers
        for place, bar in enumerate(changes.bar.tolist()):
            row, start, end = int(bars.row[bar]), int(changes.start_s[place]), int(changes.end_s[place])
            if row < len(self.rows):
                title = f"changeover {self.say(start)} – {self.say(end)}"
                yield self.box(start, end, row, f'fill="#fff" stroke="{INK}"', title, low=0.5)

    def load(self) -> Iterator[str]:
        """Blocks as high as a machine is busy."""
        load = limits.load(Runs(self.plan), len(self.rows), self.view.horizon_s)
        share = load.share.reshape(len(self.rows), load.steps) / 31
        size = -(-load.steps // _BLOCKS)
        for row in range(len(self.rows)):
            for first in range(0, load.steps, size):
                busy = float(share[row, first : first + size].mean())
                start, end = first * load.step_s, min(first + size, load.steps) * load.step_s
                if busy:
                    title = f"{self.say(start)} – {self.say(end)}: busy about {busy:.0%} of the time"
                    yield self.box(start, end, row, 'fill="#5d88ad"', title, low=1 - busy)

    def lines(self) -> Iterator[str]:
        for line in self.view.lines:
            dash = {"bound": ' stroke-dasharray="6 3"', "shift": ' stroke-dasharray="2 3"'}.get(line.kind, "")
            x, said = self.x(line.at_s), escape(line.text)
            yield f'<path d="M{x} {_HEAD - 6}V{self.foot}" stroke="#000" stroke-width="2"{dash}>'
            yield f"<title>{said}</title></path>"
