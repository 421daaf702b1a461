"""Rules for alignments from mark sites: the marks fix the model, and stand where marks can stand."""

import math
from collections.abc import Iterator

from flowplan.errors import Diagnostic, Path
from flowplan.model.flow import Flow
from flowplan.model.geometry import field_size, usable_radius
from flowplan.model.marksites import CLOSEST, FEWEST, MarkSites, Place, RingSites, mixed_up

#: A mark this far outside still counts as on the rim [mm].
_TOUCH = 1e-9
_GEOMETRY_EXAMPLE = {"field": "field: {x: 15 mm, y: 15 mm}", "wafer": "wafer: {diameter: 150 mm}"}


def marks_fix_their_model(flow: Flow) -> Iterator[Diagnostic]:
    """Yield what the marks of an alignment cannot tell."""
    for path, sites in flow.site_alignments():
        places = sites.places(flow.unit)
        apart = max(math.dist(places[0], place) for place in places)
        if sites.shapes and sites.count > 1 and 0 < apart < CLOSEST:
            message = f"all marks lie within {apart:.2g} mm of each other, closer than a mark is wide"
            hint = f"a bare length is in {flow.unit}; write for example 60 mm"
            yield Diagnostic("FP407", message, hint, (*path, "sites"))
            continue
        missing = list(mixed_up(sites.parameters, places))
        if missing:
            yield _not_fixed(sites, missing, path)


def _not_fixed(sites: MarkSites, missing: list[tuple[str, ...]], path: Path) -> Diagnostic:
    alone = [name for name, *others in missing if not others]
    told = [f"fix {_listed(alone)}"] if alone else []
    told += [f"tell {name} from {_listed(others)}" for name, *others in missing if others]
    marks = "1 mark" if sites.count == 1 else f"{sites.count} marks"
    where = "" if sites.count < FEWEST[sites.model] else " at these sites"
    needs = f"{FEWEST[sites.model]} marks" + (" that are not on one line" * (sites.model == "linear"))
    hint = f"`model: {sites.model}` needs at least {needs}; add marks or fit less"
    return Diagnostic("FP407", f"{marks}{where} cannot {', nor '.join(told)}", hint, (*path, "sites"))


def _listed(words: list[str]) -> str:
    return " and ".join(filter(None, (", ".join(words[:-1]), words[-1])))


def marks_have_room(flow: Flow) -> Iterator[Diagnostic]:
    """Yield marks off the usable wafer or field, and fits that need a geometry not given."""
    for path, sites in flow.site_alignments():
        if sites.shapes:
            for need in ("field", "wafer") if sites.over == "wafer" else ("field",):
                if getattr(flow, need) is None:
                    message = f"a {sites.model} alignment over the {sites.over} needs the {need}'s size"
                    yield Diagnostic("FP403", message, f"add `{_GEOMETRY_EXAMPLE[need]}`", (*path, "model"))
        outside = [i for i, place in enumerate(sites.places(flow.unit)) if not _inside(flow, sites, place)]
        if isinstance(sites.sites, RingSites):
            outside, step = outside[:1], ("sites", "ring", "radius")
            yield from (_off(flow, sites, (*path, *step)) for _ in outside)
        else:
            yield from (_off(flow, sites, (*path, "sites", i)) for i in outside)


def _inside(flow: Flow, sites: MarkSites, place: Place) -> bool:
    if sites.over == "wafer":
        radius = usable_radius(flow)
        return radius is None or math.hypot(*place) <= radius + _TOUCH
    width, height = field_size(flow)
    room = (width / 2 + _TOUCH, height / 2 + _TOUCH)
    return flow.field is None or all(abs(v) <= r for v, r in zip(place, room, strict=True))


def _off(flow: Flow, sites: MarkSites, path: Path) -> Diagnostic:
    if sites.over == "wafer":
        hint = f"its radius is {usable_radius(flow) or 0:.6g} mm; a bare length is in {flow.unit}"
        return Diagnostic("FP406", "a mark lies off the usable wafer", hint, path)
    width, height = field_size(flow)
    hint = f"it reaches ±{width / 2:.6g} mm in x and ±{height / 2:.6g} mm in y"
    return Diagnostic("FP406", "a mark lies off the field", hint, path)
