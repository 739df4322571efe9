"""Pages opened in a browser, for every test that looks at one."""

from __future__ import annotations

import pytest

from shopfloor.model.results import Plan
from shopfloor.render.gantt import gantt_page
from tests.render.browser import chromium, opened


@pytest.fixture(scope="module")
def browser():
    with chromium() as running:
        yield running


@pytest.fixture
def show(browser, tmp_path):
    """Open a plan's page; at the end it must have fetched nothing and complained about nothing."""
    held = []

    def open_page(plan: Plan | str, **options):
        file = tmp_path / "gantt.html"
        file.write_text(plan if isinstance(plan, str) else gantt_page(plan), encoding="utf-8")
        context = opened(browser, file, **options)
        page, seen = context.__enter__()
        held.append((context, seen))
        return page

    yield open_page
    for context, seen in held:
        context.__exit__(None, None, None)
        assert seen.everything == []
