"""A simulated flow as a JSON-ready document and as text for tables."""

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from flowplan.engine.simulate import FieldYield, PairOutcome, Rare, Simulation
from flowplan.engine.simulate.results import Interval
from flowplan.report.records import finite, in_unit
from flowplan.report.textfigures import Figures

Record = dict[str, Any]

#: Shares of the samples at which a residual is reported.
QUANTILES = (0.00135, 0.01, 0.5, 0.99, 0.99865)
#: Shares of the wafers at which the number of good fields is reported.
WAFER_QUANTILES = (0.05, 0.5, 0.95)


def simulation_document(found: Simulation) -> Record:
    """Return a simulation as one JSON-ready document.

    Parameters
    ----------
    found : Simulation
        What `simulate` returns.

    Returns
    -------
    dict
        Fractions between 0 and 1, residuals in the file's unit.
    """
    return {
        "samples": found.samples,
        "seed": found.seed,
        "bounds": found.bounds,
        "joint_yield": found.joint_yield,
        "joint_yield_interval": list(found.joint_yield_interval),
        "product_yield": found.product_yield,
        "rare": _rare(found.rare),
        "fields": _fields(found.fields),
        "pairs": [_pair(outcome, found.flow.unit) for outcome in found.pairs],
    }


def _pair(outcome: PairOutcome, unit: str) -> Record:
    entry = outcome.entry
    return {
        "pair": entry.pair.name,
        "axis": entry.axis,
        "layers": list(entry.layers),
        "fail": outcome.fail,
        "interval": list(outcome.interval),
        "closed_form": entry.fail_probability,
        "rare": _rare(outcome.rare),
        "quantiles": {f"{q:g}": in_unit(outcome.histogram.quantile(q), unit) for q in QUANTILES},
    }


def _rare(rare: Rare) -> Record:
    error = rare.relative_error
    return {"fail": rare.fail, "relative_error": None if error is None else finite(error)}


def _fields(fields: FieldYield) -> Record:
    return {
        "per_wafer": len(fields.centres),
        "wafers": int(fields.per_wafer.size),
        "share": fields.share,
        "interval": list(fields.interval),
        "good_per_wafer": {
            "mean": fields.mean_per_wafer,
            "quantiles": {f"{q:g}": v for q, v in zip(WAFER_QUANTILES, wafer_quantiles(fields), strict=True)},
            "spread": fields.spread,
        },
    }


def wafer_quantiles(fields: FieldYield) -> list[int]:
    """Return how many good fields these shares of the wafers stay at or below."""
    cut = np.quantile(fields.per_wafer, WAFER_QUANTILES, method="inverted_cdf")
    return [int(v) for v in cut]


