"""``flowplan chain``: why two layers lie apart as they do."""

from dataclasses import dataclass

from flowplan.cli.session import known_layer, read_flow
from flowplan.cli.streams import emit, emit_json, folded, width
from flowplan.cli.tables import Column, show_note, show_table
from flowplan.engine.analysis import Engine
from flowplan.engine.explain import Direct, Explanation, Hop, direct, explain
from flowplan.engine.markoutlook import Growth
from flowplan.engine.results import Entry, Parts, Verdict
from flowplan.engine.sources import Source
from flowplan.model.base import Axis
from flowplan.model.flow import Flow
from flowplan.report.textchain import explanation_record, fitted_words, mark_sites
from flowplan.report.textfigures import Figures, percent

_SHOWN = 3
_SAME = 1e-9
_EFFECTS = {"cancels": "gone", "shrinks": "smaller", "grows": "larger"}


@dataclass(frozen=True, slots=True)
class Question:
    """Which flow, which two layers and which axes."""

    name: str
    variant: str | None
    layers: tuple[str, str]
    axes: tuple[Axis, ...]


def chain(asked: Question, *, as_json: bool) -> None:
    """Explain the overlay of two layers of a flow, axis by axis."""
    flow = read_flow(asked.name, asked.variant)
    first, second = (known_layer(flow, layer, wafer=True) for layer in asked.layers)
    engine = Engine.of(flow)
    found = [
        (explain(engine, first, second, axis), direct(engine, first, second, axis)) for axis in asked.axes
    ]
    if as_json:
        records = [explanation_record(e, d, flow) for e, d in found]
        emit_json(
            {
                "flow": flow.flow,
                "variant": flow.variant,
                "unit": flow.unit,
                "layers": [first, second],
                "axes": records,
            }
        )
        return
    for number, (explanation, alternative) in enumerate(found):
        if number:
            emit("")
        _Page(flow, explanation, alternative).show()


