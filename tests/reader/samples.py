"""For every code of the registry a file, or a command, that brings it about, and what is told then."""

from dataclasses import dataclass

FLOW = """\
flow: Estuary
tools: {s: {alignment: 30, wafer_alignment: 900}}
masks:
  - {id: A, tool: s, aligns_to: wafer}
  - {id: B, tool: s, aligns_to: A}
pairs: [{rule: overlay, between: [A, B], limit: 90}]
"""


@dataclass(frozen=True)
class Sample:
    """What brings a code about.

    Attributes
    ----------
    told : str
        The first line on standard error, from the place on.
    text : str or bytes
        Content of ``f.yaml``.
    command : tuple of str
        The command line.
    status : int
        The exit status.
    data : str
        Content of ``d.csv``.
    """

    told: str
    text: str | bytes = FLOW
    command: tuple[str, ...] = ("check", "f.yaml")
    status: int = 2
    data: str = ""


def line(number: int, text: str) -> str:
    """Return the flow with one line replaced."""
    lines = FLOW.splitlines()
    lines[number - 1] = text
    return "\n".join(lines) + "\n"


def term(text: str) -> str:
    """Return the flow with a term on its tool."""
    return line(2, f"tools: {{s: {{alignment: 30, wafer_alignment: 900, terms: {{t: {text}}}}}}}")


def marks(text: str) -> str:
    """Return the flow with an alignment by marks on its tool."""
    return line(
        2,
        "wafer: {diameter: 150 mm}\nfield: {x: 15 mm, y: 15 mm}\n"
        f"tools: {{s: {{alignment: {{{text}}}, wafer_alignment: 900}}}}",
    )


HEADINGS = "mask,reference,lot,wafer,field_x,field_y,site_x,site_y,dx,dy\n"

