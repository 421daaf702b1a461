"""Flows with one contact on one pad, and the overlap drawn by plain sampling."""

from typing import Any

import numpy as np

from flowplan.engine.analysis import Engine, analyse
from flowplan.engine.landing import LandingEntry
from flowplan.engine.landing.overlap import Interval
from flowplan.model.base import AXES
from tests.support.flows import Data, bare_flow, flow_of, mask

GEOMETRY = {"wafer": {"diameter": "60 mm"}, "field": {"x": "16 mm", "y": "12 mm"}}


def rectangle(layer: str, size: Any) -> Data:
    """A layer's rectangle from one width or one an axis."""
    x, y = size if isinstance(size, tuple) else (size, size)
    return {"layer": layer, "x": x, "y": y}


def landing(contact: Any = 600, pad: Any = 1000, **more: Any) -> Data:
    return {
        "rule": "landing",
        "contact": rectangle("CONTACT", contact),
        "pad": rectangle("PAD", pad),
        **({"name": "lands"} | more),
    }


def contact_on_pad(
    pair: Data, read: Any = None, cds: tuple[Any, Any] = (None, None), terms: Data | None = None, **more: Any
) -> Data:
    """CONTACT reads PAD so, `cds` are those of contact and pad, `terms` the contact's; at one sigma."""
    contact, pad = ({} if cd is None else {"cd": cd} for cd in cds)
    reading = {"mask": "PAD", "alignment": 0 if read is None else read}
    masks = [mask("PAD", **pad), mask("CONTACT", [reading], terms=terms or {}, **contact)]
    return bare_flow(masks, [pair]) | {"sigma": 1} | more


def landed(data: Data) -> LandingEntry:
    """The landing of a flow that has one."""
    (entry,) = analyse(flow_of(data)).landings
    return entry


def still(
    mean: float = 0.0, sigma: float = 0.0, contact: float = 600.0, pad: float = 1000.0, **more: float
) -> Interval:
    """An axis whose widths do not vary unless `more` says so."""
    none = {"var_contact": 0.0, "var_pad": 0.0, "covariance": 0.0}
    return Interval(mean=mean, sigma=sigma, contact=contact / 2, pad=pad / 2, **(none | more))


def drawn_areas(data: Data, entry: LandingEntry, n: int, seed: int) -> np.ndarray:
    """Landed shares by drawing every source of a flow, at the place of an entry."""
    engine = Engine.of(flow_of(data))
    place, point = engine.placement, entry.point
    random = np.random.default_rng(seed)
    kinds = {"random": 1 / engine.flow.sigma, "uniform": 3**-0.5, "offset": 0.0, "bound": 0.0}
    scalars = [random.standard_normal(n) * kinds[s.kind] + (s.kind == "offset") for s in place.sources]
    X, Y, x, y = (0, 0, 0, 0) if point is None else (point.X, point.Y, point.x, point.y)
    at = (1, x, y, X + x, Y + y)
    area = np.ones(n)
    pad, contact = (place.index[layer] for layer in ("PAD", "CONTACT"))
    for axis in AXES:
        modes = place.modes[axis]

        def moved(row: np.ndarray, modes: Any = modes) -> np.ndarray:
            parts = zip(row, modes.source, modes.basis, strict=True)
            return sum((a * at[b] * scalars[s] for a, s, b in parts if a), np.zeros(n))

        e = moved(place.pattern[axis][contact] - place.pattern[axis][pad])
        low, high = np.full(n, -np.inf), np.full(n, np.inf)
        for layer, rectangle, shift in ((pad, entry.pair.pad, 0.0), (contact, entry.pair.contact, e)):
            half = getattr(rectangle, axis).in_base("nm") / 2 + moved(place.edge[axis][layer])
            low, high = np.maximum(low, shift - half), np.minimum(high, shift + half)
        area *= np.clip(high - low, 0, None) / getattr(entry.pair.contact, axis).in_base("nm")
    return area
