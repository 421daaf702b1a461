"""A flow whose every text tries to leave its place in HTML, SVG, DOT or a template."""

from tests.support.flows import Data

SCRIPT = "<script>alert(1)</script>"
IMAGE = "<img src=x onerror=alert(2)>"
QUOTES = '" onmouseover=alert(3) x="\'`'
LINK = "javascript:alert(4)"
CLOSING = "</title></style></script></svg></table>--><svg onload=alert(5)>"
TEMPLATE = "{{ 7 * 7 }}{% raw %}{# no #}${1}"
DOT = '"]; evil [URL="javascript:alert(6)"]; x ["\\N \\E <b>bold</b> &lt;i&gt; \\'
ENTITY = "&amp;&#60;b&#62;&lt;script&gt;"
HASH = 'a b"#p1?x=1&y=2'

TEXTS = (SCRIPT, IMAGE, QUOTES, LINK, CLOSING, TEMPLATE, DOT, ENTITY, HASH)


def hostile_flow() -> Data:
    """Return the flow as plain data, one attack or more in every place that takes free text."""
    described = {"title": CLOSING, "notes": SCRIPT, "owner": QUOTES, "why": TEMPLATE}
    return {
        "flow": SCRIPT + CLOSING,
        "revision": QUOTES,
        "notes": DOT,
        "owner": LINK,
        "reserve": 0.1,
        "tools": {
            IMAGE: {
                "alignment": 10,
                "wafer_alignment": 10,
                "terms": {
                    QUOTES: {"random": 3, "source": CLOSING, **described},
                    DOT: {"bound": 2},
                    TEMPLATE: {"offset": 1, "enters": "pattern"},
                },
                **described,
            }
        },
        "masks": [
            {"id": SCRIPT, "tool": IMAGE, "aligns_to": "wafer", **described},
            {"id": DOT, "tool": IMAGE, "aligns_to": SCRIPT, "cd": 10, "title": LINK},
            {"id": CLOSING, "tool": IMAGE, "aligns_to": {"x": SCRIPT, "y": DOT}, "title": ENTITY},
            {"id": HASH, "tool": IMAGE, "aligns_to": [SCRIPT, DOT], "terms": {IMAGE: {"random": 5}}},
        ],
        "self_aligned": [{"id": QUOTES, "follows": DOT, "edge": 4, **described}],
        "split_layers": {TEMPLATE: [CLOSING, HASH]},
        "pairs": [
            {"name": CLOSING, "rule": "overlay", "between": [SCRIPT, DOT], "limit": 5, **described},
            {"name": LINK, "rule": "overlay", "between": [SCRIPT, TEMPLATE], "limit": 90},
            {"name": IMAGE, "rule": "spacing", "between": [HASH, QUOTES], "drawn": 90, "keep": 1},
            {"name": TEMPLATE, "rule": "overlay", "between": [CLOSING, DOT]},
        ],
    }
