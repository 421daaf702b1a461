"""The alignment tree: its readings as a value, its DOT text, Graphviz's SVG inside the page."""

import re
import subprocess
import sys
from pathlib import Path

import pygraphviz
import pytest

from flowplan.engine.graph import AlignmentGraph
from flowplan.report import layout
from flowplan.report.layout import draw
from flowplan.report.tree import Edge, alignment_dot, cut, edges_of
from flowplan.report.viewbase import Base
from flowplan.report.viewtree import page_slices, tree_view
from tests.support import hostile
from tests.support.examples import example, example_page
from tests.support.flows import Data, bare_flow, flow_of, margins_of, mask
from tests.support.hostile import hostile_flow
from tests.support.page import Element, parse_page

#: One reading of each kind: both axes, one axis each, averaged, followed, from the back.
KINDS: Data = bare_flow(
    [
        mask("A"),
        mask("B", "A", title="second"),
        mask("C", {"x": "A", "y": "B"}),
        mask("D", [{"mask": "B", "weight": 0.25}, {"mask": "C", "weight": 0.75}]),
        mask("E", {"x": ["B", "C"], "y": "B"}),
        mask("F", "B", side="back"),
    ],
    [],
    self_aligned=[{"id": "S", "follows": {"x": "B", "y": "A"}}, {"id": "T", "follows": "C"}],
)


def named_edges(data: Data) -> list[tuple[str, str, str, str]]:
    flow = flow_of(data)
    names = ["wafer", *flow.layers]
    edges: tuple[Edge, ...] = edges_of(flow, AlignmentGraph(flow))
    return [(names[e.layer], names[e.reference], e.kind, e.label) for e in edges]


def picture(data: Data, *, links: bool = False) -> Element:
    return parse_page(draw(alignment_dot(flow_of(data), links=links), "svg").decode().partition("?>")[2])


def test_each_reading_stands_once_with_its_axes_and_weight() -> None:
    found = named_edges(KINDS)
    assert [edge for edge in found if edge[0] in "ABCDEF"] == [
        ("A", "wafer", "both", ""),
        ("B", "A", "both", ""),
        ("C", "A", "x", ""),
        ("C", "B", "y", ""),
        ("D", "B", "both", "25 %"),
        ("D", "C", "both", "75 %"),
        ("E", "B", "x", "50 %"),
        ("E", "B", "y", ""),
        ("E", "C", "x", "50 %"),
        ("F", "B", "both", ""),
    ]
    assert sorted(edge for edge in found if edge[0] in "ST") == [
        ("S", "A", "follow", "follows in y"),
        ("S", "B", "follow", "follows in x"),
        ("T", "C", "follow", "follows"),
    ]


def test_axes_differ_in_line_style_and_not_by_colour_alone() -> None:
    graph = pygraphviz.AGraph(string=alignment_dot(flow_of(KINDS)))
    styles = {e.attr["class"]: e.attr["style"] for e in graph.edges() if e.attr["class"]}
    assert styles == {"e-both": "solid", "e-x": "dashed", "e-y": "dotted", "e-follow": "solid"}
    tails = {e.attr["class"]: e.attr["arrowtail"] for e in graph.edges() if e.attr["class"]}
    assert tails["e-follow"] == "odot"
    assert {tails[kind] for kind in ("e-both", "e-x", "e-y")} <= {None, "", "normal"}


def test_nodes_are_named_by_place_and_rows_follow_process_order() -> None:
    graph = pygraphviz.AGraph(string=alignment_dot(flow_of(KINDS)))
    layers = list(flow_of(KINDS).layers)
    labels = {node: str(node.attr["label"]).split("\\n")[0] for node in graph.nodes() if node[0] == "n"}
    assert [labels[f"n{i + 1}"] for i in range(len(layers))] == layers
    spine = [(a, b) for a, b in graph.edges() if a[0] == b[0] == "s"]
    assert spine == [(f"s{i}", f"s{i + 1}") for i in range(len(layers))]
    steps = [graph.get_node(f"s{layers.index(name) + 1}").attr["label"].strip() for name in "ABCDEFST"]
    assert steps == ["1", "2", "3", "4", "5", "6", "", ""]


