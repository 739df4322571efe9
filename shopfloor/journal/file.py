"""The file of a journal: made whole or not at all, opened only if it is one, its errors put in words.

Readers and recorders may use a file at the same time (SQLite's write-ahead log); a recorder waits its turn.
An entry is on the disk before it is acknowledged. SQLite's log needs a disk of this computer: a journal
does not belong on a network share that several computers write to.
"""

from __future__ import annotations

import contextlib
import os
import secrets
import sqlite3
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path

from shopfloor.journal import migrations
from shopfloor.journal.errors import JournalError

BUSY_S = 30.0  # how long a recorder waits for others before giving up

_RIGHTS = "ask for the right to, or copy the file elsewhere"
_REASONS = {
    "SQLITE_FULL": "the disk is full; make room, then record this again",
    "SQLITE_READONLY": f"you may not write there; {_RIGHTS}",
    "SQLITE_READONLY_DIRECTORY": f"you may not write into its folder; {_RIGHTS}",
    "SQLITE_PERM": f"you may not write there; {_RIGHTS}",
    "SQLITE_CANTOPEN": "it, or its folder, cannot be opened; check the rights of both",
    "SQLITE_BUSY": f"another program has kept it in use for {BUSY_S:.0f} s; try again",
    "SQLITE_LOCKED": f"another program has kept it in use for {BUSY_S:.0f} s; try again",
    "SQLITE_NOTADB": "it is no journal; name the file that `log open` made",
    "SQLITE_CORRUPT": "it is damaged; take a copy of it and go on with a new journal",
    "SQLITE_IOERR": "the disk is full or reports a fault; make room, or copy the file to another disk",
    "SQLITE_TOOBIG": "a value is too long",
}


@contextmanager
def in_words(path: Path, doing: str) -> Iterator[None]:
    """Turn what SQLite raises into a :class:`JournalError` that says what to do; `doing` is write or read."""
    try:
        yield
    except sqlite3.Error as error:
        code = getattr(error, "sqlite_errorname", "") or ""
        known = [name for name in _REASONS if code.startswith(name)]
        if not known:
            raise  # a bug of ours, with its traceback
        raise JournalError(f"cannot {doing} {path}: {_REASONS[max(known, key=len)]}") from error


def connect(path: Path, *, write: bool, busy_s: float = BUSY_S) -> sqlite3.Connection:
    """Open the journal at `path`, its tables brought up to date if it may be written.

    Raises
    ------
    JournalError
        If there is none, it is no journal, it is damaged, a newer release made it, or the disk refuses.
    """
    _look(path)
    with in_words(path, "write" if write else "read"):
        connection = _connect(path, write, busy_s)
        try:
            _check(connection, path, write)
            if write:
                connection.execute("PRAGMA synchronous = FULL")
                migrations.migrate(connection)
        except BaseException:
            connection.close()
            raise
    return connection


def create(path: Path, fill: Callable[[sqlite3.Connection], None]) -> None:
    """Make a journal at `path`, with what `fill` writes into it; the file appears whole or not at all.

    Raises
    ------
    JournalError
        If a file of that name stands there already (then its message ends so), or the disk refuses.
    """
    if not path.parent.is_dir():
        raise JournalError(
            f"cannot write {path}: there is no folder {path.parent}; make it, or choose another"
        )
    part = path.with_name(f".shopfloor-{secrets.token_hex(8)}.part")
    try:
        with in_words(path, "write"):
            connection = _prepared(part)
            try:
                fill(connection)
            finally:
                connection.close()  # empties the write-ahead log into the file and removes it
        _place(part, path)
    finally:
        for name in (part, *(part.with_name(part.name + end) for end in ("-wal", "-shm", "-journal"))):
            with contextlib.suppress(OSError):
                name.unlink(missing_ok=True)


def _prepared(path: Path) -> sqlite3.Connection:
    """Make a new file with our tables at `path`."""
    connection = sqlite3.connect(path, isolation_level=None)
    try:
        connection.execute("PRAGMA journal_mode = WAL")
        connection.execute("PRAGMA synchronous = FULL")
        migrations.migrate(connection)
    except BaseException:
        connection.close()
        raise
    return connection