SAMPLES: dict[str, Sample] = {
    "FP101": Sample("none.yaml:1:1: no such file", command=("check", "none.yaml")),
    "FP102": Sample("f.yaml:1:7: not UTF-8 text: the byte B5 (hexadecimal)", b"flow: \xb5"),
    "FP103": Sample("f.yaml:1:1: larger than 4 MB, which no flow file needs", "#" * 4_000_001),
    "FP104": Sample("f.yaml:1:7: the quote opened here is never closed", 'flow: "Estuary\n'),
    "FP105": Sample("f.yaml:2:1: the key 'flow' stands twice", line(1, "flow: a\nflow: b")),
    "FP106": Sample("f.yaml:1:47: nested too deeply", "masks: " + "[" * 60 + "]" * 60),
    "FP107": Sample("f.yaml:1:8: aliases unfold to too much or to themselves", "masks: &a [*a]\n"),
    "FP108": Sample("f.yaml:1:1: the file is empty", "# nothing\n"),
    "FP109": Sample("f.yaml:2:1: a second document starts here", "flow: Estuary\n---\nflow: b\n"),
    "FP201": Sample("f.yaml:1:1: unknown key 'floww'", line(1, "floww: Estuary")),
    "FP202": Sample("f.yaml:5:5: 'tool' is missing", line(5, "  - {id: B, aligns_to: A}")),
    "FP203": Sample("f.yaml:1:7: a text belongs here", line(1, "flow: 8")),
    "FP204": Sample("f.yaml:6:16: unknown rule 'over'", line(6, "pairs: [{rule: over, between: [A, B]}]")),
    "FP205": Sample("f.yaml:5:33: no reference is named", line(5, "  - {id: B, tool: s, aligns_to: []}")),
    "FP206": Sample("f.yaml:2:61: -3 is negative", term("-3")),
    "FP207": Sample("f.yaml:2:61: the number is not finite", term(".nan")),
    "FP208": Sample(
        "f.yaml:5:49: both cd and edge are given",
        line(5, "  - {id: B, tool: s, aligns_to: A, cd: 3, edge: 4}"),
    ),
    "FP301": Sample("f.yaml:5:19: unknown tool 't'", line(5, "  - {id: B, tool: t, aligns_to: A}")),
    "FP302": Sample("f.yaml:5:10: the id 'A' is used twice", line(5, "  - {id: A, tool: s, aligns_to: A}")),
    "FP303": Sample("f.yaml:5:33: 'B' aligns to itself", line(5, "  - {id: B, tool: s, aligns_to: B}")),
    "FP304": Sample(
        "f.yaml:5:33: the weights add up to 0.9, not 1",
        line(5, "  - {id: B, tool: s, aligns_to: [{mask: A, weight: 0.9}]}"),
    ),
    "FP305": Sample(
        "f.yaml:6:38: 'A on A' pairs 'A' with itself", line(6, "pairs: [{rule: overlay, between: [A, A]}]")
    ),
    "FP306": Sample(
        "f.yaml:5:10: the id 'wafer' means the wafer itself",
        line(5, "  - {id: wafer, tool: s, aligns_to: A}"),
    ),
    "FP307": Sample(
        "f.yaml:5:67: in a mask's terms `common` needs a `source`",
        line(5, "  - {id: B, tool: s, aligns_to: A, terms: {t: {random: 3, common: 0.5}}}"),
    ),
    "FP308": Sample(
        "f.yaml:5:33: warning: 'B' reads marks, but `tools.s.alignment` is not given and counts as 0",
        line(2, "tools: {s: {}}"),
        status=0,
    ),
    "FP309": Sample("f.yaml:6:1: warning: no pair is judged", line(6, "pairs: []"), status=0),
    "FP401": Sample("f.yaml:2:61: unknown unit 'furlong'", term("3 furlong")),
    "FP402": Sample(
        "f.yaml:2:70: for shape skew an angle is wanted, ppm does not fit",
        term("{random: 2 ppm, shape: skew}"),
    ),
    "FP403": Sample(
        "f.yaml:2:85: a skew over the field needs the field's size", term("{random: 2 urad, shape: skew}")
    ),
    "FP404": Sample(
        "f.yaml:2:8: no whole field fits on the usable wafer",
        line(1, "flow: Estuary\nfield: {x: 9 mm, y: 9 mm}\nwafer: {diameter: 9 mm}"),
    ),
    "FP405": Sample(
        "f.yaml:2:70: random: a skew is one number for both axes",
        term("{random: {x: 1 urad, y: 2 urad}, shape: skew}"),
    ),
    "FP406": Sample(
        "f.yaml:4:61: a mark lies off the usable wafer",
        marks("per_mark: 30, model: shift, sites: [{x: 90 mm, y: 0}]"),
    ),
    "FP407": Sample(
        "f.yaml:4:60: 1 mark cannot fix rotation",
        marks("per_mark: 30, model: rigid, sites: [{x: 60 mm, y: 0}]"),
    ),
    "FP408": Sample(
        "f.yaml:4:43: a bound of each mark says nothing about how the marks differ",
        marks("per_mark: {bound: 3}, model: shift, sites: [{x: 60 mm, y: 0}]"),
    ),
    "FP501": Sample(
        "flowplan: cannot write 'none/f.html': No such file or directory",
        command=("report", "f.yaml", "-o", "none/f.html"),
    ),
    "FP601": Sample("flowplan: unknown layer 'C'", command=("chain", "f.yaml", "A", "C")),
    "FP602": Sample(
        "flowplan: 'f.gif' is no kind of drawing that flowplan writes",
        command=("tree", "f.yaml", "-o", "f.gif"),
    ),
    "FP603": Sample(
        "flowplan: 'B' is both freed and pinned", command=("propose", "f.yaml", "--free", "B", "--pin", "B")
    ),
    "FP604": Sample("flowplan: no mask has a choice of references", command=("propose", "f.yaml")),
    "FP605": Sample(
        "flowplan: the flow has no variant 'other'", command=("margins", "f.yaml", "--variant", "other")
    ),
    "FP701": Sample(
        "none.csv:1:1: cannot read the data: No such file or directory",
        command=("measured", "f.yaml", "none.csv"),
    ),
    "FP702": Sample(
        "d.csv:1:1: no column mask",
        command=("measured", "f.yaml", "d.csv"),
        data=HEADINGS.replace("mask", "layer"),
    ),
    "FP703": Sample(
        "d.csv:1:1: the file has no row that can be read",
        command=("measured", "f.yaml", "d.csv"),
        data=HEADINGS,
    ),
}
