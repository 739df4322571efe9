"""The shift's record of what really happened: append-only, in one SQLite file a shift."""
