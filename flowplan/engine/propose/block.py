"""Variables that are chosen together, and what is known of every plan of them."""

import numpy as np

from flowplan.engine.propose.atoms import AxisAtoms
from flowplan.engine.propose.bounds import AxisBounds
from flowplan.engine.propose.exact import values
from flowplan.engine.propose.score import Scale
from flowplan.engine.sources import BoolArray, FloatArray, IntArray
from flowplan.model.base import Axis
from flowplan.model.candidates import Choice

#: Numbers held at once while nodes are bounded.
_MOST_FLOATS = 12_000_000
#: Numbers held at once while plans are judged.
_MOST_PLAN_FLOATS = 4_000_000


class Block:
    """Some axes of a flow with their variables.

    Nodes are given by the options that are left, shape (n_nodes, n_variables, n_options); plans by the
    option of each variable, shape (n_plans, n_variables).

    Parameters
    ----------
    atoms : tuple of AxisAtoms
        The axes; at least one pair is judged.
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
        self._firsts = np.flatnonzero(np.diff(self.mask, prepend=-1))
        self.variables = {axis.axis: self._variables(axis.axis) for axis in atoms}
        self.count = np.array([len(choice.options) for choice in choices], dtype=np.int64)
        self.width = int(self.count.max())
        self.n_rows = sum(len(axis.rows.room) for axis in atoms)
        n = atoms[0].n_masks
        self.step = max(1, _MOST_FLOATS // max(1, sum(b.floats_per_node for b in self.bounds)))
        rows = sum(len(axis.rows.room) * axis.n_sites for axis in atoms)
        signed = sum(n * axis.layer.signed[0].size for axis in atoms)
        self.plan_step = max(1, _MOST_PLAN_FLOATS // (3 * n * n * len(atoms) + 8 * rows + 3 * signed))

    def _variables(self, axis: Axis) -> IntArray:
        found = [v for v, choice in enumerate(self.choices) if axis in choice.axes]
        return np.array(found, dtype=np.int64)

    @property
    def everything(self) -> BoolArray:
        """All options; masks on which no pair rests keep the plan of the file."""
        allowed = np.arange(self.width) < self.count[:, None]
        allowed[~self._counts(), 1:] = False
        return allowed

    @property
    def free(self) -> IntArray:
        """Masks that have a choice on which some pair rests, in process order."""
        several = self.everything.sum(axis=1) > 1
        return np.unique(self.mask[several])

    def _counts(self) -> BoolArray:
        """Return which variables some pair can rest on, shape (n_variables,)."""
        found = np.zeros(len(self.choices), dtype=bool)
        for axis in self.atoms:
            reached = np.zeros(axis.n_masks, dtype=bool)
            reached[axis.rows.first] = reached[axis.rows.second] = True
            for i in range(axis.n_masks - 1, 0, -1):
                if reached[i]:
                    reached[axis.reads.masks[i][axis.reads.weights[i] > 0]] = True
            found[self.variables[axis.axis]] |= reached[1:]
        return found

    def values(self, plans: IntArray) -> FloatArray:
        """Return what every pair gets under plans, shape (n_plans, n_rows)."""
        parts = (plans[i : i + self.plan_step] for i in range(0, len(plans), self.plan_step))
        found = [np.concatenate([self._axis_values(axis, p) for axis in self.atoms], axis=1) for p in parts]
        return np.concatenate(found)

    def _axis_values(self, axis: AxisAtoms, plans: IntArray) -> FloatArray:
        chosen = plans[:, self.variables[axis.axis]]
        by_mask = np.concatenate([np.zeros_like(chosen[:, :1]), chosen], axis=1)
        return values(axis, by_mask, as_yield=self.as_yield)

    def changed(self, plans: IntArray) -> BoolArray:
        """Return which masks plans change, shape (n_plans, n_masks)."""
        return self.per_mask(plans != 0)

    def forced(self, allowed: BoolArray) -> BoolArray:
        """Return which masks can no longer keep the plan of the file, shape (n_nodes, n_masks)."""
        return self.per_mask(~allowed[:, :, 0])

    def per_mask(self, flags: BoolArray) -> BoolArray:
        """Return for each mask whether any of its variables is flagged."""
        return np.asarray(np.logical_or.reduceat(flags, self._firsts, axis=1))

    def reach(self, allowed: BoolArray) -> tuple[FloatArray, IntArray]:
        """Return what each pair reaches at best with each option of its pivot.

        Returns
        -------
        values : ndarray, shape (n_nodes, n_rows, n_options)
            Upper bounds, -inf for options that are not allowed; exact where all that a pair rests on
            is decided.
        pivots : ndarray of int, shape (n_nodes, n_rows)
            The variable of each pair's pivot.
        """
        parts = [self._reach(allowed[i : i + self.step]) for i in range(0, len(allowed), self.step)]
        return np.concatenate([values for values, _ in parts]), np.concatenate([p for _, p in parts])

    def _reach(self, allowed: BoolArray) -> tuple[FloatArray, IntArray]:
        found, pivots = [], []
        for bounds in self.bounds:
            of_mask = self._of_mask(bounds.axis, allowed)
            part, masks = bounds.values(of_mask)
            if bounds.is_loose:
                part = self._settled(bounds, of_mask, part, masks)
            pivots.append(self.variables[bounds.axis.axis][masks - 1])
            missing = self.width - part.shape[2]
            found.append(np.pad(part, ((0, 0), (0, 0), (0, missing)), constant_values=-np.inf))
        return np.concatenate(found, axis=1), np.concatenate(pivots, axis=1)

    def _of_mask(self, axis: AxisAtoms, allowed: BoolArray) -> BoolArray:
        of_mask = np.zeros((len(allowed), axis.n_masks, self.width), dtype=bool)
        of_mask[:, 1:] = allowed[:, self.variables[axis.axis]]
        of_mask[:, 0, 0] = True
        return of_mask[..., : int(axis.reads.count.max())]

    def _settled(
        self, bounds: AxisBounds, of_mask: BoolArray, reach: FloatArray, masks: IntArray
    ) -> FloatArray:
        """Replace bounds by exact values where every mask on the way is decided."""
        axis = bounds.axis
        plans = of_mask.argmax(axis=2)
        exact = values(axis, plans, as_yield=self.as_yield)
        undecided = open_parts(axis, plans, of_mask.sum(axis=2) == 1)
        rows = axis.rows
        known = np.abs(undecided[:, rows.second] - undecided[:, rows.first]).max(axis=2) < 1e-12
        return np.where(
            known[..., None] & of_mask[np.arange(len(of_mask))[:, None], masks], exact[..., None], reach
        )

    def open_variables(self, allowed: BoolArray, plan: IntArray, row: int) -> IntArray:
        """Return the undecided variables on which a pair rests under a plan, the latest mask first.

        Parameters
        ----------
        allowed : ndarray of bool, shape (n_variables, n_options)
            One node.
        plan : ndarray of int, shape (n_variables,)
            A plan of it.
        row : int
            The pair.
        """
        for axis in self.atoms:
            if row < len(axis.rows.room):
                break
            row -= len(axis.rows.room)
        variables = self.variables[axis.axis]
        by_mask = np.concatenate([[0], plan[variables]])
        masks = _resting(axis, by_mask, int(axis.rows.first[row]), int(axis.rows.second[row]))
        found = variables[[m - 1 for m in masks]] if masks else np.zeros(0, dtype=np.int64)
        return np.asarray(found[allowed[found].sum(axis=1) > 1])


def _resting(axis: AxisAtoms, plan: IntArray, first: int, second: int) -> list[int]:
    """Return the masks whose choices matter to an overlay under a plan, the latest first."""
    share = np.zeros(axis.n_masks)
    share[second] += 1.0
    share[first] -= 1.0
    found = []
    for i in range(max(first, second), 0, -1):
        if abs(share[i]) < 1e-12:
            continue
        found.append(i)
        for reference, weight in zip(
            axis.reads.masks[i, plan[i]], axis.reads.weights[i, plan[i]], strict=True
        ):
            share[reference] += weight * share[i]
    return found


def open_parts(axis: AxisAtoms, plans: IntArray, decided: BoolArray) -> FloatArray:
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
