"""A landing pair judged: the worst site first, then every figure there."""

import math
from dataclasses import dataclass
from itertools import product

import numpy as np

from flowplan.engine.graph import AlignmentGraph
from flowplan.engine.landing.area import LandedArea
from flowplan.engine.landing.moments import moments_of
from flowplan.engine.landing.results import QUANTILES, LandingEntry, Resistances
from flowplan.engine.parts import Kernel
from flowplan.engine.placement import Placement
from flowplan.engine.points import Sites
from flowplan.engine.results import Verdict
from flowplan.engine.sources import FloatArray
from flowplan.model.base import AXES, Axis
from flowplan.model.flow import Flow
from flowplan.model.landing import Landing, Rectangle

#: Sites are ranked by the area left this many standard deviations away, nearest first.
_RADII = (3.0, 1.5, 6.0)
_DIRECTIONS = 16
#: Of the sites ranked worst, so many are worked out exactly.
_CANDIDATES = 3
#: ... as far as the area left there is within this of the worst.
_CLOSE = 0.01
#: Shares of sites closer than this are equally bad; the first counts.
_TIE = 1e-9
_PER_MILLION = 1e6


@dataclass(frozen=True, slots=True)
class LandingView:
    """What is fixed while landing pairs are worked out."""

    flow: Flow
    placement: Placement
    kernels: dict[Axis, Kernel]
    sites: Sites
    graph: AlignmentGraph


def landing_entries(view: LandingView, pair: Landing) -> list[LandingEntry]:
    """Return the entries of a landing pair, one for each two layers that it stands for."""
    expand = view.flow.expand
    return [_Case(view, pair, pad, contact).entry() for pad, contact in product(*map(expand, pair.layers))]


