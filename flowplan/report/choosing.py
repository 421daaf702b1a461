"""What a report shows for choosing among plans: variants, what would help, and the best references."""

from collections.abc import Callable, Mapping

from flowplan.engine.analysis import Result, analyse
from flowplan.engine.compare import compare
from flowplan.engine.propose import ladder
from flowplan.engine.remedies import remedies
from flowplan.model.flow import Flow
from flowplan.report.comparison import ComparisonText, comparison_text
from flowplan.report.proposal import LadderText, ladder_text
from flowplan.report.remedytext import RemediesText, RemedyWords
from flowplan.report.view import Extras

OWN_PLAN = "the file's own plan"
#: A report does not wait longer for the search of the best references [s].
LADDER_LIMIT = 20.0
#: Remedies of each kind that a report lists.
_EACH = 2
#: Pairs whose remedies a report lists; the command lists all.
_MOST_CASES = 12
#: In a flow beyond this the search takes minutes, and is left to the command.
_MOST_MASKS, _MOST_ENTRIES = 100, 1000

Progress = Callable[[int, int], None]


def report_extras(result: Result, variants: Mapping[str, Flow], progress: Progress | None = None) -> Extras:
    """Return the sections on choosing that a report of a flow has.

    Parameters
    ----------
    result : Result
        The analysis that is reported.
    variants : mapping of str to Flow
        The variants of its file; a report of one variant shows no others.
    progress : callable, optional
        Called with (cases done, cases in all) while remedies are sought.
    """
    own = result.flow.variant is None
    return Extras(
        comparison=_variants(result, variants) if own and variants else None,
        remedies=_remedies(result, progress) if result.worst is not None else None,
        ladder=_ladder(result) if result.worst is not None else None,
    )


def _variants(result: Result, variants: Mapping[str, Flow]) -> ComparisonText:
    notes = {variant.name: variant.note for variant in result.flow.variants}
    plans = [(OWN_PLAN, result), *((name, analyse(flow)) for name, flow in variants.items())]
    return comparison_text(compare(plans), ["", *(notes[name] for name in variants)])


def _remedies(result: Result, progress: Progress | None) -> RemediesText:
    """Return what helps the pairs with the least margin."""
    flow = result.flow
    is_large = len(flow.masks) > _MOST_MASKS or len(result.entries) > _MOST_ENTRIES
    wanting = sorted((e for e in result.entries if e.verdict in ("fail", "tight")), key=result.margin)
    named = dict.fromkeys(e.pair.name for e in wanting[:_MOST_CASES])
    found = remedies(flow, named, progress=progress) if named and not is_large else None
    cases = sorted(found.cases, key=lambda case: case.margin) if found else []
    words = [RemedyWords(found).case(case, _EACH) for case in cases[:_MOST_CASES]] if found else []
    return RemediesText(flow.unit, tuple(words), len(wanting) - len(words))


def _ladder(result: Result) -> LadderText | None:
    """Return the ladder of a flow whose masks list what else they may read."""
    if all(mask.may_align_to is None for mask in result.flow.masks):
        return None
    return ladder_text(ladder(result.flow, time_limit=LADDER_LIMIT))
