"""An alignment from mark sites goes through the engine as the equivalent independent terms would."""

import itertools

import numpy as np
import pytest

from flowplan.engine.analysis import Engine, analyse
from flowplan.engine.levers import levers
from flowplan.engine.placement import place
from flowplan.engine.propose import propose
from flowplan.engine.remedies import remedies
from flowplan.engine.remedies.changes import apply
from flowplan.files.references import references_data
from flowplan.model.differences import differences
from flowplan.model.edits import with_size
from flowplan.model.masks import References
from flowplan.model.paths import quoted_at, quoted_sizes
from tests.marksites.material import GEOMETRY, alignment, one_reading, placed_covariance
from tests.support.flows import bare_flow, entry, flow_of, margins_of, mask, overlay_pair

RING, COUNT, RADIUS = (8, 50.0), 8, 50.0
UNEVEN = [(-41.0, 12.0), (8.5, -37.0), (33.0, 30.0), (50.0, -7.0)]
POINTS = [(20.0, 10.0), (-30.0, 5.0)]


def plain_terms(**terms):
    """The same flow, the fit's errors written as terms of the reading mask."""
    data = bare_flow([mask("A"), mask("B", "A", terms=terms)], [overlay_pair("A", "B", limit=200)])
    return data | GEOMETRY


@pytest.mark.parametrize("basis", ["mixed", "rss", "linear"])
@pytest.mark.parametrize(
    ("model", "terms"),
    [
        ("shift", {}),
        ("rigid", {"turn": ("rotation", "urad")}),
        ("rigid+scale", {"turn": ("rotation", "urad"), "size": ("magnification", "ppm")}),
    ],
)
def test_on_a_ring_the_margin_is_that_of_independent_terms(basis, model, terms):
    """On a ring shift, rotation and magnification do not covary: 30 / sqrt(n) and 30 / (r sqrt(n))."""
    slope = 30 / (RADIUS * COUNT**0.5)
    shaped = {
        name: {"random": f"{slope!r} {unit}", "shape": shape, "over": "wafer"}
        for name, (shape, unit) in terms.items()
    }
    by_hand = margins_of(plain_terms(shift=30 / COUNT**0.5, **shaped) | {"basis": basis})
    read = one_reading(alignment(RING, model), basis=basis)
    read["pairs"] = [overlay_pair("A", "B", limit=200)]
    for fitted, plain in zip(margins_of(read).entries, by_hand.entries, strict=True):
        assert fitted.margin.on(basis) == pytest.approx(plain.margin.on(basis), rel=1e-12)
        assert (fitted.point, fitted.verdict) == (plain.point, plain.verdict)
        assert fitted.chain_rss == pytest.approx(plain.chain_rss, rel=1e-12)


def test_sources_say_which_reading_and_what_it_moves():
    result = margins_of(one_reading(alignment(RING)))
    sources = {row.source.name: row for row in entry(result, "A-B").sources}
    assert {name: (row.source.of, row.source.kind, row.source.shape) for name, row in sources.items()} == {
        "alignment to A": ("B", "random", "shift"),
        "alignment to A: rotation": ("B", "random", "rotation"),
    }
    assert sources["alignment to A"].source.size == pytest.approx(30 / COUNT**0.5)
    assert sources["alignment to A: rotation"].source.size == pytest.approx(30 / (RADIUS * COUNT**0.5))
    assert sum(row.share for row in sources.values()) == pytest.approx(1)


def test_a_fit_is_drawn_once_a_wafer_or_once_a_field_unless_the_file_says_otherwise():
    drawn = {
        where: {s.varies for s in place(flow_of(one_reading(read))).sources}
        for where, read in {
            "wafer": alignment(RING),
            "field": alignment([(6.0, 5.0), (-6.0, -5.0)], over="field"),
            "lot": alignment(RING, per_mark={"random": 30, "varies": "lot"}),
        }.items()
    }
    assert drawn == {level: {level} for level in ("wafer", "field", "lot")}


def test_one_reading_for_both_axes_couples_them_by_its_rotation():
    """At (X, Y) a rotation moves (-Y, X), so the covariance of dx and dy is -X Y times its variance."""
    found = placed_covariance(one_reading(alignment(RING)), [(20.0, 10.0)])
    assert found[0, 1] == pytest.approx(-20 * 10 * (30 / (RADIUS * COUNT**0.5)) ** 2)