def test_links_only_where_there_is_a_mask_table() -> None:
    assert "URL" not in alignment_dot(flow_of(KINDS))
    urls = re.findall(r'URL="([^"]*)"', alignment_dot(flow_of(KINDS), links=True))
    assert sorted(urls) == [f"#m{i}" for i in range(1, 9)]


def test_looks_of_a_layer_are_words_and_outlines() -> None:
    svg = picture(KINDS)
    nodes = {n.all("text")[0].text: n for n in svg.all("g", css="node") if n.all("text")}
    said = {name: [t.text for t in node.all("text")[1:]] for name, node in nodes.items()}
    assert said["B"] == ["second"]
    assert said["S"] == ["self-aligned"]
    assert said["F"] == ["back side"]
    assert said["D"] == said["E"] == ["averaged references"]
    assert len(nodes["S"].all("path")) == 2, "a double outline"
    assert [p.attributes["stroke-width"] for p in nodes["D"].all("polygon")] == ["2.4"]
    assert nodes["F"].all("polyline"), "a folded corner"
    assert not nodes["B"].all("polyline")


@pytest.mark.parametrize("text", hostile.TEXTS)
def test_hostile_titles_are_drawn_letter_by_letter(text: str) -> None:
    svg = picture(bare_flow([mask("A", title=text)], []), links=True)
    node = next(n for n in svg.all("g", css="mask"))
    assert [t.text for t in node.all("text")] == ["A", " ".join(cut(text).split())]
    assert [a.attributes["xlink:href"] for a in node.all("a")] == ["#m1"]


def test_hostile_texts_add_no_node_and_no_edge() -> None:
    graph = pygraphviz.AGraph(string=alignment_dot(flow_of(hostile_flow())))
    assert {node[0] for node in graph.nodes()} == {"n", "s"}
    assert len(graph.nodes()) == 2 * (len(flow_of(hostile_flow()).layers) + 1)


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("short", "short"),
        ("two\nlines\tand a tab", "two lines and a tab"),
        ("a\x00b\u202ec", "a b c"),
        ("x" * 34, "x" * 34),
        ("x" * 35, "x" * 33 + "…"),
    ],
)
def test_titles_are_cut_to_one_line(text: str, shown: str) -> None:
    assert cut(text) == shown


def test_page_shows_every_layer_with_a_link_to_its_row(name: str) -> None:
    page, flow = example_page(name), example(name).flow
    tree = page.one("svg", css="tree")
    nodes = [n for n in tree.all("g", css="node") if {"mask", "selfaligned", "back"} & n.classes]
    found = {n.all("text")[0].text: n.one("a").attributes["xlink:href"] for n in nodes}
    assert found == {layer: f"#m{i}" for i, layer in enumerate(flow.layers, start=1)}
    rows = {
        row.attributes["id"]: row.children("th")[0].text.removesuffix(" self-aligned")
        for row in page.by_id("masks").one("tbody").children("tr")
    }
    assert rows == {f"m{i}": layer for i, layer in enumerate(flow.layers, start=1)}


def test_page_draws_every_reading_with_the_style_of_its_kind(name: str) -> None:
    flow, graph = example(name).flow, example(name).engine.graph
    wanted = sorted(f"e-{edge.kind}" for edge in edges_of(flow, graph))
    tree = example_page(name).one("svg", css="tree")
    edges = tree.all("g", css="edge")
    assert sorted((e.classes - {"edge"}).pop() for e in edges) == wanted
    for edge in edges:
        dashes = edge.one("path").attributes.get("stroke-dasharray", "")
        assert dashes == {"e-x": "5,2", "e-y": "1,5"}.get((edge.classes - {"edge"}).pop(), "")


