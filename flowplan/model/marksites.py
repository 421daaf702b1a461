"""Alignment as an exposure tool does it: marks at sites are read and a model is fitted to them.

Every mark is read along x and along y. The tool fits the parameters of a model to these readings by
least squares, each mark counting alike, and places its exposure by them. What each reading is off by
turns into errors of the parameters: a shift, and with the larger models a rotation, scales and a skew
that move the exposure more the farther it lies from the marks.
"""

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Annotated, Literal

from pydantic import AfterValidator, BeforeValidator, Discriminator, Field, Tag

from flowplan.model.base import AXES, Axis, Length, Model, PositiveLength, refuse
from flowplan.model.terms import SHAPE_ACTION, Shape, Size
from flowplan.units import Quantity, convert

FitModel = Literal["shift", "rigid", "rigid+scale", "linear"]
Over = Literal["field", "wafer"]
#: A place [mm].
Place = tuple[float, float]
#: More marks than anybody reads; a larger count is a slip of the pen.
MOST_MARKS = 1000
#: Marks that lie within this of each other overlap: a mark is tens of micrometres wide [mm].
CLOSEST = 0.01
#: Columns of a design that differ by less than this, at a spread of 1, are the same.
_SAME = 1e-9


@dataclass(frozen=True, slots=True)
class Parameter:
    """One number that the model fits.

    Attributes
    ----------
    name : str
        As people say it.
    shape : str
        What it does.
    axes : tuple of {'x', 'y'}
        The axes along which it acts.
    """

    name: str
    shape: Shape
    axes: tuple[Axis, ...] = AXES

    def effect(self, axis: Axis, place: Place) -> float:
        """Return the displacement along an axis at a place when the parameter is 1 [1 or mm]."""
        found = SHAPE_ACTION[self.shape][axis] if axis in self.axes else None
        return 0.0 if found is None else found[1] * (1.0, *place)[found[0]]


_SHIFTS = (Parameter("shift x", "shift", ("x",)), Parameter("shift y", "shift", ("y",)))
_ROTATION = Parameter("rotation", "rotation")
#: What each model fits, in the order in which its errors are told apart.
PARAMETERS: dict[FitModel, tuple[Parameter, ...]] = {
    "shift": _SHIFTS,
    "rigid": (*_SHIFTS, _ROTATION),
    "rigid+scale": (*_SHIFTS, Parameter("magnification", "magnification"), _ROTATION),
    "linear": (
        *_SHIFTS,
        Parameter("scale x", "scale", ("x",)),
        Parameter("scale y", "scale", ("y",)),
        _ROTATION,
        Parameter("skew", "skew"),
    ),
}
#: The fewest marks that can fix each model.
FEWEST: dict[FitModel, int] = {"shift": 1, "rigid": 2, "rigid+scale": 2, "linear": 3}


class Site(Model):
    """Where a mark stands, from the centre of the wafer or field."""

    x: Length = Field(description="From the centre along x; a bare number is in the file's unit.")
    y: Length = Field(description="From the centre along y; a bare number is in the file's unit.")

    def __str__(self) -> str:
        return f"({self.x}, {self.y})"


def _count(value: object) -> object:
    if isinstance(value, bool) or not isinstance(value, int):
        raise refuse("FP203", "a whole number of marks belongs here", "for example 8")
    if not 1 <= value <= MOST_MARKS:
        raise refuse("FP206", f"{value} is no usual number of marks", f"from 1 to {MOST_MARKS}")
    return value


class Ring(Model):
    """Marks evenly spread on a circle about the centre, the first one on the x axis."""

    count: Annotated[
        int, BeforeValidator(_count, json_schema_input_type=Annotated[int, Field(ge=1, le=MOST_MARKS)])
    ] = Field(description="How many marks.")
    radius: PositiveLength = Field(description="Radius of the circle; a bare number is in the file's unit.")


class RingSites(Model):
    """Sites given by a pattern instead of one by one."""

    ring: Ring = Field(description="Marks evenly spread on a circle about the centre.")

    def __str__(self) -> str:
        return f"ring of {self.ring.count} at {self.ring.radius}"


def _some(sites: object) -> object:
    if not sites:
        raise refuse("FP205", "no mark is named", "list where the marks stand, or give a ring")
    return sites


def _form_of_sites(value: object) -> str:
    return "one by one" if isinstance(value, list | tuple) else "by pattern"


def _varying(size: Size) -> Size:
    for kind, article in (("bound", "a"), ("offset", "an")):
        if getattr(size, kind) is not None:
            raise refuse(
                "FP408",
                f"{article} {kind} of each mark says nothing about how the marks differ",
                "quote random or uniform here; what all marks share is a term that enters `marks`",
                key=kind,
            )
    return size


