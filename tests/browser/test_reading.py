"""A report as a reader meets it: silent, reachable by keyboard, accessible, within the screen, on paper."""

import io
import re
import unicodedata
from pathlib import Path

import pytest
from axe_playwright_python.sync_playwright import Axe
from playwright.sync_api import Page
from pypdf import PdfReader

from tests.browser.watching import Open, Watch
from tests.support import hostile
from tests.support.examples import EXAMPLES, example, example_text

PHONE, DESKTOP = 375, 1280


def open_all(page: Page) -> None:
    page.get_by_role("button", name="Open all").click()


@pytest.mark.parametrize("name", [*EXAMPLES, "hostile"])
def test_report_is_silent_asks_for_nothing_and_fits_a_phone(name: str, show: Open, watch: Watch) -> None:
    page = show(name, width=PHONE)
    open_all(page)
    page.get_by_role("button", name="Margin").click()
    page.wait_for_load_state("networkidle")
    assert watch.messages == []
    assert watch.dialogs == []
    assert watch.requests == [page.url]
    widths = page.evaluate("[document.documentElement.scrollWidth, document.body.scrollWidth, innerWidth]")
    assert widths == [PHONE, PHONE, PHONE]


def test_no_text_of_a_flow_becomes_script(show: Open, watch: Watch) -> None:
    page = show("hostile")
    open_all(page)
    for link in page.locator("a").all()[:60]:
        link.dispatch_event("mouseover")
    assert page.locator("script").count() == 1
    assert page.evaluate("document.querySelectorAll('img, iframe, object, embed').length") == 0
    assert (
        page.evaluate(
            "[...document.querySelectorAll('*')].flatMap(e => [...e.attributes])"
            ".filter(a => /^on/i.test(a.name)).length"
        )
        == 0
    )
    assert page.locator("h1").text_content() == hostile.SCRIPT + hostile.CLOSING
    assert watch.dialogs == []


def test_policy_stops_a_script_that_got_in(show: Open, watch: Watch, tmp_path: Path) -> None:
    """Even if a text did escape, the page would not run it."""
    breach = (
        "<script>window.ran = 1</script><script src=x.js></script><img src=x.png onerror='window.ran = 2'>"
        "<b id=b onclick='window.ran = 3'>b</b><a id=a href='javascript:window.ran=4'>a</a><main"
    )
    file = tmp_path / "breached.html"
    file.write_text(example_text("photonic").replace("<main", breach, 1), encoding="utf-8")
    (tmp_path / "x.js").write_text("window.ran = 5", encoding="utf-8")
    page = show(file)
    page.locator("#b").click()
    page.locator("#a").click()
    assert page.evaluate("window.ran") is None
    assert len([message for message in watch.messages if "Content Security Policy" in message]) >= 5


def test_link_from_the_margin_table_opens_the_fold_out(show: Open) -> None:
    page = show()
    fold = page.locator("#p3")
    assert not fold.evaluate("e => e.open")
    page.locator("#margin-table a[href='#p3']").first.click()
    assert fold.evaluate("e => e.open")
    assert page.evaluate("document.activeElement.parentElement.id") == "p3"


def test_address_with_a_place_opens_the_fold_out(show: Open) -> None:
    page = show(at="p5")
    assert page.locator("details.pair[open]").evaluate_all("all => all.map(e => e.id)") == ["p5"]


def test_place_that_does_not_exist_does_no_harm(show: Open, watch: Watch) -> None:
    show(at="p999")
    show(at="%22%5D")
    assert watch.messages == []


def test_all_fold_outs_open_and_close(show: Open) -> None:
    page = show()
    opened = page.locator("details.pair[open]")
    open_all(page)
    assert opened.count() == len(example("cmos").flow.pairs)
    page.get_by_role("button", name="Close all").click()
    assert opened.count() == 0


def test_keyboard_reaches_everything_that_can_be_used(show: Open) -> None:
    page = show("pressure_sensor")
    total = page.locator("a, button, input, select, summary, [tabindex]").count()
    seen: set[str] = set()
    for _ in range(total + 1):
        page.keyboard.press("Tab")
        where = page.evaluate(
            """() => { const e = document.activeElement, all = [...document.querySelectorAll('*')];
            return e === document.body ? '' : e.tagName.toLowerCase() + '#' + all.indexOf(e); }"""
        )
        if not where:
            break
        seen.add(where)
    tags = {
        tag: sum(w.startswith(f"{tag}#") for w in seen)
        for tag in ("a", "button", "input", "select", "summary")
    }
    for tag, n in tags.items():
        assert n == page.evaluate(
            "t => [...document.querySelectorAll(t)].filter(e => e.checkVisibility()).length",
            "a[*|href]" if tag == "a" else tag,
        ), tag
    assert any(w.startswith("div#") for w in seen), "boxes that scroll can be reached and scrolled"