class _Case:
    """One pad and one contact."""

    def __init__(self, view: LandingView, pair: Landing, pad: str, contact: str) -> None:
        self._view, self._pair, self._pad, self._contact = view, pair, pad, contact
        self._moments = moments_of(view.placement, view.kernels, view.sites, pad, contact)
        unit = view.flow.unit
        self._halves = {a: (_half(pair.contact, a, unit), _half(pair.pad, a, unit)) for a in AXES}
        self._drawn = 4 * self._halves["x"][0] * self._halves["y"][0]
        self._least = pair.least_fraction(unit)

    def entry(self) -> LandingEntry:
        """Return everything at the worst site."""
        view, pair = self._view, self._pair
        site, area = self._worst()
        fails = None if self._least is None else self._less(area, self._least)
        graph = view.graph
        quantiles = tuple(area.quantile(float(p)) for p in QUANTILES)
        return LandingEntry(
            pair=pair,
            layers=(self._pad, self._contact),
            chains={a: graph.chain(first=self._pad, second=self._contact, axis=a) for a in AXES},
            nominal_area=self._nominal(site),
            mean_area=area.mean(),
            area_quantiles=quantiles,
            below_least=None if pair.least_area is None else self._less(area, pair.least_area),
            open=area.open(),
            resistance=self._resistances(area, quantiles),
            fail_probability=fails,
            verdict=verdict_of(fails, pair.allowed_ppm / _PER_MILLION, view.flow.reserve),
            point=view.sites.point(site) if self._moments.shaped else None,
        )

    @staticmethod
    def _less(area: LandedArea, share: float) -> float:
        return area.less(share) if share > 0 else 0.0

    def _nominal(self, site: int) -> float:
        area = 1.0
        for axis in AXES:
            area *= self._moments.interval(axis, site, self._halves[axis]).middle()
        return area / self._drawn

    def _worst(self) -> tuple[int, LandedArea]:
        """Return the site at which most contacts fail, with the distribution there."""
        candidates = self._ranked()
        areas = [
            min((self._area(site, push) for push in self._pushes(site)), key=self._badness)
            for site in candidates
        ]
        if len(areas) == 1:
            return candidates[0], areas[0]
        badness = np.array([self._badness(area) for area in areas])
        worst = int((badness <= badness.min() + _TIE).argmax())
        return candidates[worst], areas[worst]

    def _badness(self, area: LandedArea) -> float:
        """Return a figure that is lower for a worse distribution."""
        return area.mean() if self._least is None else -self._less(area, self._least)

    def _area(self, site: int, worst: tuple[int, int]) -> LandedArea:
        x, y = (
            self._moments.interval(axis, site, self._halves[axis], worst=sign)
            for axis, sign in zip(AXES, worst, strict=True)
        )
        return LandedArea.of(self._drawn, x, y, float(self._moments.covariance[site]))

    def _pushes(self, site: int) -> list[tuple[int, int]]:
        """Return where bounds may push the contact: away from the middle, on either side where that is 0.

        With correlated axes the quadrant matters, so both signs are tried wherever bounds are at work.
        """
        moments = self._moments
        away = tuple(-1 if moments.mean[a][site] < 0 else 1 for a in AXES)
        if not moments.covariance[site] or not all(moments.bound[a][site] for a in AXES):
            return [(away[0], away[1])]
        return [(away[0], away[1]), (away[0], -away[1]), (-away[0], away[1])]

    def _ranked(self) -> list[int]:
        """Return a few sites that differ and look worst, by the area left some standard deviations away."""
        keys = [self._area_away(radius) for radius in _RADII]
        order = np.lexsort([np.round(key, 9) for key in reversed(keys)])
        found: dict[bytes, int] = {}
        alike = self._alike()
        for site in order[: 1 if not self._moments.shaped else len(order)]:
            if keys[0][site] > keys[0][order[0]] + _CLOSE:
                break
            found.setdefault(alike[site].tobytes(), int(site))
            if len(found) == _CANDIDATES:
                break
        return sorted(found.values())

    def _alike(self) -> FloatArray:
        """Return what tells sites apart, a row a site: mirror images give the same area."""
        moments = self._moments
        mean = [moments.mean[a] for a in AXES]
        sign = np.sign(mean[0] * mean[1])
        covariance = np.where(sign == 0, np.abs(moments.covariance), sign * moments.covariance)
        parts = [*map(np.abs, mean), *moments.bound.values(), *moments.variance.values(), covariance]
        return np.ascontiguousarray(np.round(np.column_stack(parts), 6) + 0.0)

    def _area_away(self, radius: float) -> FloatArray:
        """Return the least area on an ellipse about the mean displacement, at every site."""
        moments = self._moments
        angle = np.linspace(0, 2 * math.pi, _DIRECTIONS, endpoint=False)[:, None]
        sx, sy = (np.sqrt(moments.variance[a]) for a in AXES)
        share = np.divide(moments.covariance, sx * sy, out=np.zeros_like(sx), where=sx * sy > 0)
        ahead = {
            "x": sx * np.cos(angle),
            "y": sy * (share * np.cos(angle) + np.sqrt(np.maximum(0, 1 - share**2)) * np.sin(angle)),
        }
        area = np.ones((_DIRECTIONS, len(sx)))
        for axis in AXES:
            e = np.abs(moments.mean[axis] + radius * ahead[axis]) + moments.bound[axis]
            contact, pad = self._halves[axis]
            area *= np.clip(np.minimum(2 * min(contact, pad), contact + pad - e), 0.0, None)
        return np.asarray(area.min(axis=0) / self._drawn)

    def _resistances(self, area: LandedArea, quantiles: tuple[float, ...]) -> Resistances | None:
        """Return the resistance, R = nominal / landed share."""
        nominal, given = self._pair.nominal_resistance(self._view.flow.unit), self._pair.resistance
        if nominal is None or given is None:
            return None
        at = dict(zip(QUANTILES, quantiles, strict=True))
        median, q99 = (nominal / a if a else math.inf for a in (at["0.5"], at["0.01"]))
        above = None if given.limit is None else self._less(area, nominal / given.limit)
        return Resistances(nominal, median, q99, above)


def _half(rectangle: Rectangle, axis: Axis, unit: str) -> float:
    return (rectangle.x if axis == "x" else rectangle.y).in_base(unit) / 2


def verdict_of(fails: float | None, allowed: float, reserve: float) -> Verdict:
    """Return fail (more than allowed), tight (within `reserve` of what is allowed) or pass.

    Parameters
    ----------
    fails : float or None
        Probability of failure; None where nothing is judged.
    allowed : float
        What is allowed.
    reserve : float
        Share of what is allowed that must stay free.
    """
    if fails is None:
        return "unjudged"
    if fails > allowed:
        return "fail"
    return "tight" if fails > (1 - reserve) * allowed else "pass"
