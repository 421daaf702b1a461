"""What a landing pair is found to be: a frozen record beside the entries of the axes."""

from dataclasses import dataclass
from typing import Literal

from flowplan.engine.graph import Chain
from flowplan.engine.points import Point
from flowplan.engine.results import Verdict
from flowplan.model.base import Axis
from flowplan.model.landing import Landing

#: Lower-tail probabilities at which area quantiles are given: 3 standard deviations, a hundredth, the middle.
QUANTILES = ("0.00135", "0.01", "0.5")


@dataclass(frozen=True, slots=True)
class Resistances:
    """The resistance of a contact [ohm]; infinite where it is an open.

    Attributes
    ----------
    nominal : float
        Of the drawn contact, wholly landed.
    median, q99 : float
        What half and 99 % of the contacts do not exceed.
    above_limit : float or None
        Probability of more than the limit; None without one.
    """

    nominal: float
    median: float
    q99: float
    above_limit: float | None


@dataclass(frozen=True, slots=True)
class LandingEntry:
    """One landing pair at its worst site, both axes together.

    Attributes
    ----------
    pair : Landing
        The pair in the flow.
    layers : tuple of str
        Pad and contact, split layers expanded.
    chains : dict of axis to Chain
        How the two layers are connected along each axis.
    nominal_area : float
        Landed share of the drawn contact's area with offsets alone.
    mean_area : float
        Its mean; like all that follows with bounds at their worst.
    area_quantiles : tuple of float
        At the probabilities of `QUANTILES`.
    below_least : float or None
        Probability of less than the least area; None without one.
    open : float
        Probability that nothing lands.
    resistance : Resistances or None
        Where the pair says what the resistance is.
    fail_probability : float or None
        Probability of less area than asked or more resistance than allowed; None where nothing is judged.
    verdict : {'pass', 'tight', 'fail', 'unjudged'}
        Against the allowed share.
    point : Point or None
        The worst site; None where all are alike.
    """

    pair: Landing
    layers: tuple[str, str]
    chains: dict[Axis, Chain]
    nominal_area: float
    mean_area: float
    area_quantiles: tuple[float, ...]
    below_least: float | None
    open: float
    resistance: Resistances | None
    fail_probability: float | None
    verdict: Verdict
    point: Point | None

    @property
    def axis(self) -> Literal["xy"]:
        """Both axes at once."""
        return "xy"

    @property
    def chain(self) -> Chain | None:
        """The chain, where it is the same along both axes."""
        return self.chains["x"] if self.chains["x"].layers == self.chains["y"].layers else None
