"""What each section says, on small flows whose figures are known by hand."""

import math
import re

import pytest

from flowplan.engine.analysis import Result
from flowplan.report.notebook import summary_html
from flowplan.report.view import ReportView, report_view
from flowplan.report.viewanswer import point_words
from flowplan.report.viewbase import Base
from flowplan.report.viewbudget import SHOWN, BudgetBook
from flowplan.report.viewhops import HopBook, chain_text, compared_words
from flowplan.report.viewmap import LEVELS, levels, map_frame
from flowplan.report.viewmargins import used_share
from flowplan.report.viewmatrix import matrix_view
from tests.support.examples import example
from tests.support.flows import Data, bare_flow, entry, margins_of, mask, overlay_pair
from tests.support.page import parse_page

#: Each reading adds 30 nm; B and C both read A, D reads C.
READINGS = {"tool": {"alignment": 30}}
FOUR = [mask("A", tool="tool"), mask("B", "A"), mask("C", "A"), mask("D", "C")]


def view_of(masks: list[Data], pairs: list[Data], **more: object) -> ReportView:
    return report_view(margins_of(bare_flow(masks, pairs, **more)))


def four(*pairs: Data, **more: object) -> Result:
    return margins_of(
        bare_flow(FOUR, list(pairs), tools={"tool": {"alignment": 30, "wafer_alignment": 1}}, **more)
    )


def compared(result: Result, name: str) -> str:
    return compared_words(HopBook(Base(result)), entry(result, name))


# --- answer


@pytest.mark.parametrize(
    ("limits", "headline"),
    [
        ([50], "The one check passes."),
        ([50, 60], "All 2 checks pass."),
        ([20, 60], "1 check of 2 fails."),
        ([20, 20, 60], "2 checks of 3 fail."),
        ([31, 60], "No check fails; 1 of 2 is tight."),
        ([31, 31], "No check fails; 2 of 2 are tight."),
    ],
)
def test_headline(limits: list[float], headline: str) -> None:
    pairs = [
        overlay_pair("A", "B", axes="x", limit=limit) | {"name": f"p{i}"} for i, limit in enumerate(limits)
    ]
    assert report_view(four(*pairs, reserve=0.1)).answer.headline == headline


def test_detail_counts_what_is_not_judged() -> None:
    judged = overlay_pair("A", "B", axes="x", limit=50)
    free = overlay_pair("A", "C", axes="xy")
    assert report_view(four(judged)).answer.detail.startswith("1 check on 1 pair. ")
    assert report_view(four(judged, free)).answer.detail.startswith(
        "3 checks on 2 pairs, 2 of them not judged. "
    )
    unjudged = report_view(four(free)).answer
    assert unjudged.detail.startswith("2 checks on 1 pair. ")
    assert unjudged.worst is None
    assert unjudged.headline == "Nothing is judged: no pair has a drawn dimension or a limit."


def test_worst_chain_hop_by_hop() -> None:
    worst = report_view(four(overlay_pair("B", "D", axes="x", limit=50))).answer.worst
    assert worst is not None
    assert [(h.child.id, h.how, h.reference.id, h.random) for h in worst.hops] == [
        ("B", "reads", "A", "30.00"),
        ("C", "reads", "A", "30.00"),
        ("D", "reads", "C", "30.00"),
    ]
    assert [line.label for line in worst.drawing.lines] == ["±30.00"] * 3
    assert worst.need == f"{30 * math.sqrt(3):.2f}"
    assert worst.point == "the same everywhere"
    assert worst.compared.startswith(
        "The random part of their overlay is ±51.96 nm; plain RSS along the chain gives"
    )


def test_hop_with_nothing_but_an_offset_is_labelled_with_its_sign() -> None:
    masks = [mask("A"), mask("B", "A", terms={"camera": {"offset": -4}})]
    worst = view_of(masks, [overlay_pair("A", "B", axes="x", limit=9)]).answer.worst
    assert worst is not None
    assert worst.drawing.lines[0].label == "\N{MINUS SIGN}4.0"
    assert worst.compared == (
        "The random part of their overlay is ±0 nm. Exact and plain RSS are both 0: "
        "nothing random comes between them."
    )


