"""A small summary for notebooks."""

from html import escape

from flowplan.engine.analysis import Result
from flowplan.report.viewanswer import WORDS
from flowplan.report.viewbase import Base, capability

#: The checks with the smallest margins that are shown.
_SHOWN = 10
_HEADS = ("Pair", "Layers", "Axis", "Margin", "Verdict", "Cpk")


def summary_html(result: Result) -> str:
    """Return the verdict counts and the smallest margins as a small table.

    Parameters
    ----------
    result : Result
        An analysis.

    Returns
    -------
    str
        HTML without style or script; all text of the flow is escaped.
    """
    base, flow = Base(result), result.flow
    counts = ", ".join(f"{n} {WORDS[verdict]}" for verdict, n in result.counts.items() if n)
    judged = sorted((e for e in result.entries if e.margin is not None), key=result.margin)
    rows = [
        (
            e.pair.name,
            " / ".join(e.layers),
            e.axis,
            f"{base.signed(result.margin(e))} {flow.unit}",
            WORDS[e.verdict],
            capability(e.cpk),
        )
        for e in judged[:_SHOWN]
    ]
    title = f"{flow.flow} {flow.revision}".strip()
    caption = f"{escape(title)}: {escape(counts or 'no pairs')}"
    if len(judged) > _SHOWN:
        caption += f"; the {_SHOWN} smallest margins of {len(judged)}"
    head = "".join(f'<th scope="col">{word}</th>' for word in _HEADS)
    body = "".join("<tr>" + "".join(f"<td>{escape(cell)}</td>" for cell in row) + "</tr>" for row in rows)
    return f"<table><caption>{caption}</caption><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"
