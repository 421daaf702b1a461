"""A Hypothesis strategy for valid flows that use everything a flow file can say, as plain data."""

from functools import cache
from typing import Any

from hypothesis import strategies as st

from tests.support.flows import Data

#: Each shape with a unit that fits it; None for a length.
SHAPES = {"shift": None, "rotation": "urad", "magnification": "ppm", "scale": "ppb", "skew": "urad"}
RULES = ("overlay", "enclosure", "extension", "spacing", "overlap")
KINDS = ("random", "uniform", "bound", "offset")
#: A wafer of 60 mm holds seventeen fields of this size: enough for a worst point, quick to try all.
GEOMETRY = {
    "wafer": {"diameter": "60 mm", "edge_exclusion": "2 mm"},
    "field": {"x": "13 mm", "y": "11 mm"},
}
WEIGHTS = {1: (1.0,), 2: (0.25, 0.75), 3: (0.5, 0.3, 0.2)}
signed = st.integers(-400, 400).map(lambda n: n / 4)


@cache
def _below(n: int) -> st.SearchStrategy[int]:
    return st.integers(0, n - 1)


class Dice:
    """Draws by index into what is given, which is quick; the first option is the simplest."""

    def __init__(self, draw: Any) -> None:
        self._draw = draw

    def number(self, n: int) -> int:
        """Return a whole number below n."""
        return self._draw(_below(n))

    def pick(self, *options: Any) -> Any:
        """Return one of the options."""
        return options[self.number(len(options))]

    def one_in(self, n: int) -> bool:
        """Return True once in n."""
        return self.number(n) == n - 1

    def some(self, options: Any, least: int, most: int) -> list[Any]:
        """Return `least` to `most` different options in any order."""
        left = list(options)
        count = least + self.number(min(most, len(left)) - least + 1)
        return [left.pop(self.number(len(left))) for _ in range(count)]

    # -- quantities ----------------------------------------------------------------------------

    def quantity(self, unit: str | None, least: int = 0, most: int = 100) -> Any:
        """Return a number with its unit; a length bare, in nm or in um."""
        value = least + self.number(4 * (most - least) + 1) / 4
        if unit is not None:
            return f"{value!r} {unit}"
        written = self.number(4)
        return (value, value, f"{value!r} nm", f"{value / 1000!r} um")[written]

    def per_axis(self, unit: str | None, least: int = 0, most: int = 100) -> Any:
        """Return one quantity for both axes or one for each."""
        if self.one_in(3):
            return {"x": self.quantity(unit, least, most), "y": self.quantity(unit, least, most)}
        return self.quantity(unit, least, most)

    def kinds(self, unit: str | None = None, split: bool = True) -> Data:
        """Return one to three of the four kinds; `split` allows a value for each axis."""
        size = self.per_axis if split else self.quantity
        return {k: size(unit, *((-100, 100) if k == "offset" else (0, 100))) for k in self.some(KINDS, 1, 3)}

    def size(self) -> Any:
        """Return the size of an error that is a length."""
        return self.kinds() if self.one_in(2) else self.per_axis(None)

    # -- parts of a flow -----------------------------------------------------------------------

    def term(self, of_tool: bool, sources: dict[str, str]) -> Any:
        """Return one term of a tool or a mask."""
        if self.one_in(5):
            return self.per_axis(None)
        term: Data = {}
        source = self.pick(None, None, *sources)
        shape = sources[source] if source else self.pick(*SHAPES)
        if source:
            term["source"] = source
        if (source or of_tool) and self.one_in(2):
            term["common"] = self.pick(0.0, 0.25, 0.5, "80 %", 1.0)
        if shape != "shift":
            term |= {"shape": shape, "over": self.pick("field", "wafer")}
        if enters := self.pick(None, "layer", "pattern", "marks"):
            term["enters"] = enters
        return term | self.kinds(SHAPES[shape], split=shape in ("shift", "scale"))

    def terms(self, of_tool: bool, sources: dict[str, str], most: int) -> Data:
        """Return up to `most` named terms; a mask's and its tool's may bear one name."""
        names = self.some(("stage", "lens", "heat"), 0, most)
        return {name: self.term(of_tool, sources) for name in names}

    def references(self, earlier: list[str], averages: bool) -> Any:
        """Return what a mask aligns to along one axis."""
        chosen = self.some(earlier, 1, 3 if averages else 1)
        weighted = self.one_in(2)
        readings: list[Any] = []
        for name, weight in zip(chosen, WEIGHTS[len(chosen)], strict=True):
            reading: Data = {"mask": name} | ({"weight": weight} if weighted else {})
            if self.one_in(4):
                reading["alignment"] = self.size()
            readings.append(reading if len(reading) > 1 else name)
        return readings if len(readings) > 1 or self.one_in(2) else readings[0]

    def mask(self, name: str, earlier: list[str], sources: dict[str, str], averages: bool) -> Data:
        """Return one mask."""
        if self.one_in(3):
            aligns_to: Any = {axis: self.references(earlier, averages) for axis in "xy"}
        else:
            aligns_to = self.references(earlier, averages)
        mask: Data = {"id": name, "tool": self.pick("stepper", "writer"), "aligns_to": aligns_to}
        if edge := self.pick(None, "cd", "edge"):
            mask[edge] = self.size()
        if self.one_in(3):
            mask["mark_reading"] = self.size()
        if self.one_in(4):
            mask["side"] = "back"
        return mask | {"terms": self.terms(False, sources, 2)}

    def feature(self, name: str, layers: list[str]) -> Data:
        """Return one self-aligned feature."""
        feature: Data = {"id": name, "follows": self.pick(*layers)}
        if self.one_in(3):
            feature["follows"] = {axis: self.pick(*layers) for axis in "xy"}
        if tone := self.pick(
            None, "opposite", {"x": "opposite", "y": "same"}, {"x": "same", "y": "opposite"}
        ):
            feature["tone"] = tone
        if self.one_in(2):
            feature["edge"] = self.size()
        return feature

    def tool(self, sources: dict[str, str]) -> Data:
        """Return one tool."""
        known = self.some(("alignment", "wafer_alignment"), 0, 2)
        return {key: self.size() for key in known} | {"terms": self.terms(True, sources, 3)}

    def pair(self, layers: list[str], number: int) -> Data:
        """Return one pair by any of the five rules."""
        first, second = self.some(layers, 2, 2)
        rule = self.pick(*RULES)
        pair: Data = {"name": f"p{number}", "rule": rule}
        if rule != "overlay":
            pair |= {"drawn": self.per_axis(None, 0, 1200), "keep": self.per_axis(None, -100, 100)}
        elif self.one_in(2):
            pair["limit"] = self.per_axis(None, 0, 1200)
        if self.one_in(4):
            pair["axes"] = self.pick("x", "y")
        keys = {"enclosure": ("outer", "inner"), "extension": ("of", "past")}.get(rule)
        return pair | ({keys[0]: first, keys[1]: second} if keys else {"between": [first, second]})


