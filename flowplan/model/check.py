"""Rules that span several parts of a flow: ids, order, sources, geometry.

Each rule is a function from a flow to diagnostics; `check` runs them all, so that every problem of
a file is reported at once.
"""

from collections import Counter
from collections.abc import Callable, Iterator
from itertools import islice

from flowplan.errors import Diagnostic, Path, nearest
from flowplan.model.base import AXES, WAFER
from flowplan.model.build import MOST_DIAGNOSTICS
from flowplan.model.checklanding import resistance_limits_leave_room
from flowplan.model.checkmarks import marks_fix_their_model, marks_have_room
from flowplan.model.flow import Flow
from flowplan.model.geometry import MOST_FIELDS, too_many_fields, whole_fields
from flowplan.model.masks import Mask
from flowplan.model.terms import KINDS, Term

Rule = Callable[[Flow], Iterator[Diagnostic]]


def check(flow: Flow) -> tuple[Diagnostic, ...]:
    """Return every problem that spans several parts of a flow.

    Parameters
    ----------
    flow : Flow
        A flow whose form is right.

    Returns
    -------
    tuple of Diagnostic
        Errors and warnings in the order of the rules, at most `MOST_DIAGNOSTICS` of each; paths lead
        into the file's data.
    """
    return tuple(d for rule in RULES for d in islice(rule(flow), MOST_DIAGNOSTICS))


def _every_id(flow: Flow) -> Iterator[tuple[str, Path]]:
    for i, mask in enumerate(flow.masks):
        yield mask.id, ("masks", i, "id")
    for i, feature in enumerate(flow.self_aligned):
        yield feature.id, ("self_aligned", i, "id")
    for name in flow.split_layers:
        yield name, ("split_layers", name)


def _ids_are_unique(flow: Flow) -> Iterator[Diagnostic]:
    seen: set[str] = set()
    for name, path in _every_id(flow):
        if name == WAFER:
            yield Diagnostic("FP306", "the id 'wafer' means the wafer itself", "choose another", path)
        elif name in seen:
            hint = "each mask, feature and split layer has an id of its own"
            yield Diagnostic("FP302", f"the id {name!r} is used twice", hint, path)
        seen.add(name)


def _variants_have_names_of_their_own(flow: Flow) -> Iterator[Diagnostic]:
    seen: set[str] = set()
    for i, variant in enumerate(flow.variants):
        if variant.name in seen:
            message = f"two variants are called {variant.name!r}"
            yield Diagnostic("FP302", message, "give each a name of its own", ("variants", i, "name"))
        seen.add(variant.name)


def _there_are_masks(flow: Flow) -> Iterator[Diagnostic]:
    if not flow.masks:
        yield Diagnostic("FP205", "the flow has no mask", "list the masks in process order", ("masks",))
    if not flow.pairs:
        hint = "add `pairs:` with the layers that must fit each other"
        yield Diagnostic("FP309", "no pair is judged", hint, ("pairs",), severity="warning")


def _tools_exist(flow: Flow) -> Iterator[Diagnostic]:
    if not flow.tools and flow.masks:
        hint = "add `tools: {stepper: {alignment: 30}}`, with your own names and figures"
        yield Diagnostic("FP205", "the flow has no tool", hint, ("tools",))
        return
    for i, mask in enumerate(flow.masks):
        if mask.tool not in flow.tools:
            hint = nearest(mask.tool, list(flow.tools))
            yield Diagnostic("FP301", f"unknown tool {mask.tool!r}", hint, ("masks", i, "tool"))
    used = {mask.tool for mask in flow.masks}
    for name in flow.tools:
        if name not in used:
            message = f"no mask is printed on the tool {name!r}"
            yield Diagnostic("FP309", message, "", ("tools", name), severity="warning")


def _every_reading(mask: Mask) -> Iterator[tuple[Path, str]]:
    """Yield every single reading, each with its place in the mask."""
    for where, references in mask.every_reference():
        for axis in AXES:
            for k, reading in enumerate(references.on(axis)):
                yield (*where, axis, k, "mask"), reading.mask


def _references_are_earlier(flow: Flow) -> Iterator[Diagnostic]:
    everything = [name for name, _ in _every_id(flow)]
    twice = {name for name, count in Counter(everything).items() if count > 1}
    order = {name: i for i, name in enumerate(flow.layers)}
    for i, mask in enumerate(flow.masks):
        for where, reads in _every_reading(mask):
            known = order.get(reads)
            if {mask.id, reads} & twice and reads in everything:
                continue  # which of the two is meant cannot be told
            if reads == WAFER or (known is not None and known < order.get(mask.id, 0)):
                continue
            earlier = [WAFER, *list(flow.layers)[: order.get(mask.id, 0)]]
            yield _bad_reference(mask.id, reads, everything, earlier, flow, ("masks", i, *where))


