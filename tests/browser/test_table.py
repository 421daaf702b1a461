"""The margin table: sorted by any column, narrowed by filters that work together."""

import math
import re
from collections.abc import Callable

import pytest
from playwright.sync_api import Page

from flowplan.engine.results import Entry
from tests.browser.watching import Open
from tests.support.examples import example

NUMERIC = {"Margin", "Room used", "Drawn", "Keep", "Offset", "Need", "Cpk", "Fails, ppm"}
TEXT = {"Pair", "Axis", "Verdict", "Layers", "Rule"}


def column(page: Page, index: int) -> list[str]:
    """Return the shown cells of a column from top to bottom."""
    cells: list[str] = page.evaluate(
        """i => [...document.querySelectorAll('#margin-table tbody tr')]
           .filter(r => !r.hidden).map(r => r.cells[i].textContent.trim())""",
        index,
    )
    return cells


def number(text: str) -> float:
    plain = text.replace("\N{MINUS SIGN}", "-").replace("∞", "inf").lstrip("<").removesuffix(" %")
    return math.nan if plain == "\N{EN DASH}" else float(plain)


def natural(text: str) -> list[tuple[int, object]]:
    """Order digits as numbers, so that METAL2 stands before METAL10."""
    parts = re.split(r"(\d+)", re.sub(r"[^\w\s+]", "", text.lower()))
    return [(0, int(p)) if p.isdigit() else (1, p) for p in parts if p]


def heads(page: Page) -> list[str]:
    return [t.strip() for t in page.locator("#margin-table thead th").all_text_contents()]


def sort_by(page: Page, head: str) -> str:
    cell = page.locator("#margin-table thead th").filter(
        has=page.get_by_role("button", name=head, exact=True)
    )
    cell.get_by_role("button").click()
    states = page.locator("#margin-table thead th[aria-sort]")
    assert states.count() == 1, "one column at a time says how it is sorted"
    return cell.get_attribute("aria-sort") or ""


def test_every_column_sorts(show: Open) -> None:
    assert set(heads(show())) == NUMERIC | TEXT


@pytest.mark.parametrize("head", sorted(NUMERIC))
def test_numbers_sort_by_value_both_ways_and_gaps_stay_last(head: str, show: Open) -> None:
    page = show()
    index = heads(page).index(head)
    before = column(page, index)
    for direction, sign in (("ascending", 1), ("descending", -1)):
        assert sort_by(page, head) == direction
        values = [number(text) for text in column(page, index)]
        known = [v for v in values if not math.isnan(v)]
        assert len(values) == len(before)
        assert len(set(known)) > 3
        assert known == sorted(known, key=lambda v: sign * v)
        assert all(math.isnan(v) for v in values[len(known) :])


@pytest.mark.parametrize("head", sorted(TEXT))
def test_texts_sort_both_ways(head: str, show: Open) -> None:
    page = show()
    index = heads(page).index(head)
    before = column(page, index)
    assert sort_by(page, head) == "ascending"
    up = column(page, index)
    assert sort_by(page, head) == "descending"
    down = column(page, index)
    assert sorted(up) == sorted(down) == sorted(before)
    distinct = list(dict.fromkeys(up))
    assert len(distinct) == len(set(up)) > 1
    assert list(dict.fromkeys(down)) == distinct[::-1]
    if head in ("Axis", "Verdict", "Rule"):
        assert distinct == sorted(distinct, key=natural)


def test_rows_stay_whole_when_sorted(show: Open) -> None:
    page = show()
    rows = page.locator("#margin-table tbody tr")
    before = sorted(rows.all_text_contents())
    sort_by(page, "Margin")
    assert sorted(rows.all_text_contents()) == before
    worst = example("cmos").worst
    assert worst is not None
    assert worst.pair.name in rows.first.text_content()


def test_masks_sort_too(show: Open) -> None:
    page = show()
    table = page.locator("table.masks")
    table.get_by_role("button", name="Id", exact=True).click()
    ids = table.locator("tbody th").all_text_contents()
    assert [i.split()[0] for i in ids][:3] == ["ACTIVE", "CONTACT", "GATE"]


def test_filters_narrow_together_and_the_count_is_said(show: Open) -> None:
    page = show()
    entries = example("cmos").entries
    status = page.get_by_role("status")
    assert status.text_content() == f"All {len(entries)} checks shown"

    def shown(keep: Callable[[Entry], bool]) -> None:
        wanted = [e for e in entries if keep(e)]
        assert 0 < len(wanted) < len(entries)
        assert column(page, 0) == [e.pair.name for e in wanted]
        assert status.text_content() == f"{len(wanted)} of {len(entries)} checks shown"

    page.get_by_label("Axis").select_option("y")
    shown(lambda e: e.axis == "y")
    page.locator("#f-layer").select_option("CONTACT")
    shown(lambda e: e.axis == "y" and "CONTACT" in e.layers)
    page.get_by_label("Verdict").select_option("pass")
    shown(lambda e: e.axis == "y" and "CONTACT" in e.layers and e.verdict == "pass")
    page.get_by_label("Text").fill("inside  POLY")
    shown(lambda e: e.axis == "y" and {"CONTACT", "POLY2"} == set(e.layers) and e.verdict == "pass")
    page.get_by_role("button", name="Show all, in file order").click()
    assert column(page, 0) == [e.pair.name for e in entries]
    assert page.get_by_label("Text").input_value() == ""


def test_filter_that_matches_nothing_says_so(show: Open) -> None:
    page = show()
    page.get_by_label("Text").fill("no such pair")
    assert column(page, 0) == []
    assert page.get_by_role("status").text_content() == "0 of 42 checks shown"


@pytest.mark.parametrize("verdict", ["fail", "tight", "pass", "unjudged"])
def test_each_verdict_can_be_picked(verdict: str, show: Open) -> None:
    page = show()
    page.get_by_label("Verdict").select_option(verdict)
    wanted = [e.pair.name for e in example("cmos").entries if e.verdict == verdict]
    assert column(page, 0) == wanted != []


def test_sorting_keeps_the_filter(show: Open) -> None:
    page = show()
    page.get_by_label("Verdict").select_option("tight")
    sort_by(page, "Margin")
    margins = [number(t) for t in column(page, heads(page).index("Margin"))]
    assert margins == sorted(margins)
    assert len(margins) == example("cmos").counts["tight"]


def test_layer_of_the_tree_narrows_the_table_and_leads_to_its_row(show: Open) -> None:
    page = show()
    page.locator(".tree a[*|href='#m10']").first.click()
    assert page.evaluate("location.hash") == "#m10"
    layer = list(example("cmos").flow.layers)[9]
    assert column(page, 0) == [e.pair.name for e in example("cmos").entries if layer in e.layers]
    assert page.evaluate("document.activeElement.id") == "m10"
