"""Make the pictures of README from the example flows: ``python -m tests.browser.pictures``.

Needs Chromium and no network. The pictures show what the current code draws, so run it after a change
of the report's or the tables' look, and look at the pictures before you commit them.
"""

import shutil
import sys
import tempfile
from io import StringIO
from pathlib import Path

from playwright.sync_api import Browser, Page, sync_playwright
from rich.console import Console
from rich.terminal_theme import TerminalTheme
from rich.text import Text

from tests.cli.terminal import FLOWPLAN, on_a_terminal
from tests.support.examples import FLOWS, example_text

TARGET = FLOWS / "pictures"
COMMAND = ["margins", "flows/cmos.yaml", "--layer", "CONTACT"]
_NORMAL = [
    *((18, 25, 28), (255, 156, 134), (140, 200, 238), (240, 194, 106)),
    *((134, 203, 230), (200, 170, 230), (116, 180, 202), (232, 230, 221)),
]
_COLOURS = TerminalTheme((18, 25, 28), (232, 230, 221), _NORMAL)
_SHEET = (
    "<!doctype html><meta charset=utf-8><style>body{{margin:0}}"
    "pre{{margin:0;padding:16px 20px;display:inline-block;background:{background};color:{foreground};"
    "font:14px/1.45 'DejaVu Sans Mono',monospace}}{stylesheet}</style><pre>{code}</pre>"
)


def clip(page: Page, name: str, top: str, bottom: str, *, width: int, height: int) -> None:
    """Save the part of a page from one element to another, at most so high."""
    first, last = (page.locator(query).first.bounding_box() for query in (top, bottom))
    assert first is not None
    assert last is not None
    y = max(0.0, first["y"] - 1)
    tall = min(height, last["y"] + last["height"] + 1 - y)
    box = {"x": 0, "y": y, "width": width, "height": tall}
    page.screenshot(path=TARGET / name, clip=box, full_page=True)


def report_pictures(browser: Browser, folder: Path) -> None:
    """Save the report's opening, its tree and one pair unfolded."""
    width = 1180
    page = browser.new_page(viewport={"width": width, "height": 900}, color_scheme="light")
    for name in ("cmos", "logic_backend"):
        (folder / f"{name}.html").write_text(example_text(name), encoding="utf-8")
    page.goto((folder / "cmos.html").as_uri())
    clip(page, "report-top.png", "header", "#answer", width=width, height=1000)
    clip(page, "report-tree.png", ".legend", ".treebox", width=1130, height=1150)
    fold = page.locator("details.pair", has_text="contact inside active").first
    fold.evaluate("e => { e.open = true; e.id = 'picture'; }")
    clip(page, "report-pair.png", "#picture", "#picture", width=width, height=900)


def terminal_picture(browser: Browser) -> None:
    """Save the margins of one layer as a terminal of 80 columns shows them."""
    output = on_a_terminal(*FLOWPLAN, *COMMAND, cwd=FLOWS.parent)
    console = Console(record=True, width=80, file=StringIO(), force_terminal=True)
    console.print(Text(f"$ flowplan {' '.join(COMMAND)}", style="bold"))
    console.print(Text.from_ansi(output.strip()))
    html = console.export_html(theme=_COLOURS, code_format=_SHEET)
    page = browser.new_page(viewport={"width": 900, "height": 900})
    page.set_content(html)
    page.locator("pre").screenshot(path=TARGET / "terminal.png")


def main() -> None:
    """Write all pictures and say how large they are."""
    program = shutil.which("chromium") or shutil.which("google-chrome")
    TARGET.mkdir(exist_ok=True)
    with sync_playwright() as playwright, tempfile.TemporaryDirectory() as folder:
        browser = playwright.chromium.launch(executable_path=program, args=["--no-sandbox"])
        report_pictures(browser, Path(folder))
        terminal_picture(browser)
        browser.close()
    for file in sorted(TARGET.glob("*.png")):
        sys.stdout.write(f"{file.name} {file.stat().st_size // 1024} kB\n")


if __name__ == "__main__":
    main()
