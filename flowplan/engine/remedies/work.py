"""Works out the remedies of entry after entry; what serves several entries is done once."""

from collections import defaultdict
from collections.abc import Callable, Iterator
from functools import cached_property

from flowplan.engine.board import Board
from flowplan.engine.levers.ramp import largest
from flowplan.engine.levers.space import LeverSpace, Sized
from flowplan.engine.margin import verdict_of
from flowplan.engine.placement import place
from flowplan.engine.remedies.changes import Change, Redraw, Reread, Resize, SelfAlign, apply
from flowplan.engine.remedies.options import reread_options
from flowplan.engine.remedies.reread import RereadSpace
from flowplan.engine.remedies.rereads import rereads
from flowplan.engine.remedies.result import Case, Effect, Kind, Remedy
from flowplan.engine.residual import Row
from flowplan.engine.results import Entry, Verdict
from flowplan.engine.sources import FloatArray
from flowplan.model.base import Axis
from flowplan.model.flow import Flow
from flowplan.model.masks import Mask

#: What a change costs, roughly: a recipe, a process step, area on every die, a better tool. Common
#: practice, no source.
_COST: dict[Kind, int] = {"direct": 0, "reference": 0, "average": 0, "self-align": 1, "rule": 2, "size": 3}
_RANK: dict[Verdict, int] = {"pass": 0, "tight": 1, "fail": 2, "unjudged": 3}
#: What a target is overshot by, as a share of the drawn value, so that rounding cannot undo it.
_HAIR = 1e-9


class Workshop:
    """What is worked out once for all cases."""

    def __init__(self, flow: Flow, needy: list[Entry], progress: Callable[[int, int], None] | None) -> None:
        self.flow = flow
        self.rows = [Row(e.pair, *e.layers, e.axis) for e in needy]
        self.levers = LeverSpace(flow)
        self.board: Board = self.levers.board
        self.margins = self.levers.margins
        self._place = {_key(row): i for i, row in enumerate(self.board.rows)}
        self._order = list(flow.layers)
        self._self_aligned: dict[SelfAlign, FloatArray] = {}
        self._options = reread_options(flow, self.rows)
        self._steps = [0, 1 + len(self._options) // 2 + len(needy)]
        self._progress = progress
        self._step()

    @cached_property
    def _rereads(self) -> dict[int, list[Remedy]]:
        """Other readings that help each row of the board that is in need."""
        space = RereadSpace(self.flow, self._options)
        needy = frozenset(self._place[_key(row)] for row in self.rows)
        found: dict[int, list[Remedy]] = defaultdict(list)
        for mask in dict.fromkeys(mask for mask, _ in self._options):
            for at, remedy in rereads(space, mask, needy):
                found[at].append(remedy)
            self._step()
        return found

    def case(self, entry: Entry) -> Case:
        """Return one entry with what helps it."""
        row = Row(entry.pair, *entry.layers, entry.axis)
        at = self._place[_key(row)]
        found = [*self._rereads[at], *self._self_align(row, at), *self._rule(row, at), *self._sizes(at)]
        gains = (r for r in found if r.margin > self.margins[at] + self.board.grain[at])
        ranked = tuple(sorted(gains, key=worth))
        self._step()
        return Case(entry, float(self.board.settled(self.margins)[at]), ranked)

    def _self_align(self, row: Row, at: int) -> Iterator[Remedy]:
        earlier, later = sorted((row.first, row.second), key=self._order.index)
        if not isinstance(self.flow.layers[later], Mask):
            return
        # Where two grown layers eat up the same room, a step that leaves a space helps only if it
        # shrinks as its parent grows, as an implant beside a gate does.
        change = SelfAlign(later, earlier, "opposite" if row.pair.rule in ("spacing", "overlap") else "same")
        if change not in self._self_aligned:
            flow = apply(self.flow, change)
            self._self_aligned[change] = self.board.of_edited(flow).margins(place(flow))
        margins = self._self_aligned[change]
        yield self._remedy("self-align", change, margins, self._effect(margins), at)

    def _rule(self, row: Row, at: int) -> Iterator[Remedy]:
        drawn, margin = float(self.board.drawn[at]), float(self.board.settled(self.margins)[at])
        reserve = self.flow.reserve
        for_zero = drawn - margin if margin < 0 else None
        for_reserve = for_zero
        if reserve:
            lack = (reserve + _HAIR) * drawn - margin
            for_reserve = drawn + lack / (1 - reserve) if reserve < 1 else None
        after = for_reserve if for_reserve is not None else for_zero
        if after is None:
            return
        margins = self.margins.copy()
        for i, other in enumerate(self.board.rows):
            if other.pair.name == row.pair.name and other.axis == row.axis:
                margins[i] += after - drawn
        change = Redraw(row.pair.name, row.axis, drawn, after)
        yield self._remedy("rule", change, margins, self._effect(margins), at, (for_zero, for_reserve))

    @cached_property
    def _sized(self) -> list[Sized]:
        return [self.levers.sized(quoted) for quoted in self.levers.sizes if quoted.in_base(self.flow.unit)]

    def _sizes(self, at: int) -> Iterator[Remedy]:
        for sized in self._sized:
            ramps = [ramp.only(at) for ramp in sized.ramps if at in ramp.rows]
            if not ramps:
                continue
            drawn = float(self.board.drawn[at])
            fails = bool(self.board.settled(self.margins)[at] < 0)
            for_zero = largest(ramps) if fails else None
            wanted = self.flow.reserve and (self.flow.reserve + _HAIR) * drawn
            for_reserve = largest(ramps, float(wanted)) if wanted or fails else None
            t = next((v for v in (for_reserve, for_zero) if v is not None), 0.0)
            if not t < 1:
                continue
            margins = self.levers.margins_at(sized, t)
            change = Resize(sized.quoted, sized.unit, t * sized.unit)
            values = tuple(None if v is None else v * sized.unit for v in (for_zero, for_reserve))
            yield self._remedy("size", change, margins, self._effect(margins), at, (values[0], values[1]))

    def _remedy(
        self,
        kind: Kind,
        change: Change,
        margins: FloatArray,
        effect: Effect,
        at: int,
        values: tuple[float | None, float | None] = (None, None),
    ) -> Remedy:
        margin = float(self.board.settled(margins)[at])
        drawn = change.after if isinstance(change, Redraw) else float(self.board.drawn[at])
        verdict = verdict_of(margin, drawn, self.flow.reserve)
        return Remedy(kind, change, margin, verdict, effect, *values)

    def _effect(self, margins: FloatArray) -> Effect:
        board = self.board
        before, after = board.settled(self.margins), board.settled(margins)
        worse = after < before - board.grain
        return Effect(
            board.worst(margins),
            board.failing(margins),
            int(worse.sum()),
            int((worse & (after < 0) & (before >= 0)).sum()),
        )

    def _step(self) -> None:
        self._steps[0] += 1
        if self._progress:
            self._progress(self._steps[0], self._steps[1])


def worth(remedy: Remedy) -> tuple[float, ...]:
    """Return what remedies are ranked by, the smallest first; figures are rounded so that equals tie."""
    change, effect = remedy.change, remedy.effect
    return (
        effect.failing,
        _RANK[remedy.verdict],
        _COST[remedy.kind],
        -round(effect.worst, 6),
        effect.worse,
        -round(remedy.margin, 6),
        len(change.axes) if isinstance(change, Reread) else 0,
    )


def _key(row: Row) -> tuple[str, str, str, Axis]:
    return row.pair.name, row.first, row.second, row.axis
