"""dispatch.html: a page a machine, a strip an order and, in unit rounds, who is where. For printing.

One file prints on A4 and on Letter, in black and white, without scripts. What must stand on every printed
page stands in table heads and feet, which every browser repeats; page numbers are in the page margins,
where browsers that know margin boxes (Chromium since 131) print them.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from shopfloor.render.codes import code
from shopfloor.render.dispatch_sheets import dispatch_view
from shopfloor.render.dispatch_view import (
    Aside,
    DispatchView,
    MachineList,
    Move,
    RoundRow,
    RoundSheet,
    Run,
    Stop,
    Strip,
)
from shopfloor.render.html import care_notice, clean, document, escape, isolate, page_file

if TYPE_CHECKING:
    from shopfloor.model.results import Plan

LONG_NAME = 24  # characters

_TICK = '<span class="tick"></span>'


def dispatch_page(plan: Plan, *, stamp: str | None = None, codes: str | None = None) -> str:
    """Return dispatch.html for `plan`: machine lists, travellers and, in unit rounds, round sheets.

    Parameters
    ----------
    plan
        What to print.
    stamp
        The time of printing, in the words to print; nothing is printed when None, so that the same plan
        gives the same bytes.
    codes
        ``qr`` or ``code128`` to print each machine and each order as a code to scan; None for no codes.

    Raises
    ------
    ValueError
        If `codes` is anything else.

    Notes
    -----
    Linear in the number of assignments; about 0.6 kB an assignment.
    """
    return lay_out(dispatch_view(plan, stamp=stamp), codes)


def lay_out(view: DispatchView, codes: str | None = None) -> str:
    """Return the page for what is to be shown on it; `codes` as in :func:`dispatch_page`."""
    body = [
        # targets of the bar's links: the style sheet shows, and so prints, only the kind targeted
        *(f'<i class="kind" id="only-{kind}"></i>' for kind in ("machines", "strips", "rounds")),
        _bar(view),
        _index(view),
        '<main id="sheets">',
        *(_machine_sheet(view, number, sheet, codes) for number, sheet in enumerate(view.machines, 1)),
        *_strip_sheet(view, codes),
        *(_round_sheet(view, sheet) for sheet in view.round_sheets),
        "</main>",
    ]
    style = page_file("dispatch.css") + _margin_boxes(view)
    return document(title=f"Dispatch lists, plan {view.plan}", style=style, body="\n".join(body))


# ---- on the screen -------------------------------------------------------------------------------


def _bar(view: DispatchView) -> str:
    kinds = [("#machines", f"Machines ({len(view.machines)})"), ("#orders", f"Orders ({len(view.strips)})")]
    shows = [("#sheets", "everything"), ("#only-machines", "machine lists"), ("#only-strips", "travellers")]
    if view.round_sheets:
        kinds.append(("#rounds", "Rounds"))
        shows.append(("#only-rounds", "round sheets"))
    return (
        f'<header class="bar screen"><b>Dispatch lists</b> <span>plan {view.plan}</span>'
        f'<nav aria-label="Jump to">{_links(kinds)}</nav>'
        f'<nav aria-label="Show and print">Show and print: {_links(shows)}</nav></header>'
    )


def _links(links: Sequence[tuple[str, str]]) -> str:
    return " ".join(f'<a href="{target}">{escape(text)}</a>' for target, text in links)


def _index(view: DispatchView) -> str:
    machines = [
        f'<a href="#m{number}">{isolate(sheet.machine)}</a>' for number, sheet in enumerate(view.machines, 1)
    ]
    orders = [
        f'<a href="#o{number}">{isolate(_strip_name(strip))}</a>'
        for number, strip in enumerate(view.strips, 1)
    ]
    idle = ""
    if view.idle:
        idle = f"<p>Nothing to run: {', '.join(isolate(machine) for machine in view.idle)}.</p>"
    return (
        f'<section class="index screen"><p>{escape(view.shift)}. {escape(view.finish)}</p>{care_notice()}'
        f'<h2 id="machines">Machines</h2><p class="links">{" ".join(machines)}</p>{idle}'
        f'<h2 id="orders">Orders</h2><p class="links">{" ".join(orders)}</p></section>'
    )


# ---- machine lists -------------------------------------------------------------------------------


def _machine_sheet(view: DispatchView, number: int, sheet: MachineList, codes: str | None) -> str:
    titles = _titles(sheet)
    heads = "".join(f'<th scope="col">{title}</th>' for title in titles)
    widths = "".join(f'<col class="{title.lower()}">' for title in titles)
    title = f"<h2{_long(sheet.machine + sheet.name)}>{isolate(sheet.machine)}"
    title += f' <span class="name">{isolate(sheet.name)}</span></h2>' if sheet.name else "</h2>"
    return "\n".join(
        [
            f'<section class="sheet machine" id="m{number}"><table><colgroup>{widths}</colgroup>',
            f"<thead>{_head(view, len(titles), title, _facts(sheet), _code(sheet.machine, codes))}",
            f"<tr>{heads}</tr></thead>",
            f"<tfoot>{_foot(len(titles))}</tfoot>",
            "<tbody>",
            *(_run(run, titles) for run in sheet.runs),
            "</tbody></table></section>",
        ]
    )


def _facts(sheet: MachineList) -> str:
    facts = [f"{sheet.units} units"] if sheet.units > 1 else []
    facts += [f"{len(sheet.runs)} run{'s' if len(sheet.runs) > 1 else ''}", f"{sheet.work} of work"]
    facts += [f"{sheet.changes} of changeovers"] if sheet.changes else []
    facts += [f"{sheet.first} to {sheet.last}"]
    return ", ".join([*facts, sheet.crew] if sheet.crew else facts)


def _titles(sheet: MachineList) -> list[str]:
    """The columns of a list: those that all have, and those for what this machine's runs have."""
    used = {
        "Unit": sheet.units > 1,
        "Family": any(run.family for run in sheet.runs),
        "Heads": any(run.heads for run in sheet.runs),
    }
    titles = ("No", "Unit", "Order", "Family", "Heads", "Start", "End", "Began", "Ended", "Done")
    return [title for title in titles if used.get(title, True)]


