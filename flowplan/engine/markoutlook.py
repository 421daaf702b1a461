"""How an alignment from mark sites grows from the centre to the edge, and what more marks would do."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from flowplan.engine.marksites import covariance, deviations, read_variance
from flowplan.engine.sources import FloatArray
from flowplan.model.base import WAFER, Axis
from flowplan.model.flow import Flow
from flowplan.model.geometry import field_size, usable_radius
from flowplan.model.marksites import MarkSites, Parameter, centred, mixed_up
from flowplan.model.masks import Mask

#: Centre, half way, edge: where the error is told.
STOPS = (0.0, 0.5, 1.0)
#: How many marks are tried.
TRIED = (2, 3, 4, 6, 8, 12, 16, 24, 32)
#: Directions in which the worst error at a distance is looked for on a wafer.
_DIRECTIONS = 360


@dataclass(frozen=True, slots=True)
class Growth:
    """How an alignment's error grows away from the centre.

    Attributes
    ----------
    distances : ndarray, shape (n,)
        From the centre of the wafer, or of the field towards its corners [mm].
    sigma : dict of axis to ndarray, shape (n,)
        One standard deviation in the worst direction at each distance [nm].
    """

    distances: FloatArray
    sigma: dict[Axis, FloatArray]


@dataclass(frozen=True, slots=True)
class Outlook:
    """An alignment from mark sites as planned, and with other numbers of marks.

    Attributes
    ----------
    sites : MarkSites
        As planned.
    fitted : tuple of (Parameter, float)
        What is fitted, with one standard deviation of it about the centre [nm, urad or ppm].
    planned : Growth
        The exposure's error at the centre, half way and at the edge.
    radius : float
        Of the ring on which other numbers of marks are tried [mm].
    tried : tuple of (int, Growth)
        Number of marks on the ring, and the error at the same distances.
    """

    sites: MarkSites
    fitted: tuple[tuple[Parameter, float], ...]
    planned: Growth
    radius: float
    tried: tuple[tuple[int, Growth], ...]


def sites_read(flow: Flow, reader: str, reference: str, axis: Axis) -> MarkSites | None:
    """Return the mark sites by which a layer reads a reference along an axis; None where it is a size.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    reader, reference : str
        A layer, and what it takes its place from.
    axis : {'x', 'y'}
        The axis.
    """
    mask = flow.layers.get(reader)
    if not isinstance(mask, Mask):
        return None
    for reading in mask.aligns_to.on(axis):
        if reading.mask == reference:
            of_tool = None if reference == WAFER else flow.tools[mask.tool].alignment
            size = of_tool if reading.alignment is None else reading.alignment
            return size if isinstance(size, MarkSites) else None
    return None


def growth(flow: Flow, sites: MarkSites, fractions: Sequence[float] = STOPS) -> Growth:
    """Return how an alignment's error grows from the centre to the edge.

    Parameters
    ----------
    flow : Flow
        Gives the usable wafer, the field and how sizes are quoted.
    sites : MarkSites
        The alignment.
    fractions : sequence of float
        Of the way to the edge of the usable wafer, or to the corners of the field. Without a wafer or
        field the marks' own distance from their centroid stands for it.

    Returns
    -------
    Growth
        On a wafer the worst of all directions, in a field the worst of the four corners' directions.
    """
    ways = _ways(flow, sites)
    share = np.asarray(fractions, dtype=np.float64)
    places = (share[:, None, None] * ways).reshape(-1, 2)
    found = deviations(sites, flow.unit, flow.sigma, places)
    worst = {axis: value.reshape(len(share), -1).max(axis=1) for axis, value in found.items()}
    return Growth(share * float(np.hypot(*ways[0])), worst)


def _ways(flow: Flow, sites: MarkSites) -> FloatArray:
    """Return the farthest places in every direction that counts [mm], shape (n, 2)."""
    if sites.over == "field" and flow.field is not None:
        x, y = (side / 2 for side in field_size(flow))
        return np.array([(u * x, v * y) for u in (-1, 1) for v in (-1, 1)])
    radius = usable_radius(flow) if sites.over == "wafer" else None
    turns = 2 * np.pi * np.arange(_DIRECTIONS) / _DIRECTIONS
    reach = _spread(flow, sites) if radius is None else radius
    return np.asarray(np.stack([np.cos(turns), np.sin(turns)], axis=1) * reach)


def _spread(flow: Flow, sites: MarkSites) -> float:
    return centred(sites.places(flow.unit))[1]


def outlook(flow: Flow, sites: MarkSites, counts: Iterable[int] = TRIED) -> Outlook:
    """Return what an alignment does as planned, and with other numbers of marks on a ring.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    sites : MarkSites
        The alignment.
    counts : iterable of int
        Numbers of marks; those too few for the model are left out.

    Returns
    -------
    Outlook
        The ring has the root-mean-square distance of the planned marks from their centroid, as far as
        that fits the field.
    """
    radius = _spread(flow, sites)
    if sites.over == "field" and flow.field is not None:
        radius = min(radius, *(side / 2 for side in field_size(flow)))
    rings = [sites.on_ring(count, radius) for count in counts]
    fit = [ring for ring in rings if not any(mixed_up(ring.parameters, ring.places(flow.unit)))]
    tried = tuple((ring.count, growth(flow, ring)) for ring in fit)
    variance = read_variance(sites, flow.unit, flow.sigma)
    spread = np.sqrt(np.diag(covariance(sites, flow.unit, (variance["x"], variance["y"])))).tolist()
    fitted = tuple(zip(sites.parameters, spread, strict=True))
    return Outlook(sites, fitted, growth(flow, sites), radius, tried)
