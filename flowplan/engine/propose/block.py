"""Variables that are chosen together, and what is known of every plan of them."""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.propose.atoms import AxisAtoms
from flowplan.engine.propose.bounds import AxisBounds
from flowplan.engine.propose.exact import values
from flowplan.engine.propose.score import Groups, Scale
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.base import Axis
from flowplan.model.candidates import Choice

#: Numbers held at once while nodes are bounded.
_MOST_FLOATS = 12_000_000
#: Numbers held at once while plans are judged.
_MOST_PLAN_FLOATS = 4_000_000


@dataclass(frozen=True, slots=True)
class Judged:
    """Nodes of a search with what is known of them.

    Attributes
    ----------
    bound : ndarray, shape (n_nodes, n_figures)
        Scores that no plan of the node exceeds.
    reach : ndarray, shape (n_nodes, n_rows)
        What each pair would reach in that bound.
    options : ndarray of int, shape (n_nodes, n_variables)
        The option that each group would take for it.
    """

    bound: FloatArray
    reach: FloatArray
    options: IntArray


class Block:
    """Some axes of a flow with their variables.

    Parameters
    ----------
    atoms : tuple of AxisAtoms
        The axes.
    choices : tuple of Choice
        The variables; each axis of `atoms` is covered once for every mask.
    scale : Scale
        How outcomes are compared.
    """

    def __init__(self, atoms: tuple[AxisAtoms, ...], choices: tuple[Choice, ...], scale: Scale) -> None:
        self.atoms, self.choices, self.scale = atoms, choices, scale
        self.as_yield = scale.goal == "yield"
        self.bounds = tuple(AxisBounds(axis, as_yield=self.as_yield) for axis in atoms)
        order = list(dict.fromkeys(choice.mask for choice in choices))
        self.mask = np.array([order.index(choice.mask) for choice in choices], dtype=np.int64)
        self.variables = {axis.axis: self._variables(axis.axis) for axis in atoms}
        self.count = np.array([len(choice.options) for choice in choices], dtype=np.int64)
        self.width = int(self.count.max())
        self.variable = np.concatenate([self.variables[b.axis.axis][b.late - 1] for b in self.bounds])
        self.groups = Groups(self.variable, len(choices), scale)
        self.everything = np.arange(self.width) < self.count[:, None]
        n = atoms[0].n_masks
        self.step = max(1, _MOST_FLOATS // max(1, sum(b.floats_per_node for b in self.bounds)))
        rows = sum(len(axis.rows.room) * axis.n_sites for axis in atoms)
        signed = sum(n * axis.layer.signed[0].size for axis in atoms)
        self.plan_step = max(1, _MOST_PLAN_FLOATS // (3 * n * n * len(atoms) + 8 * rows + 3 * signed))

    def _variables(self, axis: Axis) -> IntArray:
        found = [v for v, choice in enumerate(self.choices) if axis in choice.axes]
        return np.array(found, dtype=np.int64)

    @property
    def n_rows(self) -> int:
        """Number of judged rows."""
        return len(self.variable)

    def values(self, plans: IntArray) -> FloatArray:
        """Return what every pair gets under plans, shape (n_plans, n_rows); plans by variable."""
        parts = (plans[i : i + self.plan_step] for i in range(0, len(plans), self.plan_step))
        found = [np.concatenate([self._axis_values(axis, p) for axis in self.atoms], axis=1) for p in parts]
        return np.concatenate(found)

    def _axis_values(self, axis: AxisAtoms, plans: IntArray) -> FloatArray:
        return values(axis, self.by_mask(axis.axis, plans), as_yield=self.as_yield)

    def by_mask(self, axis: Axis, of_variables: IntArray) -> IntArray:
        """Return what is given by variable as given by mask of one axis, the wafer first."""
        chosen = of_variables[:, self.variables[axis]]
        return np.concatenate([np.zeros_like(chosen[:, :1]), chosen], axis=1)

    def changed(self, plans: IntArray) -> FloatArray:
        """Return which masks plans change, shape (n_plans, n_masks)."""
        return self._by_mask(plans != 0)

    def forced(self, allowed: FloatArray) -> FloatArray:
        """Return which masks can no longer keep the plan of the file, shape (n_nodes, n_masks)."""
        return self._by_mask(~allowed[:, :, 0])

    def _by_mask(self, flags: FloatArray) -> FloatArray:
        found = np.zeros((len(flags), int(self.mask.max()) + 1), dtype=bool)
        for variable, mask in enumerate(self.mask):
            found[:, mask] |= flags[:, variable]
        return found

    def judge(self, allowed: FloatArray) -> Judged:
        """Bound nodes given by the options that are left, shape (n_nodes, n_variables, n_options)."""
        parts = [self._judge(allowed[i : i + self.step]) for i in range(0, len(allowed), self.step)]
        return Judged(*(np.concatenate([getattr(p, name) for p in parts]) for name in Judged.__slots__))

    def _judge(self, allowed: FloatArray) -> Judged:
        reach = self._reach(allowed)
        bound, options = self.groups.best(reach, allowed)
        taken = options[:, self.variable]
        reached = np.take_along_axis(reach, taken[..., None], axis=2)[..., 0]
        return Judged(bound, reached, options)

    def departures(self, allowed: FloatArray, plans: IntArray, rows: IntArray) -> list[int]:
        """Return for each node a variable with a choice left that its row depends on, or any at last."""
        found = [int(v) for v in (allowed.sum(axis=2) > 1).argmax(axis=1)]
        first = 0
        for bounds in self.bounds:
            axis = bounds.axis
            mine = np.flatnonzero((rows >= first) & (rows < first + len(axis.rows.room)))
            if len(mine):
                of_mask = self._of_mask(axis, allowed[mine])
                masks = bounds.departures(of_mask, self.by_mask(axis.axis, plans[mine]), rows[mine] - first)
                for node, mask in zip(mine, masks, strict=True):
                    if mask is not None:
                        found[node] = int(self.variables[axis.axis][mask - 1])
            first += len(axis.rows.room)
        return found

    def _of_mask(self, axis: AxisAtoms, allowed: FloatArray) -> FloatArray:
        of_mask = np.zeros((len(allowed), axis.n_masks, self.width), dtype=bool)
        of_mask[:, 1:] = allowed[:, self.variables[axis.axis]]
        of_mask[:, 0, 0] = True
        return of_mask[..., : int(axis.reads.count.max())]

    def _reach(self, allowed: FloatArray) -> FloatArray:
        found = []
        for bounds in self.bounds:
            axis = bounds.axis
            of_mask = self._of_mask(axis, allowed)
            part = bounds.values(of_mask)
            if bounds.is_loose:
                part = self._settled(bounds, of_mask, part)
            missing = self.width - part.shape[2]
            found.append(np.pad(part, ((0, 0), (0, 0), (0, missing)), constant_values=-np.inf))
        return np.concatenate(found, axis=1)

    def _settled(self, bounds: AxisBounds, of_mask: FloatArray, reach: FloatArray) -> FloatArray:
        """Replace bounds by exact values where every mask on the way is decided."""
        axis = bounds.axis
        plans = of_mask.argmax(axis=2)
        exact = values(axis, plans, as_yield=self.as_yield)
        decided = of_mask.sum(axis=2) == 1
        undecided = open_parts(axis, plans, decided)
        rows = axis.rows
        known = np.abs(undecided[:, rows.second] - undecided[:, rows.first]).max(axis=2) < 1e-12
        ok = of_mask[:, bounds.late]
        return np.where(known[..., None] & ok, exact[..., None], reach)


def open_parts(axis: AxisAtoms, plans: IntArray, decided: FloatArray) -> FloatArray:
    """Return how far every frame rests on undecided masks, shape (n_nodes, n_masks, n_masks)."""
    n, reads = axis.n_masks, axis.reads
    found = np.zeros((len(plans), n, n))
    which = np.arange(len(plans))
    for i in range(1, n):
        option = plans[:, i]
        for k in range(reads.masks.shape[2]):
            found[:, i] += reads.weights[i, option, k, None] * found[which, reads.masks[i, option, k]]
        found[~decided[:, i], i] = np.eye(n)[i]
    return found
