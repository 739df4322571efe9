"""handover.html: how a shift went, on one page that opens offline and prints. Pure."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from shopfloor.render import handover_words as words
from shopfloor.render.handover_text import remarks
from shopfloor.render.handover_words import Say
from shopfloor.render.html import care_notice, document, escape, isolate, page_file
from shopfloor.render.report import table

if TYPE_CHECKING:
    from shopfloor.model.calendar import Clock
    from shopfloor.replan.handover import Handover, MachineReport

_BAR = 400  # width of a machine's bar, in its own units
_KINDS = (
    ("busy", "worked"),
    ("setup", "set-up"),
    ("waiting", "stopped"),
    ("down", "down"),
    ("shut", "idle"),
)


def handover_page(found: Handover, clock: Clock, figures: Any, *, stamp: str | None = None) -> str:
    """Return the page of a handover; `figures` is :mod:`shopfloor.replan.figures`."""
    say = clock.say
    shift = "Time counts from 0:00" if clock.start is None else f"Shift from {clock.start:%Y-%m-%d %H:%M}"
    printed = f"; printed {stamp}" if stamp else ""
    under = f"{shift}, handed over at {say(found.at_s)}{printed}. {words.plans_line(found, say)}."
    body = [
        "<main>",
        "<h1>Handover</h1>",
        f'<p class="under">{escape(under)}</p>',
        *(f'<p class="verdict">{escape(sentence)}</p>' for sentence in words.summary(found, say)),
        care_notice(),
        *_machines(found),
        *_orders(found, say),
        *_left(found, say),
        *_remarks(found, say),
        *_figures(found, figures),
        "</main>",
    ]
    return document(title="Handover", style=page_file("report.css"), body="\n".join(body))


def _machines(found: Handover) -> list[str]:
    rows = []
    for row in found.machines:
        name, *cells = words.machine_cells(row)
        reasons = "<br>".join(isolate(text) for text in words.why_down(row))
        rows.append([isolate(name), *map(escape, cells), _bar(row), reasons])
    head = (*words.MACHINE_HEAD, "share of its open time", "why")
    legend = "".join(
        f'<li><svg class="bar" viewBox="0 0 26 12" aria-hidden="true"><rect class="{kind}" x="1" y="1" '
        f'width="24" height="10"/></svg>{text}</li>'
        for kind, text in _KINDS
    )
    return [
        "<h2>By machine</h2>",
        '<p class="note">Hours and minutes until the handover, all units of a group together. Done: '
        "operations done, of those that were to be done by then. Sequence: the most of the operations begun "
        "that kept the planned order.</p>",
        f'<ul class="legend">{legend}</ul>',
        table(head, rows, texts=(0, 9, 10)),
    ]


def _bar(row: MachineReport) -> str:
    times = row.times
    parts = (
        times.work_s - row.setup_s,
        row.setup_s,
        times.stopped_s,
        times.held_s + times.down_s,
        times.idle_s,
    )
    whole = sum(parts)
    if not whole:
        return "–"
    label = ", ".join(
        f"{text} {words.minutes(part)}" for (_, text), part in zip(_KINDS, parts, strict=True) if part >= 30
    )
    rects, start = [], 0.0
    for (kind, _), part in zip(_KINDS, parts, strict=True):
        width = part / whole * _BAR
        if width:
            rects.append(f'<rect class="{kind}" x="{start:.1f}" y="0" width="{width:.1f}" height="16"/>')
        start += width
    return (
        f'<svg class="bar" viewBox="0 0 {_BAR} 16" preserveAspectRatio="none" role="img" '
        f'aria-label="{escape(label)}">{"".join(rects)}</svg>'
    )


def _orders(found: Handover, say: Say) -> list[str]:
    rows = words.notable(found)
    quiet = len(found.orders) - len(rows)
    parts = ["<h2>By order</h2>"]
    if rows:
        cells = (words.order_cells(row, say) for row in rows)
        parts.append(
            table(
                words.ORDER_HEAD,
                [[isolate(order), *map(escape, rest)] for order, *rest in cells],
                texts=(0, 5),
            )
        )
    if quiet:
        parts.append(f'<p class="note">{words.count(quiet, "other order")} went as planned.</p>')
    return parts


def _left(found: Handover, say: Say) -> list[str]:
    if not found.left:
        return []
    cells = (words.left_cells(found, one, say) for one in found.left)
    rows = [
        [isolate(order), isolate(machine), escape(left), isolate(stands)]
        for order, machine, left, stands in cells
    ]
    return [
        f"<h2>Carries over ({len(rows):,})</h2>",
        table(("Order", "machine", "left", "how it stands"), rows, texts=(0, 1, 3)),
    ]


def _remarks(found: Handover, say: Say) -> list[str]:
    if not found.remarks:
        return []
    items = "".join(f"<li>{isolate(text)}</li>" for text in remarks(found, say))
    return ["<h2>Remarks</h2>", f"<ul>{items}</ul>"]


def _figures(found: Handover, figures: Any) -> list[str]:
    """Show the standard's times and figures by machine, with their formulas and the source."""
    head = ("Machine", *figures.TIMES, *(figure.name for figure in figures.FIGURES.values()))
    rows = [
        [
            isolate(name),
            *(escape(words.minutes(getattr(elements, symbol))) for symbol in figures.TIMES),
            *(escape(words.share(figure.of(elements))) for figure in figures.FIGURES.values()),
        ]
        for name, elements in [
            *((row.machine, row.elements) for row in found.machines),
            ("all", found.elements),
        ]
    ]
    times = ", ".join(f"{symbol} {name}" for symbol, name in figures.TIMES.items())
    formulas = ", ".join(f"{figure.name} = {figure.formula}" for figure in figures.FIGURES.values())
    return [
        "<h2>Figures of ISO 22400-2</h2>",
        table(head, rows),
        f'<p class="note">{escape(times)}. {escape(formulas)}.</p>',
        f'<p class="note">{escape(figures.NOTES)} Source: {escape(figures.SOURCE)}.</p>',
    ]
