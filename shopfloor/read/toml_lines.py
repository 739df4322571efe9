"""On which line of a TOML file each key and each element of a list stands.

The standard library's parser hands over values without their places. This scanner walks a text that the
parser has already accepted, so it need not check anything; TOML 1.0, https://toml.io/en/v1.0.0.
"""

from __future__ import annotations

import re
import tomllib
from bisect import bisect_right

Path = tuple[str | int, ...]  # keys, and places in lists counted from 0: ("machine", 2, "closed", 0, "from")

_BLANK = re.compile(r"(?:[ \t\r\n]|#[^\n]*)*")
_SPACE = re.compile(r"[ \t]*")
_BARE_KEY = re.compile(r"[\w-]+")
_TEXT = re.compile(
    r'"""(?:[^"\\]|\\.|"{1,2}(?!"))*"{3,5}'
    r"|'''(?:[^']|'{1,2}(?!'))*'{3,5}"
    r'|"(?:[^"\\\n]|\\.)*"'
    r"|'[^'\n]*'",
    re.DOTALL,
)
_PLAIN = re.compile(r"[^\s,\]}#]+(?: [0-9][^\s,\]}#]*)?")  # a number, a truth, a date and perhaps its time


DEEP = 32  # a key of more parts than this is none that a person wrote
_PART = r"""\.[ \t]*(?:[\w-]++|"[^"\n]*+"|'[^'\n]*+')[ \t]*+"""
_DEEP_KEY = re.compile(f"(?:{_PART}){{{DEEP}}}")


def deep_key(text: str) -> int | None:
    """Return the position of a key with very many parts, `a.a.a.…`, or None.

    The parser's time grows with the square of their number, so such a text is not handed to it.
    """
    found = _DEEP_KEY.search(text)
    return found.start() if found else None


def lines_of(text: str) -> dict[Path, int]:
    """Return the line, counted from 1, of every key, table and element; linear in the text.

    Raises
    ------
    RecursionError
        If values are nested as deeply as the parser would not have read them either.
    """
    return _Scanner(text).run()


class _Scanner:
    def __init__(self, text: str) -> None:
        self._text = text
        self._at = 0
        self._starts = [0, *(found.end() for found in re.finditer("\n", text))]
        self._lines: dict[Path, int] = {}
        self._sizes: dict[Path, int] = {}  # how many tables each list of tables has so far

    def run(self) -> dict[Path, int]:
        table: Path = ()
        while self._skip(_BLANK) < len(self._text):
            if self._text[self._at] == "[":
                table = self._head()
            else:
                self._pair(table)
        return self._lines

    def _skip(self, pattern: re.Pattern[str]) -> int:
        found = pattern.match(self._text, self._at)
        assert found is not None  # the parser has accepted the text
        self._at = found.end()
        return self._at

    def _mark(self, path: Path) -> None:
        self._lines.setdefault(path, bisect_right(self._starts, self._at))

    def _head(self) -> Path:
        """Read `[a.b]` or `[[a.b]]` and return the table that it opens."""
        many = self._text.startswith("[[", self._at)
        start = self._at
        self._at += 1 + many
        parts = self._key()
        self._at = self._text.index("]", self._at) + 1 + many
        end, self._at = self._at, start
        path: Path = ()
        for part in parts[:-1]:
            path = self._inside((*path, part))
        path = (*path, parts[-1])
        self._mark(path)
        if many:
            self._sizes[path] = self._sizes.get(path, 0) + 1
            path = self._inside(path)
        self._at = end
        return path

    def _inside(self, path: Path) -> Path:
        """Return the last table of a list of tables, or the path itself if it is none."""
        self._mark(path)
        if path in self._sizes:
            path = (*path, self._sizes[path] - 1)
            self._mark(path)
        return path

    def _key(self) -> list[str]:
        """Read a key, dotted or not."""
        parts: list[str] = []
        while True:
            start = self._skip(_SPACE)
            if self._text[start] in "\"'":
                self._skip(_TEXT)
                parts.append(tomllib.loads(f"key = {self._text[start : self._at]}")["key"])
            else:
                self._skip(_BARE_KEY)
                parts.append(self._text[start : self._at])
            if self._text[self._skip(_SPACE)] != ".":
                return parts
            self._at += 1

    def _pair(self, table: Path) -> None:
        """Read `key = value`."""
        start = self._at
        parts = self._key()
        end, self._at = self._at, start
        for size in range(1, len(parts) + 1):
            self._mark((*table, *parts[:size]))
        self._at = self._text.index("=", end) + 1
        self._skip(_SPACE)
        self._value((*table, *parts))

    def _value(self, path: Path) -> None:
        opening = self._text[self._at]
        if opening in "[{":
            self._at += 1
            count = 0
            while self._text[self._skip(_BLANK)] not in "]}":
                if opening == "{":
                    self._pair(path)
                else:
                    self._mark((*path, count))
                    self._value((*path, count))
                    count += 1
                if self._text[self._skip(_BLANK)] == ",":
                    self._at += 1
            self._at += 1
        else:
            self._skip(_TEXT if opening in "\"'" else _PLAIN)
