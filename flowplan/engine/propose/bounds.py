"""What a pair can reach at best while some masks are still free: shortest ways, all pairs at once.

In process order the place of a mask against everything earlier follows from its options alone:

    frame of l against frame of e:   min over options (own + reading + marks of r against frame of e)
    marks of e against frame of l:   min over options (own + reading + marks of e against marks of r)

What enters at one place alone cannot be cancelled, so its variances, bounds and linear sums add up
along a way and the smallest over the options is a true lower bound; it is exact once the way is
decided. Offsets and shared sources are signed, so the range of each is carried along, and the part of
the range nearest to 0 counts. An average of references lies on several ways at once: their parts
have one sign unless earlier averages mix them, and then only what is certain is counted.
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.propose.atoms import BOUND, LINEAR, VARIANCE, AxisAtoms, Parts
from flowplan.engine.propose.exact import log_chance, settled, tails
from flowplan.engine.propose.pivots import pivots
from flowplan.engine.sources import BoolArray, FloatArray, IntArray

#: Sites at which margins are bounded; a few are enough, the exact values see all.
_SITES = 4
#: Share of options left up to which only these are judged, picked out one by one.
_DENSE = 0.4


@dataclass(slots=True)
class _Tables:
    """Sizes and signed ranges of every two masks while the masks are walked through.

    Attributes
    ----------
    to_frame : ndarray, shape (n_nodes, n_masks, n_masks, n_sizes)
        Marks of the first against the frame of the second.
    to_marks : ndarray, same shape
        Marks of the first against the marks of the second.
    low_frame, high_frame, low_marks, high_marks : ndarray, shape (n_nodes, n_masks, n_masks, n_signed)
        The same for signed amounts, as ranges.
    """

    to_frame: FloatArray
    to_marks: FloatArray
    low_frame: FloatArray
    high_frame: FloatArray
    low_marks: FloatArray
    high_marks: FloatArray

    @classmethod
    def empty(cls, nodes: int, masks: int, sizes: int, signed: int, *, marked: bool) -> "_Tables":
        a = np.zeros((nodes, masks, masks, sizes))
        b = np.zeros_like(a) if marked else a
        return cls(a, b, *np.zeros((4, nodes, masks, masks, signed)))


class AxisBounds:
    """Bounds on one axis.

    Parameters
    ----------
    axis : AxisAtoms
        One axis of the flow.
    as_yield : bool
        Whether log(1 - fail probability) is bounded instead of the margin.
    """

    def __init__(self, axis: AxisAtoms, *, as_yield: bool) -> None:
        self.axis, self.as_yield = axis, as_yield
        self.sites = np.arange(axis.n_sites) if as_yield else _spread(axis.n_sites)
        self.kinds = [VARIANCE] + [BOUND] * axis.has_bounds + [LINEAR] * (axis.basis == "linear")
        self.power = np.tile([2 if kind == VARIANCE else 1 for kind in self.kinds], len(self.sites))
        self.layer, self.pattern, self.marks = (self._flat(p) for p in (axis.layer, axis.pattern, axis.marks))
        self.reads = self._flat(axis.reads.parts)
        self.is_marked, self.is_signed = axis.has_marks, axis.has_signed
        self.n_signed = self.layer.signed.shape[-1]
        self.averaged = axis.most_read > 1
        rows = axis.rows
        self.late, self.early = np.maximum(rows.first, rows.second), np.minimum(rows.first, rows.second)
        self.plain_rows = np.flatnonzero(~self.averaged[self.late] & (self.late != self.early))
        self.of_mask = [np.flatnonzero((self.late == i) & (self.early != i)) for i in range(axis.n_masks)]

    @property
    def is_loose(self) -> bool:
        """Whether a decided way is still only bounded, not exact."""
        return self.as_yield or len(self.sites) < self.axis.n_sites or bool(self.averaged.any())

    @property
    def floats_per_node(self) -> int:
        """How much one node takes in memory."""
        n, width = self.axis.n_masks, int(self.axis.reads.count.max())
        per_way = len(self.power) + 2 * self.n_signed
        floats = 2 * n * n * per_way + len(self.late) * width * (per_way + 8 * len(self.sites))
        return int(floats)

    def _flat(self, parts: Parts) -> Parts:
        """Keep the sizes and sites that count and lay them side by side."""
        sizes = parts.sizes[..., self.sites, :][..., self.kinds]
        signed = parts.signed[..., self.sites, :]
        lead = sizes.shape[:-2]
        return Parts(sizes.reshape(*lead, -1), signed.reshape(*lead, -1))

    def values(self, allowed: BoolArray) -> tuple[FloatArray, IntArray]:
        """Return what every pair reaches at best with each option of its pivot.

        Parameters
        ----------
        allowed : ndarray of bool, shape (n_nodes, n_masks, n_options)
            The options left to each mask.

        Returns
        -------
        values : ndarray, shape (n_nodes, n_rows, n_options)
            Upper bounds of margins [nm] or of logarithms; -inf for options that are not allowed.
        masks : ndarray of int, shape (n_nodes, n_rows)
            The pivots: the first undecided mask on which a pair rests, else its later mask.
        """
        tables, sizes, low, high = self._walk(allowed)
        masks = self._push_down(tables, allowed, sizes, low, high)
        ok = allowed[np.arange(len(allowed))[:, None], masks]
        if ok.mean() > _DENSE:
            row = np.arange(len(self.late))[:, None]
            return np.where(ok, self._placed(row, sizes, low, high), -np.inf), masks
        node, row, option = np.nonzero(ok)
        signed = option if self.is_signed else 0
        found = np.full(ok.shape, -np.inf)
        found[ok] = self._placed(
            row, sizes[node, row, option], low[node, row, signed], high[node, row, signed]
        )
        return found, masks

    def _placed(self, row: IntArray, sizes: FloatArray, low: FloatArray, high: FloatArray) -> FloatArray:
        """Add the patterns to the overlays of some pairs and return what the pairs get."""
        late, early = self.late[row], self.early[row]
        differ = (late != early)[..., None]
        sizes = np.where(differ, sizes + self.pattern.sizes[late] + self.pattern.sizes[early], 0.0)
        own = self.pattern.signed[late] - self.pattern.signed[early]
        least, most = np.where(differ, low + own, 0.0), np.where(differ, high + own, 0.0)
        back = (self.axis.rows.first > self.axis.rows.second)[row][..., None]
        return self._judge(row, sizes, np.where(back, -most, least), np.where(back, -least, most))

    def _push_down(
        self, t: _Tables, allowed: BoolArray, sizes: FloatArray, low: FloatArray, high: FloatArray
    ) -> IntArray:
        """Give pairs with a decided later mask by the options of their pivots, in place."""
        masks = np.repeat(self.late[None], len(allowed), axis=0)
        p = pivots(self.axis.reads, allowed, self.late, self.early)
        masks[p.node, p.row] = p.late
        refs, at, marks = self.axis.reads.masks[p.late, :, 0], p.node[:, None], p.marks[:, None, None]
        early = p.early[:, None]
        ok = allowed[p.node, p.late][..., None]
        option = allowed[p.node, self.late[p.row]].argmax(axis=1)
        ways = np.where(marks, t.to_marks[at, refs, early], t.to_frame[at, refs, early])
        ways += self.layer.sizes[p.late][:, None] + self.reads.sizes[p.late]
        least = np.where(ok, ways, np.inf).min(axis=1)
        sizes[p.node, p.row] = (sizes[p.node, p.row, option] - least)[:, None] + ways
        if self.is_signed:
            own = self.layer.signed[p.late][:, None] + self.reads.signed[p.late]
            lows = np.where(marks, t.low_marks[at, refs, early], t.low_frame[at, refs, early]) + own
            highs = np.where(marks, t.high_marks[at, refs, early], t.high_frame[at, refs, early]) + own
            turned = p.turned[:, None, None]
            lows, highs = np.where(turned, -highs, lows), np.where(turned, -lows, highs)
            least, most = np.where(ok, lows, np.inf).min(axis=1), np.where(ok, highs, -np.inf).max(axis=1)
            low[p.node, p.row] = (low[p.node, p.row, option] - least)[:, None] + lows
            high[p.node, p.row] = (high[p.node, p.row, option] - most)[:, None] + highs
        return masks

    def _walk(self, allowed: BoolArray) -> tuple["_Tables", FloatArray, FloatArray, FloatArray]:
        """Fill the tables in process order; return the rows' overlays by option of the later mask."""
        nodes, n, width = allowed.shape
        t = _Tables.empty(
            nodes, n, len(self.power), self.n_signed if self.is_signed else 0, marked=self.is_marked
        )
        least = self._least_own(allowed) if self.averaged.any() else None
        barred = np.where(allowed, 0.0, np.inf)[..., None]
        own = self.layer.sizes[:, None] + self.reads.sizes
        cost = (own + barred)[:, :, :, None]
        sizes = np.zeros((nodes, len(self.late), width, len(self.power)))
        low = high = np.zeros((nodes, len(self.late), width if self.is_signed else 1, self.n_signed))
        if self.is_signed:
            high = high.copy()
        for i in range(n):
            count = int(self.axis.reads.count[i])
            if i and self.averaged[i]:
                self._average(t, least, barred, i, count, sizes)
            elif i:
                left = np.flatnonzero(allowed[:, i].any(axis=0))
                one = self.axis.reads.masks[i, left, 0]
                least_frame = (t.to_frame[:, one, :i] + cost[:, i, left]).min(axis=1)
                t.to_frame[:, i, :i] = least_frame + self.marks.sizes[i] if self.is_marked else least_frame
                t.to_frame[:, :i, i] = least_frame
                if self.is_marked:
                    least_marks = (t.to_marks[:, one, :i] + cost[:, i, left]).min(axis=1)
                    t.to_frame[:, :i, i] = least_marks
                    t.to_marks[:, i, :i] = t.to_marks[:, :i, i] = least_marks + self.marks.sizes[i]
            if i and self.is_signed:
                ok = allowed[:, i, :count, None, None]
                self._signed(t, ok, i, self.of_mask[i], low, high)
            if self.is_marked:
                t.to_frame[:, i, i] = self.marks.sizes[i]
            if self.is_signed:
                t.low_frame[:, i, i] = t.high_frame[:, i, i] = self.marks.signed[i]
        plain = self.plain_rows
        late, early = self.late[plain], self.early[plain, None]
        sizes[:, plain] = t.to_frame[:, self.axis.reads.masks[late, :, 0], early] + own[late]
        return t, sizes, low, high

    def _average(
        self,
        t: _Tables,
        least: FloatArray | None,
        barred: FloatArray,
        i: int,
        count: int,
        sizes: FloatArray,
    ) -> None:
        """Fill in a mask that may read an average."""
        to_frame, to_marks = self._ways(t, least, i, count)
        rows = self.of_mask[i]
        sizes[:, rows, :count] = to_frame[:, :, self.early[rows]].swapaxes(1, 2)
        to_frame = (to_frame + barred[:, i, :count, None]).min(axis=1)
        to_marks = (to_marks + barred[:, i, :count, None]).min(axis=1)
        t.to_frame[:, i, :i] = to_frame + self.marks.sizes[i]
        t.to_frame[:, :i, i] = to_marks
        t.to_marks[:, i, :i] = t.to_marks[:, :i, i] = to_marks + self.marks.sizes[i]

    def _least_own(self, allowed: BoolArray) -> FloatArray:
        """Return the least that each mask and its marks add wherever they take part."""
        reads = np.where(allowed[..., None], self.reads.sizes, np.inf).min(axis=2)
        return np.asarray(self.layer.sizes + self.marks.sizes + reads)

    def _ways(
        self, t: _Tables, least: FloatArray | None, i: int, count: int
    ) -> tuple[FloatArray, FloatArray]:
        """Sizes of mask i against the frames and the marks of all earlier ones, by option."""
        masks, weights = self.axis.reads.masks[i, :count], self.axis.reads.weights[i, :count]
        own = (self.layer.sizes[i] + self.reads.sizes[i, :count])[:, None]
        scale = weights[..., None] ** self.power
        if self.averaged[:i].any() and least is not None:
            later = masks[..., None] > np.arange(i)
            certain = np.einsum("okq,bokq,oke->boeq", scale, least[:, masks], later)
            single = (weights > 0).sum(axis=1) == 1
            first = masks[:, 0]
            to_frame = np.where(single[:, None, None], t.to_frame[:, first, :i], certain)
            to_marks = np.where(single[:, None, None], t.to_marks[:, first, :i], certain)
            return to_frame + own, to_marks + own
        to_frame = np.einsum("okq,bokeq->boeq", scale, t.to_frame[:, masks, :i])
        to_marks = np.einsum("okq,bokeq->boeq", scale, t.to_marks[:, masks, :i])
        return to_frame + own, to_marks + own

    def _signed(
        self,
        t: _Tables,
        ok: BoolArray,
        i: int,
        rows: IntArray,
        low: FloatArray,
        high: FloatArray,
    ) -> None:
        """Carry the ranges of offsets and shared sources on to mask i."""
        left = np.flatnonzero(ok.any(axis=(0, 2, 3)))
        ok, masks, weights = ok[:, left], self.axis.reads.masks[i, left], self.axis.reads.weights[i, left]
        own = (self.layer.signed[i] + self.reads.signed[i, left])[:, None]
        ends = []
        for frame, marks in ((t.low_frame, t.low_marks), (t.high_frame, t.high_marks)):
            if self.averaged[i]:
                ends.append(np.einsum("ok,bokeq->boeq", weights, frame[:, masks, :i]) + own)
                ends.append(np.einsum("ok,bokeq->boeq", weights, marks[:, masks, :i]) + own)
            else:
                ends += [frame[:, masks[:, 0], :i] + own, marks[:, masks[:, 0], :i] + own]
        low_frame, low_marks, high_frame, high_marks = ends
        at, early = (slice(None), rows[:, None], left), self.early[rows]
        low[at] = low_frame[:, :, early].swapaxes(1, 2)
        high[at] = high_frame[:, :, early].swapaxes(1, 2)
        mark = self.marks.signed[i]
        t.low_frame[:, i, :i] = np.where(ok, low_frame, np.inf).min(axis=1) + mark
        t.high_frame[:, i, :i] = np.where(ok, high_frame, -np.inf).max(axis=1) + mark
        lowest = np.where(ok, low_marks, np.inf).min(axis=1)
        highest = np.where(ok, high_marks, -np.inf).max(axis=1)
        t.low_frame[:, :i, i], t.high_frame[:, :i, i] = -highest, -lowest
        t.low_marks[:, i, :i], t.high_marks[:, i, :i] = lowest + mark, highest + mark
        t.low_marks[:, :i, i], t.high_marks[:, :i, i] = -highest - mark, -lowest - mark

    def _judge(self, row: IntArray, sizes: FloatArray, low: FloatArray, high: FloatArray) -> FloatArray:
        """Turn least sizes and ranges of some pairs into upper bounds of what they get."""
        axis, n_sites = self.axis, len(self.sites)
        full = np.zeros((*sizes.shape[:-1], n_sites, 3))
        full[..., self.kinds] = sizes.reshape(*sizes.shape[:-1], n_sites, -1)
        full += axis.rows.edges[row][..., None, :]
        low = low.reshape(*low.shape[:-1], n_sites, -1)
        high = high.reshape(*high.shape[:-1], n_sites, -1)
        nearest = np.maximum(0.0, np.maximum(low, -high))
        full += axis.shared_sizes(nearest[..., 1:])
        offset_low, offset_high = low[..., 0], high[..., 0]
        room, scale = axis.rows.room[row][..., None], axis.rows.scale[row][..., None]
        if self.as_yield:
            return self._chances(row, full, offset_low, offset_high)
        need = axis.need(full)
        offset = np.maximum(0.0, np.maximum(offset_low, -offset_high))
        return np.asarray(settled(room - offset - need, scale + offset + need).min(axis=-1))

    def _chances(self, row: IntArray, full: FloatArray, low: FloatArray, high: FloatArray) -> FloatArray:
        """Return the best chances at any site; short of room, spread can bring failure down to a half."""
        sigma, bound = np.sqrt(full[..., VARIANCE]), full[..., BOUND]
        room, scale = self.axis.rows.room[row][..., None], self.axis.rows.scale[row][..., None]
        failure = np.zeros_like(sigma)
        for offset in (high, -low):
            left = settled(room + offset - bound, scale + np.abs(offset) + bound)
            failure += np.where(left < 0, 0.5, tails(left, sigma))
        return log_chance(np.minimum(failure.min(axis=-1), 1.0))


def _spread(n_sites: int) -> IntArray:
    """Return a few sites, spread evenly over the rim."""
    return np.unique(np.linspace(0, n_sites - 1, min(_SITES, n_sites)).round().astype(np.int64))
