"""The hops of a chain, what each adds, and where a plain root-sum-square along them goes wrong."""

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from flowplan.engine.graph import Chain
from flowplan.engine.points import basis_at
from flowplan.engine.results import Entry, Parts
from flowplan.engine.sources import FloatArray
from flowplan.model.base import AXES, Axis
from flowplan.model.masks import SelfAligned
from flowplan.report.viewbase import Base, listed, percent

#: Figures closer than this share are called equal.
_EQUAL = 5e-4
#: So many sources are named in a sentence.
_NAMED = 3
Hop = tuple[str, str]


@dataclass(frozen=True, slots=True)
class HopFigures:
    """One hop of a chain.

    Attributes
    ----------
    child, reference : str
        Layers.
    upward : bool
        Whether the chain goes from child to reference here.
    parts : Parts
        Overlay of the child against the reference at the entry's point [nm].
    """

    child: str
    reference: str
    upward: bool
    parts: Parts


@dataclass(frozen=True)
class HopBook:
    """Every hop of the shown chains as amounts over sources, worked out once."""

    base: Base

    @cached_property
    def _amounts(self) -> dict[Axis, tuple[dict[Hop, int], FloatArray]]:
        result = self.base.result
        index = result.engine.placement.index
        found: dict[Axis, tuple[dict[Hop, int], FloatArray]] = {}
        for axis in AXES:
            hops = dict.fromkeys(h for e in result.entries if e.axis == axis for h in e.chain.hops())
            first = [index[reference] for _, reference in hops]
            second = [index[child] for child, _ in hops]
            overlay = result.engine.placement.overlay(axis, first, second)
            found[axis] = {hop: i for i, hop in enumerate(hops)}, overlay
        return found

    def at(self, entry: Entry) -> FloatArray:
        """Return the hops' overlays over sources at the entry's point, shape (n_hops, n_active) [nm]."""
        places, overlay = self._amounts[entry.axis]
        rows = overlay[[places[hop] for hop in entry.chain.hops()]]
        engine = self.base.result.engine
        kernel = engine.view(entry.axis).kernel
        basis = engine.sites.basis[:, :1]
        if entry.point is not None:
            p = entry.point
            basis = basis_at(np.array([[p.X, p.Y, p.x, p.y]]))
        return kernel.at_points(rows, np.repeat(basis, len(rows), axis=1))

    def hops(self, entry: Entry) -> tuple[HopFigures, ...]:
        """Return the hops of an entry's chain with their errors."""
        engine, flow = self.base.result.engine, self.base.result.flow
        kernel = engine.view(entry.axis).kernel
        amounts, starts = self.at(entry), kernel.table.starts
        offset = amounts @ kernel.offset[starts]
        bound = np.abs(amounts) @ kernel.bound[starts]
        random = flow.confidence * np.sqrt(((amounts * kernel.sigma_by_source()) ** 2).sum(axis=1))
        turn = entry.chain.layers.index(entry.chain.through)
        return tuple(
            HopFigures(child, ref, i < turn, Parts(float(offset[i]), float(bound[i]), float(random[i])))
            for i, (child, ref) in enumerate(entry.chain.hops())
        )

    def double_counted(self, entry: Entry) -> tuple[tuple[str, float], ...]:
        """Return sources that act on several hops: (name, variance hop by hop less exact) [nm^2]."""
        engine = self.base.result.engine
        kernel = engine.view(entry.axis).kernel
        amounts = self.at(entry) * kernel.sigma_by_source()
        turn = entry.chain.layers.index(entry.chain.through)
        sign = np.where(np.arange(len(amounts)) < turn, -1.0, 1.0)
        excess = (amounts**2).sum(axis=0) - (sign @ amounts) ** 2
        chosen = np.flatnonzero(np.abs(excess) > 1e-9 * max(1e-300, float((amounts**2).sum())))
        chosen = chosen[np.argsort(-np.abs(excess[chosen]), kind="stable")]
        book = engine.placement.sources
        sources = [book[int(kernel.table.active[i])] for i in chosen]
        return tuple((s.name, float(excess[i])) for s, i in zip(sources, chosen, strict=True))


def chain_text(chain: Chain) -> str:
    """Return the chain on one line; ↑ means reads, ↓ is read by."""
    turn = chain.layers.index(chain.through)
    words = [chain.layers[0]]
    for i, layer in enumerate(chain.layers[1:], start=1):
        words += ["↑" if i <= turn else "↓", layer]
    return " ".join(words) + (" (one of several ways)" if chain.one_of_several else "")


def compared_words(book: HopBook, entry: Entry) -> str:
    """Return the sentence that sets plain chain RSS beside the exact overlay.

    Parameters
    ----------
    book : HopBook
        The report's hops.
    entry : Entry
        An entry of the same result.

    Returns
    -------
    str
        Which way the plain figure is wrong and through which sources.
    """
    base, plain, exact = book.base, entry.chain_rss, entry.overlay.random
    if plain is None:
        return "References are averaged, so plain RSS along one chain does not apply."
    if plain == 0 and exact == 0:
        layers = base.result.flow.layers
        follows = any(isinstance(layers.get(name), SelfAligned) for name in entry.chain.layers)
        why = "one follows the other by itself" if follows else "nothing random comes between them"
        return f"Exact and plain RSS are both 0: {why}."
    if len(entry.chain.layers) == 2:
        return "The chain is a single hop, so plain RSS says the same."
    if abs(plain - exact) <= _EQUAL * max(plain, exact):
        return "Plain RSS agrees: no source acts on two hops of this chain in a way that matters."
    too_high = plain > exact
    names = dict.fromkeys(name for name, excess in book.double_counted(entry) if (excess > 0) == too_high)
    named = listed(names, _NAMED)
    by = f"{base.length(abs(plain - exact))} {base.result.flow.unit}"
    share = "" if math.isclose(exact, 0.0) else f" ({percent(abs(plain - exact) / exact)})"
    if too_high:
        return f"Plain RSS is {by}{share} too high: it counts {named} on each hop, but these parts cancel."
    return f"Plain RSS is {by}{share} too low: it takes {named} as new on each hop, but these parts add up."
