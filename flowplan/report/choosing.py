"""What a report shows for choosing among plans: variants side by side."""

from collections.abc import Mapping

from flowplan.engine.analysis import Result, analyse
from flowplan.engine.compare import compare
from flowplan.model.flow import Flow
from flowplan.report.comparison import ComparisonText, comparison_text
from flowplan.report.view import Extras

OWN_PLAN = "the file's own plan"


def report_extras(result: Result, variants: Mapping[str, Flow]) -> Extras:
    """Return the sections on choosing that a report of a flow has.

    Parameters
    ----------
    result : Result
        The analysis that is reported.
    variants : mapping of str to Flow
        The variants of its file; a report of one variant shows no others.
    """
    own = result.flow.variant is None
    return Extras(comparison=_variants(result, variants) if own and variants else None)


def _variants(result: Result, variants: Mapping[str, Flow]) -> ComparisonText:
    notes = {variant.name: variant.note for variant in result.flow.variants}
    plans = [(OWN_PLAN, result), *((name, analyse(flow)) for name, flow in variants.items())]
    return comparison_text(compare(plans), ["", *(notes[name] for name in variants)])
