"""A shift of the tests is over before anything about it is recorded, whatever this computer's clock says."""

from __future__ import annotations

from datetime import UTC, datetime

import pytest

from shopfloor.cli import log_common

AFTERNOON = datetime(2026, 3, 2, 15, tzinfo=UTC)


@pytest.fixture(autouse=True)
def _in_the_afternoon(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(log_common, "wall_time", lambda: AFTERNOON)
    monkeypatch.delenv("SHOPFLOOR_JOURNAL", raising=False)
    monkeypatch.delenv("SHOPFLOOR_WHO", raising=False)
