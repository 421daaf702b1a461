"""Words that options choose from."""

from enum import StrEnum


class TextOrJson(StrEnum):
    """Text for people or JSON for programs."""

    TEXT = "text"
    JSON = "json"


class Form(StrEnum):
    """How margins are printed."""

    TABLE = "table"
    JSON = "json"
    CSV = "csv"
    MARKDOWN = "markdown"


class GoalName(StrEnum):
    """What the best plan is best at."""

    WORST = "worst"
    FAILS = "fails"
    YIELD = "yield"


class CompareForm(StrEnum):
    """How a comparison or a proposal is printed."""

    TABLE = "table"
    JSON = "json"
    MARKDOWN = "markdown"


class BoundsName(StrEnum):
    """How a bound counts in a simulation."""

    WORST = "worst"
    UNIFORM = "uniform"


class Order(StrEnum):
    """Order of the margins."""

    FILE = "file"
    MARGIN = "margin"


class BasisName(StrEnum):
    """How bounds and random parts add up."""

    MIXED = "mixed"
    RSS = "rss"
    LINEAR = "linear"


class VerdictName(StrEnum):
    """The four verdicts."""

    PASS = "pass"  # noqa: S105 - a verdict
    TIGHT = "tight"
    FAIL = "fail"
    UNJUDGED = "unjudged"


class AxisName(StrEnum):
    """One axis."""

    X = "x"
    Y = "y"


class SignName(StrEnum):
    """Which way measured overlay is counted."""

    MASK = "mask-minus-reference"
    REFERENCE = "reference-minus-mask"
