"""Rules on landing pairs that need the file's unit."""

from collections.abc import Iterator

from flowplan.errors import Diagnostic
from flowplan.model.flow import Flow
from flowplan.model.landing import Landing


def resistance_limits_leave_room(flow: Flow) -> Iterator[Diagnostic]:
    """Find limits below what a wholly landed contact has already."""
    for i, pair in enumerate(flow.pairs):
        if not isinstance(pair, Landing) or pair.resistance is None or pair.resistance.limit is None:
            continue
        nominal, limit = pair.nominal_resistance(flow.unit), pair.resistance.limit
        if nominal is not None and limit < nominal:
            message = f"the limit of {limit:g} ohm is below the wholly landed {nominal:.6g} ohm"
            hint = "give a limit above it, or a lower resistance"
            yield Diagnostic("FP206", message, hint, ("pairs", i, "resistance", "limit"))
