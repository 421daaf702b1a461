"""Which column of a measurement file holds what."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from flowplan.errors import Diagnostic, FlowError, Span, UsageError, nearest

#: Each column with the headings that are known for it; letters count more than their case, except
#: for the single letters, where X is the field's centre and x the site.
HEADINGS: dict[str, tuple[str, ...]] = {
    "mask": ("mask",),
    "reference": ("reference",),
    "lot": ("lot",),
    "wafer": ("wafer",),
    "field_x": ("field_x", "X"),
    "field_y": ("field_y", "Y"),
    "site_x": ("site_x", "x"),
    "site_y": ("site_y", "y"),
    "dx": ("dx",),
    "dy": ("dy",),
}
WORDS = ("mask", "reference", "lot", "wafer")
NUMBERS = tuple(name for name in HEADINGS if name not in WORDS)
#: A number beyond this, in mm or in the unit of a flow, is no measurement of a wafer.
MOST = 1e12
#: Without a lot all wafers are one lot's, without sites all rows stand at their field's centre.
OPTIONAL = {
    "lot": "all rows count as one lot",
    "site_x": "sites stand at x = 0",
    "site_y": "sites stand at y = 0",
}


@dataclass(frozen=True, slots=True)
class Columns:
    """Where each column stands in a file.

    Attributes
    ----------
    place : dict of str to int
        Index of each column that the file has.
    count : int
        How many columns the file has.
    missing : tuple of str
        Optional columns that it does not have.
    """

    place: dict[str, int]
    count: int
    missing: tuple[str, ...]


def parse_columns(text: str) -> dict[str, str]:
    """Read what ``--columns`` says, such as ``mask=LAYER,dx=OVL_X``.

    Returns
    -------
    dict of str to str
        Column to heading.

    Raises
    ------
    UsageError
        FP602, for a column that there is not, or twice, or without a heading.
    """
    found: dict[str, str] = {}
    for part in text.split(","):
        name, sign, heading = (piece.strip() for piece in part.partition("="))
        name = next((key for key, known in HEADINGS.items() if name in known), name)
        if not sign or not heading:
            raise _bad(
                f"{part.strip()!r} in --columns is not COLUMN=HEADING", "for example mask=LAYER,dx=OVL_X"
            )
        if name not in HEADINGS:
            raise _bad(f"--columns knows no column {name!r}", nearest(name, list(HEADINGS)))
        if name in found:
            raise _bad(f"--columns names {name} twice", "give each column one heading")
        found[name] = heading
    return found


def _bad(message: str, hint: str) -> UsageError:
    return UsageError([Diagnostic("FP602", message, hint)])


def find_columns(headings: Sequence[str], named: Mapping[str, str], file: str) -> Columns:
    """Return where each column stands.

    Parameters
    ----------
    headings : sequence of str
        The file's own, in order.
    named : mapping of str to str
        Headings that the user gave for some columns.
    file : str
        What diagnostics call the file.

    Raises
    ------
    FlowError
        FP702, naming every column that is missing or stands twice.
    """
    given = [heading.strip() for heading in headings]
    place: dict[str, int] = {}
    wrong: list[Diagnostic] = []
    for name, known in HEADINGS.items():
        at = _places(given, (named[name],) if name in named else known, exact=name in named)
        if len(at) > 1:
            wrong.append(_finding(file, f"the column {name} stands {len(at)} times", "keep one of them"))
        elif at:
            place[name] = at[0]
        elif name in named or name not in OPTIONAL:
            sought = f"{named[name]!r} for {name}" if name in named else name
            wrong.append(_finding(file, f"no column {sought}", _hint(name, named, given)))
    if wrong:
        raise FlowError(wrong)
    return Columns(place, len(given), tuple(name for name in OPTIONAL if name not in place))


def _places(given: Sequence[str], known: Sequence[str], *, exact: bool) -> list[int]:
    at = [i for i, heading in enumerate(given) if heading in known]
    if at or exact:
        return at
    folded = {name.casefold() for name in known if len(name) > 1}
    return [i for i, heading in enumerate(given) if heading.casefold().replace(" ", "_") in folded]


def _hint(name: str, named: Mapping[str, str], given: Sequence[str]) -> str:
    shown = ", ".join(given[:12]) + (", …" if len(given) > 12 else "")
    close = nearest(named[name], given) if name in named else ""
    return close or f"say which with --columns {name}=HEADING; the file has {shown or 'no headings'}"


def _finding(file: str, message: str, hint: str) -> Diagnostic:
    return Diagnostic("FP702", message, hint, span=Span(file, 1, 1))
