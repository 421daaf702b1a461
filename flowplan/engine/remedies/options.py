"""Which references each mask might read instead, so that a pair gains."""

from collections.abc import Iterable
from itertools import combinations

import numpy as np

from flowplan.engine.graph import AlignmentGraph
from flowplan.engine.remedies.reread import Options, shares
from flowplan.engine.residual import Row
from flowplan.engine.sources import FloatArray
from flowplan.model.base import AXES, WAFER, Axis
from flowplan.model.edits import Readings
from flowplan.model.flow import Flow
from flowplan.model.masks import Mask, Reading, References

#: A share of a move below this is the rounding of averaged weights.
_NOTHING = 1e-12


def reread_options(flow: Flow, rows: Iterable[Row]) -> Options:
    """Return what masks might read instead, for the advantage of some rows.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    rows : iterable of Row
        The rows that should gain.

    Returns
    -------
    mapping of (mask id, axis) to tuple of Readings
        For each mask that moves a row, on both axes. A mask with `may_align_to` has those candidates.
        Any other may read each earlier mask, and the other layer of a row that is its own; and the
        even average of two out of what it reads now and the earlier masks on the chains of the rows.
    """
    graph = AlignmentGraph(flow)
    share = {axis: shares(flow, axis) for axis in AXES}
    near: dict[str, dict[str, None]] = {}
    others: dict[str, dict[str, None]] = {}
    for row in rows:
        chain = graph.chain(first=row.first, second=row.second, axis=row.axis).layers
        for name in _movers(flow, share[row.axis], row):
            near.setdefault(name, {}).update(dict.fromkeys(chain))
            others.setdefault(name, {})
            if name in (row.first, row.second):
                others[name][row.second if name == row.first else row.first] = None
    order = {name: i for i, name in enumerate(flow.layers)}
    found: dict[tuple[str, Axis], tuple[Readings, ...]] = {}
    for mask in (m for m in flow.masks if m.id in near):
        earlier = [name for name in flow.layers if order[name] < order[mask.id]]
        single = [n for n in earlier if isinstance(flow.layers[n], Mask) or n in others[mask.id]]
        paired = [name for name in earlier if name in near[mask.id]]
        for axis in AXES:
            options = _options(mask, axis, single, paired)
            sound = (o for o in options if all(_is_sized(flow, mask, reading) for reading in o))
            found[mask.id, axis] = tuple(_distinct(sound, mask, axis))
    return found


def _movers(flow: Flow, share: FloatArray, row: Row) -> tuple[str, ...]:
    """Return the masks whose frame moves one layer of a row against the other, in process order.

    Any of them may be aligned anew to the row's advantage; what both layers inherit alike may not.
    """
    index = {WAFER: 0} | {name: i + 1 for i, name in enumerate(flow.layers)}
    apart = np.abs(share[index[row.second]] - share[index[row.first]])
    return tuple(mask.id for mask in flow.masks if apart[index[mask.id]] > _NOTHING)


def _options(mask: Mask, axis: Axis, single: list[str], paired: list[str]) -> list[Readings]:
    if mask.may_align_to is not None:
        return [candidate.on(axis) for candidate in mask.may_align_to]
    now = {reading.mask: reading.alignment for reading in mask.aligns_to.on(axis)}
    averaged = dict.fromkeys([name for name in now if name != WAFER] + paired)
    groups = [(name,) for name in single] + list(combinations(averaged, 2))
    return [tuple(Reading(mask=name, alignment=now.get(name)) for name in group) for group in groups]


def _is_sized(flow: Flow, mask: Mask, reading: Reading) -> bool:
    """Whether the file says how well the reading goes; what is not quoted must not look like a gain."""
    tool = flow.tools[mask.tool]
    quoted = tool.wafer_alignment if reading.mask == WAFER else tool.alignment
    return reading.alignment is not None or quoted is not None


def _distinct(options: Iterable[Readings], mask: Mask, axis: Axis) -> Iterable[Readings]:
    """Yield the options that differ from what the mask reads now and from one another."""
    seen = {plain(mask.aligns_to.on(axis))}
    for option in options:
        if plain(option) not in seen:
            seen.add(plain(option))
            yield option


def plain(readings: Readings) -> frozenset[tuple[str, float, str]]:
    """Return readings in a form in which equal ones are equal, however they are written."""
    weighted = References.model_construct(x=readings, y=readings).weighted("x")
    return frozenset((r.mask, round(weight, 12), repr(r.alignment)) for r, weight in weighted)
