"""What an engine of remedies returns: frozen records, lengths in nm."""

from dataclasses import dataclass
from typing import Literal

from flowplan.engine.remedies.changes import Change
from flowplan.engine.results import Entry, Verdict
from flowplan.model.flow import Flow

Kind = Literal["direct", "reference", "average", "self-align", "rule", "size"]
KINDS: tuple[Kind, ...] = ("direct", "reference", "average", "self-align", "rule", "size")


@dataclass(frozen=True, slots=True)
class Effect:
    """What a change does to the whole flow.

    Attributes
    ----------
    worst : float
        The worst margin afterwards [nm].
    failing : int
        How many margins fail afterwards.
    worse : int
        How many margins of other pairs get smaller.
    breaks : int
        How many of these did not fail before and do so afterwards.
    """

    worst: float
    failing: int
    worse: int
    breaks: int


@dataclass(frozen=True, slots=True)
class Remedy:
    """One change that gives a pair more margin.

    Attributes
    ----------
    kind : str
        One of `KINDS`.
    change : Change
        The change itself.
    margin : float
        The pair's margin afterwards [nm].
    verdict : {'pass', 'tight', 'fail'}
        And its verdict.
    effect : Effect
        What it does to the whole flow.
    for_zero, for_reserve : float or None
        Of a rule or a size: the value at which the margin is 0, and at which it reaches the reserve
        [nm, urad or ppm]; None where none does, or, for 0, where the margin is not below 0 as it is.
    """

    kind: Kind
    change: Change
    margin: float
    verdict: Verdict
    effect: Effect
    for_zero: float | None = None
    for_reserve: float | None = None

    @property
    def is_enough(self) -> bool:
        """Whether the pair no longer fails."""
        return self.verdict != "fail"


@dataclass(frozen=True, slots=True)
class Case:
    """One entry that does not pass, with what helps it.

    Attributes
    ----------
    entry : Entry
        The entry as it is.
    margin : float
        Its margin on the flow's basis [nm].
    remedies : tuple of Remedy
        The best first, see `remedies`.
    """

    entry: Entry
    margin: float
    remedies: tuple[Remedy, ...]


@dataclass(frozen=True, slots=True)
class Remedies:
    """What helps each pair that does not pass.

    Attributes
    ----------
    flow : Flow
        The flow.
    worst : float or None
        Its worst margin [nm]; None where nothing is judged.
    failing : int
        How many margins fail.
    cases : tuple of Case
        In file order.
    """

    flow: Flow
    worst: float | None
    failing: int
    cases: tuple[Case, ...]