class MarkSites(Model):
    """An alignment by marks at sites, to which a model is fitted by least squares."""

    per_mark: Annotated[Size, AfterValidator(_varying)] = Field(
        description="Reading one mark along one axis, fresh for each mark: random or uniform."
    )
    sites: Annotated[
        Annotated[tuple[Site, ...], Field(min_length=1), BeforeValidator(_some), Tag("one by one")]
        | Annotated[RingSites, Tag("by pattern")],
        Discriminator(_form_of_sites),
    ] = Field(description="Where the marks stand, from the centre of the wafer or field.")
    model: FitModel = Field(
        description="What is fitted: `shift`; `rigid` adds the rotation; `rigid+scale` one magnification "
        "more; `linear` shift, a scale for each axis, rotation and skew."
    )
    over: Over = Field("wafer", description="Whether the sites lie on the wafer or in each field.")

    @property
    def parameters(self) -> tuple[Parameter, ...]:
        """What is fitted."""
        return PARAMETERS[self.model]

    @property
    def shapes(self) -> frozenset[Shape]:
        """Shapes other than `shift` that the fit brings in."""
        return frozenset(p.shape for p in self.parameters if p.shape != "shift")

    @property
    def count(self) -> int:
        """Number of marks."""
        return self.sites.ring.count if isinstance(self.sites, RingSites) else len(self.sites)

    def places(self, file_unit: str) -> tuple[Place, ...]:
        """Return where the marks stand [mm]; `file_unit` is the unit of bare lengths."""
        if not isinstance(self.sites, RingSites):
            return tuple((_mm(site.x, file_unit), _mm(site.y, file_unit)) for site in self.sites)
        count, radius = self.sites.ring.count, _mm(self.sites.ring.radius, file_unit)
        turns = (2 * math.pi * k / count for k in range(count))
        return tuple((radius * math.cos(a), radius * math.sin(a)) for a in turns)

    def on_ring(self, count: int, radius: float) -> "MarkSites":
        """Return the same alignment with its marks on a ring of this radius [mm]."""
        ring = Ring(count=count, radius=Quantity(radius, "mm"))
        return self.model_copy(update={"sites": RingSites(ring=ring)})

    def __str__(self) -> str:
        marks = f"{self.count} mark" + "s" * (self.count != 1)
        return f"{self.model} from {marks} over the {self.over}"


def _mm(length: Quantity, file_unit: str) -> float:
    return convert(length.in_base(file_unit), "nm", "mm")


def _form_of_alignment(value: object) -> str:
    is_sites = isinstance(value, dict) and set(value) & {"per_mark", "sites", "model", "over"}
    return "from marks" if is_sites or isinstance(value, MarkSites) else "as a size"


#: How well marks are read: one size, or what reading each mark and a least-squares fit give.
Alignment = Annotated[
    Annotated[Size, Tag("as a size")] | Annotated[MarkSites, Tag("from marks")],
    Discriminator(_form_of_alignment),
]


def centred(places: Sequence[Place]) -> tuple[Place, float, tuple[Place, ...]]:
    """Return the marks' centroid, their rms distance from it, and their places from there over it.

    Parameters
    ----------
    places : sequence of (float, float)
        Where the marks stand [mm].

    Returns
    -------
    centroid : (float, float)
        [mm]; exactly 0 where it is nothing but rounding.
    spread : float
        Root-mean-square distance from the centroid [mm]; 1 when all marks stand at one point.
    scaled : tuple of (float, float)
        Places from the centroid, in units of the spread.
    """
    n = len(places)
    middle = [math.fsum(p[i] for p in places) / n for i in (0, 1)]
    spread = math.sqrt(math.fsum((p[0] - middle[0]) ** 2 + (p[1] - middle[1]) ** 2 for p in places) / n)
    centroid = tuple(m if abs(m) > 1e-12 * spread else 0.0 for m in middle)
    if spread <= 1e-12 * max(map(abs, middle)):
        return (middle[0], middle[1]), 1.0, ((0.0, 0.0),) * n
    scaled = tuple(((x - centroid[0]) / spread, (y - centroid[1]) / spread) for x, y in places)
    return (centroid[0], centroid[1]), spread, scaled


def design(parameters: Sequence[Parameter], places: Sequence[Place]) -> list[list[float]]:
    """Return the design of the fit: a row a reading, all along x and then all along y."""
    return [[p.effect(axis, place) for p in parameters] for axis in AXES for place in places]


def mixed_up(parameters: Sequence[Parameter], places: Sequence[Place]) -> Iterator[tuple[str, ...]]:
    """Yield what marks leave open: a parameter, then those that could stand for it; maybe none.

    Parameters
    ----------
    parameters : sequence of Parameter
        What is fitted.
    places : sequence of (float, float)
        Where the marks stand [mm].

    Notes
    -----
    The design is brought to its reduced echelon form. A column without a pivot is a sum of earlier
    ones, which are read off from the form.
    """
    _, _, scaled = centred(places)
    rows = design(parameters, scaled)
    pivots: list[int] = []
    for column, parameter in enumerate(parameters):
        top = len(pivots)
        best = max(range(top, len(rows)), key=lambda r: abs(rows[r][column]), default=top)
        if best == len(rows) or abs(rows[best][column]) < _SAME:
            yield (
                parameter.name,
                *(parameters[p].name for r, p in enumerate(pivots) if abs(rows[r][column]) > _SAME),
            )
            continue
        rows[top], rows[best] = rows[best], rows[top]
        lead = rows[top][column]
        rows[top] = [v / lead for v in rows[top]]
        for r, row in enumerate(rows):
            if r != top and row[column]:
                rows[r] = [v - row[column] * w for v, w in zip(row, rows[top], strict=True)]
        pivots.append(column)
