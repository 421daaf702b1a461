"""Fields of whole wafers: mask sets, their lots, the lots' wafers and the wafers' fields.

What varies by mask is drawn once for a mask set, what varies by lot once a lot, and so on, so that the
fields of one wafer share what they share in the fab.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.simulate.draws import BLOCK, Draws, Product, block_of, draws_of, generator
from flowplan.engine.simulate.forms import FieldForms
from flowplan.engine.simulate.intervals import clustered
from flowplan.engine.simulate.results import FieldYield
from flowplan.engine.simulate.threads import Progress, spread
from flowplan.engine.sources import N_BASIS, FloatArray, IntArray, Source
from flowplan.model.terms import LEVELS, Level

_STREAM = 1
#: Lots of a mask set and wafers of a lot; two of each tell the levels' spreads apart at least cost.
LOTS, WAFERS = 2, 2
_PER_SET = LOTS * WAFERS
_FEWEST_SETS = 24
#: Fields beyond this many add nothing that is shown.
MOST_FIELDS = 20_000
#: Corners of a field, as fractions of half its size.
_CORNERS = ((-1.0, -1.0), (1.0, -1.0), (-1.0, 1.0), (1.0, 1.0))


@dataclass(frozen=True, slots=True)
class Layout:
    """The wafer's fields: centres, shape (n_fields, 2), and half the field's width and height [mm]."""

    centres: FloatArray
    half: tuple[float, float]


@dataclass(frozen=True, slots=True)
class _Part:
    """The scalars of some levels, with D by basis function and edges as products of them."""

    draws: Draws
    pattern: tuple[tuple[int, Product], ...]
    edges: Product

    @classmethod
    def of(cls, draws: Draws, n_places: int) -> "_Part":
        by_basis = [(b, draws.product(slice(b * n_places, (b + 1) * n_places))) for b in range(N_BASIS)]
        return cls(
            draws,
            tuple((b, product) for b, product in by_basis if len(product.columns)),
            draws.product(slice(N_BASIS * n_places, None)),
        )


class FieldModel:
    """Evaluates which fields hold.

    Parameters
    ----------
    forms : FieldForms
        The judged rows as functions of position.
    layout : Layout
        The fields.
    sources, sigma, bounds_vary
        As for `draws_of`.
    """

    def __init__(
        self,
        forms: FieldForms,
        layout: Layout,
        sources: Sequence[Source],
        sigma: float,
        *,
        bounds_vary: bool,
    ) -> None:
        self.layout = layout
        self._forms = forms
        stacked = np.concatenate([*forms.pattern, forms.edge])
        draws = draws_of(stacked, sources, sigma, bounds_vary=bounds_vary)
        n_places = len(forms.edge)
        self._field = _Part.of(draws.only(["field"]), n_places)
        self._above = _Part.of(draws.only(["mask", "lot", "wafer"]), n_places)
        self._basis = sorted({0} | {b for part in (self._field, self._above) for b, _ in part.pattern})
        self._room = self._rooms()
        self._offset = self._about_centre(
            {b: part[:, None] for b, part in enumerate(forms.offset)}, layout.centres.T
        )

    def _rooms(self) -> FloatArray:
        """Return room less bounds by corner, row and field; one corner stands for all where all are alike."""
        (x, y), centres = self.layout.half, self.layout.centres
        rooms = []
        for u, v in _CORNERS:
            site = np.array([u * x, v * y])
            at = np.stack(
                [
                    np.ones(len(centres)),
                    *np.broadcast_to(site[:, None], (2, len(centres))),
                    *(centres + site).T,
                ]
            )
            rooms.append(self._forms.room[:, None] - self._forms.bound(at))
        same = all(np.array_equal(rooms[0], room) for room in rooms[1:])
        return np.stack(rooms[:1] if same else rooms)

    def wafers(self, random: np.random.Generator, sets: int) -> tuple[IntArray, IntArray]:
        """Simulate the wafers of some mask sets.

        Returns
        -------
        ndarray of int, shape (sets * n_lots * n_wafers,)
            Good fields of each wafer.
        ndarray of int, shape (n_fields,)
            On how many of the wafers each field holds.
        """
        n_fields, n_wafers = len(self.layout.centres), sets * _PER_SET
        drawn = self._draw_above(random, sets)
        above = {b: product.of(drawn) for b, product in self._above.pattern}
        edges = self._above.edges.of(drawn)
        per_wafer, per_field = np.zeros(n_wafers, dtype=np.int64), np.zeros(n_fields, dtype=np.int64)
        size = block_of(N_BASIS * len(self._forms.room))
        for start in range(0, n_wafers * n_fields, size):
            wafer, place = divmod(np.arange(start, min(start + size, n_wafers * n_fields)), n_fields)
            good = self._hold(self._field.draws.sample(random, len(wafer)), above, edges, wafer, place)
            per_wafer += np.bincount(wafer[good], minlength=n_wafers)
            per_field += np.bincount(place[good], minlength=n_fields)
        return per_wafer, per_field

    def _draw_above(self, random: np.random.Generator, sets: int) -> FloatArray:
        """Draw what several fields share, each level as often as it is redrawn; a column a wafer."""
        draws = self._above.draws
        times: dict[Level, int] = {"mask": _PER_SET, "lot": WAFERS, "wafer": 1}
        drawn = np.empty((draws.size, sets * _PER_SET))
        for level, repeat in times.items():
            rows = draws.level == LEVELS.index(level)
            drawn[rows] = np.repeat(
                draws.only([level]).sample(random, sets * _PER_SET // repeat), repeat, axis=1
            )
        return drawn

    def _hold(
        self,
        drawn: FloatArray,
        above: dict[int, FloatArray],
        edges_above: FloatArray,
        wafer: IntArray,
        place: IntArray,
    ) -> np.ndarray:
        """Return which fields hold, shape (n,)."""
        forms = self._forms
        own = {b: product.of(drawn) for b, product in self._field.pattern}
        by_basis = {b: np.zeros((len(forms.edge), len(wafer))) for b in self._basis}
        for b, values in by_basis.items():
            if b in own:
                values += own[b]
            if b in above:
                values += above[b][:, wafer]
        constant, slope_x, slope_y = (
            forms.rows_overlay(part) for part in self._about_centre(by_basis, self.layout.centres[place].T)
        )
        constant += self._offset[0][:, place]
        slope_x += self._offset[1]
        slope_y += self._offset[2]
        edges = forms.rows_edges(self._field.edges.of(drawn) + edges_above[:, wafer])
        if len(self._room) == 1:
            worst = np.abs(constant) + np.abs(slope_x) + np.abs(slope_y)
            return np.asarray((self._room[0][:, place] + edges >= worst).all(axis=0))
        good = np.ones(len(wafer), dtype=bool)
        for (u, v), room in zip(_CORNERS, self._room, strict=True):
            worst = np.abs(constant + u * slope_x + v * slope_y)
            good &= (room[:, place] + edges >= worst).all(axis=0)
        return good

    def _about_centre(self, by_basis: dict[int, FloatArray], centre: FloatArray) -> tuple[FloatArray, ...]:
        """Return displacements at the fields' centres, and their rise to the right and upper rim [nm]."""
        nothing = np.zeros_like(by_basis[0])
        constant, x, y, wafer_x, wafer_y = (by_basis.get(b, nothing) for b in range(N_BASIS))
        return (
            constant + wafer_x * centre[0] + wafer_y * centre[1],
            (x + wafer_x) * self.layout.half[0],
            (y + wafer_y) * self.layout.half[1],
        )


