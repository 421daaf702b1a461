"""All example flows: simulated fail fractions against the closed form's parts, put together exactly.

The closed form adds the two sides and takes uniform parts as normal. Here each side's tail is worked
out with its uniform parts as they are, on a grid, and the two sides are joined by a bivariate normal
where all is normal; where uniforms take part the union lies between the larger side and the sum.
"""

import math

import numpy as np
import pytest
from scipy import stats

import flowplan
from flowplan.engine.analysis import analyse
from flowplan.engine.simulate import Options, simulate
from flowplan.files.resources import resource_folder
from tests.simulate.flows import Z_SURE, holds

FLOWS = sorted(path.name for path in resource_folder("flows").glob("*.yaml"))
SAMPLES = 30_000
EDGES = ("CD", "edge")
#: A fraction this small is below what a cdf by quadrature can tell.
_SMALLEST = 1e-12


@pytest.fixture(scope="module", params=FLOWS)
def found(request):
    result = analyse(flowplan.load(str(resource_folder("flows") / request.param)))
    return result, simulate(result, Options(SAMPLES, threads=2))


class Sides:
    """Both sides of an entry from its sources: room, and what varies."""

    def __init__(self, entry, sigma):
        worse = entry.nominal - entry.keep - entry.residual.bound
        self.rooms = worse, worse + 2 * abs(entry.overlay.offset)
        rows = entry.sources
        self.flat = [abs(r.contribution) for r in rows if r.source.kind == "uniform"]
        edge, rest = (
            sum(
                (r.contribution / sigma) ** 2
                for r in rows
                if r.source.kind == "random" and (r.source.name in EDGES) == e
            )
            for e in (True, False)
        )
        self.variance, self.common = edge + rest, edge - rest

    def tail(self, room):
        """P(normal + uniforms > room), one uniform after the other averaged over its width."""
        sigma = math.sqrt(self.variance)
        if not sigma and not self.flat:
            return float(room < 0)
        if not self.flat:
            return float(stats.norm.sf(room / sigma))
        reach = sum(self.flat)
        grid = np.linspace(room - 1.2 * reach, room + 1.2 * reach, 40_001)
        values = stats.norm.sf(grid / sigma)
        for width in self.flat:
            area = np.concatenate([[0], np.cumsum((values[1:] + values[:-1]) / 2 * np.diff(grid))])
            values = (np.interp(grid + width, grid, area) - np.interp(grid - width, grid, area)) / (2 * width)
        return float(np.interp(room, grid, values))

    def union(self):
        """Return the range in which the chance of either side lies."""
        first, second = (self.tail(room) for room in self.rooms)
        if not self.variance:
            return max(first, second), max(first, second)
        if self.flat:
            return max(first, second), first + second
        cov = [[self.variance, self.common], [self.common, self.variance]]
        both = stats.multivariate_normal(cov=cov, allow_singular=True).cdf([-r for r in self.rooms])
        both = min(float(both), first, second) if first + second > _SMALLEST else 0.0
        return first + second - both, first + second - both


def test_every_judged_pair_is_there_in_file_order(found):
    result, simulation = found
    assert [p.entry for p in simulation.pairs] == [e for e in result.entries if e.margin is not None]


def test_counted_fractions(found):
    result, simulation = found
    for outcome in simulation.pairs:
        low, high = Sides(outcome.entry, result.flow.sigma).union()
        assert low == high or outcome.fail <= high or holds(high, outcome.fail, SAMPLES), (
            outcome.entry.pair.name
        )
        assert outcome.fail >= low or holds(low, outcome.fail, SAMPLES), outcome.entry.pair.name
        if low == high:
            assert holds(low, outcome.fail, SAMPLES), (outcome.entry.pair.name, low, outcome.fail)


def test_rare_fractions(found):
    result, simulation = found
    seen = 0
    for outcome in simulation.pairs:
        low, high = Sides(outcome.entry, result.flow.sigma).union()
        if high < 1e-9:  # asked for down to here; both sides together can no longer be told by quadrature
            continue
        seen += 1
        assert outcome.rare.relative_error <= 0.10
        error = Z_SURE * outcome.rare.relative_error
        slack = 1e-3 if low != high else 1e-6  # the grid's own error
        assert low * (1 - error - slack) <= outcome.rare.fail <= high * (1 + error + slack), (
            outcome.entry.pair.name
        )
    assert seen


def test_quantiles_bracket_the_closed_form_where_all_is_normal_and_one_sided(found):
    """Where one side counts alone, the median and the 0.135 % residual are the normal ones."""
    result, simulation = found
    for outcome in simulation.pairs:
        entry = outcome.entry
        sides = Sides(entry, result.flow.sigma)
        sigma = math.sqrt(sides.variance)
        if sides.flat or not sigma or sides.rooms[1] - sides.rooms[0] < 12 * sigma:
            continue
        for share in (0.01, 0.5):
            exact = entry.keep + sides.rooms[0] + sigma * stats.norm.ppf(share)
            sampling = (
                math.sqrt(share * (1 - share) / SAMPLES) / stats.norm.pdf(stats.norm.ppf(share)) * sigma
            )
            assert outcome.histogram.quantile(share) == pytest.approx(
                exact, abs=Z_SURE * sampling + outcome.histogram.width
            )


def test_joint_yield_and_the_union_agree(found):
    _, simulation = found
    error = Z_SURE * math.hypot(
        simulation.rare.fail * simulation.rare.relative_error,
        math.sqrt(simulation.joint_yield * (1 - simulation.joint_yield) / SAMPLES),
    )
    assert 1 - simulation.joint_yield == pytest.approx(simulation.rare.fail, abs=error)
