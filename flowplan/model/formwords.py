"""Words for errors of form: what to write instead of a wrong type, and which errors only echo another."""

from collections.abc import Sequence

from flowplan.errors import Diagnostic, nearest


def key_hint(key: str, known: Sequence[str], value: object) -> str:
    """Return what to do about an unknown key.

    Parameters
    ----------
    key : str
        What was written.
    known : sequence of str
        The keys that may stand there.
    value : object
        What stands after it; nothing, where a list in braces lacks its brackets.
    """
    hint = nearest(key, known)
    if value is None:
        return f"several values need brackets: `[A, B]`; otherwise: {hint}"
    return hint


def type_hint(kind: str, given: object, needed: Sequence[str] = ()) -> str:
    """Return what to do about a value of the wrong type.

    Parameters
    ----------
    kind : str
        What the model wanted, in pydantic's words, such as ``dict_type``.
    given : object
        What stands there.
    needed : sequence of str
        The keys that a mapping there must have.

    Returns
    -------
    str
        A hint.
    """
    if given is None:
        return "nothing stands after the `:`; fill it in, or leave the key out"
    if kind == "string_type":
        return "write one text" if isinstance(given, dict | list) else "put it in quotes"
    if kind in ("tuple_type", "list_type"):
        if isinstance(given, dict):
            return "begin each entry with a dash: `- {key: value}`"
        return "write `[…]`, or a dash before each entry"
    if isinstance(given, list):
        return "write `name: …` without a dash"
    keys = ", ".join(f"{key}: …" for key in needed) or "key: value"
    return f"write `{{{keys}}}`, or the keys below, indented"


def without_echoes(findings: tuple[Diagnostic, ...]) -> tuple[Diagnostic, ...]:
    """Drop "a key is missing" where the key stands there, misspelt and told as such.

    Parameters
    ----------
    findings : tuple of Diagnostic
        Errors of form; the path of an unknown key ends in that key.

    Returns
    -------
    tuple of Diagnostic
        The others, in the same order.
    """
    misspelt = {(d.path[:-1], d.hint) for d in findings if d.code == "FP201" and d.path}
    return tuple(
        d
        for d in findings
        if d.code != "FP202" or (d.path, f"did you mean {d.message.partition(' ')[0]}?") not in misspelt
    )
