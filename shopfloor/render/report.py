"""Tables of the report pages: comparisons and handovers. Pure."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Sequence

from shopfloor.render.html import escape


def table(head: Sequence[str], rows: Iterable[Sequence[str]], *, texts: Collection[int] = (0,)) -> str:
    """Return a table; cells are markup already, the first of each row is its head.

    Parameters
    ----------
    texts
        Which columns hold words; the others hold figures and keep to the right.
    """

    def kind(place: int) -> str:
        return "" if place in texts else ' class="n"'

    heads = "".join(f'<th scope="col"{kind(place)}>{escape(name)}</th>' for place, name in enumerate(head))
    lines = (
        "<tr>"
        + "".join(
            f"<td{kind(place)}>{cell}</td>" if place else f'<th scope="row">{cell}</th>'
            for place, cell in enumerate(row)
        )
        + "</tr>"
        for row in rows
    )
    return (
        f'<div class="scroll"><table><thead><tr>{heads}</tr></thead>\n<tbody>'
        + "\n".join(lines)
        + "</tbody></table></div>"
    )
