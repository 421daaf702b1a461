"""From residuals to margins: the worst point first, then every figure exactly there."""

import math
from dataclasses import dataclass, replace

import numpy as np

from flowplan.engine.graph import AlignmentGraph, Chain
from flowplan.engine.parts import CHUNK, Kernel, quadratic
from flowplan.engine.placement import Placement
from flowplan.engine.points import Sites
from flowplan.engine.residual import Residuals, Row, residuals
from flowplan.engine.results import Budget, ByBasis, Entry, Parts, Verdict
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.base import Axis
from flowplan.model.flow import BASES, Basis, Flow

#: Points whose margins differ by less than this share of the largest margin are equally bad; the
#: first counts, so that symmetric layouts always report the same corner.
_TIE = 1e-9
#: A margin this small against its own terms is 0; the rest is rounding.
DUST = 1e-12


def needs(bound: FloatArray, random: FloatArray, linear: FloatArray) -> dict[Basis, FloatArray]:
    """Return what errors take by each basis.

    Parameters
    ----------
    bound, random : ndarray
        B, and R at the flow's confidence [nm].
    linear : ndarray
        Confidence times the sum of |c| sigma [nm].

    Returns
    -------
    dict of basis to ndarray
        mixed: B + R; rss: sqrt(B^2 + R^2); linear: B + linear [nm].
    """
    return {"mixed": bound + random, "rss": np.hypot(bound, random), "linear": bound + linear}


def margins_over_sites(res: Residuals, kernel: Kernel, sites: Sites, flow: Flow) -> FloatArray:
    """Return the margin on the flow's basis of every row at every site.

    Parameters
    ----------
    res : Residuals
        Rows of one axis; where nothing is judged the drawn value counts as 0.
    kernel : Kernel
        The axis's modes.
    sites : Sites
        The sites.
    flow : Flow
        Gives basis and confidence.

    Returns
    -------
    ndarray, shape (n_rows, n_points)
        Margins of the worse side [nm].
    """
    total = res.overlay + res.edges
    basis = sites.basis
    bound = kernel.absolute_sum(total, kernel.bound, basis)
    if flow.basis == "linear":
        need = bound + flow.confidence * kernel.absolute_sum(total, kernel.sigma, basis)
    else:
        random = flow.confidence * np.sqrt(quadratic(kernel.gram(total), basis))
        need = needs(bound, random, random)[flow.basis]
    room = np.nan_to_num(res.drawn) - res.keep + res.edges @ kernel.offset
    return np.asarray(room[:, None] - np.abs(kernel.offset_form(res.overlay) @ basis) - need)


