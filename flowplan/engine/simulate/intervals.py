"""Confidence intervals of simulated shares."""

import math
from statistics import NormalDist

#: Confidence of every interval that is reported.
CONFIDENCE = 0.95


def wilson(count: float, n: float, confidence: float = CONFIDENCE) -> tuple[float, float]:
    """Return Wilson's score interval of a share.

    Parameters
    ----------
    count, n : float
        How many of how many independent trials; an effective number may be broken.
    confidence : float
        Confidence of the interval.

    Returns
    -------
    tuple of float
        Both ends, within 0 to 1; never of width 0, even where nothing or everything was counted.

    Notes
    -----
    The shares p with ``|count/n - p| <= z sqrt(p (1 - p) / n)`` (Wilson 1927).
    """
    z = NormalDist().inv_cdf((1 + confidence) / 2)
    share = count / n
    middle = (share + z * z / (2 * n)) / (1 + z * z / n)
    half = z / (1 + z * z / n) * math.sqrt(share * (1 - share) / n + z * z / (4 * n * n))
    return (0.0 if count <= 0 else middle - half, 1.0 if count >= n else middle + half)


def clustered(share: float, error: float, clusters: int) -> tuple[float, float]:
    """Return Wilson's interval of a share whose trials come in clusters that are alike.

    Parameters
    ----------
    share : float
        The mean share.
    error : float
        Its standard error, from the spread between clusters.
    clusters : int
        Number of independent clusters: what the trials count for where nothing spreads.
    """
    spread = share * (1 - share)
    n = spread / error**2 if error > 0 and spread > 0 else clusters
    return wilson(share * n, n)