def test_keyboard_works_the_controls(show: Open) -> None:
    page = show()
    page.keyboard.press("Tab")
    assert page.evaluate("document.activeElement.textContent") == "Skip to the report"
    page.keyboard.press("Enter")
    assert page.evaluate("document.activeElement.id") == "main"
    page.locator("#p1 > summary").focus()
    page.keyboard.press("Enter")
    assert page.locator("#p1").evaluate("e => e.open")
    page.locator("#margin-table thead button").first.focus()
    page.keyboard.press("Space")
    assert page.locator("#margin-table thead th").first.get_attribute("aria-sort") == "ascending"
    outline = page.evaluate("getComputedStyle(document.activeElement).outlineStyle")
    assert outline == "solid", "where the keyboard is can be seen"


@pytest.mark.parametrize(
    ("name", "width", "dark"),
    [
        ("cmos", DESKTOP, False),
        ("pressure_sensor", DESKTOP, True),
        ("pressure_sensor", PHONE, False),
        ("pressure_sensor", PHONE, True),
    ],
)
def test_axe_finds_nothing_serious(name: str, width: int, dark: bool, show: Open) -> None:
    page = show(name, width=width, dark=dark)
    page.locator("details.pair").nth(1).evaluate("e => { e.open = true; }")
    found = Axe().run(page)
    bad = [v for v in found.response["violations"] if v["impact"] in ("serious", "critical")]
    assert [(v["id"], v["nodes"][0]["html"]) for v in bad] == []
    assert len(found.response["passes"]) > 20, "axe did look"


def test_wide_tree_opens_with_its_root_in_sight(show: Open) -> None:
    page = show("logic_backend", width=PHONE)
    box, root = (page.locator(q).bounding_box() for q in (".treebox", ".tree .wafer"))
    assert box is not None
    assert root is not None
    assert box["x"] <= root["x"] <= root["x"] + root["width"] <= box["x"] + box["width"]


def test_dark_is_dark_and_light_is_light(show: Open) -> None:
    def lightness(page: Page, what: str) -> float:
        colour = page.evaluate(f"getComputedStyle(document.body).{what}")
        return sum(map(int, re.findall(r"\d+", colour)[:3])) / 765

    light, dark = show(), show(dark=True)
    assert lightness(light, "backgroundColor") > 0.9
    assert lightness(dark, "backgroundColor") < 0.15
    assert lightness(light, "color") < 0.25
    assert lightness(dark, "color") > 0.8


def test_verdict_is_a_word_and_a_sign_besides_its_colour(show: Open) -> None:
    page = show()
    signs = {
        word: page.locator(f"#margin-table .v.{kind}").first.evaluate(
            "e => [e.textContent, getComputedStyle(e, '::before').content]"
        )
        for word, kind in (("pass", "pass"), ("tight", "tight"), ("fail", "fail"), ("not judged", "unjudged"))
    }
    assert all(text == word for word, (text, _) in signs.items())
    assert len({sign for _, sign in signs.values()}) == 4


def test_whole_report_is_there_without_javascript(show: Open) -> None:
    page = show("cmos", script=False)
    assert page.locator("#margin-table tbody tr").count() == 42
    assert page.locator(".filters").is_hidden()
    assert page.get_by_role("button").count() == 0
    page.locator("#p2 > summary").click()
    assert page.locator("#p2 .facts").is_visible()
    assert page.locator("#p2 .map").first.is_visible()


@pytest.mark.parametrize(("name", "paper"), [("cmos", "A4"), ("pressure_sensor", "Letter")])
def test_print(name: str, paper: str, show: Open) -> None:
    page = show(name)
    page.get_by_label("Text").fill("nothing of this")
    page.get_by_role("button", name="Show all").click()
    pdf = PdfReader(io.BytesIO(page.pdf(format=paper, print_background=True)))
    texts = [" ".join(unicodedata.normalize("NFKC", p.extract_text()).split()) for p in pdf.pages]
    whole = " ".join(texts)
    assert 5 < len(texts) < 30
    assert "These figures are a planning estimate." in whole
    assert "local safety rules and qualified staff decide" in whole
    assert all("Planning estimate, to be confirmed on silicon" in text for text in texts)
    for pair in example(name).flow.pairs:
        assert whole.count(pair.name) >= 2, "in the table and unfolded"
    blocks = {(entry.pair.name, entry.layers) for entry in example(name).entries}
    assert whole.count("Basis linear") == len(blocks), "every fold-out is open on paper"
    assert "Show all, in file order" not in whole
    sizes = {(round(float(p.mediabox.width)), round(float(p.mediabox.height))) for p in pdf.pages}
    assert sizes <= {(596, 843), (843, 596), (595, 842), (842, 595), (612, 792), (792, 612)}
