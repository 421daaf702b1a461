"""What spans several parts of a flow: ids, order, weights, pairs, geometry."""

import pytest

from tests.reader.cases import Case, read_cases, told

CASES = """\
4:   - {id: wafer, tool: s, aligns_to: wafer}
FP306 4:10 the id 'wafer' means the wafer itself
hint: choose another
FP301 5:33 unknown mask 'A'
hint: known here: wafer, wafer
FP301 6:35 unknown layer 'A'
hint: known here: wafer, B

5:   - {id: B, tool: t, aligns_to: A}
FP301 5:19 unknown tool 't'
hint: known here: s

5:   - {id: B, tool: s, aligns_to: a}
FP301 5:33 unknown mask 'a'
hint: did you mean 'A'?

5:   - {id: B, tool: s, aligns_to: Q}
FP301 5:33 unknown mask 'Q'
hint: known here: wafer, A

5:   - {id: B, tool: s, aligns_to: B}
FP303 5:33 'B' aligns to itself
hint: known here: wafer, A

4:   - {id: A, tool: s, aligns_to: B}
FP303 4:33 'A' aligns to 'B', which does not exist yet at that point
hint: only earlier layers can be read: wafer

5:   - {id: B, tool: s, aligns_to: A}
 :   - {id: A, tool: s, aligns_to: A}
FP302 6:10 the id 'A' is used twice
hint: each mask, feature and split layer has an id of its own

5:   - {id: B, tool: s, aligns_to: [{mask: A, weight: 0.5}, {mask: wafer, weight: 0.6}]}
FP304 5:33 the weights add up to 1.1, not 1
hint: change them to add up to 1

5:   - {id: B, tool: s, aligns_to: [{mask: A, weight: 0.5}, wafer]}
FP304 5:33 some references have a weight and some do not
hint: give all or none

5:   - {id: B, tool: s, aligns_to: [{mask: A, weight: -1}, {mask: wafer, weight: 2}]}
FP206 5:52 -1 is not above 0
hint: give a number above 0

5:   - {id: B, tool: s, aligns_to: [A, A]}
FP302 5:33 'A' stands twice in one average
hint: name each reference once

5:   - {id: B, tool: s, aligns_to: {x: A, y: [{mask: A, weight: 0.9}]}}
FP304 5:33 the weights add up to 0.9, not 1
hint: change them to add up to 1

5:   - {id: B, tool: s, aligns_to: A, terms: {t: {random: 3, common: 0.5}}}
FP307 5:67 in a mask's terms `common` needs a `source`
hint: add `source: NAME`, the same name where the error is shared

2: tools: {s: {alignment: 30, wafer_alignment: 900, terms: {t: {random: 2 urad, shape: rotation}}}}
FP403 2:85 a rotation over the field needs the field's size
hint: add `field: {x: 15 mm, y: 15 mm}`

2: wafer: {diameter: 100 mm}
 : tools: {s: {alignment: 30, wafer_alignment: 900, terms: {t: {random: 2 urad, shape: skew, over: wafer}}}}
FP403 3:85 a skew over the wafer needs the field's size
hint: add `field: {x: 15 mm, y: 15 mm}`

2: field: {x: 9 mm, y: 9 mm}
 : tools: {s: {alignment: 30, wafer_alignment: 900, terms: {t: {random: 2 ppm, shape: scale, over: wafer}}}}
FP403 3:84 a scale over the wafer needs the wafer's size
hint: add `wafer: {diameter: 150 mm}`

2: wafer: {diameter: 10 mm}
 : field: {x: 9 mm, y: 9 mm}
 : tools: {s: {alignment: 30, wafer_alignment: 900}}
FP404 3:8 no whole field fits on the usable wafer
hint: check the units of `wafer` and `field`

2: wafer: {diameter: 300 mm}
 : field: {x: 9, y: 9}
 : tools: {s: {alignment: 30, wafer_alignment: 900}}
FP206 3:8 the wafer would hold more than 40000 fields
hint: check the units of `wafer` and `field`

2: wafer: {diameter: 9 mm, edge_exclusion: 5 mm}
 : field: {x: 9 mm, y: 9 mm}
 : tools: {s: {alignment: 30, wafer_alignment: 900}}
FP404 3:8 no whole field fits on the usable wafer
hint: check the units of `wafer` and `field`

6: pairs: [{rule: overlay, between: [A, A]}]
FP305 6:38 'A on A' pairs 'A' with itself
hint: name two different layers

6: pairs: [{rule: overlay, between: [A, C]}]
FP301 6:38 unknown layer 'C'
hint: known here: A, B

6: pairs: [{rule: enclosure, inner: A, outer: metal, drawn: 3}]
FP301 6:44 unknown layer 'metal'
hint: known here: A, B

6: pairs: [{name: p, rule: overlay, between: [A, B]}, {name: p, rule: overlay, between: [B, A]}]
FP302 6:59 the pair name 'p' is used twice
hint: give each pair a `name:` of its own

6: pairs: [{rule: overlay, between: [A, B]}, {rule: overlay, between: [A, B]}]
FP302 6:43 the pair name 'B on A' is used twice
hint: give each pair a `name:` of its own

6: split_layers: {M: []}
 : pairs: [{rule: overlay, between: [A, B]}]
FP205 6:19 the split layer 'M' has no mask
hint: list the masks that print it

6: split_layers: {M: [A, X]}
 : pairs: [{rule: overlay, between: [A, B]}]
FP301 6:23 unknown mask 'X'
hint: known here: A, B

6: split_layers: {M: [A, A]}
 : pairs: [{rule: overlay, between: [A, B]}]
FP302 6:23 'A' stands twice in 'M'
hint: name each mask once

6: split_layers: {M: [A, B]}
 : pairs: [{rule: overlay, between: [M, B]}]
FP305 7:38 'B on M' pairs 'B' with itself
hint: name two different layers

6: split_layers: {A: [A, B]}
 : pairs: [{rule: overlay, between: [A, B]}]
FP302 6:19 the id 'A' is used twice
hint: each mask, feature and split layer has an id of its own

5:   - {id: B, tool: s, aligns_to: M}
 : split_layers: {M: [A]}
FP301 5:33 'M' is a split layer and has no mark of its own
hint: name one of A

6: self_aligned: [{id: S, follows: Q}]
 : pairs: [{rule: overlay, between: [A, B]}]
FP301 6:33 unknown layer 'Q'
hint: known here: A, B, S

6: self_aligned: [{id: S, follows: S}]
 : pairs: [{rule: overlay, between: [A, B]}]
FP303 6:33 'S' follows 'S' in a circle
hint: let one of them follow a mask

6: self_aligned: [{id: B, follows: A}]
 : pairs: [{rule: overlay, between: [A, B]}]
FP302 6:21 the id 'B' is used twice
hint: each mask, feature and split layer has an id of its own

6: self_aligned: [{id: S, follows: A, tone: inverse}]
 : pairs: [{rule: overlay, between: [A, B]}]
FP204 6:42 'inverse' is not one of same, opposite
hint: known here: same, opposite

6: self_aligned: [{id: S, follows: wafer}]
 : pairs: [{rule: overlay, between: [A, B]}]
FP301 6:33 unknown layer 'wafer'
hint: known here: A, B, S

5:   - {id: B, tool: s, aligns_to: S}
 : self_aligned: [{id: S, follows: B}]
FP303 5:33 'B' aligns to 'S', which does not exist yet at that point
hint: only earlier layers can be read: wafer, A
"""


@pytest.mark.parametrize("case", read_cases(CASES))
def test_a_contradiction_is_told_at_the_part_to_change(case: Case):
    assert told(case.text) == case.expected
