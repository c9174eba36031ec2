"""One server, started as a person starts it, and one browser for all tests; each test has a page of its own.

The browser is the one of the system: nothing is downloaded.
"""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest
from playwright.sync_api import Browser, ConsoleMessage, Page, sync_playwright

from tests.browser.served import served
from tests.filled_archive import filled
from tests.outside import program


@pytest.fixture(scope="session")
def browser() -> Iterator[Browser]:
    """Give the system's Chromium, without a window."""
    path = program("chromium")
    with sync_playwright() as playwright:
        # As root, and in a container without user namespaces, its sandbox cannot be made; the pages are our own.
        browser = playwright.chromium.launch(executable_path=path, args=["--no-sandbox", "--disable-gpu"])
        yield browser
        browser.close()


@pytest.fixture(scope="session")
def archive_root(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give the folder of a filled archive."""
    return filled(tmp_path_factory.mktemp("looked-at"))


@pytest.fixture(scope="session")
def server(archive_root: Path) -> Iterator[str]:
    """Give the address of a server of that archive, without a solidus at its end."""
    with served(archive_root) as address:
        yield address


@pytest.fixture
def page(browser: Browser, server: str) -> Iterator[Page]:
    """Give a page of 1280 by 900 with the server as its base; whatever its console complains about fails the test."""
    context = browser.new_context(base_url=server, viewport={"width": 1280, "height": 900}, locale="en-GB")
    page = context.new_page()
    complaints: list[str] = []

    def said(message: ConsoleMessage) -> None:
        # A browser says of every answer of 400 and above that it failed to load; the tests of those pages know.
        if message.type in ("error", "warning") and "the server responded with a status" not in message.text:
            complaints.append(message.text)

    page.on("console", said)
    page.on("pageerror", lambda error: complaints.append(str(error)))
    yield page
    context.close()
    assert complaints == []
