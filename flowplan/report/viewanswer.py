"""The answer: how many checks pass, and the worst one with its chain."""

from dataclasses import dataclass

from flowplan.engine.points import Point
from flowplan.engine.results import VERDICTS, Entry, Verdict
from flowplan.model.masks import Mask
from flowplan.report.charts import ChainDrawing, chain_drawing
from flowplan.report.viewbase import NBSP, Base, LayerName, capability, counted, per_million, plain
from flowplan.report.viewhops import HopBook, HopFigures, chain_text, compared_words

WORDS: dict[Verdict, str] = {"pass": "pass", "tight": "tight", "fail": "fail", "unjudged": "not judged"}


@dataclass(frozen=True, slots=True)
class Count:
    """How many checks got a verdict."""

    verdict: Verdict
    word: str
    number: int


@dataclass(frozen=True, slots=True)
class HopRow:
    """One hop as the table beside the drawing shows it."""

    child: LayerName
    reference: LayerName
    how: str
    offset: str
    bound: str
    random: str


@dataclass(frozen=True, slots=True)
class WorstView:
    """The judged pair with the smallest margin."""

    anchor: str
    name: str
    first: LayerName
    second: LayerName
    axis: str
    verdict: Verdict
    word: str
    margin: str
    need: str
    room: str
    cpk: str
    ppm: str
    point: str
    chain: str
    through: LayerName
    drawing: ChainDrawing
    hops: tuple[HopRow, ...]
    several: bool
    compared: str


@dataclass(frozen=True, slots=True)
class AnswerView:
    """What the report opens with."""

    headline: str
    detail: str
    counts: tuple[Count, ...]
    worst: WorstView | None


def answer_view(base: Base, book: HopBook) -> AnswerView:
    """Return the opening of the report."""
    result = base.result
    counts = result.counts
    judged = sum(counts.values()) - counts["unjudged"]
    pairs = counted(base.n_pairs, "pair")
    left_out = f", {counts['unjudged']} of them not judged" if counts["unjudged"] and judged else ""
    checks = counted(len(result.checks), "check")
    area = ", or a contact's landed area" if result.landings else ""
    detail = f"{checks} on {pairs}{left_out}. A check is one pair of layers on one axis{area}."
    worst = result.worst
    return AnswerView(
        _headline(counts, judged),
        detail,
        tuple(Count(v, WORDS[v], counts[v]) for v in VERDICTS),
        None if worst is None else _worst(base, book, worst),
    )


def _headline(counts: dict[Verdict, int], judged: int) -> str:
    if not judged:
        return "Nothing is judged: no pair has a drawn dimension or a limit."
    if counts["fail"]:
        verb = "fails" if counts["fail"] == 1 else "fail"
        return f"{counted(counts['fail'], 'check')} of {judged} {verb}."
    if counts["tight"]:
        verb = "is" if counts["tight"] == 1 else "are"
        return f"No check fails; {counts['tight']} of {judged} {verb} tight."
    return f"All {judged} checks pass." if judged > 1 else "The one check passes."


def point_words(entry: Entry) -> str:
    """Return where the figures of an entry are taken [mm]."""
    return site_words(entry.point)


def site_words(at: Point | None) -> str:
    """Return a place on the wafer and in its field [mm]."""
    if at is None:
        return "the same everywhere"
    field, site = (f"({plain(a)},{NBSP}{plain(b)})" for a, b in ((at.X, at.Y), (at.x, at.y)))
    return f"field{NBSP}{field}, site{NBSP}{site}"


def overlay_words(book: HopBook, entry: Entry) -> str:
    """Return the random part of an overlay in a sentence, with what plain chain RSS makes of it."""
    base, unit = book.base, book.base.result.flow.unit
    words = f"The random part of their overlay is {base.plus_minus(entry.overlay.random)} {unit}"
    if entry.chain_rss is not None and len(entry.chain.layers) > 2:
        words += f"; plain RSS along the chain gives {base.plus_minus(entry.chain_rss)} {unit}"
    return f"{words}. {compared_words(book, entry)}"


def hop_words(base: Base, hop: HopFigures) -> str:
    """Return how the child gets its place."""
    return "reads" if isinstance(base.result.flow.layers[hop.child], Mask) else "follows"


def _worst(base: Base, book: HopBook, entry: Entry) -> WorstView:
    hops = book.hops(entry)
    result = base.result
    return WorstView(
        anchor=base.pair_anchor(entry),
        name=entry.pair.name,
        first=base.names[entry.layers[0]],
        second=base.names[entry.layers[1]],
        axis=entry.axis,
        verdict=entry.verdict,
        word=WORDS[entry.verdict],
        margin=base.signed(result.margin(entry)),
        need=base.length(entry.need.on(result.flow.basis)),
        room=base.length(None if entry.nominal is None else entry.nominal - entry.keep),
        cpk=capability(entry.cpk),
        ppm=per_million(entry.fail_probability),
        point=point_words(entry),
        chain=chain_text(entry.chain),
        through=base.names[entry.chain.through],
        drawing=chain_drawing(entry.chain, tuple(_hop_label(base, hop) for hop in hops)),
        hops=tuple(_hop_row(base, hop) for hop in hops),
        several=entry.chain.one_of_several,
        compared=overlay_words(book, entry),
    )


def _hop_label(base: Base, hop: HopFigures) -> str:
    need = hop.parts.bound + hop.parts.random
    return f"±{base.length(need)}" if need or not hop.parts.offset else base.signed(hop.parts.offset)


def _hop_row(base: Base, hop: HopFigures) -> HopRow:
    return HopRow(
        base.names[hop.child],
        base.names[hop.reference],
        hop_words(base, hop),
        base.signed(hop.parts.offset),
        base.length(hop.parts.bound),
        base.length(hop.parts.random),
    )
