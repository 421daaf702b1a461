"""The rules by which two layers must fit each other; five along an axis, and one of areas."""

from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BeforeValidator, Field

from flowplan.errors import nearest
from flowplan.model.base import (
    AXES,
    Axis,
    Described,
    Id,
    Lengths,
    NonNegativeLengths,
    PerAxis,
    refuse,
)
from flowplan.model.landing import Landing
from flowplan.units import Quantity

ZERO = PerAxis(x=Quantity(0.0), y=Quantity(0.0))


class _Pair(Described):
    """What every rule shares."""

    name: str = Field("", description="Name of the pair; made from its layers when left out.")
    axes: Literal["x", "y", "xy"] = Field("xy", description="Axes on which the pair is judged.")

    @property
    def judged_axes(self) -> tuple[Axis, ...]:
        """The axes on which the pair is judged."""
        return tuple(axis for axis in AXES if axis in self.axes)


class _DrawnPair(_Pair):
    drawn: NonNegativeLengths = Field(description="The drawn dimension.")
    keep: Lengths = Field(
        default=ZERO, description="What must remain of it after all errors; below 0 allows a loss."
    )


class Enclosure(_DrawnPair):
    """One layer lies inside another with a drawn border on every side."""

    rule: Literal["enclosure"] = Field(description="How the two layers must fit.")
    inner: Id = Field(description="The layer that lies inside.")
    outer: Id = Field(description="The layer around it.")

    @property
    def layers(self) -> tuple[str, str]:
        """Outer, inner."""
        return self.outer, self.inner

    @property
    def edge_signs(self) -> tuple[int, int]:
        """A grown outer layer adds room, a grown inner one takes it."""
        return 1, -1


class Extension(_DrawnPair):
    """One layer reaches past the edge of another."""

    rule: Literal["extension"] = Field(description="How the two layers must fit.")
    of: Id = Field(description="The layer that reaches out.")
    past: Id = Field(description="The layer that it must reach past.")

    @property
    def layers(self) -> tuple[str, str]:
        """Of, past."""
        return self.of, self.past

    @property
    def edge_signs(self) -> tuple[int, int]:
        """A grown layer reaches further, a grown other one is harder to pass."""
        return 1, -1


Between = Annotated[tuple[Id, Id], Field(description="The two layers.")]


class _Between(_Pair):
    between: Between

    @property
    def layers(self) -> tuple[str, str]:
        """As written in `between`."""
        return self.between


class Spacing(_DrawnPair, _Between):
    """Two layers keep apart."""

    rule: Literal["spacing"] = Field(description="How the two layers must fit.")

    @property
    def edge_signs(self) -> tuple[int, int]:
        """Both layers grow into the gap."""
        return -1, -1


class Overlap(_DrawnPair, _Between):
    """Two layers overlap."""

    rule: Literal["overlap"] = Field(description="How the two layers must fit.")

    @property
    def edge_signs(self) -> tuple[int, int]:
        """Both layers grow into the overlap."""
        return 1, 1


class Overlay(_Between):
    """The overlay of two layers against a limit, without edges; no limit, no verdict."""

    rule: Literal["overlay"] = Field(description="How the two layers must fit.")
    limit: NonNegativeLengths | None = Field(None, description="Largest allowed overlay error.")

    @property
    def edge_signs(self) -> tuple[int, int]:
        """Edges do not take part."""
        return 0, 0


#: The rules that are judged along each axis on its own.
AxisPair = Enclosure | Extension | Spacing | Overlap | Overlay
AnyPair = AxisPair | Landing
RULES = ("enclosure", "extension", "spacing", "overlap", "overlay", "landing")

_WORDS = {
    "enclosure": "{1} inside {0}",
    "extension": "{0} past {1}",
    "spacing": "{0} clear of {1}",
    "overlap": "{0} over {1}",
    "overlay": "{1} on {0}",
    "landing": "{1} landing on {0}",
}


def _named(pair: AnyPair) -> AnyPair:
    """Fill in a name made from the layers."""
    if pair.name:
        return pair
    return pair.model_copy(update={"name": _WORDS[pair.rule].format(*pair.layers)})


def _known_rule(value: object) -> Any:
    if isinstance(value, dict) and value.get("rule") not in RULES:
        if "rule" not in value:
            raise refuse("FP202", "the pair has no rule", "give one of " + ", ".join(RULES))
        rule = value["rule"]
        raise refuse("FP204", f"unknown rule {rule!r}", nearest(str(rule), RULES), key="rule")
    return value


Pair = Annotated[
    Annotated[AnyPair, Field(discriminator="rule")],
    BeforeValidator(_known_rule, json_schema_input_type=AnyPair),
    AfterValidator(_named),
]
