"""Placement, overlay and residual by plain recursion over a flow's data, one layer at a time.

Written from the definition of the arithmetic alone: it reads the plain data itself and shares no
code with the engine. What a scalar is stays open, so the same recursion runs in the uncertain
numbers of `uncertainties` and of GTC, in plain numbers (offsets), and in `Form`.
"""

import math
from collections.abc import Callable, Iterable
from typing import Any

import numpy as np

from flowplan.engine.results import Entry
from tests.support.flows import Data

#: nm, urad or ppm in one of each unit.
FACTORS = {
    "nm": 1,
    "um": 1e3,
    "mm": 1e6,
    "cm": 1e7,
    "in": 2.54e7,
    "urad": 1,
    "mrad": 1e3,
    "ppm": 1,
    "ppb": 1e-3,
}
KINDS = ("random", "uniform", "bound", "offset")
#: Signs of (first, second) layer's edge in what is left of the drawn dimension.
EDGE_SIGNS = {
    "enclosure": (1, -1),
    "extension": (1, -1),
    "spacing": (-1, -1),
    "overlap": (1, 1),
    "overlay": (0, 0),
}
LAYER_KEYS = {"enclosure": ("outer", "inner"), "extension": ("of", "past")}


class Form:
    """A sum of coefficients times named scalars; coefficients may be arrays over points."""

    __array_ufunc__ = None  # an array times a Form is the Form's business

    def __init__(self, coefficients: dict[Any, Any] | None = None) -> None:
        self.of = coefficients or {}

    def __add__(self, other: "Form") -> "Form":
        if not isinstance(other, Form):
            assert not other, "only 0 may stand for an empty sum"
            return self
        return Form({k: self.of.get(k, 0.0) + other.of.get(k, 0.0) for k in {**self.of, **other.of}})

    __radd__ = __add__

    def __mul__(self, factor: Any) -> "Form":
        return Form({k: v * factor for k, v in self.of.items()})

    __rmul__ = __mul__

    def absolute(self, size: Callable[[Any], float] = lambda key: 1.0) -> Any:
        """Sum of |coefficient| times the size of each scalar."""
        return sum((np.abs(v) * size(k) for k, v in self.of.items()), 0.0)

    def square(self, size: Callable[[Any], float]) -> Any:
        """Sum of (coefficient times the size of each scalar) squared."""
        return sum((np.square(v * size(k)) for k, v in self.of.items()), 0.0)


