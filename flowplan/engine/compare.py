"""Plans side by side: pair by pair, what each of them leaves."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from flowplan.engine.analysis import Result
from flowplan.engine.landing import LandingEntry
from flowplan.engine.results import Entry, Verdict
from flowplan.model.differences import Difference, differences
from flowplan.model.masks import SelfAligned

Key = tuple[str, str, str, str]
#: ``unsettled``: only the first plan settles it; ``rejudged``: only one of the two judges it.
Status = Literal[
    "same", "better", "worse", "settled", "unsettled", "appears", "disappears", "absent", "rejudged"
]
#: A change below this share of the drawn value, or of what the errors take, is rounding.
_NOISE = 1e-9
#: A probability that changes by less is what integration leaves.
_SAME_FAILS = 1e-8


@dataclass(frozen=True, slots=True)
class Plan:
    """One of the plans compared.

    Attributes
    ----------
    name : str
        What it is called.
    result : Result
        Its margins.
    changes : tuple of Difference
        What it changes against the first plan; empty for that one.
    """

    name: str
    result: Result
    changes: tuple[Difference, ...]


@dataclass(frozen=True, slots=True)
class Row:
    """One pair of layers on one axis in every plan.

    Attributes
    ----------
    pair : str
        The pair's name.
    layers : tuple of str
        The two layers.
    axis : {'x', 'y', 'xy'}
        The axis; both for a landing.
    entries : tuple of (Entry, LandingEntry or None)
        One a plan; None where the plan does not have the pair.
    margins : tuple of (float or None)
        Margins on each plan's own basis [nm]; None where nothing is judged.
    overlays : tuple of (float or None)
        What all errors of the residual take, the known offset included, on the same basis [nm].
    settled : tuple of bool
        Where a self-aligned step leaves no overlay error at all.
    """

    pair: str
    layers: tuple[str, str]
    axis: str
    entries: tuple[Entry | LandingEntry | None, ...]
    margins: tuple[float | None, ...]
    overlays: tuple[float | None, ...]
    settled: tuple[bool, ...]

    def change(self, plan: int) -> float | None:
        """Return how much is gained over the first plan [nm], below 0 when lost.

        The margin where both plans judge the pair, else the smaller overlay where neither does; None
        when the pair is not in both, or judged in one only.
        """
        for figures, sign in ((self.margins, 1), (self.overlays, -1)):
            first, other = figures[0], figures[plan]
            if (
                first is not None
                and other is not None
                and (figures is self.margins or not self._judged(plan))
            ):
                return sign * (other - first)
        return None

    def _judged(self, plan: int) -> bool:
        return self.margins[0] is not None or self.margins[plan] is not None

    def verdicts(self) -> tuple[Verdict | None, ...]:
        """Return the verdict in each plan."""
        return tuple(None if e is None else e.verdict for e in self.entries)

    def status(self, plan: int) -> Status:
        """Return how the pair fared against the first plan."""
        first, other = self.entries[0], self.entries[plan]
        if first is None or other is None:
            return "absent" if first is other else "appears" if first is None else "disappears"
        if self.settled[plan] != self.settled[0]:
            return "settled" if self.settled[plan] else "unsettled"
        change = self.change(plan)
        if change is None:
            return "rejudged"
        largest = max(
            abs(v)
            for v in (self.overlays[0], self.overlays[plan], getattr(first, "drawn", None), 0.0)
            if v is not None
        )
        if abs(change) <= _NOISE * largest:
            return "same"
        return "better" if change > 0 else "worse"


@dataclass(frozen=True, slots=True)
class LandingRow(Row):
    """A landing pair in every plan: it has no margins, and is measured by how many contacts fail."""

    @property
    def fails(self) -> tuple[float | None, ...]:
        """Probability of failure in each plan; None where the pair is missing or nothing is judged."""
        return tuple(e.fail_probability if isinstance(e, LandingEntry) else None for e in self.entries)

    def status(self, plan: int) -> Status:
        """Return how the pair fared against the first plan."""
        first, other = self.entries[0], self.entries[plan]
        if first is None or other is None:
            return "absent" if first is other else "appears" if first is None else "disappears"
        before, after = self.fails[0], self.fails[plan]
        if before is None or after is None:
            return "same" if before is after else "rejudged"
        if abs(after - before) <= _SAME_FAILS:
            return "same"
        return "better" if after < before else "worse"


@dataclass(frozen=True, slots=True)
class Comparison:
    """Several plans side by side; the first is what the others are measured against."""

    plans: tuple[Plan, ...]
    rows: tuple[Row, ...]


def compare(named: Sequence[tuple[str, Result]]) -> Comparison:
    """Lay plans side by side.

    Parameters
    ----------
    named : sequence of (str, Result)
        Plans with their names, the base first; pairs are matched by name, layers and axis.

    Returns
    -------
    Comparison
        Rows in the order of the first plan, then those that appear in later ones.

    Raises
    ------
    ValueError
        With fewer than two plans.
    """
    if len(named) < 2:
        msg = "two plans or more are needed"
        raise ValueError(msg)
    base = named[0][1]
    plans = tuple(
        Plan(name, result, differences(base.flow, result.flow) if result is not base else ())
        for name, result in named
    )
    tables = [{_key(e): e for e in plan.result.checks} for plan in plans]
    keys = dict.fromkeys(key for table in tables for key in table)
    return Comparison(plans, tuple(_row(key, plans, tables) for key in keys))


def _key(entry: Entry | LandingEntry) -> Key:
    return (entry.pair.name, *entry.layers, entry.axis)


def _row(key: Key, plans: Sequence[Plan], tables: Sequence[dict[Key, Entry | LandingEntry]]) -> Row:
    found = tuple(table.get(key) for table in tables)
    none = (None,) * len(plans)
    if key[3] == "xy":
        return LandingRow(key[0], (key[1], key[2]), key[3], found, none, none, (False,) * len(plans))
    entries = tuple(e if isinstance(e, Entry) else None for e in found)
    both = [*zip(plans, entries, strict=True)]
    margins = tuple(None if e is None or e.margin is None else p.result.margin(e) for p, e in both)
    overlays = tuple(None if e is None else taken(p.result, e) for p, e in both)
    settled = tuple(e is not None and is_settled(p.result, e) for p, e in both)
    return Row(key[0], (key[1], key[2]), key[3], entries, margins, overlays, settled)


def taken(result: Result, entry: Entry) -> float:
    """Return what all errors of an entry take on the flow's basis, known offset included [nm]."""
    return entry.need.on(result.flow.basis) + abs(entry.residual.offset)


def is_settled(result: Result, entry: Entry) -> bool:
    """Whether a self-aligned step leaves no overlay error between the entry's layers.

    Parameters
    ----------
    result : Result
        The analysis that the entry belongs to.
    entry : Entry
        One of its entries.
    """
    parts = entry.overlay
    if parts.random or parts.bound or parts.offset:
        return False
    layers = result.flow.layers
    return any(isinstance(layers.get(name), SelfAligned) for name in entry.chain.layers)