def test_point_is_worded_with_its_field_and_site() -> None:
    text = point_words(example("cmos").entries[0])
    assert re.fullmatch(r"field\u00a0\(−?\d+,\u00a0−?\d+\), site\u00a0\(−?[\d.]+,\u00a0−?[\d.]+\)", text)


# --- what plain chain RSS gets wrong


def test_plain_rss_along_a_single_hop_is_the_exact_value() -> None:
    assert compared(four(overlay_pair("A", "B", limit=9)), "A-B") == (
        "The chain is a single hop, so plain RSS says the same."
    )


def test_plain_rss_agrees_where_nothing_is_shared() -> None:
    assert compared(four(overlay_pair("B", "D", limit=9)), "B-D").startswith("Plain RSS agrees")


def test_plain_rss_is_too_high_where_a_source_cancels() -> None:
    """Both hops see the pattern error of A, 40 nm; between B and C it cancels: 100 against 84.9 nm."""
    masks = [mask("A"), mask("B", "A"), mask("C", "A")]
    tool = {"alignment": 60, "terms": {"lens": {"random": 40, "enters": "pattern", "common": 1}}}
    result = margins_of(
        bare_flow(
            [masks[0] | {"tool": "other"}, *masks[1:]],
            [overlay_pair("B", "C", limit=200)],
            tools={"tool": tool, "other": {"wafer_alignment": 1}},
        )
    )
    assert compared(result, "B-C") == (
        "Plain RSS is 17.13 nm (20 %) too high: it counts lens on each hop, but these parts cancel."
    )


def test_plain_rss_is_too_low_where_a_source_adds_up() -> None:
    """The same 10 nm at each of two hops is 20 nm, not 14.1 nm."""
    masks = [mask("A"), mask("B", "A"), mask("C", "B")]
    for later in masks[1:]:
        later["terms"] = {"baseline": {"random": 10, "source": "camera"}}
    result = margins_of(bare_flow(masks, [overlay_pair("A", "C", limit=200)]))
    assert compared(result, "A-C") == (
        "Plain RSS is 5.86 nm (29 %) too low: it takes camera as new on each hop, but these parts add up."
    )


def test_plain_rss_without_an_exact_rest_needs_no_share() -> None:
    """B and C move together, so nothing is left between them, where plain RSS sees 14 nm."""
    masks = [mask("A"), mask("B", "A"), mask("C", "A")]
    for later in masks[1:]:
        later["terms"] = {"heat": {"random": 10, "source": "oven"}}
    result = margins_of(bare_flow(masks, [overlay_pair("B", "C", limit=20)]))
    assert compared(result, "B-C").startswith("Plain RSS is 14.1 nm too high: it counts oven on each hop")


def test_plain_rss_does_not_apply_to_averages() -> None:
    masks = [mask("A"), mask("B", "A"), mask("C", ["A", "B"])]
    result = margins_of(
        bare_flow(
            masks,
            [overlay_pair("A", "C", limit=9)],
            tools=READINGS | {"tool": {"alignment": 30, "wafer_alignment": 1}},
        )
    )
    assert compared(result, "A-C") == "References are averaged, so plain RSS along one chain does not apply."
    assert chain_text(entry(result, "A-C").chain).endswith("(one of several ways)")


def test_self_aligned_step_is_named_as_the_reason_for_nothing() -> None:
    result = margins_of(
        bare_flow([mask("A")], [overlay_pair("A", "S", limit=9)], self_aligned=[{"id": "S", "follows": "A"}])
    )
    assert compared(result, "A-S") == "Exact and plain RSS are both 0: one follows the other by itself."
    view = report_view(result)
    assert view.features[0].settled == ("A-S in x", "A-S in y")
    assert view.answer.worst is not None
    assert view.answer.worst.hops[0].how == "follows"


# --- margin table


