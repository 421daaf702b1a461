"""What each source adds to a pair's error, x and y side by side."""

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from flowplan.engine.results import Entry
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.model.terms import Kind
from flowplan.report.charts import bar
from flowplan.report.viewbase import NBSP, NONE, Base, percent

#: Rows of their own; what is smaller stands together in the row of the rest.
SHOWN = 6
BoolArray = NDArray[np.bool_]
_VARYING: tuple[Kind, ...] = ("random", "uniform")
#: Owners of a row that are named; more are counted.
_NAMED = 3
#: What the engine names after the layer that is read counts as one group.
_READ = ("alignment to ", "mark reading of ")


@dataclass(frozen=True, slots=True)
class Amount:
    """One row's part on one axis, in words, with the length of its bar."""

    error: str
    share: str
    bar: int


@dataclass(frozen=True, slots=True)
class BudgetRow:
    """One source, several of one name, or the rest; one amount a column."""

    name: str
    of: str
    kind: str
    amounts: tuple[Amount, ...]


@dataclass(frozen=True, slots=True)
class _Sizes:
    """Groups of sources and the columns of a budget.

    Attributes
    ----------
    error : ndarray, shape (n_groups, n_columns)
        The random part at the flow's confidence, or the bound, or the signed offset [nm].
    share : ndarray, shape (n_groups, n_columns)
        Of the variance.
    members : ndarray of int, shape (n_groups,)
        Sources in each that take part, in the column with the most.
    taking_part, group : ndarray of int, shape (n_taking_part,)
        Those sources, and the group of each.
    """

    error: FloatArray
    share: FloatArray
    members: IntArray
    taking_part: IntArray
    group: IntArray


@dataclass(frozen=True)
class BudgetBook:
    """Every source of the flow, single and in groups of one name and kind."""

    base: Base

    @cached_property
    def _single(self) -> tuple[list[tuple[str, str, Kind]], IntArray]:
        return _numbered((s.name, s.of, s.kind) for s in self.base.result.engine.placement.sources)

    @cached_property
    def _group(self) -> tuple[list[tuple[str, str, Kind]], IntArray]:
        sources = self.base.result.engine.placement.sources
        return _numbered((_group_name(s.name), "", s.kind) for s in sources)

    def rows(self, entries: Sequence[Entry]) -> tuple[BudgetRow, ...]:
        """Return the sources of entries of the same layers, the largest first, the rest last.

        Parameters
        ----------
        entries : sequence of Entry
            One for each column.

        Returns
        -------
        tuple of BudgetRow
            Sources of one name are joined where there are many. A random source's error is at the
            flow's confidence; a known offset keeps its sign on the worse side.
        """
        labels, places = self._single
        sizes = self._sizes(entries, places, labels)
        if np.count_nonzero(sizes.members) > SHOWN + 1:
            labels, places = self._group
            sizes = self._sizes(entries, places, labels)
        return self._worded(sizes, labels)

    def _sizes(
        self, entries: Sequence[Entry], places: IntArray, labels: Sequence[tuple[str, str, Kind]]
    ) -> _Sizes:
        n, confidence = len(labels), self.base.result.flow.confidence
        error, share = np.zeros((n, len(entries))), np.zeros((n, len(entries)))
        seen, members = np.zeros(len(places), dtype=bool), np.zeros(n, dtype=np.int64)
        for column, entry in enumerate(entries):
            budget = entry.budget
            at = places[budget.index]
            seen[budget.index] = True
            members = np.maximum(members, np.bincount(at, minlength=n))
            variance = np.bincount(at, budget.variance, n)
            fixed = np.where(budget.variance > 0, 0.0, self._fixed(budget.amount, budget.index))
            error[:, column] = confidence * np.sqrt(variance) + np.bincount(at, fixed, n)
            total = variance.sum()
            share[:, column] = variance / total if total else 0.0
        taking_part = np.flatnonzero(seen)
        return _Sizes(error, share, members, taking_part, places[taking_part])

    def _fixed(self, amount: FloatArray, index: IntArray) -> FloatArray:
        """Return bounds by size and offsets with their sign [nm]."""
        return np.where(self._is_bound[index], np.abs(amount), amount)

    @cached_property
    def _is_bound(self) -> BoolArray:
        sources = self.base.result.engine.placement.sources
        return np.array([s.kind == "bound" for s in sources], dtype=bool)

    def _worded(self, sizes: _Sizes, labels: Sequence[tuple[str, str, Kind]]) -> tuple[BudgetRow, ...]:
        largest = np.abs(sizes.error).max(axis=1, initial=0.0)
        order = [int(i) for i in np.argsort(-largest, kind="stable") if sizes.members[i]]
        shown = order if len(order) <= SHOWN + 1 else order[:SHOWN]
        full = float(largest.max(initial=0.0)) or 1.0
        rows = []
        for i in shown:
            name, _, kind = labels[i]
            rows.append(BudgetRow(name, self._owners(sizes, i), kind, self._amounts(sizes, i, kind, full)))
        rest = order[len(shown) :]
        if rest:
            count = int(sizes.members[rest].sum())
            kinds = [labels[i][2] for i in rest]
            columns = range(sizes.error.shape[1])
            amounts = tuple(self._rest(sizes, rest, kinds, column, full) for column in columns)
            rows.append(BudgetRow(f"{count} smaller sources", "", "", amounts))
        return tuple(rows)

    def _owners(self, sizes: _Sizes, i: int) -> str:
        """Return the masks and tools behind a row, or how many sources it joins."""
        sources = self.base.result.engine.placement.sources
        found = dict.fromkeys(sources[k].of for k in sizes.taking_part[sizes.group == i])
        return ", ".join(found) if len(found) <= _NAMED else f"{sizes.members[i]} sources"

    def _amounts(self, sizes: _Sizes, i: int, kind: Kind, full: float) -> tuple[Amount, ...]:
        found = []
        for error, share in zip(sizes.error[i].tolist(), sizes.share[i].tolist(), strict=True):
            word = self.base.signed(error) if kind == "offset" else self.base.plus_minus(error)
            part = percent(share) if kind in _VARYING and error else NONE
            found.append(Amount(word if error else NONE, part, bar(abs(error) / full)))
        return tuple(found)

    def _rest(
        self, sizes: _Sizes, rest: Sequence[int], kinds: Sequence[Kind], column: int, full: float
    ) -> Amount:
        """Return the smaller sources of one column together, each kind added up in its own way."""
        errors = [(kind, float(sizes.error[i, column])) for i, kind in zip(rest, kinds, strict=True)]
        random = math.hypot(*(error for kind, error in errors if kind in _VARYING))
        bound = sum(error for kind, error in errors if kind == "bound")
        offset = sum(error for kind, error in errors if kind == "offset")
        words = [self.base.plus_minus(random)] if random else []
        words += [f"{self.base.plus_minus(bound)}{NBSP}bound"] if bound else []
        words += [f"{self.base.signed(offset)}{NBSP}offset"] if offset else []
        share = percent(float(sizes.share[list(rest), column].sum())) if random else NONE
        return Amount(", ".join(words) or NONE, share, bar((random + bound) / full))


def _numbered(keys: Iterable[tuple[str, str, Kind]]) -> tuple[list[tuple[str, str, Kind]], IntArray]:
    """Return the distinct keys in order of appearance, and each key's place among them."""
    places: dict[tuple[str, str, Kind], int] = {}
    found = [places.setdefault(key, len(places)) for key in keys]
    return list(places), np.array(found, dtype=np.int64)


def _group_name(name: str) -> str:
    return next((read.rsplit(" ", 2)[0] for read in _READ if name.startswith(read)), name)
