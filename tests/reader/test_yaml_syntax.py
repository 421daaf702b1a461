"""Text that is not YAML, or uses what a flow file does not, is told at the place to mend."""

import pytest

from tests.reader.cases import Case, read_cases, told

CASES = r"""
2: tools: {s: {alignment: 30}
FP104 3:1 the `{` at line 2, column 8 is not closed before this
hint: add the missing `,` or `}`

2: tools: {s: {alignment: 30}}}
FP104 2:28 not a part of the mapping that begins at line 1, column 1
hint: indent the keys of one mapping alike; let nothing follow a closed quote or bracket

6: pairs: [{rule: overlay, between: [A, B}]
FP104 6:39 the `[` at line 6, column 34 is not closed before this
hint: add the missing `,` or `]`

1: flow: "Estuary
FP104 1:7 the quote opened here is never closed
hint: close the quote

1: flow: 'Estuary
FP104 1:7 the quote opened here is never closed
hint: close the quote

1: flow: "Estuary" CMOS
FP104 1:17 not a part of the mapping that begins at line 1, column 1
hint: indent the keys of one mapping alike; let nothing follow a closed quote or bracket

1: flow: "Estu\qary"
FP104 1:12 no escape that YAML knows
hint: use single quotes, in which a backslash is itself

1: flow:Estuary
FP104 1:1 a key without its `: `
hint: write `key: value`; indent what continues the line above

1: flow: Estuary: CMOS
FP104 1:14 a `:` where no `key: value` can stand
hint: put a text with `: ` in quotes; indent the keys of one mapping alike

1: flow
FP104 1:1 a key without its `: `
hint: write `key: value`; indent what continues the line above

1: flow: *star
FP104 1:7 the alias *star names no anchor
hint: write the value out

1: flow: * star
FP104 1:7 a text cannot begin with `*` or `&`
hint: put the text in quotes

1: flow: @home
FP104 1:7 a text cannot begin with '@'
hint: put the text in quotes

1: flow: %x
FP104 1:7 a text cannot begin with '%'
hint: put the text in quotes

1: flow: !home Estuary
FP109 1:7 the tag !home is not used in a flow file
hint: leave the tag out

1: flow: !!str Estuary
FP109 1:7 the tag !!str is not used in a flow file
hint: leave the tag out

1: flow: - a
FP104 1:7 a list entry cannot begin here
hint: begin each `- ` on a line of its own

5:    - {id: B, tool: s, aligns_to: A}
FP104 5:4 not indented like the list above
hint: indent the `- ` of one list alike, and the keys of one entry

5:  - {id: B, tool: s, aligns_to: A}
FP104 5:2 not a part of the mapping that begins at line 1, column 1
hint: indent the keys of one mapping alike; let nothing follow a closed quote or bracket

5: ␉- {id: B, tool: s, aligns_to: A}
FP104 5:1 a tab where only spaces may stand
hint: indent with spaces

3:  masks:
FP104 3:2 not a part of the mapping that begins at line 1, column 1
hint: indent the keys of one mapping alike; let nothing follow a closed quote or bracket

5:   - {id: B, tool: s, aligns_to:A}
FP104 5:31 a `:` without a space after it
hint: write `key: value`

6: pairs: [{rule: overlay, between: [A, B], limit:}]
FP104 6:47 a `:` without a space after it
hint: write `key: value`

6: pairs: [
FP104 6:9 nothing stands here where a value belongs
hint: fill it in; close what is open

6: ---
FP109 6:1 a second document starts here
hint: one flow a file

6: ? [a, b]
 : : c
FP109 6:3 a key must be a plain text
hint: write `key: value`

5:   - &b {id: B, tool: s, aligns_to: A}
 :   - {<<: *b, id: C}
FP109 6:6 merge keys are not used in a flow file
hint: write the keys out

5:   - {id: B, tool: s, aligns_to: &a [*a]}
FP107 5:33 aliases unfold to too much or to themselves
hint: write values out

1: flow: Estuary
 : flow: Estuary again
FP105 2:1 the key 'flow' stands twice
hint: keep one of them; the first is in line 1

2: tools: {s: {alignment: 30, 'alignment': 40}}
FP105 2:28 the key 'alignment' stands twice
hint: keep one of them; the first is in line 2
"""


@pytest.mark.parametrize("case", read_cases(CASES))
def test_the_place_to_mend_is_told(case: Case):
    assert told(case.text) == case.expected
