"""The page as a document: one file, no request, a strict policy, whole without JavaScript."""

import base64
import hashlib
import re
from itertools import pairwise

import pytest

from flowplan.report import view
from flowplan.report.page import content_policy, render_report
from tests.support.examples import example, example_page, example_text
from tests.support.flows import bare_flow, margins_of, mask, overlay_pair
from tests.support.page import parse_page

SECTIONS = [
    *("answer", "tree", "margins", "matrix", "pairs", "masks", "tools", "selfaligned", "assumptions"),
    *("glossary", "caution"),
]
#: Names of vocabularies; nobody fetches them.
NAMESPACES = {"http://www.w3.org/2000/svg", "http://www.w3.org/1999/xlink"}


def directives(name: str) -> dict[str, str]:
    (meta,) = [
        e
        for e in example_page(name).all("meta")
        if e.attributes.get("http-equiv") == "Content-Security-Policy"
    ]
    pairs = (rule.split(" ", 1) for rule in meta.attributes["content"].split("; "))
    return dict(pairs)


def sha(text: str) -> str:
    return "'sha256-" + base64.b64encode(hashlib.sha256(text.encode()).digest()).decode() + "'"


def test_policy_allows_the_one_script_and_the_one_style_and_nothing_else(name: str) -> None:
    page, rules = example_page(name), directives(name)
    script, style = "".join(page.one("script").texts()), "".join(page.one("style").texts())
    assert rules == {
        "default-src": "'none'",
        "script-src": sha(script),
        "style-src": sha(style),
        "base-uri": "'none'",
        "form-action": "'none'",
        "require-trusted-types-for": "'script'",
    }


def test_policy_stands_before_anything_that_it_governs() -> None:
    tags = [e.tag for e in example_page("cmos").one("head").walk()]
    assert tags[:2] == ["meta", "meta"]
    assert tags.index("style") > 1


def test_policy_follows_the_text() -> None:
    assert content_policy("a{}", "1;") != content_policy("a{}", "2;")
    assert sha("a{}") in content_policy("a{}", "1;")


def test_no_address_of_anything_outside(name: str) -> None:
    text = example_text(name)
    assert set(re.findall(r"\b\w+://[^\s\"'<>)]+", text)) <= NAMESPACES
    assert "@import" not in text
    assert set(re.findall(r"url\(([^)]*)\)", text)) <= {"#arrow"}
    assert not {e.tag for e in example_page(name).walk()} & {
        "img",
        "link",
        "iframe",
        "object",
        "embed",
        "base",
    }
    assert not [e for e in example_page(name).walk() if "src" in e.attributes or "srcset" in e.attributes]


def test_no_style_attribute_that_the_policy_would_refuse(name: str) -> None:
    assert not [e.tag for e in example_page(name).walk() if "style" in e.attributes]


def test_every_id_is_there_once_and_every_link_has_a_target(name: str) -> None:
    page = example_page(name)
    ids = [e.attributes["id"] for e in page.walk() if "id" in e.attributes]
    assert len(ids) == len(set(ids))
    links = {e.attributes.get("href", e.attributes.get("xlink:href")) for e in page.walk()} - {None}
    assert {link for link in links if link is not None and link[1:] not in ids} == set()
    named = {e.attributes[k] for e in page.walk() for k in ("aria-labelledby",) if k in e.attributes}
    assert named <= set(ids)


def test_sections_come_in_the_order_of_the_contents(name: str) -> None:
    page = example_page(name)
    landing = ["landing"] if example(name).landings else []
    at = SECTIONS.index("margins") + 1
    assert [s.attributes["id"] for s in page.all("section")] == [*SECTIONS[:at], *landing, *SECTIONS[at:]]
    contents = [(a.attributes["href"][1:], a.text) for a in page.one("nav").all("a")]
    heads = [(s.attributes["id"], s.one("h2").text) for s in page.all("section")]
    assert contents == heads


def test_headings_descend_one_level_at_a_time(name: str) -> None:
    levels = [int(e.tag[1]) for e in example_page(name).walk() if re.fullmatch(r"h\d", e.tag)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(b <= a + 1 for a, b in pairwise(levels))


def test_only_controls_need_javascript(name: str) -> None:
    """What is hidden until the script runs is filters, buttons, the count and what explains them."""
    page = example_page(name)
    hidden = [e for e in page.walk() if "hidden" in e.attributes]
    assert [e.tag for e in hidden] == ["span", "div", "p", "p"]
    assert all("js-only" in e.classes for e in hidden)
    assert not [e for e in hidden if e.all("table") or e.all("svg")]


def test_every_check_is_in_the_html(name: str) -> None:
    page, result = example_page(name), example(name)
    assert len(page.by_id("margin-table").rows()) == len(result.checks)
    folds = page.all("details", css="pair")
    assert len(folds) == len(result.flow.pairs) - len(result.landings)
    assert sum(len(f.all("div", css="axis")) for f in folds) == len(result.entries)


def test_caution_says_that_people_decide(name: str) -> None:
    caution = example_page(name).by_id("caution").text
    assert "planning estimate" in caution
    assert "confirmed on silicon" in caution
    assert "local safety rules and qualified staff decide" in caution


def test_progress_counts_the_pairs() -> None:
    seen: list[tuple[int, int]] = []
    render_report(example("photonic"), progress=lambda done, total: seen.append((done, total)))
    n = len(example("photonic").flow.pairs)
    assert seen == [(i, n) for i in range(1, n + 1)]


def test_flow_without_pairs_has_a_report() -> None:
    page = parse_page(render_report(margins_of(bare_flow([mask("A"), mask("B", "A")], []))))
    assert "Nothing is judged" in page.by_id("answer").text
    assert page.by_id("margin-table").rows() == []
    assert "The flow names no pair." in page.by_id("pairs").text
    assert "The flow has no self-aligned step." in page.by_id("selfaligned").text


def test_same_flow_gives_the_same_page() -> None:
    data = bare_flow([mask("A"), mask("B", "A")], [overlay_pair("A", "B", limit=9)])
    assert render_report(margins_of(data)) == render_report(margins_of(data))


def test_version_is_left_out_where_nothing_is_installed(monkeypatch: pytest.MonkeyPatch) -> None:
    def missing(name: str) -> str:
        raise view.PackageNotFoundError(name)

    monkeypatch.setattr(view, "version", missing)
    data = bare_flow([mask("A")], [])
    assert view.report_view(margins_of(data)).head.version == ""