def worst_sites(res: Residuals, kernel: Kernel, sites: Sites, flow: Flow) -> IntArray:
    """Return the index of each row's worst site, shape (n_rows,); a few rows at a time."""
    if sites.n_points == 1:
        return np.zeros(len(res.rows), dtype=np.int64)
    step = max(1, CHUNK // sites.n_points)
    found = [
        _first_lowest(margins_over_sites(part, kernel, sites, flow))
        for part in (select(res, slice(i, i + step)) for i in range(0, len(res.rows), step))
    ]
    return np.concatenate(found) if found else np.zeros(0, dtype=np.int64)


def _first_lowest(margins: FloatArray) -> IntArray:
    lowest = margins.min(axis=1, keepdims=True)
    tie = _TIE * np.abs(margins).max(axis=1, keepdims=True)
    return np.asarray((margins <= lowest + tie).argmax(axis=1))


def select(res: Residuals, part: slice | IntArray) -> Residuals:
    """Return some of the rows."""
    rows = res.rows[part] if isinstance(part, slice) else tuple(res.rows[i] for i in part)
    return Residuals(rows, res.overlay[part], res.edges[part], res.drawn[part], res.keep[part])


@dataclass(frozen=True, slots=True)
class Figures:
    """Everything about rows at their points, as arrays of shape (n_rows,) unless said otherwise.

    Attributes
    ----------
    amounts, variance : ndarray, shape (n_rows, n_active)
        Signed amounts on the worse side [nm] and variances [nm^2] by source.
    overlay_offset, edge_offset : ndarray
        Signed D_second - D_first, and the edges' part [nm].
    overlay_bound, overlay_random, bound, random, linear : ndarray
        Parts of the overlay alone and of the residual [nm].
    sigma : ndarray
        One standard deviation of the residual [nm].
    """

    amounts: FloatArray
    variance: FloatArray
    overlay_offset: FloatArray
    edge_offset: FloatArray
    overlay_bound: FloatArray
    overlay_random: FloatArray
    bound: FloatArray
    random: FloatArray
    linear: FloatArray
    sigma: FloatArray


def figures_at(res: Residuals, kernel: Kernel, basis: FloatArray, confidence: float) -> Figures:
    """Return the exact figures of rows, each at a point of its own.

    Parameters
    ----------
    res : Residuals
        Rows of one axis.
    kernel : Kernel
        The axis's modes.
    basis : ndarray, shape (n_basis, n_rows)
        Basis functions at each row's point.
    confidence : float
        Standard deviations at which the verdict is taken.

    Returns
    -------
    Figures
        Coefficients are summed within each source before they are squared, so what cancels is 0.
    """
    sigma = kernel.sigma_by_source()
    is_bound, is_offset = kernel.bound[kernel.table.starts], kernel.offset[kernel.table.starts]
    overlay = kernel.at_points(res.overlay, basis)
    edges = kernel.by_source(res.edges)
    overlay_offset = overlay @ is_offset
    side = np.where(overlay_offset > 0, -1.0, 1.0)
    amounts = side[:, None] * overlay + edges
    variance = (amounts * sigma) ** 2
    deviation = np.sqrt(variance.sum(axis=1))
    return Figures(
        amounts=amounts,
        variance=variance,
        overlay_offset=overlay_offset,
        edge_offset=edges @ is_offset,
        overlay_bound=np.abs(overlay) @ is_bound,
        overlay_random=confidence * np.sqrt(((overlay * sigma) ** 2).sum(axis=1)),
        bound=np.abs(amounts) @ is_bound,
        random=confidence * deviation,
        linear=confidence * np.abs(amounts) @ sigma,
        sigma=deviation,
    )


@dataclass(frozen=True, slots=True)
class AxisView:
    """What is fixed while the rows of one axis are worked out."""

    flow: Flow
    axis: Axis
    placement: Placement
    kernel: Kernel
    sites: Sites
    graph: AlignmentGraph


def entries_of(view: AxisView, rows: tuple[Row, ...]) -> list[Entry]:
    """Return the entries of rows on one axis, each at its worst site.

    Rows of layers that lie close together in the process share most of what they inherit, which then
    never has to be looked at; so a batch of such rows costs little.
    """
    index = view.placement.index
    layers = np.array(sorted({index[name] for row in rows for name in (row.first, row.second)}))
    modes = view.placement.telling(view.axis, layers)
    res = residuals(view.flow, view.placement, rows, view.axis, modes)
    narrow = replace(view, kernel=view.kernel.narrowed(modes))
    worst = worst_sites(res, narrow.kernel, view.sites, view.flow)
    chains = [view.graph.chain(first=r.first, second=r.second, axis=r.axis) for r in rows]
    return _entries(narrow, res, worst, chains, _chain_rss(view, chains, worst))


def _chain_rss(view: AxisView, chains: list[Chain], worst: IntArray) -> FloatArray:
    """Root-sum-square of the hops' own overlays, shape (n_chains,); NaN where references are averaged."""
    found = np.full(len(chains), np.nan)
    single = np.array([i for i, chain in enumerate(chains) if not chain.one_of_several], dtype=np.int64)
    hops = sorted({hop for i in single for hop in chains[i].hops()})
    if not hops:
        return found
    place = {hop: k for k, hop in enumerate(hops)}
    child, reference = ([view.placement.index[hop[end]] for hop in hops] for end in (0, 1))
    modes = view.placement.telling(view.axis, np.unique([*child, *reference]))
    kernel = view.kernel.narrowed(modes)
    overlay = view.placement.overlay(view.axis, reference, child, modes)
    for site in np.unique(worst[single]):
        here = [(i, [place[hop] for hop in chains[i].hops()]) for i in single[worst[single] == site]]
        variance = np.zeros(len(hops))
        used = sorted({k for _, places in here for k in places})
        at = np.repeat(view.sites.basis[:, site : site + 1], len(used), axis=1)
        variance[used] = (kernel.at_points(overlay[used], at) ** 2) @ kernel.sigma_by_source() ** 2
        for i, places in here:
            found[i] = view.flow.confidence * math.sqrt(variance[places].sum())
    return found


def _entries(
    view: AxisView, res: Residuals, worst: IntArray, chains: list[Chain], hand: FloatArray
) -> list[Entry]:
    figures = figures_at(res, view.kernel, view.sites.basis[:, worst], view.flow.confidence)
    need = needs(figures.bound, figures.random, figures.linear)
    shaped = ((res.overlay + res.edges) != 0)[:, view.kernel.table.basis != 0].any(axis=1)
    entries = []
    for i, row in enumerate(res.rows):
        at_need = ByBasis(*(float(need[b][i]) for b in BASES))
        judged = _judge(view.flow, res, figures, at_need, i)
        entries.append(
            Entry(
                pair=row.pair,
                layers=(row.first, row.second),
                axis=row.axis,
                chain=chains[i],
                keep=float(res.keep[i]),
                residual=Parts(
                    float(figures.edge_offset[i] - abs(figures.overlay_offset[i])),
                    float(figures.bound[i]),
                    float(figures.random[i]),
                ),
                overlay=Parts(
                    float(figures.overlay_offset[i]),
                    float(figures.overlay_bound[i]),
                    float(figures.overlay_random[i]),
                ),
                need=at_need,
                point=view.sites.point(int(worst[i])) if shaped[i] else None,
                chain_rss=None if np.isnan(hand[i]) else float(hand[i]),
                budget=budget_of(view, figures, i),
                drawn=judged.drawn,
                nominal=judged.nominal,
                margin=judged.margin,
                verdict=judged.verdict,
                cpk=judged.cpk,
                fail_probability=judged.fail_probability,
            )
        )
    return entries


def budget_of(view: AxisView, figures: Figures, i: int) -> Budget:
    """Return row i of some figures broken into its sources."""
    taking_part = np.flatnonzero(figures.amounts[i])
    return Budget(
        view.placement.sources,
        view.kernel.table.active[taking_part],
        figures.amounts[i, taking_part],
        figures.variance[i, taking_part],
    )


@dataclass(frozen=True, slots=True)
class _Judged:
    drawn: float | None = None
    nominal: float | None = None
    margin: ByBasis | None = None
    verdict: Verdict = "unjudged"
    cpk: float | None = None
    fail_probability: float | None = None


def _judge(flow: Flow, res: Residuals, figures: Figures, need: ByBasis, i: int) -> _Judged:
    drawn, keep = float(res.drawn[i]), float(res.keep[i])
    if math.isnan(drawn):
        return _Judged()
    overlay, edge = float(figures.overlay_offset[i]), float(figures.edge_offset[i])
    nominal = drawn + edge - abs(overlay)
    margin = ByBasis(*(settle(nominal - keep - need.on(b), nominal, keep, need.on(b)) for b in BASES))
    bound, sigma = float(figures.bound[i]), float(figures.sigma[i])
    sides = [settle(drawn + edge + s * overlay - keep - bound, drawn, keep, bound) for s in (1, -1)]
    return _Judged(
        drawn=drawn,
        nominal=nominal,
        margin=margin,
        verdict=verdict_of(margin.on(flow.basis), drawn, flow.reserve),
        cpk=capability(min(sides), sigma),
        fail_probability=min(1.0, sum(tail(room, sigma) for room in sides)),
    )


def settle(value: float, *terms: float) -> float:
    """Return 0 where a difference is nothing but the rounding of its terms, else the value."""
    return 0.0 if abs(value) <= DUST * sum(abs(t) for t in terms) else value


def verdict_of(margin: float, drawn: float, reserve: float) -> Verdict:
    """Return fail (below 0), tight (below `reserve` times `drawn`) or pass."""
    if margin < 0:
        return "fail"
    return "tight" if margin < reserve * drawn else "pass"


def capability(room: float, sigma: float) -> float:
    """Return Cpk = room / (3 sigma), infinite without variation.

    Parameters
    ----------
    room : float
        Distance from the nominal to the limit on the worse side [nm].
    sigma : float
        Standard deviation [nm].
    """
    if sigma == 0:
        return math.copysign(math.inf, room)
    return room / (3 * sigma)


def tail(room: float, sigma: float) -> float:
    """Return the probability that a normal error exceeds the room on one side.

    Parameters
    ----------
    room : float
        Distance from the nominal to the limit [nm].
    sigma : float
        Standard deviation [nm]; 0 makes the answer certain.
    """
    if sigma == 0:
        return 1.0 if room < 0 else 0.0
    return 0.5 * math.erfc(room / sigma / math.sqrt(2))