def _long(name: str) -> str:
    """Smaller type for a long name: browsers repeat a table's head only while it is low."""
    return ' class="long"' if len(name) > LONG_NAME else ""


def _code(text: str, codes: str | None) -> str:
    return code(text, codes) if codes is not None else ""


def _head(view: DispatchView, columns: int, title: str, facts: str, mark: str = "") -> str:
    """The first row of a table's head, repeated on each page; `facts` is plain text, the rest markup."""
    breaks = f"<br>breaks {escape(view.breaks)}" if view.breaks else ""
    stamp = f"<br>printed {escape(view.stamp)}" if view.stamp else ""
    return (
        f'<tr class="head"><td colspan="{columns}"><div class="flank">'
        f"<div>{title}<p>{escape(facts)}</p></div>{mark}"
        f"<p>plan {view.plan}<br>{escape(view.shift)}{breaks}{stamp}</p></div></td></tr>"
    )


def _foot(columns: int) -> str:
    return f'<tr><td colspan="{columns}">{care_notice()}</td></tr>'


def _run(run: Run, titles: Sequence[str]) -> str:
    came = f"from {_move(run.before)}" if run.before else "first stop"
    goes = _move(run.after) if run.after else "last stop"
    way = f"{came} → {goes}" if run.before or run.after else "only stop"
    extra = "".join(f' <span class="mark">{escape(remark)}</span>' for remark in run.remarks)
    extra += f' <span class="note">{isolate(run.note)}</span>' if run.note else ""
    set_up = f" <small>set-up {run.set_up}</small>" if run.set_up else ""
    cells = {
        "No": f'<td class="no">{run.number}</td>',
        "Unit": f'<td class="unit">{run.unit}</td>',
        "Order": f'<td class="order"><b>{isolate(run.order)}</b>{extra}<div class="way">{way}</div></td>',
        "Family": f'<td class="family">{isolate(run.family)}</td>',
        "Heads": f'<td class="unit">{run.heads}</td>',
        "Start": f'<td class="time">{escape(run.start)}{set_up}</td>',
        "End": f'<td class="time">{escape(run.end)} <small>{run.minutes} min</small></td>',
        "Began": "<td></td>",
        "Ended": "<td></td>",
        "Done": f'<td class="done">{_TICK}</td>',
    }
    asides = "".join(_aside(aside, len(titles)) for aside in run.asides)
    return f"{asides}<tr>{''.join(cells[title] for title in titles)}</tr>"


def _aside(aside: Aside, columns: int) -> str:
    unit = f"unit {aside.unit}: " if aside.unit else ""
    kind = "change" if aside.changeover else "shut"
    what = f"{unit}{isolate(aside.what)}" if aside.changeover else f"closed: {isolate(aside.what)}"
    times = f"{escape(aside.start)} – {escape(aside.end)}, {aside.minutes} min"
    return f'<tr class="aside {kind}"><td colspan="{columns}">{times} <b>{what}</b></td></tr>'


