"""One Chromium for each worker, and pages that watch what a report does."""

import os
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest
from playwright.sync_api import Browser, BrowserContext, Page, sync_playwright

from flowplan.report.page import render_report
from tests.browser.watching import Open, Watch
from tests.support.examples import EXAMPLES, example_text
from tests.support.flows import margins_of
from tests.support.hostile import hostile_flow

_NAMES = ("chromium", "chromium-browser", "google-chrome", "chrome")


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    here = Path(__file__).parent
    for item in items:
        if here in item.path.parents:
            item.add_marker(pytest.mark.browser)


@pytest.fixture(scope="session")
def browser() -> Iterator[Browser]:
    """Start the system's Chromium; without one, skip here and fail where everything must run."""
    program = next(filter(None, map(shutil.which, _NAMES)), None)
    if program is None:
        reason = "no Chromium on this machine, so nothing here looks at a report as a reader does"
        if os.environ.get("CI"):
            pytest.fail(reason)
        pytest.skip(reason)
    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=program, args=["--no-sandbox"])
        yield browser
        browser.close()


@pytest.fixture(scope="session")
def reports(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Path]:
    """Write a report where the browser can open it: an example flow's, or the hostile one."""
    folder = tmp_path_factory.mktemp("reports")

    def path(name: str) -> Path:
        file = folder / f"{name}.html"
        if not file.exists():
            text = example_text(name) if name in EXAMPLES else render_report(margins_of(hostile_flow()))
            file.write_text(text, encoding="utf-8")
        return file

    return path


@pytest.fixture
def watch() -> Watch:
    """Note what the pages of one test do."""
    return Watch()


@pytest.fixture
def show(browser: Browser, reports: Callable[[str], Path], watch: Watch) -> Iterator[Open]:
    """Open a report in a fresh context: ``show("cmos", width=375, dark=True, script=False, at="p3")``."""
    contexts: list[BrowserContext] = []

    def open_page(
        name: str | Path = "cmos", *, width: int = 1280, dark: bool = False, script: bool = True, at: str = ""
    ) -> Page:
        context = browser.new_context(
            viewport={"width": width, "height": 900},
            color_scheme="dark" if dark else "light",
            java_script_enabled=script,
        )
        context.set_default_timeout(10_000)
        contexts.append(context)
        page = context.new_page()
        watch.on(page)
        file = name if isinstance(name, Path) else reports(name)
        page.goto(file.as_uri() + (f"#{at}" if at else ""))
        return page

    yield open_page
    for context in contexts:
        context.close()