class _Tally:
    def __init__(self, wafers: int, fields: int) -> None:
        self.per_wafer = np.zeros(wafers, dtype=np.int64)
        self.per_field = np.zeros(fields, dtype=np.int64)


def mask_sets(n_fields: int, samples: int) -> int:
    """Return how many mask sets are simulated: enough fields, but no more than are shown."""
    return max(_FEWEST_SETS, -(-min(samples, MOST_FIELDS) // (n_fields * _PER_SET)))


def simulate_fields(
    model: FieldModel, samples: int, seed: int, threads: int, progress: Progress | None = None
) -> FieldYield:
    """Simulate wafers and count the fields that hold; arguments as for `simulate_pairs`."""
    n_fields = len(model.layout.centres)
    sets = mask_sets(n_fields, samples)
    step = max(1, BLOCK // (n_fields * _PER_SET))

    def work(tally: _Tally, block: int) -> None:
        first, last = block * step, min(sets, (block + 1) * step)
        per_wafer, per_field = model.wafers(generator(seed, _STREAM, block), last - first)
        tally.per_wafer[first * _PER_SET : last * _PER_SET] = per_wafer
        tally.per_field += per_field

    tallies = spread(-(-sets // step), lambda: _Tally(sets * _PER_SET, n_fields), work, threads, progress)
    per_wafer = sum((t.per_wafer for t in tallies), np.zeros(sets * _PER_SET, dtype=np.int64))
    per_field = sum((t.per_field for t in tallies), np.zeros(n_fields, dtype=np.int64))
    return _yield(model.layout.centres, per_wafer.reshape(sets, LOTS, WAFERS), per_field / (sets * _PER_SET))


def _yield(centres: FloatArray, per_wafer: IntArray, good: FloatArray) -> FieldYield:
    share = float(per_wafer.mean()) / len(centres)
    error = float(per_wafer.mean(axis=(1, 2)).std(ddof=1)) / len(centres) / len(per_wafer) ** 0.5
    return FieldYield(
        centres, good, per_wafer, share, clustered(share, error, len(per_wafer)), spreads(per_wafer)
    )


def spreads(values: IntArray) -> dict[str, float]:
    """Return the standard deviations of balanced nested levels.

    Parameters
    ----------
    values : ndarray, shape (n_mask_sets, n_lots, n_wafers)
        One value a wafer.

    Returns
    -------
    dict of str to float
        Between mask sets, between lots of a mask set, and between wafers of a lot, from the expected
        mean squares of a nested analysis of variance; what comes out below 0 is 0.
    """
    lots, wafers = values.shape[1:]
    by_lot = values.mean(axis=2)
    by_set = by_lot.mean(axis=1)
    wafer = float(values.var(axis=2, ddof=1).mean())
    lot = float(by_lot.var(axis=1, ddof=1).mean()) - wafer / wafers
    mask = float(by_set.var(ddof=1)) - float(by_lot.var(axis=1, ddof=1).mean()) / lots
    return {name: max(0.0, v) ** 0.5 for name, v in (("mask", mask), ("lot", lot), ("wafer", wafer))}
