"""Where input comes from: a path, bytes, or an open binary file, taken into memory whole and hashed."""

from __future__ import annotations

import hashlib
import os
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import BinaryIO, TypeAlias

from shopfloor import settings
from shopfloor.read.rules import Place, printable, refuse

Readable: TypeAlias = "str | os.PathLike[str] | bytes | BinaryIO"

# What people feed to a reader of tables by mistake, by the first bytes of the file.
_PASSWORD = ", without a password"
_KINDS: tuple[tuple[bytes, str, str], ...] = (
    (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an old .xls workbook or one with a password", _PASSWORD),
    (b"%PDF", "a PDF", ""),
    (b"{\\rtf", "a formatted text", ""),
    (b"\x1f\x8b", "a compressed file", ""),
    (b"\x89PNG", "a picture", ""),
    (b"\xff\xd8\xff", "a picture", ""),
    (b"PAR1", "a Parquet file", ""),
    (b"SQLite format 3\0", "a database", ""),
    (b"<!doctype html", "a web page", " (open it in a spreadsheet first, whatever its name ends in)"),
    (b"<html", "a web page", " (open it in a spreadsheet first, whatever its name ends in)"),
    (b"<table", "a web page", " (open it in a spreadsheet first, whatever its name ends in)"),
    (b"<?xml", "an XML file", " (open it in a spreadsheet first, whatever its name ends in)"),
)


@dataclass(frozen=True)
class Source:
    """The bytes of one input and the name that messages call it by."""

    name: str
    data: bytes

    @cached_property
    def sha256(self) -> str:
        """Hexadecimal SHA-256 of the bytes."""
        return hashlib.sha256(self.data).hexdigest()

    @property
    def place(self) -> Place:
        """The file as a whole."""
        return Place(self.name)


def take(source: Readable, *, name: str | None = None, limit: int | None = None) -> Source:
    """Read all of `source`.

    Parameters
    ----------
    source
        Path, bytes, or an open binary file such as ``sys.stdin.buffer``.
    name
        What messages call it; otherwise the file's name without its folders, ``<stdin>``, or ``<input>``.
    limit
        Most bytes accepted; ``settings.MAX_FILE_BYTES`` unless given.

    Raises
    ------
    InputError
        If the file is missing, cannot be read, is empty or is too large.
    """
    limit = settings.MAX_FILE_BYTES if limit is None else limit
    shown = printable(name or _name_of(source))
    place = Place(shown)
    try:
        data = _bytes_of(source, limit)
    except FileNotFoundError:
        raise refuse(place, "file-missing") from None
    except OSError as error:
        reason = error.strerror or str(error)
        raise refuse(place, "file-unreadable", reason=reason[:1].lower() + reason[1:]) from None
    if len(data) > limit:
        raise refuse(place, "file-too-large", limit=limit)
    if not data:
        raise refuse(place, "file-empty")
    return Source(shown, data)


def refuse_other_kinds(source: Source) -> None:
    """Name a file that is no table by what it is.

    Raises
    ------
    InputError
        If the first bytes are those of a PDF, an old workbook, a web page and the like.
    """
    start = source.data[:64].removeprefix(b"\xef\xbb\xbf").lstrip()
    for magic, kind, extra in _KINDS:
        if start.startswith(magic) or start.lower().startswith(magic):
            raise refuse(source.place, "not-a-table", kind=kind, extra=extra)


def _name_of(source: Readable) -> str:
    if isinstance(source, bytes):
        return "<input>"
    if isinstance(source, str | os.PathLike):
        return Path(source).name or str(source)
    name = getattr(source, "name", None)
    return Path(name).name if isinstance(name, str) and name else "<input>"


def _bytes_of(source: Readable, limit: int) -> bytes:
    """Return the bytes, one more than `limit` at most."""
    if isinstance(source, bytes):
        return source
    if isinstance(source, str | os.PathLike):
        if "\0" in str(source):
            raise FileNotFoundError
        with Path(source).open("rb") as file:
            return file.read(limit + 1)
    parts: list[bytes] = []
    while part := source.read(limit + 1 - sum(map(len, parts))):  # a pipe may hand over less than asked for
        if not isinstance(part, bytes):
            raise TypeError("an open file must be opened in binary mode, 'rb'")
        parts.append(part)
    return b"".join(parts)