def _bad_reference(
    mask: str, reads: str, everything: list[str], earlier: list[str], flow: Flow, path: Path
) -> Diagnostic:
    aligns = "may align" if path[2] == "may_align_to" else "aligns"
    if reads == mask:
        return Diagnostic("FP303", f"{mask!r} {aligns} to itself", nearest(reads, earlier), path)
    if reads in flow.split_layers:
        hint = "name one of " + ", ".join(flow.split_layers[reads])
        return Diagnostic("FP301", f"{reads!r} is a split layer and has no mark of its own", hint, path)
    if reads in everything:
        message = f"{mask!r} {aligns} to {reads!r}, which does not exist yet at that point"
        return Diagnostic("FP303", message, "only earlier layers can be read: " + ", ".join(earlier), path)
    return Diagnostic("FP301", f"unknown mask {reads!r}", nearest(reads, earlier), path)


def _features_follow_layers(flow: Flow) -> Iterator[Diagnostic]:
    everything = [name for name, _ in _every_id(flow) if name not in flow.split_layers]
    for i, feature in enumerate(flow.self_aligned):
        for axis in AXES:
            parent = feature.follows.on(axis)
            path: Path = ("self_aligned", i, "follows", axis)
            if parent not in everything:
                yield Diagnostic("FP301", f"unknown layer {parent!r}", nearest(parent, everything), path)
            elif feature.id not in flow.layers and parent not in flow.layers:
                message = f"{feature.id!r} follows {parent!r} in a circle"
                yield Diagnostic("FP303", message, "let one of them follow a mask", path)


def _split_layers_exist(flow: Flow) -> Iterator[Diagnostic]:
    known = [mask.id for mask in flow.masks] + [feature.id for feature in flow.self_aligned]
    for name, members in flow.split_layers.items():
        if not members:
            message = f"the split layer {name!r} has no mask"
            yield Diagnostic("FP205", message, "list the masks that print it", ("split_layers", name))
        for k, member in enumerate(members):
            path: Path = ("split_layers", name, k)
            if member not in known:
                yield Diagnostic("FP301", f"unknown mask {member!r}", nearest(member, known), path)
            elif member in members[:k]:
                hint = "name each mask once"
                yield Diagnostic("FP302", f"{member!r} stands twice in {name!r}", hint, path)


_LAYER_KEYS = {"enclosure": ("outer", "inner"), "extension": ("of", "past")}


def pair_layer_paths(flow: Flow, index: int) -> tuple[Path, Path]:
    """Return the paths of the two layers of a pair."""
    pair = flow.pairs[index]
    if pair.rule == "landing":
        return ("pairs", index, "pad", "layer"), ("pairs", index, "contact", "layer")
    if pair.rule in _LAYER_KEYS:
        first, second = _LAYER_KEYS[pair.rule]
        return ("pairs", index, first), ("pairs", index, second)
    return ("pairs", index, "between", 0), ("pairs", index, "between", 1)


def _pairs_name_layers(flow: Flow) -> Iterator[Diagnostic]:
    known = [name for name, _ in _every_id(flow)]
    twice = {name for name, count in Counter(known).items() if count > 1}
    names = Counter[str]()
    for i, pair in enumerate(flow.pairs):
        names[pair.name] += 1
        if names[pair.name] > 1:
            hint = "give each pair a `name:` of its own"
            message = f"the pair name {pair.name!r} is used twice"
            yield Diagnostic("FP302", message, hint, ("pairs", i, "name"))
        for layer, path in zip(pair.layers, pair_layer_paths(flow, i), strict=True):
            if flow.masks and layer not in known:
                yield Diagnostic("FP301", f"unknown layer {layer!r}", nearest(layer, known), path)
        first, second = (flow.expand(layer) for layer in pair.layers)
        if set(first) & set(second) and not twice & set(pair.layers):
            both = pair_layer_paths(flow, i)[1]
            message = f"{pair.name!r} pairs {pair.layers[1]!r} with itself"
            yield Diagnostic("FP305", message, "name two different layers", both)


def _terms_with_paths(flow: Flow) -> Iterator[tuple[Path, Term]]:
    for tool_id, tool in flow.tools.items():
        for name, term in tool.terms.items():
            yield ("tools", tool_id, "terms", name), term
    for i, mask in enumerate(flow.masks):
        for name, term in mask.terms.items():
            yield ("masks", i, "terms", name), term