def _move(move: Move) -> str:
    way = f" ({escape(move.way)} on the way)" if move.way else ""
    return f"{isolate(move.machine)} {escape(move.time)}{way}"


# ---- travellers ----------------------------------------------------------------------------------


def _strip_sheet(view: DispatchView, codes: str | None) -> list[str]:
    if not view.strips:
        return []
    strips = (_strip(view, number, strip, codes) for number, strip in enumerate(view.strips, 1))
    return ['<section class="sheet strips">', *strips, "</section>"]


def _strip_name(strip: Strip) -> str:
    return f"{strip.order} ({strip.strip} of {strip.strips})" if strip.strips > 1 else strip.order


def _strip(view: DispatchView, number: int, strip: Strip, codes: str | None) -> str:
    facts = [f"not before {strip.release}"] if strip.release else []
    facts.append(f"done {strip.finish}")
    facts += [f"due {strip.due}"] if strip.due else []
    late = f' <b class="late">late by {escape(strip.late)}</b>' if strip.late else ""
    return (
        f'<article class="strip" id="o{number}"><div class="flank">'
        f"<h3{_long(_strip_name(strip))}>{isolate(_strip_name(strip))}</h3>"
        f"{_code(strip.order, codes)}{care_notice()}<p>{escape(', '.join(facts))}{late}<br>"
        f"<small>plan {view.plan}, {escape(view.shift)}</small></p></div>"
        f"<ol>{''.join(map(_stop, strip.stops))}</ol></article>"
    )


def _stop(stop: Stop) -> str:
    extras = [f"{stop.minutes} min"]
    extras += [f"unit {stop.unit}"] if stop.unit else []
    extras += map(escape, stop.remarks)
    extras = [extra.replace(" min", "\N{NO-BREAK SPACE}min") for extra in extras]
    extras += [f"<i>{isolate(stop.note)}</i>"] if stop.note else []
    extras += [f"then {escape(stop.way)} on the way"] if stop.way else []
    return (
        f"<li><div>{stop.number}. <b>{isolate(stop.machine)}</b></div><div>{_TICK}"
        f"{escape(stop.start)} – {escape(stop.end)}<br><small>{', '.join(extras)}</small></div></li>"
    )


# ---- round sheets --------------------------------------------------------------------------------


def _round_sheet(view: DispatchView, sheet: RoundSheet) -> str:
    anchor = ' id="rounds"' if sheet.sheet == 1 else ""
    which = f", sheet {sheet.sheet} of {sheet.sheets}" if sheet.sheets > 1 else ""
    facts = f"{len(sheet.rows)} round{'s' if len(sheet.rows) > 1 else ''}{which}"
    columns = len(sheet.machines) + 1
    heads = "".join(f'<th scope="col">{isolate(machine)}</th>' for machine in sheet.machines)
    return "\n".join(
        [
            f'<section class="sheet rounds"{anchor}><table><colgroup><col class="round"></colgroup>',
            f"<thead>{_head(view, columns, '<h2>Who is where</h2>', facts)}",
            f'<tr><th scope="col">Round</th>{heads}</tr></thead>',
            f"<tfoot>{_foot(columns)}</tfoot>",
            "<tbody>",
            *map(_round, sheet.rows),
            "</tbody></table></section>",
        ]
    )


def _round(row: RoundRow) -> str:
    cells = "".join(f"<td>{isolate(order) if order else '·'}</td>" for order in row.orders)
    times = f"<small>{escape(row.start)} – {escape(row.end)}</small>"
    return f'<tr><th scope="row">{row.number} {times}</th>{cells}</tr>'


# ---- page margins --------------------------------------------------------------------------------


def _margin_boxes(view: DispatchView) -> str:
    printed = f", printed {clean(view.stamp)}" if view.stamp else ""
    return (
        "\n@page {\n"
        f"  @bottom-left {{ content: {css_string(f'plan {view.plan}{printed}')}; }}\n"
        '  @bottom-right { content: "page " counter(page) " of " counter(pages); }\n'
        "}\n"
    )


def css_string(text: str) -> str:
    """Return `text` as a CSS string in which nothing but letters, digits and spaces stands bare."""
    letters = (
        letter if letter.isascii() and (letter.isalnum() or letter == " ") else f"\\{ord(letter):x} "
        for letter in text
    )
    return f'"{"".join(letters)}"'