class ByHand:
    """A flow's layers in numbers of the caller's choice.

    Parameters
    ----------
    data : dict
        The flow as a YAML reader returns it.
    kinds : iterable of str
        The kinds of errors that count, the others are left out.
    scalar : callable
        Returns the number for one independent error of size 1, given its key, whose last entry is
        the kind. Called once a key.
    point : tuple
        (X, Y, x, y) in mm; numbers, or arrays for `Form`.
    """

    def __init__(
        self,
        data: Data,
        kinds: Iterable[str],
        scalar: Callable[[Any], Any],
        point: tuple[Any, Any, Any, Any] = (0.0, 0.0, 0.0, 0.0),
    ) -> None:
        self.data, self.kinds, self.point = data, tuple(kinds), point
        self._scalar = scalar
        self._scalars: dict[Any, Any] = {}
        self._masks = {m["id"]: m for m in data["masks"]}
        self._features = {f["id"]: f for f in data.get("self_aligned", ())}
        self._known: dict[Any, Any] = {}

    # -- what the file says ------------------------------------------------------------------

    def length(self, quantity: Any) -> float:
        """Return a quantity in nm, urad or ppm."""
        if isinstance(quantity, str):
            number, unit = quantity.split()
            return float(number) * FACTORS[unit]
        return quantity * FACTORS[self.data.get("unit", "nm")]

    def parts(self, size: Any, axis: str) -> list[tuple[str, float]]:
        """Return (kind, size) of a term or size along one axis."""
        if not isinstance(size, dict) or set(size) <= {"x", "y"}:
            size = {"random": size}
        found = []
        for kind in self.kinds:
            value = size.get(kind)
            if value is not None:
                found.append((kind, self.length(value[axis] if isinstance(value, dict) else value)))
        return found

    def readings(self, mask: str, axis: str) -> list[tuple[str, float, Any]]:
        """Return (reference, weight, alignment of its own or None)."""
        listed = self._masks[mask]["aligns_to"]
        if isinstance(listed, dict) and "mask" not in listed:
            listed = listed[axis]
        if not isinstance(listed, list):
            listed = [listed]
        entries = [{"mask": r} if isinstance(r, str) else r for r in listed]
        return [(r["mask"], r.get("weight", 1 / len(entries)), r.get("alignment")) for r in entries]

    def share(self, value: Any) -> float:
        """Return a share from 0.8 or "80 %"."""
        return float(value.removesuffix("%")) / 100 if isinstance(value, str) else value

    # -- errors of one layer -----------------------------------------------------------------

    def scalar(self, *key: Any) -> Any:
        if key not in self._scalars:
            self._scalars[key] = self._scalar(key)
        return self._scalars[key]

    def fresh(self, size: Any, axis: str, *key: Any) -> Any:
        """An error along one axis that nothing else shares."""
        return sum((value * self.scalar(*key, axis, kind) for kind, value in self.parts(size, axis)), 0.0)

    def moved(self, shape: str, over: str, axis: str) -> Any:
        """What a scalar of size 1 does along an axis at the point."""
        wafer_x, wafer_y, x, y = self.point
        if over == "wafer":
            x, y = wafer_x + x, wafer_y + y
        if shape == "shift":
            return 1.0
        if shape in ("magnification", "scale"):
            return x if axis == "x" else y
        if axis == "x":
            return -1.0 * y
        return x if shape == "rotation" else 0.0

    def entering(self, mask: str, where: str, axis: str) -> Any:
        """The mask's own and its tool's terms that enter at one place."""
        tool = self._masks[mask]["tool"]
        total = 0.0
        for origin, terms in (
            ("tool", self.data["tools"][tool].get("terms", {})),
            ("mask", self._masks[mask].get("terms", {})),
        ):
            for name, term in terms.items():
                spec = term if isinstance(term, dict) and not set(term) <= {"x", "y"} else {"random": term}
                if spec.get("enters", "layer") == where:
                    total = total + self.term(mask, tool, origin, name, spec, axis)
        return total

    def term(self, mask: str, tool: str, origin: str, name: str, term: Data, axis: str) -> Any:
        shape = term.get("shape", "shift")
        act = self.moved(shape, term.get("over", "field"), axis)
        turned_over = self._masks[mask].get("side", "front") == "back"
        if turned_over and (shape in ("rotation", "skew") or (shape == "shift" and axis == "x")):
            act = -1.0 * act
        source = term.get("source")
        common = self.share(term.get("common", 1.0 if source else 0.0))
        everyone = ("source", source) if source else ("tool", tool, name)
        scalar_axis = axis if shape in ("shift", "scale") else "both"
        total = 0.0
        for kind, value in self.parts(term, axis):
            if kind == "offset":
                total = total + value * act * self.scalar("offset")
                continue
            shared, own = (
                (common, 1 - common) if kind == "bound" else (math.sqrt(common), math.sqrt(1 - common))
            )
            total = total + value * shared * act * self.scalar(*everyone, scalar_axis, kind)
            total = total + value * own * act * self.scalar("own", mask, origin, name, scalar_axis, kind)
        return total

    # -- placement ---------------------------------------------------------------------------

    def printed(self, layer: str, axis: str) -> Any:
        """F: the printed frame."""
        if layer == "wafer":
            return 0.0
        if layer in self._features:
            return self.printed(self.parent(layer, axis), axis)
        if ("F", layer, axis) not in self._known:
            self._known["F", layer, axis] = self._print(layer, axis)
        return self._known["F", layer, axis]

    def _print(self, mask: str, axis: str) -> Any:
        tool = self.data["tools"][self._masks[mask]["tool"]]
        mirrored = -1.0 if self._masks[mask].get("side") == "back" and axis == "x" else 1.0
        total = self.entering(mask, "layer", axis)
        for reference, weight, own in self.readings(mask, axis):
            size = (
                own
                if own is not None
                else tool.get("wafer_alignment" if reference == "wafer" else "alignment")
            )
            extra = self._masks.get(reference, {}).get("mark_reading")
            read = self.fresh(0 if size is None else size, axis, "alignment", mask, reference)
            read = read + self.fresh(0 if extra is None else extra, axis, "mark reading", mask, reference)
            total = total + weight * (
                self.printed(reference, axis) + self.marks(reference, axis) + mirrored * read
            )
        return total

    def parent(self, feature: str, axis: str) -> str:
        follows = self._features[feature]["follows"]
        return follows if isinstance(follows, str) else follows[axis]

    def marks(self, layer: str, axis: str) -> Any:
        """M: what moves the marks but not the pattern."""
        if layer == "wafer":
            return 0.0
        if layer in self._features:
            return self.marks(self.parent(layer, axis), axis)
        return self.entering(layer, "marks", axis)

    def device(self, layer: str, axis: str) -> Any:
        """D: the device pattern."""
        if layer in self._features:
            return self.device(self.parent(layer, axis), axis)
        if ("D", layer, axis) not in self._known:
            pattern = self.printed(layer, axis) + self.entering(layer, "pattern", axis)
            self._known["D", layer, axis] = pattern
        return self._known["D", layer, axis]

    def edge(self, layer: str, axis: str) -> Any:
        """E: one edge, outward positive."""
        if layer in self._features:
            feature = self._features[layer]
            tone = feature.get("tone", "same")
            sign = 1.0 if (tone if isinstance(tone, str) else tone.get(axis, "same")) == "same" else -1.0
            inherited = sign * self.edge(self.parent(layer, axis), axis)
            return inherited + self.fresh(feature.get("edge", 0), axis, "edge", layer)
        spec = self._masks[layer]
        half = 0.5 * self.fresh(spec.get("cd", 0), axis, "edge", layer)
        return half + self.fresh(spec.get("edge", 0), axis, "edge", layer)

    def overlay(self, first: str, second: str, axis: str) -> Any:
        """e = D_second - D_first."""
        return self.device(second, axis) + (-1.0) * self.device(first, axis)

    def edges(self, rule: str, first: str, second: str, axis: str) -> Any:
        """What both edges add to a drawn dimension."""
        a, b = EDGE_SIGNS[rule]
        return float(a) * self.edge(first, axis) + float(b) * self.edge(second, axis)