def two_references(aligns_to):
    read = alignment(RING)
    data = bare_flow([mask("A"), mask("B", "wafer"), mask("C", aligns_to)], [overlay_pair("A", "C")])
    return data | GEOMETRY | {"tools": {"tool": {"alignment": read}}}


def test_axes_that_read_different_marks_are_two_fits_of_which_one_axis_is_used():
    split = placed_covariance(two_references({"x": "A", "y": "B"}), POINTS, layer="C")
    both = placed_covariance(two_references("A"), POINTS, layer="C")
    n = len(POINTS)
    assert split[:n, :n] == pytest.approx(both[:n, :n])
    assert split[n:, n:] == pytest.approx(both[n:, n:])
    assert np.abs(split[:n, n:]).max() == 0
    assert np.abs(both[:n, n:]).max() > 1


def test_one_mark_read_in_two_ways_is_two_fits():
    """x and y read A's marks, each by an alignment of its own."""
    ways = {
        axis: {"mask": "A", "alignment": alignment(RING, per_mark=p)} for axis, p in (("x", 30), ("y", 31))
    }
    found = placed_covariance(two_references(ways), POINTS, layer="C")
    n = len(POINTS)
    assert np.abs(found[:n, n:]).max() == 0
    assert found[n:, n:] == pytest.approx(
        (31 / 30) ** 2 * placed_covariance(one_reading(alignment(RING)), POINTS)[n:, n:]
    )


def test_every_reading_is_fresh():
    """Two masks that read the same marks differ by two readings; an average of two halves each."""
    data = bare_flow(
        [mask("A"), mask("B", "A"), mask("C", "A"), mask("D", ["A", "B"])],
        [overlay_pair("A", "B"), overlay_pair("B", "C"), overlay_pair("A", "D")],
    )
    result = margins_of(data | GEOMETRY | {"tools": {"tool": {"alignment": alignment(RING)}}})
    one = entry(result, "A-B").overlay.random
    assert entry(result, "B-C").overlay.random == pytest.approx(2**0.5 * one)
    # D = (A + a + B + b) / 2 with B = A + c: a, b and c at half weight each.
    assert entry(result, "A-D").overlay.random == pytest.approx(3**0.5 / 2 * one)


def test_the_marks_of_a_back_side_exposure_are_seen_from_the_back():
    """Turning the wafer about y reverses x: of the marks, of where one looks, and of what moves in x."""
    from_back = one_reading(alignment(UNEVEN, "linear"))
    from_back["masks"][1]["side"] = "back"
    from_front = one_reading(alignment(UNEVEN, "linear"))
    turned = [(-x, y) for x, y in POINTS]
    sign = np.repeat([-1.0, 1.0], len(POINTS))
    seen = np.outer(sign, sign) * placed_covariance(from_front, turned)
    assert placed_covariance(from_back, POINTS) == pytest.approx(seen)


@pytest.mark.parametrize("model", ["shift", "rigid", "rigid+scale", "linear"])
def test_reading_x_and_y_almost_alike_gives_almost_what_reading_them_alike_does(model):
    """Alike readings are factored as a whole, others axis by axis: one answer."""
    alike = placed_covariance(one_reading(alignment(UNEVEN, model)), POINTS)
    almost = placed_covariance(one_reading(alignment(UNEVEN, model, {"x": 30, "y": 30.0000001})), POINTS)
    assert almost == pytest.approx(alike, rel=1e-6, abs=1e-6)


# -- what builds on the engine ---------------------------------------------------------------------


def plan(per_mark, basis="mixed", model="rigid+scale"):
    """Three masks; C may read either of the others."""
    read = alignment(UNEVEN, model, per_mark)
    own = alignment([(6.0, 5.0), (-6.0, -5.0)], "rigid", {"x": 12, "y": 9}, over="field")
    masks = [
        mask("A"),
        mask("B", "A", terms={"own": 5}),
        mask("C", {"x": "B", "y": [{"mask": "A", "alignment": own}]},
             may_align_to=["A", [{"mask": "B", "alignment": own}]]),
    ]  # fmt: skip
    pairs = [
        overlay_pair("A", "B", limit=40),
        overlay_pair("A", "C", limit=38),
        overlay_pair("B", "C", limit=45),
    ]
    data = bare_flow(masks, pairs, basis=basis) | GEOMETRY
    return flow_of(data | {"tools": {"tool": {"alignment": read, "terms": {"stage": 4}}}})


def worst(flow):
    return min(e.margin.on(flow.basis) for e in analyse(flow).entries)