@pytest.mark.parametrize(
    ("need", "room", "share"),
    [(5, 10, 0.5), (5, 0, math.inf), (0, 0, 0.0), (0, -1, math.inf), (1, -1, math.inf)],
)
def test_share_of_the_room(need: float, room: float, share: float) -> None:
    assert used_share(need, room) == share


def test_margin_row_without_room_says_so() -> None:
    pair = {"name": "p", "rule": "spacing", "between": ["A", "B"], "drawn": 50, "keep": 60, "axes": "x"}
    (row,) = report_view(four(pair)).margins.rows
    assert (row.used, row.verdict, row.bar) == ("no room", "fail", 39)


def test_unjudged_row_shows_the_need_alone() -> None:
    (row,) = report_view(four(overlay_pair("A", "B", axes="x"))).margins.rows
    assert (row.drawn, row.keep, row.margin, row.used, row.cpk, row.ppm) == ("–",) * 6
    assert (row.need, row.word) == ("30.00", "not judged")


# --- budget


def test_budget_joins_equal_names_only_where_there_are_many() -> None:
    few = four(overlay_pair("B", "D", axes="x", limit=90))
    rows = BudgetBook(Base(few)).rows([entry(few, "B-D")])
    assert [(r.name, r.of, r.amounts[0].error, r.amounts[0].share) for r in rows] == [
        ("alignment to A", "B", "±30.00", "33 %"),
        ("alignment to A", "C", "±30.00", "33 %"),
        ("alignment to C", "D", "±30.00", "33 %"),
    ]


def test_budget_of_many_sources_ends_with_the_rest() -> None:
    terms: Data = {f"t{i}": {"random": 10 + i} for i in range(9)}
    terms |= {"push": {"bound": 3}, "pull": {"bound": 2}, "lean": {"offset": 1}}
    result = margins_of(
        bare_flow([mask("A"), mask("B", "A", terms=terms)], [overlay_pair("A", "B", limit=99)])
    )
    rows = BudgetBook(Base(result)).rows([entry(result, "A-B"), entry(result, "A-B", "y")])
    assert len(rows) == SHOWN + 1
    assert [r.name for r in rows[:2]] == ["t8", "t7"]
    rest = rows[-1]
    assert rest.name == "6 smaller sources"
    random = math.hypot(10, 11, 12)
    assert rest.amounts[0].error.replace("\u00a0", " ") == f"±{random:.2f}, ±5.00 bound, −1.00 offset"
    assert rest.amounts[0] == rest.amounts[1]
    shares = [float(r.amounts[0].share.removesuffix(" %")) for r in rows]
    assert sum(shares) == pytest.approx(100, abs=3)


def test_bounds_and_offsets_have_no_share_of_the_variance() -> None:
    masks = [mask("A"), mask("B", "A", terms={"push": {"bound": 3}, "lean": {"offset": -2}})]
    result = margins_of(bare_flow(masks, [overlay_pair("A", "B", limit=99)]))
    rows = BudgetBook(Base(result)).rows([entry(result, "A-B")])
    assert [(r.name, r.kind, r.amounts[0].error, r.amounts[0].share) for r in rows] == [
        ("push", "bound", "±3.00", "–"),
        ("lean", "offset", "\N{MINUS SIGN}2.00", "–"),
    ]


def test_pair_that_nothing_moves_has_an_empty_budget() -> None:
    view = view_of([mask("A"), mask("B", "A")], [overlay_pair("A", "B", limit=9)])
    assert view.pairs[0].blocks[0].budget == ()


# --- matrix


def test_matrix_holds_x_below_and_y_above_the_diagonal() -> None:
    tools = {"tool": {"alignment": {"x": 30, "y": 40}, "wafer_alignment": 1}}
    pairs = [overlay_pair("A", "B", limit={"x": 10, "y": 90}), overlay_pair("A", "C")]
    result = margins_of(bare_flow(FOUR[:3], pairs, tools=tools))
    matrix = matrix_view(Base(result))
    cells = [[(c.text, c.look.split()[-1]) for c in row.cells] for row in matrix.rows]
    assert cells[1][0] == ("30.00", "fail")
    assert cells[0][1] == ("40.00", "pass")
    assert cells[0][0] == ("", "d")
    assert cells[2][0][1].startswith("s"), "a pair that is not judged is not framed"
    assert cells[1][2][0] == f"{math.hypot(40, 40):.2f}"
    assert matrix.largest == cells[1][2][0]
    assert matrix.size == "small"


