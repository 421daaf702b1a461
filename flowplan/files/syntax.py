"""What a YAML parser complains about, in words that say what to mend."""

import re
from typing import Any, NamedTuple

from flowplan.errors import Diagnostic, Span


class _Advice(NamedTuple):
    """How a parser's complaint is told."""

    message: str
    hint: str
    #: Whether the place where the broken part began helps more than the place where it broke.
    at_begin: bool = False


_LINE_END = re.compile(r"\r\n|[\n\r\x85\u2028\u2029]")
#: What YAML 1.2 does not count as a printable character.
_FORBIDDEN = re.compile(r"[^\t\n\r\x20-\x7e\x85\xa0-\ud7ff\ue000-\ufefe\uff00-\ufffd\U00010000-\U0010ffff]")
_DEFAULT_HINT = "check brackets, quotes and indentation"
_QUOTE = "put the text in quotes"

_NO_COLON = _Advice(
    "a key without its `: `", "write `key: value`; indent what continues the line above", at_begin=True
)

#: Part of the parser's complaint -> advice; the first that fits counts. ``{sign}`` is the character at
#: the place, ``{begin}`` the line and column where the broken part began.
_ADVICE: tuple[tuple[str, _Advice], ...] = (
    ("cannot start any token", _Advice("a text cannot begin with {sign}", _QUOTE)),
    ("unexpected end of stream", _Advice("the quote opened here is never closed", "close the quote", True)),
    (
        "document indicator",
        _Advice("the quote opened here is never closed", "close the quote", True),
    ),
    ("could not find expected ':'", _NO_COLON),
    (
        "mapping values are not allowed",
        _Advice(
            "a `:` where no `key: value` can stand",
            "put a text with `: ` in quotes; indent the keys of one mapping alike",
        ),
    ),
    (
        "sequence entries are not allowed",
        _Advice("a list entry cannot begin here", "begin each `- ` on a line of its own"),
    ),
    (
        "did not find expected '-' indicator",
        _Advice(
            "not indented like the list above", "indent the `- ` of one list alike, and the keys of one entry"
        ),
    ),
    (
        "did not find expected key",
        _Advice(
            "not a part of the mapping that begins at {begin}",
            "indent the keys of one mapping alike; let nothing follow a closed quote or bracket",
        ),
    ),
    (
        "expected ',' or '}'",
        _Advice("the `{{` at {begin} is not closed before this", "add the missing `,` or `}`"),
    ),
    (
        "expected ',' or ']'",
        _Advice("the `[` at {begin} is not closed before this", "add the missing `,` or `]`"),
    ),
    (
        "expected node content",
        _Advice("nothing stands here where a value belongs", "fill it in; close what is open"),
    ),
    ("found unexpected ':'", _Advice("a `:` without a space after it", "write `key: value`")),
    (
        "unknown escape character",
        _Advice("no escape that YAML knows", "use single quotes, in which a backslash is itself"),
    ),
    (
        "alphabetic or numeric character",
        _Advice("a text cannot begin with `*` or `&`", _QUOTE, True),
    ),
    ("undefined tag handle", _Advice("a text cannot begin with `!`", _QUOTE)),
    ("expected <document start>", _Advice("nothing may follow the end of the flow", "one flow a file")),
)


def syntax_diagnostic(error: Any, text: str, file: str) -> Diagnostic:
    """Return the finding for what a YAML parser refuses.

    Parameters
    ----------
    error : ruamel.yaml.error.MarkedYAMLError
        The parser's complaint.
    text : str
        The whole text.
    file : str
        Name used in the finding.

    Returns
    -------
    Diagnostic
        FP104, at the place to mend.
    """
    broke = _position(error.problem_mark) or _position(error.context_mark) or (0, 0)
    began = _position(error.context_mark) or broke
    sign = _sign_at(text, *broke)
    problem = " ".join(str(error.problem or "").split())
    if sign == "\t" or "tab character" in problem:
        advice = _Advice("a tab where only spaces may stand", "indent with spaces")
    else:
        context = " ".join(str(error.context or "").split())
        unforeseen = f"not valid YAML {context}: {problem}".replace(" :", ":")
        known = (advice for part, advice in _ADVICE if part in problem)
        advice = next(known, _Advice(unforeseen.replace("{", "{{").replace("}", "}}"), _DEFAULT_HINT))
    if "mapping values are not allowed" in problem and (above := _line_without_colon(text, broke[0])):
        advice, began = _NO_COLON, above
    line, column = _inside(text, *(began if advice.at_begin else broke))
    begin = f"line {began[0] + 1}, column {began[1] + 1}"
    message = advice.message.format(sign=repr(sign), begin=begin)
    return Diagnostic("FP104", message, advice.hint, span=Span(file, line + 1, column + 1))


def unreadable_diagnostic(message: str, text: str, file: str) -> Diagnostic:
    """Return the finding for text with a character that YAML does not allow."""
    found = _FORBIDDEN.search(text)
    if found is None:
        told, at = "not valid YAML: " + " ".join(message.split())[:120], 0
    else:
        told, at = f"the character U+{ord(found.group()):04X} cannot stand in YAML", found.start()
    return Diagnostic("FP104", told, "is this a flow file?", span=span_at(text, at, file))


def span_at(text: str, index: int, file: str) -> Span:
    """Return the place of the character at an index of a text."""
    before = _LINE_END.split(text[:index])
    return Span(file, len(before), len(before[-1]) + 1)


def _position(mark: Any) -> tuple[int, int] | None:
    return None if mark is None else (mark.line, mark.column)


def _line_without_colon(text: str, line: int) -> tuple[int, int] | None:
    """Return the begin of the line above, when it is the one that lacks ``: ``."""
    lines = _LINE_END.split(text)
    above = next((i for i in range(line - 1, -1, -1) if lines[i].strip()), None)
    if above is None:
        return None
    content = lines[above].strip()
    if content[0] in "#-" or ": " in content or content.endswith(":"):
        return None
    return above, len(lines[above]) - len(lines[above].lstrip())


def _inside(text: str, line: int, column: int) -> tuple[int, int]:
    """Return the place, or the end of the last line that says something, for one behind it."""
    lines = _LINE_END.split(text)
    if line < len(lines) and any(rest.strip() for rest in lines[line:]):
        return line, min(column, len(lines[line]))
    last = max((i for i, content in enumerate(lines) if content.strip()), default=0)
    return last, len(lines[last].rstrip())


def _sign_at(text: str, line: int, column: int) -> str:
    lines = _LINE_END.split(text)
    return lines[line][column : column + 1] if line < len(lines) else ""
