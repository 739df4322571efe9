"""What every page shares: escaping, data inside a page, the security policy, the care notice.

Pages are single files that open from a disk, offline, in front of people who did not write the
names on them. So three things hold here, once, for every page: text from files is only ever text;
nothing is fetched; and only the scripts the page was made with may run.
"""

from __future__ import annotations

import base64
import hashlib
import html
import json
import re
from collections.abc import Iterable, Sequence
from importlib import resources
from typing import Any

CARE_NOTICE = (
    "This is a plan, not a permit. Isolate and lock out before setting up or clearing a machine. "
    "Site procedures, local rules on working time and rest, and the judgement of authorised people "
    "come first."
)

# What no page can show: controls other than tab and newline, and halves of surrogate pairs, which
# cannot even be written as UTF-8.
_UNPRINTABLE = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\ud800-\udfff\ufffe\uffff]")
_ENDS_ELEMENT = re.compile(r"</(script|style)|<!--", re.IGNORECASE)


def clean(text: str) -> str:
    """Return `text` with what cannot be shown replaced by U+FFFD and line ends written as newlines."""
    return _UNPRINTABLE.sub("\N{REPLACEMENT CHARACTER}", text.replace("\r\n", "\n").replace("\r", "\n"))


def escape(text: str) -> str:
    """Return `text` for use between tags or inside a quoted attribute."""
    return html.escape(clean(text), quote=True)


def isolate(text: str) -> str:
    """Return `text` escaped and kept from turning the reading direction of its surroundings."""
    return f"<bdi>{escape(text)}</bdi>"


def care_notice() -> str:
    """Return the care notice as a paragraph of class `care`; every page and printed sheet has it."""
    return f'<p class="care">{escape(CARE_NOTICE)}</p>'


def json_element(element_id: str, value: Any) -> str:
    """Return `value` as JSON in a script element that no browser runs and no text can close.

    Parameters
    ----------
    element_id
        The `id` under which the page's script finds it.
    value
        Anything the standard JSON writer takes; key order is kept, so equal values are equal bytes.
    """
    text = json.dumps(value, ensure_ascii=True, allow_nan=False, separators=(",", ":"))
    for letter in "<>&":  # inside JSON these stand only in strings, where an escape means the same
        text = text.replace(letter, f"\\u{ord(letter):04x}")
    return f'<script type="application/json" id="{escape(element_id)}">{text}</script>'


def source_hash(code: str) -> str:
    """Return the policy's name for an inline script or style: its SHA-256 as the browser takes it."""
    digest = hashlib.sha256(code.encode()).digest()
    return f"'sha256-{base64.b64encode(digest).decode()}'"


def policy(scripts: Iterable[str], styles: Iterable[str] | None) -> str:
    """Return a Content-Security-Policy that fetches nothing and runs only what is named.

    Parameters
    ----------
    scripts
        The inline scripts that may run.
    styles
        The inline styles that may apply; None allows any, for a library that writes its own.
    """
    run = " ".join(map(source_hash, scripts)) or "'none'"
    look = "'unsafe-inline'" if styles is None else " ".join(map(source_hash, styles)) or "'none'"
    return f"default-src 'none'; script-src {run}; style-src {look}; base-uri 'none'; form-action 'none'"


def page_file(name: str) -> str:
    """Return a script or style sheet of `render/page` as text."""
    return resources.files("shopfloor.render").joinpath("page", name).read_text(encoding="utf-8")


def document(
    *,
    title: str,
    style: str,
    body: str,
    scripts: Sequence[str] = (),
    any_style: bool = False,
) -> str:
    """Return a whole page: one file that needs nothing else.

    Parameters
    ----------
    title
        Plain text.
    style
        The page's style sheet.
    body
        Markup, already escaped.
    scripts
        Run in this order after the body; each is allowed by its hash.
    any_style
        Allow styles that a script adds (plotly does); otherwise only `style` applies.

    Raises
    ------
    ValueError
        If a script or the style sheet holds text that would end its own element.
    """
    scripts = [code.replace("\r\n", "\n").replace("\r", "\n") for code in scripts]  # as browsers read them
    for code in (style, *scripts):
        found = _ENDS_ELEMENT.search(code)
        if found:
            raise ValueError(f"a script or style holds {found[0]!r}, which would end its element")
    rules = policy(scripts, None if any_style else [style])
    parts = [
        "<!DOCTYPE html>\n",
        '<html lang="en">\n<head>\n<meta charset="utf-8">\n',
        f'<meta http-equiv="Content-Security-Policy" content="{rules}">\n',
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n',
        '<meta name="referrer" content="no-referrer">\n',
        f"<title>{escape(title)}</title>\n<style>{style}</style>\n</head>\n<body>\n",
        body,
        *(f"\n<script>{code}</script>" for code in scripts),
        "\n</body>\n</html>\n",
    ]
    return "".join(parts)
