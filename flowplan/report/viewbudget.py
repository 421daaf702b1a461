"""What each source adds to a pair's error, x and y side by side."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from flowplan.engine.results import Entry
from flowplan.model.terms import Kind
from flowplan.report.charts import bar
from flowplan.report.viewbase import NONE, Base, percent

#: Sources with a row of their own; the others stand together in the row of the rest.
SHOWN = 6
#: Length of a full bar [px].
BAR = 60


@dataclass(frozen=True, slots=True)
class Amount:
    """One source on one axis, in words, with the length of its bar."""

    error: str
    share: str
    bar: int


@dataclass(frozen=True, slots=True)
class BudgetRow:
    """One source, or the rest; one amount a column."""

    name: str
    of: str
    kind: str
    amounts: tuple[Amount, ...]


@dataclass(slots=True)
class _Source:
    """A source's sizes by column: what it can do to the error, and its share of the variance."""

    name: str
    of: str
    kind: Kind
    size: list[float] = field(default_factory=list)
    share: list[float] = field(default_factory=list)

    @property
    def largest(self) -> float:
        return max(abs(s) for s in self.size)


def budget_rows(base: Base, entries: Sequence[Entry]) -> tuple[BudgetRow, ...]:
    """Return the sources of entries of the same layers, the largest first, the rest last.

    Parameters
    ----------
    base : Base
        Words numbers.
    entries : sequence of Entry
        One for each column.

    Returns
    -------
    tuple of BudgetRow
        A random source's error is at the flow's confidence; a known offset keeps its sign on the
        worse side.
    """
    sources = sorted(_gather(base, entries), key=lambda s: -s.largest)
    shown = sources if len(sources) <= SHOWN + 1 else sources[:SHOWN]
    full = max((s.largest for s in sources), default=0.0)
    rows = [_row(base, source, full) for source in shown]
    rest = sources[len(shown) :]
    if rest:
        columns = tuple(_rest(base, rest, column, full) for column in range(len(entries)))
        rows.append(BudgetRow(f"{len(rest)} smaller sources", "", "", columns))
    return tuple(rows)


def _gather(base: Base, entries: Sequence[Entry]) -> list[_Source]:
    found: dict[tuple[str, str, Kind], _Source] = {}
    confidence = base.result.flow.confidence
    for column, entry in enumerate(entries):
        budget = entry.budget
        total = float(budget.variance.sum())
        deviation = np.sqrt(budget.variance)
        for i, index in enumerate(budget.index):
            source = budget.book[int(index)]
            key = (source.name, source.of, source.kind)
            if key not in found:
                zeros = [0.0] * len(entries)
                found[key] = _Source(source.name, source.of, source.kind, zeros, [*zeros])
            row = found[key]
            if source.kind in ("random", "uniform"):
                row.size[column] = math.hypot(row.size[column], confidence * float(deviation[i]))
                row.share[column] += float(budget.variance[i]) / total if total else 0.0
            else:
                row.size[column] += float(budget.amount[i])
    return list(found.values())


def _row(base: Base, source: _Source, full: float) -> BudgetRow:
    amounts = []
    for size, share in zip(source.size, source.share, strict=True):
        varies = source.kind in ("random", "uniform")
        error = base.signed(size) if source.kind == "offset" else base.plus_minus(abs(size))
        amounts.append(
            Amount(
                error if size else NONE,
                percent(share) if varies and size else NONE,
                bar(abs(size) / full if full else 0.0, BAR),
            )
        )
    return BudgetRow(source.name, source.of, source.kind, tuple(amounts))


def _rest(base: Base, rest: Sequence[_Source], column: int, full: float) -> Amount:
    """Return the smaller sources of one column together, each kind added up in its own way."""
    sizes = {kind: [s.size[column] for s in rest if s.kind in kinds] for kind, kinds in _ADDED.items()}
    random = math.hypot(*sizes["random"])
    bound, offset = sum(abs(s) for s in sizes["bound"]), sum(sizes["offset"])
    words = [f"±{base.length(random)}"] if random else []
    words += [f"±{base.length(bound)} bound"] if bound else []
    words += [f"{base.signed(offset)} offset"] if offset else []
    share = percent(sum(s.share[column] for s in rest)) if random else NONE
    return Amount(", ".join(words) or NONE, share, bar((random + bound) / full if full else 0.0, BAR))


_ADDED: dict[str, tuple[Kind, ...]] = {
    "random": ("random", "uniform"),
    "bound": ("bound",),
    "offset": ("offset",),
}
