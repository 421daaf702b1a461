"""What each quoted size of a flow is worth, and how large it may become.

Every figure is exact: it is the engine's for the flow with that one size changed.
"""

import math
from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace

import numpy as np

from flowplan.engine.levers.ramp import largest
from flowplan.engine.levers.space import LeverSpace, Sized
from flowplan.engine.sources import FloatArray, IntArray
from flowplan.errors import Diagnostic, UsageError, nearest
from flowplan.model.flow import Flow
from flowplan.model.paths import Quoted, quoted_sizes

#: Margins closer to the worst than this share of all that was drawn are equally bad.
_TIE = 1e-9


@dataclass(frozen=True, slots=True)
class Gain:
    """What a change of one size brings the whole flow.

    Attributes
    ----------
    worst : float
        How much larger the worst margin is [nm].
    failing : int
        How many margins fewer fail.
    """

    worst: float
    failing: int


@dataclass(frozen=True, slots=True)
class Lever:
    """One quoted size and what it is worth.

    Attributes
    ----------
    quoted : Quoted
        The place in the file.
    value : float
        The size [nm, urad or ppm].
    halved, removed : Gain
        With half the size, and without it.
    derivative : float
        Change of the worst margin per unit of the size [nm per nm, urad or ppm]. Where the worst pair
        or point changes at just this size, the one towards smaller sizes; at a size of 0, larger.
    dominates : int
        How many margins gain more from removing this size than from removing any other; the first in
        the file on a tie.
    largest : float or None
        The largest value at which no margin fails [nm, urad or ppm]; infinite where it may be
        anything, None where no value of this size alone makes every pair pass.
    """

    quoted: Quoted
    value: float
    halved: Gain
    removed: Gain
    derivative: float
    dominates: int
    largest: float | None

    @property
    def is_unlimited(self) -> bool:
        """Whether every pair passes at any value."""
        return self.largest is not None and math.isinf(self.largest)


@dataclass(frozen=True, slots=True)
class Levers:
    """The sizes of a flow, the most worthwhile first.

    Attributes
    ----------
    flow : Flow
        The flow.
    worst : float or None
        The worst margin on the flow's basis [nm]; None where nothing is judged.
    failing : int
        How many margins fail.
    levers : tuple of Lever
        By gain in the worst margin when removed, then gain in failing margins, then the same when
        halved, then by how many margins they dominate, then in file order.
    """

    flow: Flow
    worst: float | None
    failing: int
    levers: tuple[Lever, ...]


def levers(
    flow: Flow,
    paths: Iterable[str] = (),
    progress: Callable[[int, int], None] | None = None,
) -> Levers:
    """Return what each quoted size of a flow is worth.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    paths : iterable of str, optional
        Only these places, as `Quoted.path` writes them; also the beginning of a path.
    progress : callable, optional
        Called with (sizes done, sizes in all).

    Returns
    -------
    Levers
        Lengths in nm, angles in urad, ratios in ppm.

    Raises
    ------
    UsageError
        FP602, when a path names no size.
    """
    wanted = _known(flow, tuple(paths))
    space = LeverSpace(flow)
    count = len(space.sizes)
    removed = np.zeros((count, len(space.board.rows)))
    found = []
    for i, quoted in enumerate(space.sizes):
        sized = space.sized(quoted)
        removed[i] = space.margins_at(sized, 0.0) - space.margins
        found.append(_lever(space, sized, removed[i] + space.margins))
        if progress:
            progress(i + 1, count)
    dominates = _dominated(space, removed)
    counted = [replace(lever, dominates=int(n)) for lever, n in zip(found, dominates, strict=True)]
    ranked = sorted(counted, key=_worth)
    board = space.board
    worst = board.worst(space.margins) if board.rows else None
    shown = tuple(lever for lever in ranked if wanted is None or lever.quoted.path in wanted)
    return Levers(flow, worst, board.failing(space.margins), shown)


def _known(flow: Flow, paths: tuple[str, ...]) -> set[str] | None:
    if not paths:
        return None
    every = [quoted.path for quoted in quoted_sizes(flow)]
    found = set()
    problems = []
    for path in paths:
        under = {known for known in every if known == path or known.startswith(path + ".")}
        found |= under
        if not under:
            hint = nearest(path, list(dict.fromkeys(every)))
            problems.append(Diagnostic("FP602", f"the flow quotes no size at {path!r}", hint))
    if problems:
        raise UsageError(problems)
    return found


def _lever(space: LeverSpace, sized: Sized, without: FloatArray) -> Lever:
    t = largest(sized.ramps) if sized.ramps else math.inf
    still = np.ones(len(space.board.rows), dtype=bool)
    for ramp in sized.ramps:
        still[ramp.rows] = False
    if (space.board.settled(space.margins)[still] < 0).any():
        t = None  # a pair fails that this size has no part in
    return Lever(
        sized.quoted,
        sized.unit * sized.now,
        _gain(space, space.margins_at(sized, sized.now / 2)),
        _gain(space, without),
        _derivative(space, sized) / sized.unit,
        0,
        None if t is None else t * sized.unit,
    )


def _gain(space: LeverSpace, margins: FloatArray) -> Gain:
    board = space.board
    if not board.rows:
        return Gain(0.0, 0)
    worst = board.worst(margins) - board.worst(space.margins)
    return Gain(worst, board.failing(space.margins) - board.failing(margins))


def _derivative(space: LeverSpace, sized: Sized) -> float:
    """Return the derivative of the worst margin in t: to the left, or to the right at 0."""
    if not space.board.rows:
        return 0.0
    worst = float(space.margins.min())
    reach = worst + _TIE * float((space.board.drawn + np.abs(space.board.keep)).max())
    still = np.ones(len(space.margins), dtype=bool)
    slopes: list[float] = []
    for ramp in sized.ramps:
        still[ramp.rows] = False
        active = ramp.at(sized.now) <= reach
        slopes += ramp.slope(sized.now, -1 if sized.now else 1)[active].tolist()
    if (space.margins[still] <= reach).any():
        slopes.append(0.0)
    return max(slopes) if sized.now else min(slopes)


def _dominated(space: LeverSpace, gains: FloatArray) -> IntArray:
    """Return how many rows each size dominates; `gains` has shape (n_sizes, n_rows)."""
    best = gains.max(axis=0, initial=0.0)
    first = (gains >= best - space.board.grain).argmax(axis=0) if len(gains) else np.zeros(0, dtype=int)
    return np.asarray(np.bincount(first[best > space.board.grain], minlength=len(gains)))


def _worth(lever: Lever) -> tuple[float, ...]:
    """Return what levers are ranked by; gains are rounded so that equal ones tie."""
    removed, halved = lever.removed, lever.halved
    gains = round(removed.worst, 6), removed.failing, round(halved.worst, 6), halved.failing
    return tuple(-figure for figure in (*gains, lever.dominates))
