"""Landing pairs in words: areas as shares of the drawn contact, failures in parts per million."""

import math

from flowplan.engine.landing import LandingEntry
from flowplan.model.flow import Flow
from flowplan.model.landing import Landing

#: Headings of `landing_cells`; the pair and its verdict stand around them.
LANDING_HEADS = ("nominal", "mean", "3 sigma", "fails", "open", "ohm 99 %")
LANDING_NOTE = (
    "landed area of contacts, shares of the drawn one (0.135 % land with less than at 3 sigma); fails and "
    "opens in ppm; the resistance that 99 % do not exceed"
)


def share(area: float) -> str:
    """Return a share of the drawn contact's area."""
    return f"{area:.3f}"


def ppm(probability: float | None) -> str:
    """Return a probability in parts per million; empty for none."""
    if probability is None:
        return ""
    value = probability * 1e6
    return "<0.001" if 0 < value < 0.001 else f"{value:.3g}" if value < 1000 else f"{value:.0f}"


def ohm(resistance: float) -> str:
    """Return a resistance; an open is infinite."""
    return "open" if math.isinf(resistance) else f"{resistance:.4g}"


def landing_cells(entry: LandingEntry) -> list[str]:
    """Return the figures of a landing under `LANDING_HEADS`."""
    return [
        share(entry.nominal_area),
        share(entry.mean_area),
        share(entry.area_quantiles[0]),
        ppm(entry.fail_probability),
        ppm(entry.open),
        "" if entry.resistance is None else ohm(entry.resistance.q99),
    ]


def left_to_margins(flow: Flow) -> str:
    """Return what a command that judges single axes leaves out; empty for nothing."""
    n = sum(isinstance(pair, Landing) for pair in flow.pairs)
    if not n:
        return ""
    return f"{n} landing pair{'s are' if n > 1 else ' is'} left out; `flowplan margins` judges areas"
