"""A large flow made by rule: as many masks and pairs as asked, every shape, a 300 mm wafer.

No process in particular; each mask reads one of a few before it, as in a long back end.
"""

import random
from typing import Any

from tests.support.flows import Data

RULES = ("enclosure", "extension", "spacing", "overlap", "overlay")
_KEYS = {"enclosure": ("outer", "inner"), "extension": ("of", "past")}


def generated_flow(masks: int = 200, pairs: int = 2000, seed: int = 1) -> Data:
    """Return a flow as plain data.

    Parameters
    ----------
    masks, pairs : int
        How many; every tenth mask is followed by a self-aligned feature.
    seed : int
        The same seed gives the same flow.
    """
    dice = random.Random(seed)
    tools = {f"scanner {n}": _tool(dice) for n in "ABCD"}
    layers: list[str] = []
    listed: list[Data] = []
    features: list[Data] = []
    for k in range(masks):
        listed.append(_mask(dice, f"L{k}", layers, list(tools)))
        layers.append(f"L{k}")
        if k % 10 == 9:
            features.append({"id": f"S{k}", "follows": f"L{k}", "tone": "opposite", "edge": 1.5})
            layers.append(f"S{k}")
    return {
        "flow": "Estuary, generated",
        "unit": "nm",
        "reserve": "10 %",
        "wafer": {"diameter": "300 mm", "edge_exclusion": "3 mm"},
        "field": {"x": "26 mm", "y": "33 mm"},
        "tools": tools,
        "masks": listed,
        "self_aligned": features,
        "split_layers": {"SPLIT": ["L2", "L3"]} if masks > 4 else {},
        "pairs": [_pair(dice, layers, i) for i in range(pairs)],
    }


def _tool(dice: random.Random) -> Data:
    def size(most: float) -> float:
        return round(dice.uniform(0.2, 1) * most, 3)

    return {
        "alignment": size(3),
        "wafer_alignment": "2 um",
        "terms": {
            "stage": size(2),
            "lens": {"random": size(2), "enters": "pattern", "common": 0.8},
            "field magnification": {"random": f"{size(0.08)} ppm", "shape": "magnification"},
            "field rotation": {"random": f"{size(0.08)} urad", "shape": "rotation", "common": 0.5},
            "field skew": {"uniform": f"{size(0.05)} urad", "shape": "skew"},
            "wafer scale": {"random": f"{size(0.02)} ppm", "shape": "scale", "over": "wafer"},
            "wafer rotation": {"bound": f"{size(0.01)} urad", "shape": "rotation", "over": "wafer"},
        },
    }


def _mask(dice: random.Random, name: str, earlier: list[str], tools: list[str]) -> Data:
    recent = earlier[-6:]
    aligns_to: Any = dice.choice(recent) if recent else "wafer"
    if len(recent) > 3 and dice.random() < 0.15:
        aligns_to = [{"mask": m, "weight": 0.5} for m in dice.sample(recent, 2)]
    elif len(recent) > 3 and dice.random() < 0.2:
        aligns_to = dict(zip("xy", dice.sample(recent, 2), strict=True))
    terms: Data = {
        "mask writing": {"random": round(dice.uniform(0.5, 2), 3), "enters": "pattern"},
        "mark asymmetry": {"bound": round(dice.uniform(0.1, 0.6), 3), "enters": "marks"},
    }
    if dice.random() < 0.2:
        terms["chuck heat"] = {
            "random": "0.01 ppm",
            "shape": "magnification",
            "over": "wafer",
            "source": "heat",
        }
    if dice.random() < 0.2:
        terms["film stress"] = {"offset": round(dice.uniform(-1, 1), 3)}
    return {"id": name, "tool": dice.choice(tools), "aligns_to": aligns_to, "cd": 2, "terms": terms}


def _pair(dice: random.Random, layers: list[str], number: int) -> Data:
    second = dice.randrange(1, len(layers))
    first = second - dice.randint(1, min(second, 12))
    names = layers[first], layers[second]
    rule = dice.choice(RULES)
    size = "limit" if rule == "overlay" else "drawn"
    pair: Data = {"name": f"pair {number}", "rule": rule, size: dice.randint(8, 40)}
    return pair | (dict(zip(_KEYS[rule], names, strict=True)) if rule in _KEYS else {"between": list(names)})