def _sources_are_one_thing(flow: Flow) -> Iterator[Diagnostic]:
    first: dict[str, Term] = {}
    for path, term in _terms_with_paths(flow):
        if term.source is None:
            if term.common is not None and path[0] == "masks":
                message = "in a mask's terms `common` needs a `source`"
                hint = "add `source: NAME`, the same name where the error is shared"
                yield Diagnostic("FP307", message, hint, (*path, "common"))
            continue
        other = first.setdefault(term.source, term)
        if other.shape != term.shape:
            message = f"source {term.source!r} is a {other.shape} elsewhere, a {term.shape} here"
            yield Diagnostic("FP307", message, "give it one shape, or another name", (*path, "source"))
        if other.varies != term.varies:
            said, here = (t.varies or "left open" for t in (other, term))
            message = f"source {term.source!r} varies: {said} elsewhere, {here} here"
            hint = "one error is redrawn equally often wherever it stands: say the same everywhere"
            yield Diagnostic("FP307", message, hint, (*path, "source"))
        if _random_kinds(other) != _random_kinds(term):
            message = f"source {term.source!r} is quoted in other kinds elsewhere; they do not cancel"
            hint = "quote it with the same of " + ", ".join(KINDS[:3]) + " everywhere"
            yield Diagnostic("FP307", message, hint, (*path, "source"), severity="warning")


def _random_kinds(term: Term) -> frozenset[str]:
    return frozenset(kind for kind, _ in term.parts() if kind != "offset")


def _sizes_are_given(flow: Flow) -> Iterator[Diagnostic]:
    to_wafer = 0
    for i, mask in enumerate(flow.masks):
        tool = flow.tools.get(mask.tool)
        if tool is None:
            continue
        readings = [r for axis in AXES for r in mask.aligns_to.on(axis)]
        bare = [r for r in readings if r.alignment is None]
        to_wafer += any(r.mask == WAFER for r in readings)
        path: Path = ("masks", i, "aligns_to")
        if tool.alignment is None:
            for where, references in mask.every_reference():
                if any(r.alignment is None and r.mask != WAFER for a in AXES for r in references.on(a)):
                    what = f"{mask.id!r} {'reads' if where == ('aligns_to',) else 'may read'} marks"
                    yield _no_size(f"tools.{mask.tool}.alignment", what, ("masks", i, *where))
        if tool.wafer_alignment is None and to_wafer > 1 and any(r.mask == WAFER for r in bare):
            yield _no_size(f"tools.{mask.tool}.wafer_alignment", f"{mask.id!r} aligns to the wafer", path)


def _no_size(missing: str, what: str, path: Path) -> Diagnostic:
    message = f"{what}, but `{missing}` is not given and counts as 0"
    return Diagnostic("FP308", message, f"add `{missing}`", path, severity="warning")


_GEOMETRY_EXAMPLE = {"field": "field: {x: 15 mm, y: 15 mm}", "wafer": "wafer: {diameter: 150 mm}"}


def _geometry_is_there(flow: Flow) -> Iterator[Diagnostic]:
    for path, term in _terms_with_paths(flow):
        if term.shape == "shift":
            continue
        needs = ["field"] + (["wafer"] if term.over == "wafer" else [])
        for need in needs:
            if getattr(flow, need) is None:
                message = f"a {term.shape} over the {term.over} needs the {need}'s size"
                yield Diagnostic("FP403", message, f"add `{_GEOMETRY_EXAMPLE[need]}`", (*path, "shape"))
    if flow.wafer is None or flow.field is None:
        return
    hint = "check the units of `wafer` and `field`"
    if too_many_fields(flow):
        message = f"the wafer would hold more than {MOST_FIELDS} fields"
        yield Diagnostic("FP206", message, hint, ("field",))
    elif not whole_fields(flow):
        yield Diagnostic("FP404", "no whole field fits on the usable wafer", hint, ("field",))


RULES: tuple[Rule, ...] = (
    _there_are_masks,
    _ids_are_unique,
    _tools_exist,
    _references_are_earlier,
    _features_follow_layers,
    _split_layers_exist,
    _pairs_name_layers,
    resistance_limits_leave_room,
    _sources_are_one_thing,
    _sizes_are_given,
    _geometry_is_there,
    marks_fix_their_model,
    marks_have_room,
    _variants_have_names_of_their_own,
)
