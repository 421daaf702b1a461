"""Small flows to simulate, and how a share is held against an exact one."""

from typing import Any

from flowplan.engine.simulate import Options, Simulation, simulate
from flowplan.engine.simulate.intervals import wilson
from tests.support.flows import Data, bare_flow, margins_of, mask, overlay_pair

#: Confidence of a test's interval: wrong once in 30 000 such tests, and the seed is fixed.
SURE = 1 - 3e-5
Z_SURE = 4.2


def simulated(data: Data, samples: int = 20_000, **options: Any) -> Simulation:
    """Simulate plain data on one thread."""
    return simulate(margins_of(data), Options(samples=samples, **({"threads": 1} | options)))


def one_pair(terms: dict[str, Any], limit: float, **more: Any) -> Data:
    """Return a flow with one overlay pair along x, whose second mask has these terms."""
    masks = [mask("A"), mask("B", "A", terms=terms)]
    return bare_flow(masks, [overlay_pair("A", "B", limit=limit, axes="x")], **more)


def holds(exact: float, share: float, samples: float) -> bool:
    """Whether an exact share lies in the interval of a counted one."""
    low, high = wilson(share * samples, samples, SURE)
    return low <= exact <= high
