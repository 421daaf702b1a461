"""The landing pairs of a report: how much of each contact lands, and what that does to it."""

from dataclasses import dataclass

from flowplan.engine.landing import LandingEntry
from flowplan.engine.results import Verdict
from flowplan.report.landing import ohm, ppm, share
from flowplan.report.viewanswer import WORDS, site_words
from flowplan.report.viewbase import NONE, Base, LayerName, plain
from flowplan.report.viewpairs import remarks_of


@dataclass(frozen=True, slots=True)
class LandingRow:
    """One landing pair."""

    anchor: str
    pair: str
    contact: LayerName
    pad: LayerName
    sizes: str
    verdict: Verdict
    word: str
    areas: tuple[str, ...]
    asked: str
    below: str
    open: str
    fails: str
    allowed: str
    resistances: tuple[str, ...]
    point: str
    remarks: tuple[tuple[str, str], ...]


def landings_view(base: Base) -> tuple[LandingRow, ...]:
    """Return the landing pairs in file order."""
    return tuple(_row(base, entry) for entry in base.result.landings)


def _row(base: Base, entry: LandingEntry) -> LandingRow:
    pair, found = entry.pair, entry.resistance
    pad, contact = entry.layers
    limit = None if pair.resistance is None else pair.resistance.limit
    asked = [] if pair.least_area is None else [f"area {plain(pair.least_area)} or more"]
    asked += [] if limit is None else [f"{plain(limit)} ohm or less"]
    sizes = ", ".join(f"{r.x} × {r.y}" for r in (pair.contact, pair.pad))
    resistances = (NONE,) * 4
    if found is not None:
        above = NONE if found.above_limit is None else ppm(found.above_limit)
        resistances = (ohm(found.nominal), ohm(found.median), ohm(found.q99), above)
    return LandingRow(
        anchor=base.landing_anchor(entry),
        pair=pair.name,
        contact=base.names[contact],
        pad=base.names[pad],
        sizes=sizes,
        verdict=entry.verdict,
        word=WORDS[entry.verdict],
        areas=tuple(share(a) for a in (entry.nominal_area, entry.mean_area, *entry.area_quantiles)),
        asked=", ".join(asked) or NONE,
        below=ppm(entry.below_least) or NONE,
        open=ppm(entry.open),
        fails=ppm(entry.fail_probability) or NONE,
        allowed=plain(pair.allowed_ppm),
        resistances=resistances,
        point=site_words(entry.point),
        remarks=remarks_of(pair),
    )
