"""Scannable codes as inline SVG: QR (ISO/IEC 18004) and Code 128 (ISO/IEC 15417).

The only module that imports segno and python-barcode, and only when a sheet asks for codes.
"""

from __future__ import annotations

import functools
import itertools

from shopfloor.render.html import escape

KINDS = ("qr", "code128")

_QR_MODULE_MM = 0.55  # a hand scanner reads this from a printed sheet at arm's length
_BAR_MODULE_MM, _BAR_HEIGHT_MM, _BAR_QUIET = 0.27, 11, 10
MAX_BAR_CHARACTERS = 24  # wider bars do not fit beside the words


@functools.lru_cache(maxsize=4096)
def code(text: str, kind: str) -> str:
    """Return the markup of a code that a scanner types out as `text`, quiet zone included.

    Code 128 holds only ASCII and grows with every letter, so a name that is not ASCII or longer than
    ``MAX_BAR_CHARACTERS`` gets the words ``no bar code`` instead.

    Raises
    ------
    ValueError
        If `kind` is none of ``KINDS``.
    """
    if kind not in KINDS:
        raise ValueError(f"codes must be one of {', '.join(KINDS)}, not {kind!r}")
    drawing = _qr(text) if kind == "qr" else _bars(text)
    name = "QR code" if kind == "qr" else "bar code"
    if not drawing:
        return f'<small class="code">no {name}</small>'
    return f'<span class="code" role="img" aria-label="{name} {escape(text)}">{drawing}</span>'


def _qr(text: str) -> str:
    import segno

    # error correction M survives a thumb of grease; never Micro QR, which few scanners read
    symbol = segno.make(text, error="m", micro=False, boost_error=False)
    drawing = str(symbol.svg_inline(omitsize=True, svgclass=None, lineclass=None))
    size = symbol.symbol_size()[0] * _QR_MODULE_MM
    return drawing.replace("<svg ", f'<svg width="{size:.2f}mm" height="{size:.2f}mm" ', 1)


def _bars(text: str) -> str:
    if not text.isascii() or not text.isprintable() or not 0 < len(text) <= MAX_BAR_CHARACTERS:
        return ""
    from barcode import Code128

    modules = Code128(text).build()[0]
    runs = [(bit, len(list(group))) for bit, group in itertools.groupby(modules)]
    starts = itertools.accumulate((width for _, width in runs), initial=_BAR_QUIET)
    bars = "".join(
        f"M{start} 0h{width}v{_BAR_HEIGHT_MM}h-{width}z"
        for start, (bit, width) in zip(starts, runs, strict=False)
        if bit == "1"
    )
    size = len(modules) + 2 * _BAR_QUIET
    return (
        f'<svg width="{size * _BAR_MODULE_MM:.2f}mm" height="{_BAR_HEIGHT_MM}mm" '
        f'viewBox="0 0 {size} {_BAR_HEIGHT_MM}" preserveAspectRatio="none"><path d="{bars}"/></svg>'
    )
