"""JCGM 101:2008, clause 9.2: additive models by simulation, as the clause's own method has them.

Clause read; figures of its tables from memory: standard uncertainties 2.0, 2.0 and 10.1, and shortest
95 % intervals of ±3.92, ±3.88 and ±17.0 by Monte Carlo.
"""

import math

import pytest
from scipy import integrate, stats

from tests.simulate.flows import Z_SURE, one_pair, simulated

ROOT3 = math.sqrt(3)
SAMPLES = 200_000
LIMIT = 100.0


def irwin_hall(x: float, n: int) -> float:
    """Density of the sum of n rectangles of half-width sqrt(3), by the textbook formula."""
    t = x / (2 * ROOT3) + n / 2
    terms = ((-1) ** k * math.comb(n, k) * max(0.0, t - k) ** (n - 1) for k in range(n + 1))
    return sum(terms) / math.factorial(n - 1) / (2 * ROOT3)


def density_with_wide(x: float) -> float:
    """Density of three rectangles and one of ten times their width."""
    wide, reach = 10 * ROOT3, 3 * ROOT3
    area, _ = integrate.quad(irwin_hall, max(-reach, x - wide), min(reach, x + wide), args=(3,))
    return area / (2 * wide)


CASES = {
    # terms, printed u, printed half-width, exact half-width, density of e there
    "9.2.2 four normal": ([{"random": 1.0}] * 4, 2.0, 3.92, 3.919928, stats.norm.pdf(1.959964) / 2),
    "9.2.3 four rectangular": ([{"uniform": ROOT3}] * 4, 2.0, 3.88, 3.879407, irwin_hall(3.879407, 4)),
    "9.2.4 one ten times as large": (
        [{"uniform": ROOT3}] * 3 + [{"uniform": 10 * ROOT3}],
        10.1,
        17.0,
        17.02,
        density_with_wide(17.02),
    ),
}


@pytest.fixture(scope="module", params=CASES)
def case(request):
    terms, *figures = CASES[request.param]
    found = simulated(one_pair({f"X{i}": t for i, t in enumerate(terms)}, LIMIT), SAMPLES)
    return found.pairs[0].histogram, figures


def test_standard_uncertainty(case):
    """From mean and spread of the residual, limit - |e|: u^2 = spread^2 + (limit - mean)^2."""
    histogram, (printed, *_) = case
    standard = math.hypot(histogram.deviation, LIMIT - histogram.mean)
    sampling = printed / math.sqrt(2 * SAMPLES)  # no case here has heavier tails than a normal one
    assert standard == pytest.approx(printed if printed == 2.0 else math.sqrt(103), abs=Z_SURE * sampling)
    assert abs(standard - printed) <= 0.05


def test_interval(case):
    """Half-width of the 95 % interval: the residual that 5 % of the samples stay below."""
    histogram, (_, printed, exact, density) = case
    sampling = math.sqrt(0.05 * 0.95 / SAMPLES) / (2 * density)
    half_width = LIMIT - histogram.quantile(0.05)
    assert half_width == pytest.approx(exact, abs=Z_SURE * sampling + histogram.width)
    assert abs(half_width - printed) <= 0.05