@pytest.mark.parametrize(("n", "size"), [(2, "small"), (15, "middle"), (29, "large"), (53, "huge")])
def test_large_matrix_prints_small_and_a_huge_one_not_at_all(n: int, size: str) -> None:
    assert matrix_view(Base(margins_of(bare_flow([mask(f"L{i}") for i in range(n)], [])))).size == size


# --- maps


def test_map_needs_something_that_depends_on_position() -> None:
    assert map_frame(Base(four())) is None


def shaped(term: Data, **more: object) -> ReportView:
    masks = [mask("A"), mask("B", "A", terms={"shape": term})]
    pair = overlay_pair("A", "B", limit=4, axes="x")
    return view_of(masks, [pair], field={"x": "10 mm", "y": "10 mm"}, **more)


WAFER: Data = {"wafer": {"diameter": "100 mm", "edge_exclusion": "5 mm"}}


def test_map_over_the_wafer_shows_the_rim_failing() -> None:
    """1 ppm of scale is 1 nm a mm: past 4 mm from the centre every field has a site that fails."""
    view = shaped({"bound": "1 ppm", "shape": "scale", "over": "wafer"}, **WAFER)
    drawn = view.pairs[0].blocks[0].columns[0].map
    assert drawn is not None
    assert drawn.kind == "wafer"
    assert {s.level for s in drawn.squares} <= set(range(LEVELS))
    assert drawn.failing
    assert re.fullmatch(r"−\S+ to −1\.0\d* by field; below 0 in (\d+) of \1", drawn.words)
    assert view.map_frame is not None
    assert view.map_frame.rim_x == 5.0
    assert view.map_frame.usable_x == 4.5


def test_map_where_every_field_is_the_same_shows_the_sites_of_one() -> None:
    view = shaped({"bound": "1 ppm", "shape": "magnification"}, **WAFER)
    drawn = view.pairs[0].blocks[0].columns[0].map
    assert drawn is not None
    assert drawn.kind == "field"
    assert drawn.words == "\N{MINUS SIGN}1.00 to +4.00 by site; below 0 in 6 of 9"


def test_map_without_a_wafer_shows_one_field() -> None:
    view = shaped({"bound": "0.1 urad", "shape": "rotation"})
    drawn = view.pairs[0].blocks[0].columns[0].map
    assert drawn is not None
    assert (drawn.kind, drawn.failing) == ("field", "")


def test_many_small_fields_are_joined_to_squares() -> None:
    masks = [mask("A"), mask("B", "A", terms={"s": {"bound": "0.01 ppm", "shape": "scale", "over": "wafer"}})]
    pair = overlay_pair("A", "B", limit=4, axes="x")
    view = view_of(masks, [pair], field={"x": "2 mm", "y": "2 mm"}, **WAFER)
    assert view.map_frame is not None
    assert view.map_frame.block == 2
    drawn = view.pairs[0].blocks[0].columns[0].map
    assert drawn is not None
    assert drawn.words.endswith("by square")


def test_levels_are_fifths_of_the_range() -> None:
    import numpy as np

    assert levels(np.array([0.0, 1.9, 2.0, 9.9, 10.0])).tolist() == [0, 0, 1, 4, 4]
    assert levels(np.array([3.0, 3.0])).tolist() == [LEVELS - 1] * 2


# --- masks, tools, notes


