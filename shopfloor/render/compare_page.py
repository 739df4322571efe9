"""compare.html: what moved between two plans, on one page that opens offline. Pure."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

from shopfloor.model.calendar import HOUR
from shopfloor.render import compare_text as words
from shopfloor.render.html import care_notice, document, escape, isolate, page_file
from shopfloor.render.report import table
from shopfloor.render.text import cut

if TYPE_CHECKING:
    from shopfloor.model.calendar import Clock
    from shopfloor.replan.compare import Change, Comparison, Row, Side

LISTED = 5_000  # changes on the page; --json has every one
DRAWN = 4_000  # bars of the picture; with more it would show nothing
_WIDTH, _LEFT, _LANE = 1_120, 120, 9  # of the picture: its width, the room for names, the height of a lane
_TICKS = (HOUR // 4, HOUR // 2, HOUR, 2 * HOUR, 4 * HOUR, 12 * HOUR, 24 * HOUR)

_LEGEND = (
    ("same", "unmoved"),
    ("moved", "moved"),
    ("resequenced", "moved and resequenced"),
    ("added", "only in B"),
    ("dropped", "only in A"),
)


def compare_page(found: Comparison, clock: Clock) -> str:
    """Return the page of a comparison; `clock` writes its moments. Linear in the rows of both plans."""
    say = clock.say
    body = [
        "<main>",
        "<h1>Two plans compared</h1>",
        f'<p class="under">{_shift(clock)}</p>',
        f'<p class="verdict">{escape(words.verdict(found, say))}</p>',
        _sides(found, say),
        care_notice(),
    ]
    if not found.identical:
        body += [
            *_picture(found, clock),
            *_machines(found, say),
            *_orders(found, say),
            *_changes(found, say),
        ]
    body.append("</main>")
    return document(title="Two plans compared", style=page_file("report.css"), body="\n".join(body))


def _shift(clock: Clock) -> str:
    if clock.start is None:
        return "Time counts from 0:00."
    return f"Shift from {clock.start:%Y-%m-%d %H:%M}."


def _sides(found: Comparison, say: Callable[[int], str]) -> str:
    def column(side: Side) -> list[str]:
        proved = "yes" if side.proved else "no"
        fits = {True: "yes", False: "no", None: "not known"}[side.fits]
        return [
            isolate(side.name),
            escape(side.sha256[:8]),
            escape(side.method),
            f"{len(side.rows):,}",
            escape(say(side.makespan_s)),
            escape(say(side.bound_s)),
            proved,
            fits,
            escape(words.late_words(side)),
        ]

    names = (
        "file",
        "plan",
        "method",
        "rows",
        "ends",
        "bound",
        "proved",
        "fits the shift",
        "lateness",
    )
    columns = zip(names, column(found.a), column(found.b), strict=True)
    return table(("Plans", "A", "B"), columns, texts=(0, 1, 2))


def _machines(found: Comparison, say: Callable[[int], str]) -> list[str]:
    head = ("Machine", "same", "moved", "resequenced", "added", "dropped", "ends A", "ends B")
    rows = (
        [isolate(cells[0]), *map(escape, cells[1:])]
        for cells in (words.machine_cells(row, say) for row in found.machines)
    )
    return ["<h2>By machine</h2>", table(head, rows)]


def _orders(found: Comparison, say: Callable[[int], str]) -> list[str]:
    if not found.orders:
        return []
    rows = []
    for row in found.orders:
        order, *cells, late = words.order_cells(row, say)
        mark = f'<span class="late">{escape(late)}</span>' if row.late_after_s else escape(late)
        rows.append([isolate(order), *map(escape, cells), mark])
    return [
        "<h2>By order</h2>",
        table(("Order", "ends A", "ends B", "change", "lateness"), rows, texts=(0, 4)),
    ]


def _changes(found: Comparison, say: Callable[[int], str]) -> list[str]:
    parts = []
    for kind, title in (("moved", "Moved"), ("added", "Only in B"), ("dropped", "Only in A")):
        changes = found.of(kind)
        if not changes:
            continue
        rows = (
            [isolate(c.row.machine), isolate(c.row.order), escape(words.change_words(c, say))]
            for c in changes[:LISTED]
        )
        parts += [
            f"<h2>{title} ({len(changes):,})</h2>",
            table(("Machine", "Order", "When"), rows, texts=(0, 1, 2)),
        ]
        if len(changes) > LISTED:
            parts.append(f"<p>… and {len(changes) - LISTED:,} more.</p>")
    return parts


# ---- the picture -----------------------------------------------------------------------------------


def _picture(found: Comparison, clock: Clock) -> list[str]:
    """Draw both plans under each other, unit by unit: A above, B below."""
    rows = [row for change in found.changes for row in (change.before, change.after) if row is not None]
    if not rows:
        return []
    if len(rows) > DRAWN:
        return [f'<p class="note">With {len(rows):,} rows a picture would show nothing; the lists do.</p>']
    units = sorted({(row.machine, row.unit) for row in rows})
    several = {machine for machine, unit in units if unit > 1}
    first, last = min(row.start_s for row in rows), max(row.end_s for row in rows)
    scale = (_WIDTH - _LEFT - 2) / max(1, last - first)
    height = 18 + len(units) * (2 * _LANE + 8)

    def x(moment: int) -> float:
        return round(_LEFT + (moment - first) * scale, 1)

    parts = [
        f'<svg viewBox="0 0 {_WIDTH} {height}" role="img" '
        'aria-label="Both plans, machine by machine: A above, B below; the tables say the same">'
    ]
    parts += _axis(clock, first, last, height, x)
    if found.b.from_s is not None and first <= found.b.from_s <= last:
        parts.append(_line("now", x(found.b.from_s), 14, height))
    top = {unit: 22 + place * (2 * _LANE + 8) for place, unit in enumerate(units)}
    for (machine, unit), y in top.items():
        name = f"{machine} {unit}" if machine in several else machine
        parts.append(f'<text x="0" y="{y + _LANE + 3}">{escape(cut(name, 16))}</text>')
        parts.append(
            f'<line class="unit" x1="{_LEFT}" x2="{_WIDTH}" y1="{y + 2 * _LANE + 1}" '
            f'y2="{y + 2 * _LANE + 1}"/>'
        )
    for change in found.changes:
        for row, lane in ((change.before, 0), (change.after, _LANE)):
            if row is not None:
                parts.append(_bar(change, row, x, top[row.machine, row.unit] + lane, clock))
    return ["<h2>Where it moved</h2>", _legend(found.counts.get("passed", 0) > 0), *parts, "</svg>"]


def _axis(clock: Clock, first: int, last: int, height: int, x: Callable[[int], float]) -> list[str]:
    step = next((step for step in _TICKS if (last - first) / step <= 14), _TICKS[-1])
    parts = []
    moment = -(-first // step) * step
    while moment <= last:
        parts.append(_line("tick", x(moment), 14, height))
        parts.append(f'<text x="{x(moment)}" y="11" text-anchor="middle">{escape(clock.say(moment))}</text>')
        moment += step
    return parts


def _line(kind: str, x: float, top: int, bottom: int) -> str:
    return f'<line class="{kind}" x1="{x}" x2="{x}" y1="{top}" y2="{bottom}"/>'


def _bar(change: Change, row: Row, x: Callable[[int], float], y: int, clock: Clock) -> str:
    kind = "resequenced" if change.kind == "moved" and change.resequenced else change.kind
    width = max(1.0, round(x(row.end_s) - x(row.start_s) - 0.6, 1))
    when = f"{clock.say(row.start_s)} – {clock.say(row.end_s)}"
    return (
        f'<rect class="{kind}" x="{x(row.start_s)}" y="{y}" width="{width}" height="{_LANE - 1}">'
        f"<title>{escape(f'{row.order} on {row.machine}, {when}')}</title></rect>"
    )


def _legend(passed: bool) -> str:
    shown = (*_LEGEND, ("passed", "begun before B")) if passed else _LEGEND
    items = (
        f'<li><svg viewBox="0 0 26 12" aria-hidden="true"><rect class="{kind}" x="1" y="1" width="24" '
        f'height="10"/></svg>{text}</li>'
        for kind, text in shown
    )
    return f'<ul class="legend">{"".join(items)}</ul>'