def rows(data: Data) -> list[tuple[Data, str, str, str]]:
    """Return (pair, first, second, axis) as the answer lists them: file order, layers, x before y."""
    split = data.get("split_layers", {})
    found = []
    for pair in data["pairs"]:
        keys = LAYER_KEYS.get(pair["rule"])
        named = [pair[k] for k in keys] if keys else pair["between"]
        for first in split.get(named[0], [named[0]]):
            for second in split.get(named[1], [named[1]]):
                found += [(pair, first, second, axis) for axis in "xy" if axis in pair.get("axes", "xy")]
    return found


def deviation(data: Data, key: Any) -> float:
    """Standard deviation of one scalar of size 1 that is quoted as its key says."""
    return {"random": 1 / data.get("sigma", 3), "uniform": 1 / math.sqrt(3)}[key[-1]]


def place_of(entry: Entry) -> tuple[float, float, float, float]:
    """Return the entry's point; where it reports none, one place is as good as another."""
    p = entry.point
    return (p.X, p.Y, p.x, p.y) if p else (0.0, 0.0, 0.0, 0.0)


def scale_of(data: Data, entry: Entry) -> float:
    """Return the sum of everything that enters the two layers at confidence, before it cancels [nm]."""
    hand = ByHand(data, KINDS, lambda key: Form({key: 1.0}), place_of(entry))
    parts = [part(layer, entry.axis) for part in (hand.device, hand.edge) for layer in entry.layers]
    return 1 + data["confidence"] * sum(part.absolute() for part in parts if isinstance(part, Form))


def sites(data: Data) -> np.ndarray:
    """Return every (X, Y, x, y) [mm] at which a margin may be worst, by trying all grid places."""
    if "field" not in data:
        return np.zeros((1, 4))
    width, height = (_mm(data, data["field"][axis]) for axis in "xy")
    centres = [(0.0, 0.0)]
    if "wafer" in data:
        radius = _mm(data, data["wafer"]["diameter"]) / 2 - _mm(data, data["wafer"].get("edge_exclusion", 0))
        most = range(-int(2 * radius / min(width, height)), int(2 * radius / min(width, height)) + 1)
        half = (-0.5, 0.5)
        centres = [
            (i * width, j * height)
            for j in most
            for i in most
            if all(math.hypot((i + u) * width, (j + v) * height) <= radius + 1e-9 for u in half for v in half)
        ]
    thirds = (-0.5, 0.0, 0.5)
    return np.array([(X, Y, u * width, v * height) for X, Y in centres for v in thirds for u in thirds])


def _mm(data: Data, quantity: Any) -> float:
    return ByHand({**data, "masks": []}, (), lambda key: 0.0).length(quantity) / 1e6