def test_mask_table_tells_who_reads_whom() -> None:
    masks = [
        mask("A", mark_reading=7, cd={"random": 8, "offset": -2}),
        mask("B", {"x": "A", "y": "wafer"}, side="back"),
        mask("C", [{"mask": "A", "weight": 0.25}, {"mask": "B", "weight": 0.75, "alignment": 3}]),
    ]
    view = view_of(
        masks,
        [overlay_pair("A", "C", limit=9)],
        self_aligned=[{"id": "S", "follows": "A", "edge": {"uniform": 2}}],
    )
    rows = {row.id: row for row in view.masks}
    assert [(r.order, r.id) for r in view.masks if r.kind == "mask"] == [("1", "A"), ("2", "B"), ("3", "C")]
    assert (rows["S"].order, rows["S"].tool, rows["S"].side) == ("–",) * 3
    assert [(r.layer.id, r.weight) for r in rows["C"].reads_x] == [("A", "25 %"), ("B", "75 %")]
    assert [r.layer.id for r in rows["B"].reads_y] == ["wafer"]
    assert {r.id for r in rows["A"].read_by} == {"B", "C", "S"}
    assert rows["A"].edge == "CD ±8 nm (1σ), \N{MINUS SIGN}2 nm offset"
    assert rows["S"].edge == "edge ±2 nm half-width, uniform"
    assert rows["A"].mark_reading == "±7 nm (1σ)"
    assert [p.name for p in rows["A"].pairs] == ["A-C"]
    assert rows["B"].side == "back"
    (term,) = view.mask_terms
    assert (term.layer.id, term.term.name, term.term.size, term.term.enters) == (
        "C",
        "alignment to B",
        "±3 nm (1σ)",
        "reading",
    )


def test_tools_and_terms_keep_their_notes_and_their_shares() -> None:
    tools = {
        "tool": {
            "alignment": {"x": 5, "y": 6},
            "notes": "old",
            "terms": {
                "lens": {"random": 4, "enters": "pattern", "common": 0.8, "why": "one lens"},
                "stage": {"random": 3, "source": "floor"},
            },
        }
    }
    view = view_of([mask("A")], [], tools=tools | {"spare": {}})
    used, spare = view.tools
    assert used.alignment == "±x 5 nm, y 6 nm (1σ)".replace("±x ", "x ±").replace("y ", "y ±")
    assert used.remarks == (("Notes", "old"),)
    assert [(t.name, t.common, t.remarks) for t in used.terms] == [
        ("lens", "80 % with all masks on this tool", (("Why", "one lens"),)),
        ("stage", "100 % with source floor", ()),
    ]
    assert spare.masks == ()


def test_assumptions_follow_the_flow() -> None:
    text = " ".join(view_of([mask("A")], [], reserve=0.1, basis="rss").notes.assumptions)
    assert "basis rss: everything root-sum-square" in text
    assert "below 10 % of the drawn value is called tight" in text
    assert "No error depends on position" in text
    assert "No reserve is set" in " ".join(view_of([mask("A")], []).notes.assumptions)
    cmos = " ".join(report_view(example("cmos")).notes.assumptions)
    assert re.search(r"worst point among (\d+) sites: 9 sites", cmos)


def test_findings_of_the_flow_file_are_repeated() -> None:
    view = view_of(
        [mask("A"), mask("B", "A")], [overlay_pair("A", "B", limit=9)], tools={"tool": {}, "spare": {}}
    )
    assert any("spare" in message for message, _ in view.notes.findings)


# --- notebook


def test_notebook_shows_the_smallest_margins_first() -> None:
    pairs = [overlay_pair("A", "B", axes="x", limit=40 + i) | {"name": f"p{i}"} for i in reversed(range(12))]
    page = parse_page(summary_html(four(*pairs)))
    assert [row[0].text for row in page.one("table").rows()] == [f"p{i}" for i in range(10)]
    assert page.one("caption").text == "test: 12 pass; the 10 smallest margins of 12"
    assert [cell.text for cell in page.one("table").rows()[0]] == [
        "p0",
        "A / B",
        "x",
        "+10.00 nm",
        "pass",
        "0.44",
    ]


def test_notebook_of_a_flow_without_pairs() -> None:
    page = parse_page(summary_html(margins_of(bare_flow([mask("A")], [], revision="B"))))
    assert page.one("caption").text == "test B: no pairs"
    assert page.one("table").rows() == []
