"""One fold-out a pair: its figures on each axis side by side, its sources, its map."""

from collections.abc import Callable
from dataclasses import dataclass

from flowplan.engine.results import Entry, Verdict
from flowplan.model.flow import BASES, Basis
from flowplan.model.pairs import AnyPair
from flowplan.report.viewanswer import WORDS, point_words
from flowplan.report.viewbase import NBSP, NONE, Base, capability, per_million
from flowplan.report.viewbudget import BudgetBook, BudgetRow
from flowplan.report.viewhops import HopBook, chain_text, compared_words
from flowplan.report.viewmap import MapView

Progress = Callable[[int, int], None]
_WORST_FIRST: tuple[Verdict, ...] = ("fail", "tight", "pass", "unjudged")


@dataclass(frozen=True, slots=True)
class Fact:
    """One row of figures, a cell a column; `chosen` marks the basis of the verdict."""

    label: str
    cells: tuple[str, ...]
    chosen: bool = False


@dataclass(frozen=True, slots=True)
class PairColumn:
    """What one axis adds beside the figures: verdict, chain, sentence, map."""

    axis: str
    verdict: Verdict
    word: str
    chain: str
    compared: str
    map: MapView | None


@dataclass(frozen=True, slots=True)
class PairBlock:
    """One pair of layers; a split layer gives several to one pair."""

    heading: str
    columns: tuple[PairColumn, ...]
    facts: tuple[Fact, ...]
    budget: tuple[BudgetRow, ...]


@dataclass(frozen=True, slots=True)
class PairView:
    """One pair of the flow."""

    anchor: str
    name: str
    rule: str
    verdict: Verdict
    word: str
    summary: str
    remarks: tuple[tuple[str, str], ...]
    blocks: tuple[PairBlock, ...]


@dataclass(frozen=True, slots=True)
class Books:
    """What the fold-outs draw on: the result, its hops, its sources and the maps by entry."""

    base: Base
    hops: HopBook
    budgets: BudgetBook
    maps: dict[int, MapView]


def remarks_of(part: object) -> tuple[tuple[str, str], ...]:
    """Return the free text of a part of the flow: (what it is, text)."""
    words = {"title": "Title", "notes": "Notes", "owner": "Owner", "why": "Why"}
    found = ((label, str(getattr(part, key, ""))) for key, label in words.items())
    return tuple((label, text) for label, text in found if text)


def pairs_view(books: Books, progress: Progress | None = None) -> tuple[PairView, ...]:
    """Return the fold-outs in file order.

    Parameters
    ----------
    books : Books
        What the fold-outs draw on.
    progress : callable, optional
        Called with (pairs done, pairs in all).
    """
    base = books.base
    groups: dict[int, list[tuple[int, Entry]]] = {}
    for i, entry in enumerate(base.result.entries):
        groups.setdefault(id(entry.pair), []).append((i, entry))
    found = []
    for group in groups.values():
        found.append(_pair(books, group))
        if progress:
            progress(len(found), len(groups))
    return tuple(found)


def _pair(books: Books, group: list[tuple[int, Entry]]) -> PairView:
    base = books.base
    pair: AnyPair = group[0][1].pair
    blocks: dict[tuple[str, str], list[tuple[int, Entry]]] = {}
    for i, entry in group:
        blocks.setdefault(entry.layers, []).append((i, entry))
    verdicts = {entry.verdict for _, entry in group}
    worst = next(v for v in _WORST_FIRST if v in verdicts)
    return PairView(
        anchor=base.pair_anchor(group[0][1]),
        name=pair.name,
        rule=pair.rule,
        verdict=worst,
        word=WORDS[worst],
        summary=_summary(base, [entry for _, entry in group]),
        remarks=remarks_of(pair),
        blocks=tuple(_block(books, layers, rows) for layers, rows in blocks.items()),
    )


def _summary(base: Base, entries: list[Entry]) -> str:
    unit = base.result.flow.unit
    judged = [e for e in entries if e.margin is not None]
    if judged:
        worst = min(judged, key=base.result.margin)
        return f"{base.signed(base.result.margin(worst))} {unit} in {worst.axis}"
    largest = max(entries, key=lambda e: e.need.on(base.result.flow.basis))
    return f"±{base.length(largest.need.on(base.result.flow.basis))} {unit} in {largest.axis}"


def _block(
    books: Books,
    layers: tuple[str, str],
    rows: list[tuple[int, Entry]],
) -> PairBlock:
    entries = [entry for _, entry in rows]
    base = books.base
    columns = tuple(
        PairColumn(
            e.axis,
            e.verdict,
            WORDS[e.verdict],
            chain_text(e.chain),
            compared_words(books.hops, e),
            books.maps.get(i),
        )
        for i, e in rows
    )
    heading = f"{layers[0]} and {layers[1]}"
    return PairBlock(heading, columns, _facts(base, entries), books.budgets.rows(entries))


def _facts(base: Base, entries: list[Entry]) -> tuple[Fact, ...]:
    flow = base.result.flow
    at = f"at {flow.confidence:g}σ"

    def row(label: str, cell: Callable[[Entry], str]) -> Fact:
        return Fact(label, tuple(cell(e) for e in entries))

    limit = "Limit" if entries[0].pair.rule == "overlay" else "Drawn"
    facts = [row(limit, lambda e: base.length(e.drawn))]
    if limit == "Drawn":
        facts.append(row("Must remain", lambda e: base.length(e.keep)))
    facts += [
        row("Offset, worse side", lambda e: base.signed(e.residual.offset)),
        row("Bounds", lambda e: base.plus_minus(e.residual.bound)),
        row(f"Random {at}", lambda e: base.plus_minus(e.residual.random)),
    ]
    facts += [_basis_fact(base, entries, basis) for basis in BASES]
    facts += [
        row(f"Overlay {at}, exact", lambda e: base.plus_minus(e.overlay.random)),
        row(f"Overlay {at}, plain RSS", lambda e: _chain_rss(base, e)),
        row("Cpk", lambda e: capability(e.cpk)),
        row("Fails, ppm", lambda e: per_million(e.fail_probability)),
        row("Worst point, mm", point_words),
    ]
    return tuple(facts)


def _chain_rss(base: Base, entry: Entry) -> str:
    return NONE if entry.chain_rss is None else base.plus_minus(entry.chain_rss)


def _basis_fact(base: Base, entries: list[Entry], name: Basis) -> Fact:
    flow = base.result.flow
    cells = []
    for e in entries:
        need = f"need{NBSP}{base.length(e.need.on(name))}"
        cells.append(need if e.margin is None else f"{need}, margin{NBSP}{base.signed(e.margin.on(name))}")
    chosen = name == flow.basis
    return Fact(f"Basis {name}" + (" (verdict)" if chosen else ""), tuple(cells), chosen)
