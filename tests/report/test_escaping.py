"""Text of the flow stays text: in HTML, in the drawing, in the notebook's table."""

import pytest

from flowplan.report.notebook import summary_html
from tests.support import hostile
from tests.support.flows import margins_of
from tests.support.hostile import hostile_flow
from tests.support.page import Element, parse_page

#: Elements that the page's own templates write.
OWN_TAGS = {
    *(
        "html",
        "head",
        "meta",
        "title",
        "style",
        "body",
        "script",
        "header",
        "nav",
        "main",
        "section",
        "footer",
    ),
    *("h1", "h2", "h3", "p", "a", "b", "i", "span", "code", "div", "ol", "ul", "li", "dl", "dt", "dd"),
    *("table", "caption", "thead", "tbody", "tr", "th", "td", "details", "summary", "figure", "figcaption"),
    *("label", "input", "select", "option", "button"),
    *(
        "svg",
        "defs",
        "marker",
        "use",
        "g",
        "path",
        "rect",
        "ellipse",
        "circle",
        "polygon",
        "polyline",
        "text",
    ),
}


def folded(text: str) -> str:
    return " ".join(text.split())


def test_no_element_comes_from_the_flow(hostile_page: Element) -> None:
    assert {e.tag for e in hostile_page.walk()} <= OWN_TAGS
    assert len(hostile_page.all("script")) == 1
    assert not hostile_page.all("img")


def test_no_attribute_handles_an_event_or_holds_style(hostile_page: Element) -> None:
    names = {name for e in hostile_page.walk() for name in e.attributes}
    assert not {name for name in names if name.startswith("on")}
    assert "style" not in names


def test_every_link_leads_to_a_place_in_the_page(hostile_page: Element) -> None:
    places = {e.attributes["id"] for e in hostile_page.walk() if "id" in e.attributes}
    links = [e.attributes.get(k) for e in hostile_page.walk() for k in ("href", "xlink:href")]
    links = [link for link in links if link is not None]
    assert len(links) > 40
    assert [link for link in links if link[0] != "#" or link[1:] not in places] == []


@pytest.mark.parametrize("text", hostile.TEXTS)
def test_every_hostile_text_is_shown_as_it_is(text: str, hostile_page: Element) -> None:
    assert folded(text) in hostile_page.one("body").text


def test_every_free_text_of_a_part_is_shown(hostile_page: Element) -> None:
    """Title, notes, owner and why of the tool, the term, the mask, the feature and the pair."""
    (tool,) = [e for e in hostile_page.all("h3") if e.attributes.get("id") == "t1"]
    assert tool.text == hostile.IMAGE
    for place in ("#tools", "#masks", "#selfaligned", "#pairs"):
        text = hostile_page.by_id(place[1:]).text
        for free in (hostile.CLOSING, hostile.SCRIPT, hostile.QUOTES, hostile.TEMPLATE):
            assert folded(free) in text, (place, free)
    head = hostile_page.one("header").text
    assert folded(hostile.DOT) in head
    assert hostile.LINK in head


def test_title_of_the_document_is_text(hostile_page: Element) -> None:
    title = hostile_page.one("head").one("title").text
    assert title.startswith(hostile.SCRIPT + hostile.CLOSING)


def test_layers_in_the_tree_are_text(hostile_page: Element) -> None:
    tree = hostile_page.one("svg", css="tree")
    labels = {text.text for text in tree.all("text")}
    assert {hostile.SCRIPT, hostile.HASH, hostile.QUOTES, hostile.ENTITY, hostile.LINK} <= labels
    assert {a.attributes["xlink:href"] for a in tree.all("a") if a.attributes.get("xlink:href")} == {
        f"#m{i}" for i in range(1, 6)
    }


def test_filter_offers_layers_as_text_with_anchors_as_values(hostile_page: Element) -> None:
    options = hostile_page.by_id("f-layer").all("option")
    assert [o.attributes["value"] for o in options] == ["", "m1", "m2", "m3", "m4", "m5"]
    assert {hostile.SCRIPT, hostile.QUOTES} <= {o.text for o in options}


def test_templates_in_the_flow_are_not_run(hostile_text: str) -> None:
    assert "49" not in parse_page(hostile_text).one("header").text
    assert "{{ 7 * 7 }}" in hostile_text


def test_notebook_summary_escapes() -> None:
    page = parse_page(summary_html(margins_of(hostile_flow())))
    assert {e.tag for e in page.walk()} == {"table", "caption", "thead", "tbody", "tr", "th", "td"}
    assert {name for e in page.walk() for name in e.attributes} == {"scope"}
    assert hostile.SCRIPT in page.one("caption").text
    assert hostile.LINK in page.text
