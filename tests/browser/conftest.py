"""One Chromium for all files here: playwright can be started only once in a process."""

from __future__ import annotations

import pytest


@pytest.fixture(scope="session")
def browser():
    """The browser; playwright gives it a fresh profile of its own and takes that away again."""
    # skips where something is missing, and so never comes here then
    from test_report_browser import CHROMIUM, FLAGS, sync_api  # noqa: PLC0415

    with sync_api.sync_playwright() as playwright:
        started = playwright.chromium.launch(executable_path=CHROMIUM, headless=True, args=FLAGS)
        yield started
        started.close()
