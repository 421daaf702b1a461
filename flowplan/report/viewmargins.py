"""The margin table: one row a check, in file order."""

from dataclasses import dataclass

from flowplan.engine.landing import LandingEntry
from flowplan.engine.results import Entry, Verdict
from flowplan.report.charts import bar
from flowplan.report.viewanswer import WORDS
from flowplan.report.viewbase import NONE, Base, LayerName, capability, per_million, percent


@dataclass(frozen=True, slots=True)
class MarginRow:
    """One pair of layers on one axis."""

    anchor: str
    pair: str
    rule: str
    first: LayerName
    second: LayerName
    axis: str
    drawn: str
    keep: str
    offset: str
    need: str
    margin: str
    used: str
    bar: int
    verdict: Verdict
    word: str
    cpk: str
    ppm: str


@dataclass(frozen=True, slots=True)
class MarginsView:
    """The table with what its filters offer."""

    rows: tuple[MarginRow, ...]
    layers: tuple[LayerName, ...]


def margins_view(base: Base) -> MarginsView:
    """Return the margin table."""
    named = {name for e in base.result.checks for name in e.layers}
    layers = tuple(layer for name, layer in base.names.items() if name in named)
    return MarginsView(tuple(_check(base, e) for e in base.result.checks), layers)


def used_share(need: float, room: float) -> float:
    """Return the share of the room that the need takes; infinite where there is no room."""
    if room > 0:
        return need / room
    return float("inf") if need > 0 or room < 0 else 0.0


def _check(base: Base, check: Entry | LandingEntry) -> MarginRow:
    return _landing(base, check) if isinstance(check, LandingEntry) else _row(base, check)


def _landing(base: Base, entry: LandingEntry) -> MarginRow:
    """Return a landing's row; its own table tells more."""
    return MarginRow(
        anchor=base.landing_anchor(entry),
        pair=entry.pair.name,
        rule=entry.pair.rule,
        first=base.names[entry.layers[0]],
        second=base.names[entry.layers[1]],
        axis=entry.axis,
        **dict.fromkeys(("drawn", "keep", "offset", "need", "margin", "used"), NONE),
        bar=bar(0.0),
        verdict=entry.verdict,
        word=WORDS[entry.verdict],
        cpk=NONE,
        ppm=per_million(entry.fail_probability),
    )


def _row(base: Base, entry: Entry) -> MarginRow:
    need = entry.need.on(base.result.flow.basis)
    judged = entry.nominal is not None
    used = used_share(need, entry.nominal - entry.keep) if entry.nominal is not None else 0.0
    return MarginRow(
        anchor=base.pair_anchor(entry),
        pair=entry.pair.name,
        rule=entry.pair.rule,
        first=base.names[entry.layers[0]],
        second=base.names[entry.layers[1]],
        axis=entry.axis,
        drawn=base.length(entry.drawn),
        keep=base.length(entry.keep) if judged else NONE,
        offset=base.signed(entry.residual.offset),
        need=base.length(need),
        margin=base.signed(None if entry.margin is None else base.result.margin(entry)),
        used=("no room" if used == float("inf") else percent(used)) if judged else NONE,
        bar=bar(used),
        verdict=entry.verdict,
        word=WORDS[entry.verdict],
        cpk=capability(entry.cpk),
        ppm=per_million(entry.fail_probability),
    )