def memory(fill: Callable[[sqlite3.Connection], None]) -> sqlite3.Connection:
    """Return a journal that lives as long as its connection, for trying things out."""
    connection = sqlite3.connect(":memory:", isolation_level=None)
    migrations.migrate(connection)
    fill(connection)
    return connection


def damage(connection: sqlite3.Connection) -> Sequence[str]:
    """Return what SQLite's own check finds wrong with a file; nothing if it is sound. O(size of the file)."""
    try:
        found = [str(row[0]) for row in connection.execute("PRAGMA integrity_check(5)")]
    except sqlite3.DatabaseError as error:
        return [str(error)]
    return [] if found == ["ok"] else found


def _look(path: Path) -> None:
    """Refuse what is plainly no file of ours, before SQLite would make an empty one of it."""
    try:
        with path.open("rb") as file:
            head = file.read(16)
    except FileNotFoundError:
        raise JournalError(
            f"cannot open {path}: there is no such journal; make one with: shopfloor log open PLAN"
        ) from None
    except IsADirectoryError:
        raise JournalError(f"cannot open {path}: it is a folder; name a file in it") from None
    except PermissionError:
        raise JournalError(f"cannot open {path}: you may not read it; {_RIGHTS}") from None
    except OSError as error:
        reason = (error.strerror or str(error)).lower()
        raise JournalError(f"cannot open {path}: {reason}; choose another file") from error
    if head != b"SQLite format 3\0":
        raise JournalError(f"cannot open {path}: {_REASONS['SQLITE_NOTADB']}")


def _connect(path: Path, write: bool, busy_s: float) -> sqlite3.Connection:
    def opened(how: str) -> sqlite3.Connection:
        uri = f"{path.resolve().as_uri()}?{how}"
        connection = sqlite3.connect(uri, uri=True, timeout=busy_s, isolation_level=None)
        connection.execute(f"PRAGMA query_only = {not write:d}")
        return connection

    # Also to read: only who may write can tidy up the log that SQLite keeps beside the file.
    connection = opened("mode=rw")
    if write:
        return connection
    try:
        connection.execute("SELECT count(*) FROM sqlite_master").fetchone()
    except sqlite3.OperationalError:
        connection.close()
        if path.with_name(path.name + "-wal").exists():
            raise
        # A folder that cannot be written holds no log of entries to come: the file is all there is.
        connection = opened("immutable=1")
    return connection


def _check(connection: sqlite3.Connection, path: Path, write: bool) -> None:
    found = connection.execute("PRAGMA application_id").fetchone()[0]
    if found != migrations.APPLICATION_ID:
        raise JournalError(f"cannot open {path}: {_REASONS['SQLITE_NOTADB']}")
    version, newest = migrations.version(connection), len(migrations.MIGRATIONS)
    if version > newest:
        raise JournalError(
            f"cannot open {path}: it is of version {version}, and this release knows none above {newest}; "
            "use the newer release that made it"
        )
    if version < newest and not write:
        raise JournalError(
            f"cannot read {path}: it is of version {version}, older than {newest}; record something in it, "
            "such as a remark, which brings it up to date"
        )


def _place(part: Path, path: Path) -> None:
    """Give a finished file its name, if that is free."""
    taken = f"cannot write {path}: a file of that name stands there; choose another name"
    try:
        try:
            os.link(part, path)
        except FileExistsError:
            raise JournalError(taken) from None
        except OSError:  # a disk without hard links
            if path.exists():
                raise JournalError(taken) from None
            part.rename(path)
    except OSError as error:
        reason = (error.strerror or str(error)).lower()
        raise JournalError(f"cannot write {path}: {reason}; choose another place") from error
    with contextlib.suppress(OSError):  # flush the name too, where the system lets a folder be flushed
        handle = os.open(path.parent, os.O_RDONLY)
        try:
            os.fsync(handle)
        finally:
            os.close(handle)
