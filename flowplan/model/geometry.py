"""Where the exposure fields lie on the wafer."""

import math

from flowplan.model.flow import Flow
from flowplan.units import convert

#: A corner this far outside the usable radius still counts as on it [mm].
_TOUCH = 1e-9
#: More fields than this mean that a unit is wrong.
MOST_FIELDS = 40_000


def field_size(flow: Flow) -> tuple[float, float]:
    """Return the field's width and height [mm]; (0, 0) when the flow gives no field."""
    if flow.field is None:
        return 0.0, 0.0
    return (
        convert(flow.field.x.in_base(flow.unit), "nm", "mm"),
        convert(flow.field.y.in_base(flow.unit), "nm", "mm"),
    )


def usable_radius(flow: Flow) -> float | None:
    """Return the wafer's radius less the edge exclusion [mm], or None without a wafer."""
    if flow.wafer is None:
        return None
    rim = flow.wafer.edge_exclusion.in_base(flow.unit)
    return convert(flow.wafer.diameter.in_base(flow.unit) / 2 - rim, "nm", "mm")


def whole_fields(flow: Flow) -> tuple[tuple[float, float], ...]:
    """Return the centres of the fields that lie wholly inside the usable wafer.

    Parameters
    ----------
    flow : Flow
        Without a wafer there is one field, at the centre.

    Returns
    -------
    tuple of (float, float)
        Centres (X, Y) [mm], row by row from -Y to +Y; empty when no whole field fits.
    """
    radius = usable_radius(flow)
    width, height = field_size(flow)
    if radius is None:
        return ((0.0, 0.0),)
    if radius < 0:
        return ()
    return field_grid(radius, width, height)


def too_many_fields(flow: Flow) -> bool:
    """Whether the field is so small against the wafer that a unit must be wrong."""
    radius = usable_radius(flow)
    width, height = field_size(flow)
    return bool(radius and width and height) and math.pi * (radius or 0) ** 2 > MOST_FIELDS * width * height


def field_grid(radius: float, width: float, height: float) -> tuple[tuple[float, float], ...]:
    """Return the centres of whole fields in a circle, one field centred on the circle's centre.

    Parameters
    ----------
    radius, width, height : float
        Usable radius, field width and height [mm]; a point field (0, 0) stands at the centre.

    Returns
    -------
    tuple of (float, float)
        Centres (X, Y) [mm], row by row from -Y to +Y.
    """
    if width == 0 or height == 0:
        return ((0.0, 0.0),)
    limit = (radius + _TOUCH) ** 2
    centres: list[tuple[float, float]] = []
    rows = int(radius / height)
    for row in range(-rows, rows + 1):
        reach = abs(row * height) + height / 2
        room = limit - reach**2
        if room < (width / 2) ** 2:
            continue
        columns = int((math.sqrt(room) - width / 2) / width)
        centres += [(column * width, row * height) for column in range(-columns, columns + 1)]
    return tuple(centres)