#: Headings, and whether what stands below is a figure.
PAIR_HEADINGS = (
    ("pair", False), ("axis", False), ("counted", True), ("95 % interval", True), ("rare", True),
    ("closed form", True), ("0.135 %", True),
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class SimulationText:
    """A simulation as text.

    Attributes
    ----------
    heading : str
        How it was drawn, and the units.
    rows : tuple of tuple of str
        One text a heading of `PAIR_HEADINGS`, the likeliest to fail first.
    left_out : int
        How many rows are not shown.
    yields : tuple of (str, str, str)
        A figure's name, the figure, and what it says.
    legend : tuple of str
        What the columns say.
    """

    heading: str
    rows: tuple[tuple[str, ...], ...]
    left_out: int
    yields: tuple[tuple[str, str, str], ...]
    legend: tuple[str, ...]


def simulation_text(found: Simulation, most: int | None = None) -> SimulationText:
    """Return a simulation as text.

    Parameters
    ----------
    found : Simulation
        What `simulate` returns.
    most : int, optional
        Show only the rows that are the likeliest to fail.
    """
    unit = found.flow.unit
    ordered = likeliest(found.pairs)
    shown = ordered[:most]
    lengths = [outcome.histogram.quantile(QUANTILES[0]) for outcome in ordered]
    figures = Figures.fitting(unit, lengths)
    split = several(found.pairs)
    return SimulationText(
        heading=f"{found.samples} samples, seed {found.seed}, {bounds_words(found)}; "
        f"fail fractions in ppm, lengths in {unit}",
        rows=tuple(_row(outcome, figures, split) for outcome in shown),
        left_out=len(ordered) - len(shown),
        yields=yields_of(found),
        legend=_legend(found),
    )


def bounds_words(found: Simulation) -> str:
    """Return how bounds counted."""
    return "bounds at their worst sign" if found.bounds == "worst" else "bounds uniform"


def likeliest(outcomes: Sequence[PairOutcome]) -> list[PairOutcome]:
    """Return outcomes with the likeliest to fail first."""
    return sorted(outcomes, key=lambda outcome: (-outcome.rare.fail, -outcome.fails))


def several(outcomes: Sequence[PairOutcome]) -> set[tuple[str, str]]:
    """Return the names and axes that several pairs of masks of a split layer share."""
    counted = Counter((o.entry.pair.name, o.entry.axis) for o in outcomes)
    return {key for key, count in counted.items() if count > 1}


def title_of(outcome: PairOutcome, split: set[tuple[str, str]]) -> str:
    """Return a row's name, with its masks where the name alone does not tell."""
    entry = outcome.entry
    masks = f" ({' - '.join(entry.layers)})" if (entry.pair.name, entry.axis) in split else ""
    return f"{entry.pair.name}{masks}"


def _row(outcome: PairOutcome, figures: Figures, split: set[tuple[str, str]]) -> tuple[str, ...]:
    low, high = outcome.interval
    return (
        title_of(outcome, split),
        outcome.entry.axis,
        ppm(outcome.fail),
        f"{ppm(low)} - {ppm(high)}",
        ppm(outcome.rare.fail),
        ppm(outcome.entry.fail_probability or 0.0),
        figures.text(outcome.histogram.quantile(QUANTILES[0])),
    )


def ppm(fraction: float) -> str:
    """Return a fraction in parts per million, three digits, in powers of ten where it is far too small."""
    value = fraction * 1e6
    if value >= 100:
        return f"{value:.0f}"
    return f"{value:.3g}" if value >= 1e-3 or value == 0 else f"{value:.1e}"


def share_text(share: float, interval: Interval | None = None) -> str:
    """Return a share in percent, with its interval; nothing less than all is rounded up to it."""
    text = f"{_percent(share)} %"
    return text if interval is None else f"{text} ({_percent(interval[0])} to {_percent(interval[1])} %)"


def _percent(share: float) -> str:
    text = f"{100 * share:.2f}"
    return ">99.99" if text == "100.00" and share < 1 else text


def yields_of(found: Simulation) -> tuple[tuple[str, str, str], ...]:
    """Return the flow's figures: name, figure, and what it says."""
    fields = found.fields
    total = len(fields.centres)
    low, _, high = wafer_quantiles(fields)
    error = found.rare.relative_error
    within = f" within {100 * error:.2g} %" if error else ""
    yields = [
        (
            "joint yield",
            share_text(found.joint_yield, found.joint_yield_interval),
            "every pair holds, each at its worst point",
        ),
        (
            "product of yields",
            share_text(found.product_yield),
            "what pairs without a common source would give",
        ),
        ("some pair fails", f"{ppm(found.rare.fail)} ppm{within}", "by importance sampling"),
    ]
    if total == 1:
        return (
            *yields,
            ("wafers that hold", share_text(fields.share, fields.interval), "every pair, everywhere"),
        )
    spread = fields.spread
    return (
        *yields,
        (
            "fields that hold",
            share_text(fields.share, fields.interval),
            "every pair, at every site of a field",
        ),
        (
            "good fields a wafer",
            f"{fields.mean_per_wafer:.1f} of {total}",
            f"9 of 10 wafers have {low} to {high}; one sigma between wafers of a lot "
            f"{spread['wafer']:.2g}, lots {spread['lot']:.2g}, mask sets {spread['mask']:.2g}",
        ),
    )


def _legend(found: Simulation) -> tuple[str, ...]:
    errors = [o.rare.relative_error for o in found.pairs if o.rare.relative_error is not None]
    return (
        "counted: samples in which the pair fails",
        "rare: the same by importance sampling"
        + (f", relative error at most {100 * max(errors):.2g} %" if errors else ""),
        "closed form: as in margins; it takes uniform parts as normal, and adds both sides",
        "0.135 %: the residual that only so many samples fall below",
    )
