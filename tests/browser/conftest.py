"""A Chromium with its network off, and pages that keep a log of what they try to do."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from tests.sheets.made_up_run import Row, made_up_run

if TYPE_CHECKING:
    from playwright.sync_api import Browser, Page

_NAMES = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable", "chrome")


@dataclass(frozen=True, slots=True, kw_only=True)
class Opened:
    """A page and what it logged: console lines, errors, requests beyond its own file, dialogs."""

    page: Page
    log: list[str] = field(default_factory=list)


Opener = Callable[..., Opened]


@pytest.fixture
def document() -> Row:
    """Return a whole document of a 20 km run with every placement."""
    return made_up_run()


@pytest.fixture
def hostile_document() -> Row:
    """Return the same run with names that would be run if a page took them for its own."""
    return made_up_run(hostile=True)


@pytest.fixture(scope="session")
def chromium() -> Iterator[Browser]:
    """Start the Chromium of this machine, or skip with the reason if it has none."""
    path = next((found for name in _NAMES if (found := shutil.which(name))), None)
    if path is None:
        pytest.skip("no Chromium on this machine: pages are not opened in a browser")
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=path)
        yield browser
        browser.close()


@pytest.fixture
def open_html(chromium: Browser, tmp_path: Path) -> Iterator[Opener]:
    """Return a function that opens HTML from disk, offline; at the end every log must be empty."""
    contexts = []
    opened_pages: list[Opened] = []

    def open_page(
        html: str, *, width: int = 1280, height: int = 860, touch: bool = False
    ) -> Opened:
        path = tmp_path / f"page{len(opened_pages)}.html"
        path.write_text(html, "utf-8")
        context = chromium.new_context(
            viewport={"width": width, "height": height}, offline=True, has_touch=touch
        )
        contexts.append(context)
        opened = Opened(page=context.new_page())
        opened_pages.append(opened)
        _keep_log(opened, path)
        opened.page.goto(path.as_uri())
        if "run-data" in html:
            opened.page.wait_for_function("document.documentElement.dataset.ready === 'yes'")
        return opened

    yield open_page
    for context in contexts:
        context.close()
    assert [opened.log for opened in opened_pages] == [[] for _ in opened_pages]


def _keep_log(opened: Opened, path: Path) -> None:
    page, log = opened.page, opened.log
    page.on("console", lambda message: log.append(f"console: {message.text}"))
    page.on("pageerror", lambda error: log.append(f"error: {error}"))
    page.on(
        "request",
        lambda request: None if request.url == path.as_uri() else log.append(request.url),
    )

    def refuse(dialog: object) -> None:
        log.append("dialog")
        dialog.dismiss()  # type: ignore[attr-defined]

    page.on("dialog", refuse)
