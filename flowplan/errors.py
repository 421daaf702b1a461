"""Diagnostics: what is wrong, where, and what to do about it.

``FlowplanError``
    ``FlowError``     the flow file is at fault; holds every diagnostic found in it
    ``UsageError``    what was asked of a sound flow cannot be answered
    ``OutputError``   a result cannot be written
"""

import heapq
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from difflib import get_close_matches
from itertools import takewhile
from typing import Literal

Path = tuple[str | int, ...]
Severity = Literal["error", "warning"]

#: Every code with a one-line description. 1xx text, 2xx form, 3xx references, 4xx units and geometry,
#: 5xx output, 6xx what was asked on the command line, 7xx measured data.
CODES: dict[str, str] = {
    "FP101": "the file cannot be read",
    "FP102": "the file is not UTF-8 text",
    "FP103": "the file is larger than a flow file can be",
    "FP104": "the text is not valid YAML",
    "FP105": "a key stands twice in one mapping",
    "FP106": "the text is nested too deeply",
    "FP107": "aliases refer to themselves or unfold to too much",
    "FP108": "the file is empty or is not a mapping",
    "FP109": "a YAML feature that a flow file does not use",
    "FP201": "unknown key",
    "FP202": "a needed key is missing",
    "FP203": "a value of the wrong type",
    "FP204": "a word that is not among the choices",
    "FP205": "an empty part that needs an entry",
    "FP206": "a number out of its range",
    "FP207": "a number that is not finite",
    "FP208": "keys that exclude each other",
    "FP301": "unknown id",
    "FP302": "an id or name is used twice",
    "FP303": "a reference to something that does not exist yet",
    "FP304": "weights that do not add up to 1",
    "FP305": "a pair of a layer with itself",
    "FP306": "a reserved id",
    "FP307": "one source described in two ways",
    "FP308": "a size that the flow relies on is not given",
    "FP309": "something that has no effect",
    "FP401": "unknown unit",
    "FP402": "a unit that does not fit",
    "FP403": "a shape without the geometry that it needs",
    "FP404": "no whole field fits on the usable wafer",
    "FP405": "per-axis values where one number serves both axes",
    "FP406": "an alignment mark off the usable wafer or field",
    "FP407": "marks that cannot fix what the model fits",
    "FP408": "a kind of size that a single mark cannot have",
    "FP501": "the output cannot be written",
    "FP601": "unknown layer on the command line",
    "FP602": "the question does not fit the flow",
    "FP603": "a mask both freed and pinned",
    "FP604": "no mask has a choice of references",
    "FP605": "unknown variant on the command line",
    "FP701": "the measured data cannot be read",
    "FP702": "the measured data lack a column",
    "FP703": "a row of the measured data cannot be read",
}


@dataclass(frozen=True, slots=True)
class Span:
    """A place in a text file.

    Attributes
    ----------
    file : str
        The file's name as the user gave it.
    line, column : int
        Counted from 1.
    """

    file: str
    line: int
    column: int

    def __str__(self) -> str:
        return f"{self.file}:{self.line}:{self.column}"


@dataclass(frozen=True, slots=True)
class Diagnostic:
    """One finding about a flow.

    Attributes
    ----------
    code : str
        A key of `CODES`.
    message : str
        What is wrong, in one sentence.
    hint : str
        What to do about it; may be empty.
    path : tuple of str or int
        The keys and indices that lead to the place in the data.
    span : Span or None
        The place in the file, once the reader has looked it up.
    severity : {'error', 'warning'}
        A warning does not stop the work.
    """

    code: str
    message: str
    hint: str = ""
    path: Path = ()
    span: Span | None = None
    severity: Severity = "error"

    def at(self, span: Span | None) -> "Diagnostic":
        """Return the same finding, placed at `span`."""
        return replace(self, span=span)

    def __str__(self) -> str:
        place = f"{self.span}: " if self.span else ""
        word = "warning: " if self.severity == "warning" else ""
        return f"{place}{word}{self.message} [{self.code}]"


class FlowplanError(Exception):
    """Base of every error that flowplan raises on purpose."""

    def __init__(self, diagnostics: Iterable[Diagnostic]) -> None:
        self.diagnostics = tuple(diagnostics)
        super().__init__("\n".join(str(d) for d in self.diagnostics))


class FlowError(FlowplanError):
    """The flow file is at fault."""


class UsageError(FlowplanError):
    """A question that does not fit the flow, such as an unknown layer."""


class OutputError(FlowplanError):
    """A file cannot be written."""


#: Longer than any key or id that somebody mistypes.
_LONGEST_WORD = 100
#: Comparing is slow; of more words than this the ones with like beginnings and ends are compared.
_MOST_COMPARED = 60
_LONGEST_QUOTE = 60
_LONGEST_MESSAGE = 300
_QUOTED = re.compile(r"'[^']{61,}'|\"[^\"]{61,}\"")


def in_brief(finding: Diagnostic) -> Diagnostic:
    """Return the finding with what it quotes from the file cut short.

    Parameters
    ----------
    finding : Diagnostic
        May quote a text of any length.

    Returns
    -------
    Diagnostic
        Quotes of at most 60 characters, message and hint of at most 300.
    """
    return replace(finding, message=_brief(finding.message), hint=_brief(finding.hint))


def _brief(text: str) -> str:
    if len(text) > _LONGEST_QUOTE:
        text = _QUOTED.sub(lambda found: _cut(found.group(), _LONGEST_QUOTE), text)
    return _cut(text, _LONGEST_MESSAGE)


def _cut(text: str, length: int) -> str:
    """Cut out the middle of a text that is too long."""
    if len(text) <= length:
        return text
    tail = length // 4
    return f"{text[: length - tail - 1]}…{text[-tail:]}"


def nearest(word: str, known: Sequence[str]) -> str:
    """Return a hint that names the nearest known word, or lists the known ones.

    Parameters
    ----------
    word : str
        What was written.
    known : sequence of str
        What could have been meant.

    Returns
    -------
    str
        A sentence for `Diagnostic.hint`; empty when nothing is known.
    """
    everything = known
    if len(word) > _LONGEST_WORD:
        return ""
    if len(known) > _MOST_COMPARED:
        known = heapq.nlargest(_MOST_COMPARED, known, key=lambda name: _alike_at_ends(word, name))
    folded = {k.casefold(): k for k in reversed(known)}
    close = get_close_matches(word.casefold(), list(folded), n=1, cutoff=0.6)
    if close:
        return f"did you mean {folded[close[0]]!r}?"
    if not everything:
        return ""
    shown = ", ".join(everything[:12]) + (", …" if len(everything) > 12 else "")
    return f"known here: {shown}"


def _alike_at_ends(one: str, other: str) -> int:
    """Count the characters that two words share at their beginning and at their end."""
    one, other = one.casefold(), other.casefold()
    return _alike(one, other) + _alike(one[::-1], other[::-1])


def _alike(one: str, other: str) -> int:
    return sum(1 for _ in takewhile(lambda pair: pair[0] == pair[1], zip(one, other, strict=False)))