def test_the_size_of_a_mark_is_a_quoted_place():
    found = [(q.path, q.axis, str(q.size)) for q in quoted_sizes(plan(30)) if "per_mark" in q.path]
    assert found == [
        ("tools.tool.alignment.per_mark", None, "30"),
        ("masks.C.aligns_to.y.A.alignment.per_mark", "x", "12"),
        ("masks.C.aligns_to.y.A.alignment.per_mark", "y", "9"),
    ]
    uniform = flow_of(one_reading(alignment(RING, per_mark={"random": 3, "uniform": 4})))
    assert [q.path for q in quoted_sizes(uniform)] == [
        "masks.B.aligns_to.A.alignment.per_mark",
        "masks.B.aligns_to.A.alignment.per_mark.uniform",
    ]


@pytest.mark.parametrize("basis", ["mixed", "rss", "linear"])
@pytest.mark.parametrize(
    "per_mark", [30, {"x": 30, "y": 20}, {"x": 0, "y": 1}, 0, {"random": 20, "uniform": {"x": 20, "y": 30}}]
)
def test_levers_say_what_the_engine_says_of_the_changed_flow(per_mark, basis):
    flow = plan(per_mark, basis)
    found = levers(flow)
    assert found.worst == pytest.approx(worst(flow))
    own = [lever for lever in found.levers if "per_mark" in lever.quoted.path]
    assert len(own) >= 3
    for lever in own:
        quoted = quoted_at(flow, lever.quoted.path, lever.quoted.axis)
        without = worst(with_size(flow, quoted, quoted.quantity(0.0, "nm")))
        assert lever.removed.worst == pytest.approx(without - worst(flow), abs=1e-9)
        if lever.largest is not None and np.isfinite(lever.largest):
            at_most = with_size(flow, quoted, quoted.quantity(lever.largest, "nm"))
            assert worst(at_most) == pytest.approx(0, abs=1e-6)


@pytest.mark.parametrize("basis", ["mixed", "linear"])
def test_remedies_say_what_the_engine_says_of_the_changed_flow(basis):
    flow = plan({"x": 60, "y": 45}, basis)
    tried = 0
    for case in remedies(flow).cases:
        for remedy in case.remedies:
            changed = analyse(apply(flow, remedy.change)).entries
            (after,) = [
                e for e in changed
                if (e.pair.name, e.axis) == (case.entry.pair.name, case.entry.axis)
            ]  # fmt: skip
            assert remedy.margin == pytest.approx(after.margin.on(basis), abs=1e-8), remedy
            tried += 1
    assert tried > 5


@pytest.mark.parametrize("basis", ["mixed", "linear"])
def test_the_best_references_are_those_of_trying_all(basis):
    flow = plan(30, basis)
    found = propose(flow, goal="worst")
    (c,) = [m for m in flow.masks if m.id == "C"]
    options = {axis: [r.on(axis) for _, r in c.every_reference()] for axis in ("x", "y")}
    tried = []
    for x, y in itertools.product(options["x"], options["y"]):
        other = c.model_copy(update={"aligns_to": References.model_construct(x=x, y=y)})
        tried.append(worst(flow.model_copy(update={"masks": (*flow.masks[:2], other)})))
    assert found.proved
    assert worst(found.flow) == pytest.approx(max(tried), abs=1e-9)


def test_a_candidate_with_sites_is_judged_over_the_wafer():
    """The plan of the file has no shape; what it may read instead has one, so all fields count."""
    data = one_reading(3)
    data["masks"][1]["may_align_to"] = [[{"mask": "A", "alignment": alignment(RING)}]]
    assert Engine.of(flow_of(data)).sites.n_points > 9


def test_references_are_written_as_they_were_given():
    for given in (
        alignment(RING, "linear", {"x": 3, "y": "4 um"}),
        alignment([(6.5, 5.0), (-6.5, -5.0)], "rigid", {"random": 3, "uniform": 4}, over="field"),
        alignment(RING, per_mark={"random": 30, "varies": "lot"}),
    ):
        references = References.model_validate({"mask": "A", "alignment": given})
        assert References.model_validate(references_data(references)) == references


def test_differences_name_the_marks():
    before, after = (flow_of(two_references("A") | {"tools": {"tool": {"alignment": a}}}) for a in (
        alignment((8, 50.0)), alignment((4, 50.0), per_mark=20)
    ))  # fmt: skip
    assert [(d.what, d.before, d.after) for d in differences(before, after)] == [
        ("alignment.per_mark.random", "30", "20"),
        ("alignment.sites.ring.count", "8", "4"),
    ]