def test_legend_lists_what_the_drawing_uses_and_no_more() -> None:
    used = {
        "cmos": {"both", "x", "y", "follow", "selfaligned"},
        "pressure_sensor": {"both", "follow", "selfaligned", "back"},
        "logic_backend": {"both", "x", "y", "follow", "selfaligned", "averaged"},
    }
    for name, marks in used.items():
        assert tree_view(Base(example(name))).marks == marks
        assert len(example_page(name).one("ul", css="legend").all("li")) == len(marks)


def test_short_tree_prints_on_one_page() -> None:
    assert tree_view(Base(example("photonic"))).slices == ()
    assert page_slices("<svg>no size</svg>") == ()


def test_tall_tree_prints_in_slices_that_cut_no_layer() -> None:
    view = tree_view(Base(example("logic_backend")))
    svg = parse_page(view.svg)
    height = int(svg.one("svg").attributes["height"])
    assert len(view.slices) == 3
    tops = [part.top for part in view.slices]
    assert tops[0] == 0
    assert sum(part.height for part in view.slices) == pytest.approx(height, abs=2)
    assert max(part.height for part in view.slices) < 1.2 * height / 3
    shift = float(re.search(r"translate\(\S+ (\S+)\)", view.svg)[1])  # type: ignore[index]
    for node in svg.all("g", css="node"):
        corners = " ".join(p.attributes["points"] for p in node.all("polygon"))
        ys = [float(point.split(",")[1]) + shift for point in corners.split()]
        crossed = [top for top in tops[1:] if ys and min(ys) < top < max(ys)]
        assert crossed == []


def test_dot_text_is_a_format_of_its_own() -> None:
    dot = alignment_dot(flow_of(KINDS))
    assert draw(dot, "dot") == dot.encode()
    assert dot.startswith("digraph alignment {")


def test_png_is_a_png() -> None:
    assert draw(alignment_dot(flow_of(KINDS)), "png").startswith(b"\x89PNG\r\n")


def test_drawing_says_nothing_on_the_error_stream(capfd: pytest.CaptureFixture[str]) -> None:
    """Fonts differ between machines; remarks about them are no concern of who reads a report."""
    draw(alignment_dot(flow_of(KINDS)), "svg")
    assert capfd.readouterr() == ("", "")


def test_command_line_says_nothing_but_its_own_words(tmp_path: Path) -> None:
    flow = Path(__file__).parents[2] / "flows" / "photonic.yaml"
    command = [sys.executable, "-m", "flowplan", "tree", str(flow), "-o", "tree.svg"]
    done = subprocess.run(command, cwd=tmp_path, capture_output=True, text=True, check=True)
    assert (done.stdout, done.stderr) == ("", "wrote tree.svg\n")


def test_fault_of_the_drawing_tells_what_it_was() -> None:
    with pytest.raises(RuntimeError, match="syntax error"):
        draw("digraph {", "svg")


def test_modules_of_the_current_folder_are_not_picked_up(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "pygraphviz.py").write_text("raise SystemExit('wrong module')", encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    assert b"<svg" in draw("digraph {a}", "svg")


def test_interpreter_without_a_program_draws_by_itself(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(layout.sys, "executable", "")
    assert b"<svg" in draw("digraph {a}", "svg")


def test_text_of_layers_that_share_a_name_with_their_title_stands_once() -> None:
    svg = picture(bare_flow([mask("A", title="A")], []))
    assert [t.text for t in svg.one("g", css="mask").all("text")] == ["A"]


def test_summary_counts_masks_and_features() -> None:
    assert tree_view(Base(margins_of(bare_flow([mask("A")], [])))).summary.startswith(
        "Alignment tree of 1 mask, "
    )
    assert "6 masks and 2 self-aligned features" in tree_view(Base(margins_of(KINDS))).summary