class _Page:
    """One axis on the screen."""

    def __init__(self, flow: Flow, explanation: Explanation, alternative: Direct) -> None:
        self.flow = flow
        self.explanation = explanation
        self.entry = explanation.entry
        self.alternative = alternative
        amounts = [row.contribution for row in self.entry.sources]
        self.figures = Figures.fitting(flow.unit, [*amounts, self.entry.overlay.random], digits=3)

    def show(self) -> None:
        self._show_head()
        self._show_hops()
        self._show_mark_sites()
        self._show_shared()
        self._show_sources()
        self._show_sum()
        self._show_alternative()

    def _show_head(self) -> None:
        entry, flow = self.entry, self.flow
        first, second = entry.layers
        show_note(f"{second} on {first}, along {entry.axis}", strong=True)
        show_note(f"lengths in {flow.unit}: offset ± random at {flow.confidence:g} sigma ± bounds")
        if entry.point:
            p = entry.point
            where = f"field at {p.X:g}, {p.Y:g} mm, site {p.x:g}, {p.y:g} mm from its centre"
            show_note(f"at the worst point: {where}")

    def _show_hops(self) -> None:
        chain = self.entry.chain
        several = ", the heaviest of several ways" if chain.one_of_several else ""
        self._section(f"Chain through {chain.through}{several}")
        steps = [(_step(hop), self._error(hop.overlay)) for hop in self.explanation.hops]
        left, right = (max(len(cells[i]) for cells in steps) for i in (0, 1))
        left = max(min(left, width() - right - 4), 1)
        for (step, error), hop in zip(steps, self.explanation.hops, strict=True):
            if len(step) > left:
                emit(folded(f"  {step}", 4))
                step = ""
            emit(f"  {step:<{left}}  {error:>{right}}")
            show_note(f"      {self._largest(hop)}")

    def _show_mark_sites(self) -> None:
        for found, hops in mark_sites(self.explanation, self.flow):
            read = ", ".join(f"{hop.child} reads {hop.reference}" for hop in hops)
            self._section(f"Alignment from mark sites: {read}")
            show_note(f"  {found.sites}; ± random of this reading alone, in its worst direction")
            words = fitted_words(found, self.flow, self.figures.text)
            emit(folded(f"  about the centre: {words}", 4))
            rows = [(f"{found.sites.count}, as planned", *self._grown(found.planned))]
            rows += [(str(count), *self._grown(growth)) for count, growth in found.tried]
            _, middle, edge = (f"{d:.4g} mm" for d in found.planned.distances)
            stops = ("centre", middle, f"{'edge' if found.sites.over == 'wafer' else 'corner'} {edge}")
            columns = (Column("marks"), *(Column(stop, "right") for stop in stops))
            show_table(columns, rows, indent=2)
            show_note(f"  other numbers of marks stand on a ring of radius {found.radius:.4g} mm")

    def _grown(self, growth: Growth) -> tuple[str, ...]:
        sigma = growth.sigma[self.entry.axis]
        return tuple(self.figures.text(self.flow.confidence * s) for s in sigma.tolist())

    def _show_shared(self) -> None:
        rows: list[tuple[str, ...]] = []
        inherited: list[str] = []
        for row in self.explanation.shared:
            source = row.source
            if row.effect == "cancels" and not row.in_hops and source.of in self.flow.layers:
                inherited.append(source.of)
                continue
            values = self.figures.text(row.apart), self.figures.text(abs(row.in_overlay))
            rows.append((_named(source), source.kind, *values, _EFFECTS[row.effect]))
        if inherited:
            layers = [layer for layer in self.flow.layers if layer in inherited]
            span = layers[0] if len(layers) == 1 else f"{layers[0]} to {layers[-1]}"
            rows.append((f"all that both inherit from {span}", "", "", self.figures.text(0.0), "gone"))
        grows = any(row.effect == "grows" for row in self.explanation.shared)
        title = "What cancels and what adds up" if grows else "What cancels"
        self._section(title if rows else "Nothing cancels: no source is shared")
        if rows:
            columns = (
                Column("source"), Column("kind"), Column("step by step", "right"),
                Column("exact", "right"), Column(""),
            )  # fmt: skip
            show_table(columns, rows, indent=2)

    def _show_sources(self) -> None:
        if not self.entry.sources:
            return
        self._section("Where the overlay comes from")
        columns = (
            Column("source"), Column("kind"), Column("amount", "right"), Column("share", "right"),
        )  # fmt: skip
        rows = [
            (
                _named(row.source),
                row.source.kind,
                self.figures.text(row.contribution if row.source.kind == "offset" else abs(row.contribution)),
                percent(row.share) if row.source.kind in ("random", "uniform") else "",
            )
            for row in self.entry.sources
        ]
        show_table(columns, rows, indent=2)

    def _show_sum(self) -> None:
        entry, figures = self.entry, self.figures
        emit("")
        rows = [
            ("random, exact", figures.text(entry.overlay.random), ""),
            ("random, plain chain RSS", *self._by_hand()),
        ]
        if entry.overlay.bound:
            rows.append(("bounds", figures.text(entry.overlay.bound), ""))
        if entry.overlay.offset:
            rows.append(("offset", figures.text(entry.overlay.offset), ""))
        width = max(len(label) for label, _, _ in rows)
        number = max(len(value) for _, value, _ in rows)
        for label, value, note in rows:
            emit(f"  {label:<{width}}  {value:>{number}}  {note}".rstrip())

    def _by_hand(self) -> tuple[str, str]:
        if self.entry.chain_rss is None:
            return "-", "not defined where references are averaged"
        excess = self.explanation.excess
        note = ""
        if excess is not None and abs(excess) < _SAME:
            note = "the same"
        elif excess is not None:
            note = f"{percent(abs(excess))} too {'large' if excess > 0 else 'small'}"
        return self.figures.text(self.entry.chain_rss), note

    def _show_alternative(self) -> None:
        other = self.alternative
        if other.overlay is None:
            emit("")
            emit(folded(f"{other.refusal}.", 2))
            return
        self._section(f"If {other.later} aligned directly to {other.earlier} along {self.entry.axis}")
        basis = self.flow.basis
        rows = [
            (
                "overlay",
                self._error(other.overlay.before.overlay),
                self._error(other.overlay.after.overlay),
                "",
            )
        ]
        for change in other.pairs:
            was, now = (self._margin(entry) for entry in (change.before, change.after))
            verdicts = dict.fromkeys((change.before.verdict, change.after.verdict))
            rows.append((f"margin of {change.before.pair.name}", was, now, " to ".join(verdicts)))
        columns = (
            Column(""), Column("now", "right"), Column("then", "right"), Column("verdict"),
        )  # fmt: skip
        show_table(columns, rows, indent=2)
        before, after = (_count_line(counts) for counts in other.counts)
        told = [f"{before}, before and after"] if before == after else [f"{before} now", f"{after} then"]
        for label, line in zip((f"whole flow, {basis} basis:", ""), told, strict=False):
            emit(f"  {label:<{len(basis) + 19}} {line}")

    def _section(self, title: str) -> None:
        emit("")
        show_note(title, strong=True)

    def _margin(self, entry: Entry) -> str:
        return "" if entry.margin is None else self.figures.text(entry.margin.on(self.flow.basis))

    def _error(self, parts: Parts) -> str:
        """Return the random part, with bounds and offset where there are any."""
        text = f"± {self.figures.text(parts.random)}"
        if parts.bound:
            text += f" ± {self.figures.text(parts.bound)}"
        return f"{self.figures.text(parts.offset)} {text}" if parts.offset else text

    def _largest(self, hop: Hop) -> str:
        """Return the largest sources of a hop; one that is not the child's own with whose it is."""
        named = [
            (row.source.name if row.source.of == hop.child else _named(row.source))
            + f" {self.figures.text(abs(row.contribution))}"
            for row in hop.sources[:_SHOWN]
        ]
        more = len(hop.sources) - _SHOWN
        text = ", ".join(named) + (f", {more} more" if more > 0 else "")
        return text or "nothing: exactly the same place"


def _step(hop: Hop) -> str:
    verb = "follows" if hop.follows else "reads"
    share = "" if hop.weight == 1 else f" ({percent(hop.weight)})"
    return f"{hop.child} {verb} {hop.reference}{share}"


def _named(source: Source) -> str:
    return f"{source.name} ({source.of})"


def _count_line(counts: dict[Verdict, int]) -> str:
    return ", ".join(f"{n} {verdict}" for verdict, n in counts.items() if n or verdict == "fail")
