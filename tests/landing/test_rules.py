"""What is wrong with a landing pair is said at its line and column."""

import pytest

from flowplan.errors import FlowError
from flowplan.files.reader import parse
from flowplan.model.schema import flow_schema

HEAD = """\
flow: Estuary
tools: {t: {alignment: 50, wafer_alignment: 500}}
masks:
  - {id: GATE, tool: t, aligns_to: wafer}
  - {id: CONTACT, tool: t, aligns_to: GATE}
pairs:
"""
CONTACT = "contact: {layer: CONTACT, x: 600, y: 600}"
PAD = "pad: {layer: GATE, x: 900, y: 900}"


def flow_with(pair):
    return f"{HEAD}  - {{rule: landing, {pair}}}\n"


#: What is written, with ^ before the place that is pointed at, and what is said there.
CASES = {
    "no width": (f"contact: {{layer: CONTACT, x: ^0, y: 600}}, {PAD}", "0 is not above 0 [FP206]"),
    "a negative width": (f"{CONTACT}, pad: {{layer: GATE, x: 900, y: ^-3}}", "-3 is not above 0 [FP206]"),
    "an angle for a width": (
        f"{CONTACT}, pad: {{layer: GATE, x: ^2 urad, y: 3}}",
        "a length is wanted, urad does not fit [FP402]",
    ),
    "no pad": (CONTACT, "'pad' is missing [FP202]"),
    "more than all of the area": (
        f"{CONTACT}, {PAD}, least_area: ^1.2",
        "1.2 is not between 0 and 1 [FP206]",
    ),
    "less than no area": (f"{CONTACT}, {PAD}, least_area: ^-0.1", "-0.1 is not between 0 and 1 [FP206]"),
    "axes": (f"{CONTACT}, {PAD}, ^axes: x", "`axes` does not belong to a landing pair [FP201]"),
    "a drawn enclosure": (
        f"{CONTACT}, {PAD}, ^drawn: 90",
        "`drawn` does not belong to a landing pair [FP201]",
    ),
    "an unknown key": (f"{CONTACT}, {PAD}, ^least: 0.7", "unknown key 'least' [FP201]"),
    "an unknown layer": (
        f"contact: {{layer: ^CONTAKT, x: 600, y: 600}}, {PAD}",
        "unknown layer 'CONTAKT' [FP301]",
    ),
    "a layer on itself": (
        "pad: {layer: GATE, x: 9, y: 9}, contact: {layer: ^GATE, x: 600, y: 600}",
        "'GATE landing on GATE' pairs 'GATE' with itself [FP305]",
    ),
    "a limit below what there is": (
        f"{CONTACT}, {PAD}, resistance: {{nominal: 8, limit: ^7}}",
        "the limit of 7 ohm is below the wholly landed 8 ohm [FP206]",
    ),
    "a limit below what the resistivity gives": (
        f"{CONTACT}, {PAD}, resistance: {{resistivity: 3.6 ohm um2, limit: ^9}}",
        "the limit of 9 ohm is below the wholly landed 10 ohm [FP206]",
    ),
    "two resistances": (
        f"{CONTACT}, {PAD}, resistance: {{nominal: 8, resistivity: ^20}}",
        "`nominal` and `resistivity` exclude each other [FP208]",
    ),
    "no resistance": (
        f"{CONTACT}, {PAD}, resistance: ^{{limit: 12}}",
        "the resistance itself is not given [FP202]",
    ),
    "a resistivity in another unit": (
        f"{CONTACT}, {PAD}, resistance: {{resistivity: ^20 ohm m}}",
        "'20 ohm m' is not a specific contact resistivity [FP401]",
    ),
    "a resistivity of nothing": (
        f"{CONTACT}, {PAD}, resistance: {{resistivity: ^0}}",
        "0 is not above 0 [FP206]",
    ),
    "nothing allowed": (f"{CONTACT}, {PAD}, allowed_ppm: ^0", "0 is not above 0 [FP206]"),
    "more than all allowed": (f"{CONTACT}, {PAD}, allowed_ppm: ^2e6", "2e+06 ppm is more than all [FP206]"),
}


@pytest.mark.parametrize("case", CASES)
def test_a_fault_is_said_once_at_its_place(case):
    pair, said = CASES[case]
    with pytest.raises(FlowError) as caught:
        parse(flow_with(pair.replace("^", "")), "f.yaml")
    found = [str(d) for d in caught.value.diagnostics]
    place = "f.yaml:7:" + (
        str(len("  - {rule: landing, ") + pair.index("^") + 1) + ": " if "^" in pair else ""
    )
    assert len(found) == 1, found
    assert found[0].startswith(place), found
    assert said in found[0]


def test_every_finding_has_a_hint():
    for pair, _ in CASES.values():
        with pytest.raises(FlowError) as caught:
            parse(flow_with(pair.replace("^", "")), "f.yaml")
        assert all(d.hint for d in caught.value.diagnostics)


@pytest.mark.parametrize("text", ["20", "20 ohm um2", "20 ohm µm²", "20 ohm·um^2", "2e-7 ohm cm2"])
def test_resistivities_are_read_as_people_write_them(text):
    flow = parse(flow_with(f"{CONTACT}, {PAD}, resistance: {{resistivity: {text}}}"), "f.yaml").flow
    assert flow.pairs[0].resistance.resistivity == pytest.approx(20)
    assert flow.pairs[0].name == "CONTACT landing on GATE"


def test_the_schema_knows_the_rule():
    landing = flow_schema()["$defs"]["Landing"]
    assert set(landing["required"]) == {"rule", "contact", "pad"}
    assert "axes" not in landing["properties"]
