"""What to do about each pair that does not pass: every single change that helps, the best first.

Every figure is the engine's for the flow with that one change made; see `changes.apply`.
"""

from collections.abc import Callable, Iterable

from flowplan.engine.analysis import Engine
from flowplan.engine.remedies.result import Remedies
from flowplan.engine.remedies.work import Workshop
from flowplan.errors import Diagnostic, UsageError, nearest
from flowplan.model.flow import Flow
from flowplan.model.landing import Landing


def remedies(
    flow: Flow,
    pairs: Iterable[str] = (),
    *,
    every: bool = False,
    progress: Callable[[int, int], None] | None = None,
) -> Remedies:
    """Return what helps the pairs that fail or are tight.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    pairs : iterable of str, optional
        Only these pairs, by name.
    every : bool
        Pairs that pass as well.
    progress : callable, optional
        Called with (steps done, steps in all).

    Returns
    -------
    Remedies
        Changes that raise the pair's margin, ranked: fewest failing margins in the flow afterwards;
        then the pair's own verdict, pass before tight before fail; then what the change costs, other
        references before a self-aligned step before a wider rule before a smaller error; then the
        largest worst margin of the flow; then fewest other margins made smaller; then the largest
        margin of the pair; then fewest axes touched; then process order.

    Raises
    ------
    UsageError
        FP602, when a pair is not in the flow.
    """
    wanted = tuple(pairs)
    _refuse_unknown(flow, wanted)
    judged = [e for e in Engine.of(flow).entries() if e.margin is not None]
    needy = [
        e
        for e in judged
        if (every or e.verdict in ("fail", "tight")) and (not wanted or e.pair.name in wanted)
    ]
    work = Workshop(flow, needy, progress)
    cases = tuple(work.case(e) for e in needy)
    board, margins = work.board, work.margins
    return Remedies(flow, board.worst(margins) if board.rows else None, board.failing(margins), cases)


def _refuse_unknown(flow: Flow, names: tuple[str, ...]) -> None:
    known = [pair.name for pair in flow.pairs]
    problems = [
        Diagnostic("FP602", f"unknown pair {name!r}", nearest(name, known))
        for name in names
        if name not in known
    ]
    hint = "remedies are sought for what is judged along an axis"
    problems += [
        Diagnostic("FP602", f"{pair.name!r} is judged by its landed area", hint)
        for pair in flow.pairs
        if isinstance(pair, Landing) and pair.name in names
    ]
    if problems:
        raise UsageError(problems)