@st.composite
def flows(draw: Any, averages: bool = True, most_masks: int = 5) -> Data:
    """A valid flow of two to `most_masks` masks, some self-aligned features, and one to four pairs.

    Parameters
    ----------
    averages : bool
        Whether masks may read more than one reference on an axis.
    most_masks : int
        Largest number of masks.
    """
    dice = Dice(draw)
    sources = {name: dice.pick(*SHAPES) for name in ("reticle writer", "chuck")}
    layers: list[str] = []
    masks: list[Data] = []
    features: list[Data] = []
    for k in range(2 + dice.number(most_masks - 1)):
        earlier = ["wafer", *layers] if dice.one_in(4) else [*layers, "wafer"]
        masks.append(dice.mask(f"M{k}", earlier, sources, averages))
        layers.append(f"M{k}")
        if dice.one_in(3):
            features.append(dice.feature(f"S{k}", layers))
            layers.append(f"S{k}")
    data: Data = {
        "flow": "random",
        "unit": dice.pick("nm", "um"),
        "sigma": dice.pick(3, 1, 2),
        "confidence": dice.pick(3, 1, 4.5),
        "basis": dice.pick("mixed", "rss", "linear"),
        "reserve": dice.pick(0, "10 %", 0.5),
        **GEOMETRY,
        "tools": {name: dice.tool(sources) for name in ("stepper", "writer")},
        "masks": masks,
        "self_aligned": features[::-1],
    }
    named = list(layers)
    if len(masks) > 2 and dice.one_in(2):
        data["split_layers"] = {"SPLIT": ["M0", "M1"]}
        named = [*(name for name in layers if name not in ("M0", "M1")), "SPLIT"]
    return data | {"pairs": [dice.pair(named, i) for i in range(1 + dice.number(4))]}
