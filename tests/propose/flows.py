"""Random flows with candidates, small enough to try every plan and large enough to time."""

import random
from itertools import product

from flowplan.engine.analysis import analyse
from flowplan.model.build import build
from flowplan.model.candidates import choices_of
from flowplan.model.check import check
from flowplan.model.edits import with_references


def sound(data):
    """Build a flow from plain data and insist that it is right."""
    flow, findings = build(data)
    assert flow is not None, findings
    errors = [d for d in check(flow) if d.severity == "error"]
    assert not errors, errors
    return flow


def small_flow(seed, n_masks=None, most=4, shapes=None):
    """Return a small flow with split axes, averages, shared sources, bounds and offsets."""
    r = random.Random(seed)
    n = n_masks or r.randint(3, 7)
    with_shapes = r.random() < 0.3 if shapes is None else shapes

    def size(top, signed=False):
        value = round(r.uniform(1, top), 1)
        found = {r.choice(["random", "random", "uniform", "bound"]): value}
        if signed and r.random() < 0.4:
            found["offset"] = round(r.uniform(-top, top) / 4, 1)
        return found

    def terms(tool):
        found = {}
        for k in range(r.randint(0, 3)):
            term = size(25, signed=True) | {"enters": r.choice(["layer", "layer", "pattern", "marks"])}
            if tool and r.random() < 0.5:
                term["common"] = round(r.random(), 2)
            elif r.random() < 0.3:
                term |= {"source": f"S{r.randint(1, 2)}", "common": round(r.random(), 2)}
            found[f"t{k}"] = term
        if with_shapes and r.random() < 0.6:
            shape = r.choice(["rotation", "magnification", "scale", "skew"])
            unit = "urad" if shape in ("rotation", "skew") else "ppm"
            over = r.choice(["field", "wafer"])
            value = f"{round(r.uniform(0.05, 1.5 if over == 'field' else 0.3), 2)} {unit}"
            found["shape"] = {r.choice(["random", "bound"]): value, "shape": shape, "over": over}
            if tool:
                found["shape"]["common"] = r.choice([0, 0.5, 1])
        return found

    tools = {
        f"T{k}": {"alignment": size(20, True), "wafer_alignment": 150, "terms": terms(True)} for k in range(2)
    }
    ids = [f"M{i}" for i in range(n)]

    def single(i):
        return (
            r.choice(["wafer", *ids[:i]]) if i and r.random() < 0.1 else (r.choice(ids[:i]) if i else "wafer")
        )

    def form(i):
        kind = r.random()
        if kind < 0.5 or i < 2:
            return single(i)
        if kind < 0.7:
            return {"x": single(i), "y": single(i)}
        if kind < 0.85:
            return {"mask": single(i), "alignment": size(20)}
        a, b = r.sample(ids[:i], 2)
        w = round(r.uniform(0.2, 0.8), 2)
        return [{"mask": a, "weight": w}, {"mask": b, "weight": round(1 - w, 2)}]

    masks = []
    for i, name in enumerate(ids):
        mask = {"id": name, "tool": r.choice(["T0", "T1"]), "aligns_to": form(i), "terms": terms(False)}
        if i and r.random() < 0.85:
            mask["may_align_to"] = [form(i) for _ in range(r.randint(1, most - 1))]
        if r.random() < 0.5:
            mask["cd"] = size(20)
        if r.random() < 0.4:
            mask["mark_reading"] = size(15)
        if r.random() < 0.1:
            mask["side"] = "back"
        masks.append(mask)
    layers = list(ids)
    features = []
    if r.random() < 0.4:
        features = [{"id": "SA", "follows": {"x": r.choice(ids), "y": r.choice(ids)}, "edge": 5}]
        layers.append("SA")
    pairs = []
    for k in range(r.randint(2, 6)):
        a, b = r.sample(layers, 2)
        drawn = round(r.uniform(20, 160))
        rule = r.choice(["enclosure", "spacing", "overlap", "overlay"])
        pair = {"name": f"p{k}", "rule": rule, "axes": r.choice(["x", "y", "xy", "xy"])}
        if rule == "overlay":
            pair |= {"between": [a, b]} | ({"limit": drawn} if r.random() < 0.8 or not k else {})
        elif rule == "enclosure":
            pair |= {"outer": a, "inner": b, "drawn": drawn, "keep": r.choice([0, 10])}
        else:
            pair |= {"between": [a, b], "drawn": drawn}
        pairs.append(pair)
    data = {
        "flow": f"random {seed}",
        "basis": r.choice(["mixed", "rss", "linear"]),
        "tools": tools,
        "masks": masks,
        "self_aligned": features,
        "pairs": pairs,
    }
    if with_shapes:
        data |= {"field": {"x": "10 mm", "y": "14 mm"}, "wafer": {"diameter": "60 mm"}}
    return sound(data)


def per_axis(r, low, high):
    """Return a random length for each axis."""
    return {axis: round(r.uniform(low, high), 2) for axis in "xy"}


def large_flow(seed, n_masks=60, n_candidates=5, n_pairs=150, reach=8, tight=1.0):
    """Return a flow whose masks each have candidates among the `reach` masks before them."""
    r = random.Random(seed)
    ids = [f"M{i:02d}" for i in range(n_masks)]
    masks = []
    for i, name in enumerate(ids):
        earlier = ids[max(0, i - reach) : i]
        chosen = r.sample(earlier, min(n_candidates, len(earlier))) or ["wafer"]
        mask = {"id": name, "tool": r.choice(["T0", "T1", "T2"]), "aligns_to": chosen[0]}
        mask |= {"cd": per_axis(r, 2, 10), "mark_reading": per_axis(r, 1, 6)}
        mask["terms"] = {"writing": {"random": per_axis(r, 1, 5), "enters": "pattern"}}
        if chosen[1:]:
            mask["may_align_to"] = chosen[1:]
        masks.append(mask)
    pairs = []
    while len(pairs) < n_pairs:
        i = r.randrange(1, n_masks)
        j = r.randrange(max(0, i - reach), i)
        name = f"{ids[i]} on {ids[j]} {len(pairs)}"
        drawn = per_axis(r, 25 * tight, 70 * tight)
        pairs.append({"name": name, "rule": "enclosure", "outer": ids[j], "inner": ids[i], "drawn": drawn})
    tool = {"wafer_alignment": 500}
    tools = {
        f"T{k}": tool
        | {
            "alignment": 6 + 2 * k,
            "terms": {"stage": 4 + k, "lens": {"random": 5 + k, "enters": "pattern", "common": 0.8}},
        }
        for k in range(3)
    }
    return sound({"flow": f"large {seed}", "tools": tools, "masks": masks, "pairs": pairs})


def every_plan(flow, same_reference=False):
    """Yield each plan as (option numbers, changed masks, flow)."""
    choices = choices_of(flow, same_reference=same_reference)
    for numbers in product(*(range(len(c.options)) for c in choices)):
        taken = {
            (c.mask, axis): c.options[o][c.axes.index(axis)]
            for c, o in zip(choices, numbers, strict=True)
            for axis in c.axes
        }
        changed = {c.mask for c, o in zip(choices, numbers, strict=True) if o}
        yield numbers, changed, with_references(flow, taken)


def judged(flow):
    """Return the entries that are judged, with their margins on the flow's basis."""
    result = analyse(flow)
    return [(e, result.margin(e)) for e in result.entries if e.margin is not None]
