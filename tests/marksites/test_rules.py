"""What is wrong with mark sites is said at its line and column."""

import pytest

from flowplan.errors import FlowError
from flowplan.files.reader import parse

HEAD = """\
flow: Estuary
wafer: {diameter: 130 mm, edge_exclusion: 5 mm}
field: {x: 13 mm, y: 11 mm}
"""
TAIL = """\
masks:
  - {id: A, tool: t, aligns_to: wafer}
  - {id: B, tool: t, aligns_to: A}
pairs:
  - {rule: overlay, between: [A, B], limit: 90}
"""
ON_A_LINE = "[{x: 40 mm, y: 40 mm}, {x: 0, y: 0}, {x: -20 mm, y: -20 mm}]"


def marked(case):
    """The alignment without its ^, and the finding in full."""
    alignment, message, hint = CASES[case]
    column = len("    alignment: {") + alignment.index("^") + 1
    return alignment.replace("^", ""), (f"f.yaml:6:{column}: {message}", hint)


def findings(alignment, head=HEAD):
    with pytest.raises(FlowError) as caught:
        parse(f"{head}tools:\n  t:\n    alignment: {{{alignment}}}\n{TAIL}", "f.yaml")
    return [(str(d), d.hint) for d in caught.value.diagnostics]


#: What is written, with ^ before the place that is pointed at; what is said, and what to do.
CASES = {
    "one mark has no direction": (
        "per_mark: 30, model: rigid, sites: ^[{x: 40 mm, y: 0}]",
        "1 mark cannot fix rotation [FP407]",
        "`model: rigid` needs at least 2 marks; add marks or fit less",
    ),
    "too few for a linear model": (
        "per_mark: 30, model: linear, sites: ^{ring: {count: 2, radius: 40 mm}}",
        "2 marks cannot fix scale y and skew [FP407]",
        "`model: linear` needs at least 3 marks that are not on one line; add marks or fit less",
    ),
    "all on a slanted line": (
        f"per_mark: 30, model: linear, sites: ^{ON_A_LINE}",
        "3 marks at these sites cannot tell rotation from scale x and scale y, nor tell skew "
        "from scale x [FP407]",
        "`model: linear` needs at least 3 marks that are not on one line; add marks or fit less",
    ),
    "all at one point": (
        "per_mark: 30, model: rigid+scale, sites: ^[{x: 3 mm, y: 3 mm}, {x: 3 mm, y: 3 mm}]",
        "2 marks at these sites cannot fix magnification and rotation [FP407]",
        "`model: rigid+scale` needs at least 2 marks; add marks or fit less",
    ),
    "millimetres meant, nanometres written": (
        "per_mark: 30, model: rigid, sites: ^[{x: 60, y: 0}, {x: -60, y: 0}]",
        "all marks lie within 0.00012 mm of each other, closer than a mark is wide [FP407]",
        "a bare length is in nm; write for example 60 mm",
    ),
    "off the usable wafer": (
        "per_mark: 30, model: rigid, sites: [{x: 40 mm, y: 0}, ^{x: 0, y: 61 mm}]",
        "a mark lies off the usable wafer [FP406]",
        "its radius is 60 mm; a bare length is in nm",
    ),
    "a ring off the usable wafer": (
        "per_mark: 30, model: rigid, sites: {ring: {count: 4, radius: ^60.1 mm}}",
        "a mark lies off the usable wafer [FP406]",
        "its radius is 60 mm; a bare length is in nm",
    ),
    "off the field": (
        "per_mark: 30, model: rigid, over: field, sites: [{x: 6.5 mm, y: 5.5 mm}, ^{x: 0, y: -5.6 mm}]",
        "a mark lies off the field [FP406]",
        "it reaches ±6.5 mm in x and ±5.5 mm in y",
    ),
    "a bound a mark": (
        "per_mark: {bound: ^30}, model: shift, sites: [{x: 0, y: 0}]",
        "a bound of each mark says nothing about how the marks differ [FP408]",
        "quote random or uniform here; what all marks share is a term that enters `marks`",
    ),
    "an offset a mark": (
        "per_mark: {random: 3, offset: ^3}, model: shift, sites: [{x: 0, y: 0}]",
        "an offset of each mark says nothing about how the marks differ [FP408]",
        "quote random or uniform here; what all marks share is a term that enters `marks`",
    ),
    "a model nobody knows": (
        "per_mark: 30, model: ^rigd, sites: [{x: 0, y: 0}]",
        "'rigd' is not one of shift, rigid, rigid+scale, linear [FP204]",
        "did you mean 'rigid'?",
    ),
    "no marks": (
        "per_mark: 30, model: shift, sites: ^[]",
        "no mark is named [FP205]",
        "list where the marks stand, or give a ring",
    ),
    "half a mark": (
        "per_mark: 30, model: shift, sites: {ring: {count: ^2.5, radius: 3 mm}}",
        "a whole number of marks belongs here [FP203]",
        "for example 8",
    ),
    "too many marks": (
        "per_mark: 30, model: shift, sites: {ring: {count: ^4000, radius: 3 mm}}",
        "4000 is no usual number of marks [FP206]",
        "from 1 to 1000",
    ),
    "a key misspelt": (
        "per_mark: 30, model: shift, sites: {^rings: {count: 2, radius: 3 mm}}",
        "unknown key 'rings' [FP201]",
        "did you mean 'ring'?",
    ),
    "an angle for a place": (
        "per_mark: 30, model: shift, sites: [{x: ^3 urad, y: 0}]",
        "a length is wanted, urad does not fit [FP402]",
        "units that fit: nm, um, mm, cm, in",
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_what_is_wrong_and_where(case):
    alignment, expected = marked(case)
    assert expected in findings(alignment)


@pytest.mark.parametrize(
    "name", ["one mark has no direction", "a ring off the usable wafer", "a bound a mark"]
)
def test_one_fault_is_told_once(name):
    alignment, expected = marked(name)
    assert findings(alignment) == [expected]


def test_a_fault_of_one_reading_is_told_once_at_that_reading():
    """The reading serves x and y, its place in the file is one."""
    reads = "{mask: A, alignment: {per_mark: 3, model: rigid, sites: [{x: 0, y: 0}]}}"
    tail = TAIL.replace("aligns_to: A}", f"aligns_to: {reads}}}")
    with pytest.raises(FlowError) as caught:
        parse(f"{HEAD}tools: {{t: {{}}}}\n{tail}", "f.yaml")
    (found,) = [str(d) for d in caught.value.diagnostics]
    column = tail.splitlines()[2].index("[{x") + 1
    assert found == f"f.yaml:7:{column}: 1 mark cannot fix rotation [FP407]"


@pytest.mark.parametrize(("over", "missing"), [("wafer", ["field", "wafer"]), ("field", ["field"])])
def test_a_fit_that_turns_needs_the_geometry(over, missing):
    alignment = f"per_mark: 3, model: rigid, over: {over}, sites: [{{x: 3 mm, y: 0}}, {{x: 0, y: 0}}]"
    assert [message for message, _ in findings(alignment, "flow: Estuary\n")] == [
        f"f.yaml:4:37: a rigid alignment over the {over} needs the {need}'s size [FP403]" for need in missing
    ]


def test_a_shift_needs_none():
    text = "flow: Estuary\ntools:\n  t: {alignment: {per_mark: 3, model: shift, sites: [{x: 3 mm, y: 0}]}}\n"
    assert parse(text + TAIL, "f.yaml").flow.unit == "nm"


@pytest.mark.parametrize(
    ("model", "sites"),
    [
        ("shift", "[{x: 0, y: 0}]"),
        ("rigid", "{ring: {count: 2, radius: 60 mm}}"),
        ("rigid+scale", "[{x: 0, y: 0}, {x: 1 mm, y: 1 mm}]"),
        ("linear", "[{x: 0, y: 0}, {x: 1 mm, y: 1 mm}, {x: 1 mm, y: 2 mm}]"),
    ],
)
def test_the_fewest_marks_that_do(model, sites):
    text = f"{HEAD}tools: {{t: {{alignment: {{per_mark: 3, model: {model}, sites: {sites}}}}}}}\n{TAIL}"
    assert not [d for d in parse(text, "f.yaml").warnings if d.code != "FP308"]


def test_bare_lengths_are_in_the_unit_of_the_file():
    alignment = "{per_mark: 30 nm, model: rigid, sites: {ring: {count: 4, radius: 50}}}"
    text = f"unit: mm\n{HEAD}tools: {{t: {{alignment: {alignment}}}}}\n{TAIL}"
    flow = parse(text, "f.yaml").flow
    assert flow.tools["t"].alignment.places(flow.unit)[0] == (50.0, 0.0)
