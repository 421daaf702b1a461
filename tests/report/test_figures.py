"""Figures on the page are those of the JSON document, rounded to the digits shown."""

import re
from typing import Any

import pytest

from flowplan.model.flow import BASES
from flowplan.report.records import margins_document
from tests.support.examples import example, example_page
from tests.support.page import Element

WORDS = {"pass": "pass", "tight": "tight", "fail": "fail", "unjudged": "not judged"}


def documents(name: str) -> list[dict[str, Any]]:
    records: list[dict[str, Any]] = margins_document(example(name))["margins"]
    return records


def agrees(shown: str, exact: float | None) -> None:
    """Assert that a figure as shown is the exact one within half of its last digit."""
    text = shown.replace("\N{MINUS SIGN}", "-").lstrip("±+")
    if exact is None:
        assert text in ("\N{EN DASH}", "∞", "-∞")
        return
    if text == "0" or exact == 0:
        assert (text, exact) == ("0", 0), "a small rest is not shown as 0"
        return
    mantissa, _, exponent = text.partition("e")
    decimals = len(mantissa.partition(".")[2])
    half = 0.5 * 10.0 ** (int(exponent or 0) - decimals)
    assert float(text) == pytest.approx(exact, abs=half * 1.0000001)


def cells(row: list[Element]) -> list[str]:
    return [cell.text for cell in row]


def test_margin_table(name: str) -> None:
    rows, records = example_page(name).by_id("margin-table").rows(), documents(name)
    basis = example(name).flow.basis
    for row, record in zip(rows, records, strict=True):
        pair, axis, verdict, margin, _, layers, rule, drawn, keep, offset, need, cpk, ppm = cells(row)
        judged = record["margin"] is not None
        assert (pair, axis, rule) == (record["pair"], record["axis"], record["rule"])
        assert verdict == WORDS[record["verdict"]]
        assert layers == ", ".join(record["layers"])
        agrees(margin, record["margin"][basis] if judged else None)
        is_landing = record["rule"] == "landing"
        agrees(need, None if is_landing else record["need"][basis])
        agrees(offset, record["offset"])
        agrees(drawn, record["drawn"])
        agrees(keep, record["keep"] if judged else None)
        agrees(cpk, record["cpk"])
        if record["fail_ppm"] is None:
            assert ppm == "\N{EN DASH}"
        elif record["fail_ppm"] >= 0.001:
            assert float(ppm) == pytest.approx(record["fail_ppm"], rel=5.1e-3)


def test_share_of_the_room_is_need_over_room(name: str) -> None:
    basis = example(name).flow.basis
    for row, record in zip(example_page(name).by_id("margin-table").rows(), documents(name), strict=True):
        if record["margin"] is None:
            assert row[4].text == "\N{EN DASH}"
            continue
        room = record["nominal"] - record["keep"]
        assert room > 0, "no example is drawn without room"
        shown = re.fullmatch(r"<?(\d+) %", row[4].text)
        assert shown is not None
        assert int(shown[1]) == pytest.approx(100 * record["need"][basis] / room, abs=0.51)


def test_fold_outs(name: str) -> None:
    records = iter(r for r in documents(name) if r["rule"] != "landing")
    for fold in example_page(name).all("details", css="pair"):
        for block in fold.all("div", css="block"):
            facts = [cells(row) for row in block.one("table", css="facts").rows()]
            for column, axis in enumerate(block.all("div", css="axis"), start=1):
                record = next(records)
                check_facts({row[0]: row[column] for row in facts}, record)
                assert axis.one("b").text == record["axis"]
                assert chain_of(axis) == record["chain"]
    assert next(records, None) is None


def check_facts(facts: dict[str, str], record: dict[str, Any]) -> None:
    agrees(facts["Limit" if record["rule"] == "overlay" else "Drawn"], record["drawn"])
    agrees(facts["Offset, worse side"], record["offset"])
    agrees(facts["Bounds"], record["bound"])
    agrees(facts["Random at 3σ"], record["random"])
    agrees(facts["Overlay at 3σ, exact"], record["overlay"]["random"])
    agrees(facts["Overlay at 3σ, plain RSS"], record["chain_rss"])
    agrees(facts["Cpk"], record["cpk"])
    for basis in BASES:
        (text,) = [value for label, value in facts.items() if label.split(" (")[0] == f"Basis {basis}"]
        figures = re.findall(r"(?:need|margin) (\S+?)(?:,|$)", text)
        agrees(figures[0], record["need"][basis])
        if record["margin"] is None:
            assert len(figures) == 1
        else:
            agrees(figures[1], record["margin"][basis])
    numbers = [
        float(n) for n in re.findall(r"-?[\d.]+", facts["Worst point, mm"].replace("\N{MINUS SIGN}", "-"))
    ]
    point = record["point"]
    assert numbers == ([] if point is None else pytest.approx([point[k] for k in ("X", "Y", "x", "y")]))


def chain_of(axis: Element) -> list[str]:
    text = axis.all("p")[0].text.removesuffix(" (one of several ways)")
    return re.split(r" [↑↓] ", text.split(" ", 1)[1])


def test_answer(name: str) -> None:
    answer, result = example_page(name).by_id("answer"), example(name)
    counts = {
        li.all("b")[1].text: int(li.all("b")[0].text) for li in answer.one("ul", css="counts").all("li")
    }
    assert counts == {WORDS[verdict]: n for verdict, n in result.counts.items()}
    worst = min(
        (r for r in documents(name) if r["margin"] is not None), key=lambda r: r["margin"][result.flow.basis]
    )
    assert answer.one("h3").text == f"Smallest margin: {worst['pair']} in {worst['axis']}"
    figures = {div.one("dt").text: div.one("dd").text for div in answer.one("dl", css="figures").all("div")}
    agrees(figures["Margin"].split()[0], worst["margin"][result.flow.basis])
    agrees(figures["Need"].split()[0], worst["need"][result.flow.basis])
    agrees(figures["Room"].split()[0], worst["nominal"] - worst["keep"])
    agrees(figures["Cpk"], worst["cpk"])


def test_drawing_of_the_worst_chain_shows_every_layer_of_it(name: str) -> None:
    answer, worst = example_page(name).by_id("answer"), example(name).worst
    assert worst is not None
    drawn = [t.text for t in answer.one("svg", css="chain").all("text") if "hop" not in t.classes]
    assert sorted(drawn) == sorted(worst.chain.layers)
    hops = [row[0].text for row in answer.one("table", css="hops").rows()]
    assert len(hops) == len(worst.chain.layers) - 1
    assert [tuple(re.split(" reads | follows ", hop)) for hop in hops] == list(worst.chain.hops())
