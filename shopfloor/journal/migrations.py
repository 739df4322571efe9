"""The tables of a journal, version by version.

A journal is append-only: the triggers refuse to alter or delete an entry, whoever asks. Only `run`, which
can be worked out again from the entries, is rewritten; it is kept so that recording stays as quick on the
last entry of a shift as on the first.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Sequence

APPLICATION_ID = 0x53464A4C  # "SFJL" in the file's header: this is a journal of ours
OPEN = 1 << 62  # the end of a run that lasts

_FIRST = """
CREATE TABLE shift (
    name  TEXT PRIMARY KEY,  -- start, zone, end_s
    value TEXT NOT NULL
) WITHOUT ROWID;

CREATE TABLE event (
    seq       INTEGER PRIMARY KEY,
    id        TEXT NOT NULL UNIQUE,
    kind      TEXT NOT NULL,
    at_s      INTEGER NOT NULL,
    at_text   TEXT NOT NULL,
    who       TEXT NOT NULL,
    order_id  TEXT NOT NULL,
    machine   TEXT NOT NULL,
    piece     INTEGER NOT NULL,
    unit      INTEGER NOT NULL,
    corrects  INTEGER NOT NULL,
    place     INTEGER NOT NULL,
    entered   TEXT NOT NULL,
    entered_s INTEGER,
    accepted  TEXT NOT NULL,
    data      TEXT NOT NULL  -- a JSON object
);
CREATE INDEX event_work     ON event (order_id, machine, piece);
CREATE INDEX event_order    ON event (order_id, kind);
CREATE INDEX event_machine  ON event (machine, kind, unit, at_s, place);
CREATE INDEX event_kind     ON event (kind, seq);
CREATE INDEX event_who      ON event (who, seq);
CREATE INDEX event_corrects ON event (corrects) WHERE corrects > 0;
CREATE TRIGGER event_is_not_altered BEFORE UPDATE ON event
    BEGIN SELECT RAISE(ABORT, 'a journal is append-only'); END;
CREATE TRIGGER event_is_not_deleted BEFORE DELETE ON event
    BEGIN SELECT RAISE(ABORT, 'a journal is append-only'); END;

-- The operations that an entry brings: a plan, an order added or changed.
CREATE TABLE visit (
    source   INTEGER NOT NULL REFERENCES event (seq),
    order_id TEXT NOT NULL,
    machine  TEXT NOT NULL,
    piece    INTEGER NOT NULL,
    seconds  INTEGER NOT NULL,
    unit     INTEGER NOT NULL,
    start_s  INTEGER,
    end_s    INTEGER,
    round    INTEGER,
    part     INTEGER NOT NULL,
    parts    INTEGER NOT NULL,
    PRIMARY KEY (source, order_id, machine, piece)
) WITHOUT ROWID;
CREATE INDEX visit_order   ON visit (order_id COLLATE NOCASE, machine);
CREATE INDEX visit_machine ON visit (machine COLLATE NOCASE, unit);
CREATE TRIGGER visit_is_not_altered BEFORE UPDATE ON visit
    BEGIN SELECT RAISE(ABORT, 'a journal is append-only'); END;
CREATE TRIGGER visit_is_not_deleted BEFORE DELETE ON visit
    BEGIN SELECT RAISE(ABORT, 'a journal is append-only'); END;

-- When each operation ran on which unit, by the entries that count.
CREATE TABLE run (
    order_id TEXT NOT NULL,
    machine  TEXT NOT NULL,
    piece    INTEGER NOT NULL,
    unit     INTEGER NOT NULL,
    start_s  INTEGER NOT NULL,
    end_s    INTEGER NOT NULL
);
CREATE INDEX run_piece ON run (order_id, machine, piece);
CREATE INDEX run_unit  ON run (machine, unit, end_s);
CREATE INDEX run_order ON run (order_id, end_s);
"""

MIGRATIONS: Sequence[str] = (_FIRST,)  # the n-th leads from version n-1 to n; none is ever edited


def version(connection: sqlite3.Connection) -> int:
    """Return the version of the tables in a file; 0 for a new one."""
    return int(connection.execute("PRAGMA user_version").fetchone()[0])


def migrate(connection: sqlite3.Connection, migrations: Sequence[str] = MIGRATIONS) -> int:
    """Bring the tables up to date in one transaction, and return how many steps that took.

    A file of the newest version is not written to. Several programs may do this at once: the second finds
    nothing left to do.
    """
    if version(connection) >= len(migrations):
        return 0
    connection.execute("BEGIN IMMEDIATE")
    try:
        done = version(connection)
        for step in migrations[done:]:
            for statement in _statements(step):
                connection.execute(statement)
        connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
        connection.execute(f"PRAGMA user_version = {len(migrations)}")
        connection.execute("COMMIT")
    except BaseException:
        connection.execute("ROLLBACK")
        raise
    return len(migrations) - done


def _statements(script: str) -> list[str]:
    """Split a script; `executescript` would commit what is open."""
    found: list[str] = []
    pending = ""
    for line in script.splitlines(keepends=True):
        pending += line
        if sqlite3.complete_statement(pending):
            found.append(pending.strip())
            pending = ""
    return found
