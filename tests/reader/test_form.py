"""Wrong types, unknown keys, words and units, and numbers out of range, each at its value."""

import pytest

from tests.reader.cases import Case, read_cases, told

CASES = """\
1: flow:
FP203 1:6 a text belongs here
hint: nothing stands after the `:`; fill it in, or leave the key out

1: flow: 8
FP203 1:7 a text belongs here
hint: put it in quotes

1: flow: [a]
FP203 1:7 a text belongs here
hint: write one text

1: flow: ""
FP205 1:7 an empty text
hint: write a name

1: title: Estuary
FP202 1:1 'flow' is missing
hint: add `flow: …`

1: flow: Estuary
 : revision: 3
FP203 2:11 a text belongs here
hint: put it in quotes

1: flow: Estuary
 : units: nm
FP201 2:1 unknown key 'units'
hint: did you mean 'unit'?

1: flow: Estuary
 : unit: micron
FP401 2:7 unknown unit 'micron'
hint: did you mean 'um'?

1: flow: Estuary
 : unit: parsecs
FP401 2:7 unknown unit 'parsecs'
hint: choose from nm, um, mm, cm, in

1: flow: Estuary
 : unit: urad
FP402 2:7 urad is not a length
hint: choose from nm, um, mm, cm, in

1: flow: Estuary
 : unit: 3
FP203 2:7 a unit's name belongs here
hint: choose from nm, um, mm, cm, in

1: flow: Estuary
 : unit: parsec
FP401 2:7 unknown unit 'parsec'
hint: choose from nm, um, mm, cm, in

1: flow: Estuary
 : sigma: three
FP203 2:8 a plain number belongs here
hint: for example 3

1: flow: Estuary
 : sigma: 0
FP206 2:8 0 is not above 0
hint: give a number above 0

1: flow: Estuary
 : sigma: .nan
FP207 2:8 the number is not finite
hint: write an ordinary number

1: flow: Estuary
 : confidence: 5000
FP206 2:13 5000 is no usual number of standard deviations
hint: between 0.01 and 100, mostly 1 or 3

1: flow: Estuary
 : basis: mix
FP204 2:8 'mix' is not one of mixed, rss, linear
hint: did you mean 'mixed'?

1: flow: Estuary
 : basis: worst
FP204 2:8 'worst' is not one of mixed, rss, linear
hint: known here: mixed, rss, linear

1: flow: Estuary
 : reserve: 10
FP206 2:10 10 is not between 0 and 1
hint: write 0.1 or 10 % for a tenth

1: flow: Estuary
 : reserve: ten %
FP203 2:10 'ten %' is not a share
hint: write 0.8 or 80 %

1: flow: Estuary
 : reserve: much
FP203 2:10 a share belongs here
hint: write 0.8 or 80 %

1: flow: Estuary
 : wafer: 150 mm
FP203 2:8 a mapping (key: value) belongs here
hint: write `{diameter: …}`, or the keys below, indented

1: flow: Estuary
 : wafer: {diameter: -150 mm}
FP206 2:19 -150 mm is not above 0
hint: give a size above 0

1: flow: Estuary
 : wafer: {edge_exclusion: 5 mm}
FP202 2:8 'diameter' is missing
hint: add `diameter: …`

1: flow: Estuary
 : field: {x: 15 mm}
FP202 2:8 'y' is missing
hint: add `y: …`

1: flow: Estuary
 : field: {x: 0, y: 3}
FP206 2:12 0 is not above 0
hint: give a size above 0

2: tools: [{s: {alignment: 30}}]
FP203 2:8 a mapping (key: value) belongs here
hint: write `name: …` without a dash

2: tools: {s: 30}
FP203 2:12 a mapping (key: value) belongs here
hint: write `{key: value}`, or the keys below, indented

2: tools: {s: }
FP203 2:12 a mapping (key: value) belongs here
hint: nothing stands after the `:`; fill it in, or leave the key out

2: tools: {s: {alignement: 30}}
FP201 2:13 unknown key 'alignement'
hint: did you mean 'alignment'?

2: tools: {s: {alignment: 30, speed: 3}}
FP201 2:28 unknown key 'speed'
hint: known here: alignment, wafer_alignment, terms, title, notes, owner, why

2: tools: {s: {alignment: -30}}
FP206 2:24 -30 is negative
hint: a size is 0 or more; only offsets have a sign

2: tools: {s: {alignment: .inf}}
FP207 2:24 the number is not finite
hint: write an ordinary number

2: tools: {s: {alignment: .nan}}
FP207 2:24 the number is not finite
hint: write an ordinary number

2: tools: {s: {alignment: 1e999}}
FP207 2:24 the number is not finite
hint: write an ordinary number

2: tools: {s: {alignment: 1e40 mm}}
FP206 2:24 1e+40 mm is far too large
hint: check the number and its unit

2: tools: {s: {alignment: thirty}}
FP203 2:24 'thirty' is not a number with a unit
hint: write for example 120 or "0.12 um", with a point for decimals

2: tools: {s: {alignment: '30,5 nm'}}
FP203 2:24 '30,5 nm' is not a number with a unit
hint: write for example 120 or "0.12 um", with a point for decimals

2: tools: {s: {alignment: 30 NM}}
FP401 2:24 unknown unit 'NM'
hint: did you mean 'nm'?

2: tools: {s: {alignment: 30 Å}}
FP401 2:24 unknown unit 'Å'
hint: 1 Å is 0.1 nm

2: tools: {s: {alignment: 30 furlong}}
FP401 2:24 unknown unit 'furlong'
hint: known units: nm, um, mm, cm, in, urad, mrad, ppm, ppb, degC, K

2: tools: {s: {alignment: 30 urad}}
FP402 2:24 a length is wanted, urad does not fit
hint: units that fit: nm, um, mm, cm, in

2: tools: {s: {alignment: yes}}
FP203 2:24 'yes' is not a number with a unit
hint: write for example 120 or "0.12 um", with a point for decimals

2: tools: {s: {alignment: true}}
FP203 2:24 a number or a text with a unit belongs here
hint: for example 120 or "0.12 um"

2: tools: {s: {alignment: [30, 40]}}
FP203 2:24 a number or a text with a unit belongs here
hint: for example 120 or "0.12 um"

2: tools: {s: {alignment: {x: 30}}}
FP202 2:24 'y' is missing
hint: add `y: …`

2: tools: {s: {alignment: {x: 30, y: 40, z: 5}}}
FP201 2:25 unknown key 'x'
hint: known here: random, uniform, bound, offset, varies, per_mark, sites, model, over
FP201 2:32 unknown key 'y'
hint: known here: random, uniform, bound, offset, varies, per_mark, sites, model, over
FP201 2:39 unknown key 'z'
hint: known here: random, uniform, bound, offset, varies, per_mark, sites, model, over

2: tools: {s: {alignment: {}}}
FP202 2:24 no size is given
hint: give one of random, uniform, bound, offset

2: tools: {s: {terms: {t: {shape: rotation}}}}
FP202 2:24 no size is given
hint: give one of random, uniform, bound, offset

2: tools: {s: {terms: {t: {random: 2, shape: rotation}}}}
FP402 2:33 for shape rotation an angle is wanted, a bare number (a length) does not fit
hint: units that fit: urad, mrad

2: tools: {s: {terms: {t: {random: 2 nm, shape: scale}}}}
FP402 2:33 for shape scale a ratio is wanted, nm does not fit
hint: units that fit: ppm, ppb

2: tools: {s: {terms: {t: {random: 2 urad}}}}
FP402 2:33 for shape shift a length is wanted, urad does not fit
hint: units that fit: nm, um, mm, cm, in

2: tools: {s: {terms: {t: {random: 2 ppm, shape: skew}}}}
FP402 2:33 for shape skew an angle is wanted, ppm does not fit
hint: units that fit: urad, mrad

2: tools: {s: {terms: {t: {bound: 2 K}}}}
FP402 2:32 for shape shift a length is wanted, K does not fit
hint: units that fit: nm, um, mm, cm, in

2: tools: {s: {terms: {t: {random: 2 ppm, shape: magnifcation}}}}
FP204 2:47 'magnifcation' is not one of shift, rotation, magnification, scale, skew
hint: did you mean 'magnification'?

2: tools: {s: {terms: {t: {random: {x: 1 ppm, y: 2 ppm}, shape: magnification}}}}
FP405 2:33 random: a magnification is one number for both axes
hint: give a single value, or use shape: scale for a factor on each axis

2: tools: {s: {terms: {t: {random: 2, enters: mask}}}}
FP204 2:44 'mask' is not one of layer, pattern, marks
hint: did you mean 'marks'?

2: tools: {s: {terms: {t: {random: 2, common: 1.5}}}}
FP206 2:44 1.5 is not between 0 and 1
hint: write 0.1 or 10 % for a tenth

2: tools: {s: {terms: {t: {rnadom: 2}}}}
FP201 2:25 unknown key 'rnadom'
hint: did you mean 'random'?

3: masks: {}
FP104 4:3 not a part of the mapping that begins at line 1, column 1
hint: indent the keys of one mapping alike; let nothing follow a closed quote or bracket

4:   - A
FP203 4:5 a mapping (key: value) belongs here
hint: write `{id: …, tool: …, aligns_to: …}`, or the keys below, indented

4:   - {tool: s, aligns_to: wafer}
FP202 4:5 'id' is missing
hint: add `id: …`

4:   - {id: 1, tool: s, aligns_to: wafer}
FP203 4:10 an id is a text
hint: put it in quotes, for example "M1"

4:   - {id: ' A', tool: s, aligns_to: wafer}
FP203 4:10 ' A' cannot be an id
hint: use letters and digits, such as METAL1

5:   - {id: B, aligns_to: A}
FP202 5:5 'tool' is missing
hint: add `tool: …`

5:   - {id: B, tool: s}
FP202 5:5 'aligns_to' is missing
hint: add `aligns_to: …`

5:   - {id: B, tool: s, align_to: A}
FP201 5:22 unknown key 'align_to'
hint: did you mean 'aligns_to'?

5:   - {id: B, tool: s, aligns_to: A, cd: 3, edge: 4}
FP208 5:49 both cd and edge are given
hint: keep one; cd is full width, edge one side

5:   - {id: B, tool: s, aligns_to: A, side: bottom}
FP204 5:42 'bottom' is not one of front, back
hint: known here: front, back

5:   - {id: B, tool: s, aligns_to: A, title: [a]}
FP203 5:43 a text belongs here
hint: write one text

5:   - {id: B, tool: s, aligns_to: []}
FP205 5:33 no reference is named
hint: name an earlier mask, or wafer

5:   - {id: B, tool: s, aligns_to: {x: A}}
FP202 5:33 'y' is missing
hint: add `y: …`

5:   - {id: B, tool: s, aligns_to: 3}
FP203 5:33 a mask's id belongs here
hint: name an earlier mask, or wafer

6: pairs: {rule: overlay, between: [A, B]}
FP203 6:8 a list belongs here
hint: begin each entry with a dash: `- {key: value}`

6: pairs: [A, B]
FP203 6:9 a mapping (key: value) belongs here
hint: write `{rule: …}`, or the keys below, indented
FP203 6:12 a mapping (key: value) belongs here
hint: write `{rule: …}`, or the keys below, indented

6: pairs: [{between: [A, B]}]
FP202 6:9 the pair has no rule
hint: give one of enclosure, extension, spacing, overlap, overlay, landing

6: pairs: [{rule: overlays, between: [A, B]}]
FP204 6:16 unknown rule 'overlays'
hint: did you mean 'overlay'?

6: pairs: [{rule: overlay, between: [A]}]
FP205 6:34 too few entries
hint: `between` names two layers

6: pairs: [{rule: overlay, between: [A, B, A]}]
FP205 6:34 too many entries
hint: `between` names two layers

6: pairs: [{rule: overlay, between: A}]
FP203 6:34 a list belongs here
hint: write `[…]`, or a dash before each entry

6: pairs: [{rule: spacing, between: [A, B]}]
FP202 6:9 'drawn' is missing
hint: add `drawn: …`

6: pairs: [{rule: enclosure, inner: A, outer: B, drawn: 3, limit: 3}]
FP201 6:57 unknown key 'limit'
hint: known here: name, axes, drawn, keep, rule, inner, outer, title, notes, owner, why

6: pairs: [{rule: overlay, between: [A, B], limit: -3}]
FP206 6:49 -3 is negative
hint: a size is 0 or more; only offsets have a sign

6: pairs: [{rule: overlay, between: [A, B], axes: z}]
FP204 6:48 'z' is not one of x, y, xy
hint: known here: x, y, xy

5:   - {id: B, tool: s, aligns_to: A, wafer}
FP201 5:36 unknown key 'wafer'
hint: several values need brackets: `[A, B]`; otherwise: did you mean 'owner'?
"""


@pytest.mark.parametrize("case", read_cases(CASES))
def test_a_wrong_form_is_told_at_its_value(case: Case):
    assert told(case.text) == case.expected
