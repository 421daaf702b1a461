"""From plain data to a `Flow`: form errors in the words of the flow file, as many as there are."""

import types
from collections.abc import Sequence
from typing import Annotated, Any, Literal, Union, get_args, get_origin

from pydantic import BaseModel, ValidationError
from pydantic_core import ErrorDetails

from flowplan.errors import CODES, Diagnostic, Path, nearest
from flowplan.model.base import Described
from flowplan.model.flow import Flow
from flowplan.model.formwords import key_hint, type_hint, without_echoes

#: Longest list of findings that still helps a reader.
MOST_DIAGNOSTICS = 200

_WRONG_TYPE = {
    "string_type": "a text belongs here",
    "dict_type": "a mapping (key: value) belongs here",
    "model_type": "a mapping (key: value) belongs here",
    "model_attributes_type": "a mapping (key: value) belongs here",
    "tuple_type": "a list belongs here",
    "list_type": "a list belongs here",
}


def build(data: object) -> tuple[Flow | None, tuple[Diagnostic, ...]]:
    """Validate plain data as a flow.

    Parameters
    ----------
    data : object
        What a YAML or JSON reader returns.

    Returns
    -------
    flow : Flow or None
        The flow, when its form is right.
    diagnostics : tuple of Diagnostic
        Everything wrong with its form, each with the path to its place in `data`.
    """
    try:
        return Flow.model_validate(data), ()
    except ValidationError as error:
        found: dict[tuple[Path, str], Diagnostic] = {}
        for detail in error.errors(include_url=False, include_input=False):
            if len(found) == MOST_DIAGNOSTICS:
                break
            diagnostic = _translate(detail, data)
            found.setdefault((diagnostic.path, diagnostic.message), diagnostic)
        return None, without_echoes(tuple(found.values()))


def follow(data: object, path: Path) -> object:
    """Return what stands at a path of plain data, or None."""
    for step in path:
        if isinstance(data, dict):
            data = data.get(step)
        elif isinstance(data, list) and isinstance(step, int) and step < len(data):
            data = data[step]
        else:
            return None
    return data


def real_path(data: Any, loc: Sequence[str | int]) -> Path:
    """Reduce an error location to the steps that exist in the data.

    The model also knows forms that the file may leave out (the x of a single value) and names of
    union members; those steps have no place of their own in the file.
    """
    path: list[str | int] = []
    for step in loc:
        present: Any = data if isinstance(data, dict) else range(len(data)) if isinstance(data, list) else ()
        if step in present:
            data = data[step]
            path.append(step)
    return tuple(path)


def _translate(detail: ErrorDetails, data: object) -> Diagnostic:
    kind, loc = detail["type"], detail["loc"]
    path = real_path(data, loc)
    context = detail.get("ctx", {})
    if kind in CODES:
        value = follow(data, path)
        if isinstance(value, dict) and context["key"] in value:
            path = (*path, context["key"])
        return Diagnostic(kind, context["message"], context["hint"], path)
    if kind == "extra_forbidden":
        known = _fields_at(loc[:-1])
        hint = key_hint(str(loc[-1]), known, follow(data, path))
        return Diagnostic("FP201", f"unknown key {loc[-1]!r}", hint, path)
    if kind == "missing" and isinstance(loc[-1], int):
        return Diagnostic("FP205", "too few entries", _ENTRIES_HINT, path)
    if kind == "missing":
        return Diagnostic("FP202", f"{loc[-1]!r} is missing", f"add `{loc[-1]}: …`", path)
    if kind == "literal_error":
        given = follow(data, path)
        choices = str(context["expected"]).replace("'", "").replace(" or ", ", ")
        hint = nearest(str(given), choices.split(", "))
        return Diagnostic("FP204", f"{given!r} is not one of {choices}", hint, path)
    if kind in ("too_short", "too_long", "string_too_short"):
        return Diagnostic("FP205", *_COUNT[kind], path)
    message = _WRONG_TYPE.get(kind, detail["msg"].lower())
    needed = [] if kind == "dict_type" else _fields_at(loc, needed=True)
    return Diagnostic("FP203", message, type_hint(kind, follow(data, path), needed), path)


_ENTRIES_HINT = "`between` names two layers"
_COUNT = {
    "too_short": ("too few entries", _ENTRIES_HINT),
    "too_long": ("too many entries", _ENTRIES_HINT),
    "string_too_short": ("an empty text", "write a name"),
}


def _fields_at(loc: Sequence[str | int], *, needed: bool = False) -> list[str]:
    """Return the keys that the model knows, or needs, at an error location."""
    current: Any = Flow
    for step in loc:
        current = _descend(current, step)
    members = [m for m in _members(current) if isinstance(m, type) and issubclass(m, BaseModel)]
    names = dict.fromkeys(name for model in members for name in model.model_fields)
    if needed:
        return [name for name in names if all(_needs(model, name) for model in members)]
    return sorted(names, key=lambda name: name in Described.model_fields)


def _needs(model: type[BaseModel], name: str) -> bool:
    field = model.model_fields.get(name)
    return field is not None and field.is_required()


def _descend(annotation: Any, step: str | int) -> Any:
    for member in _members(annotation):
        origin, args = get_origin(member), get_args(member)
        if origin in (tuple, list) and isinstance(step, int):
            return args[0]
        if origin is dict:
            return args[1]
        if isinstance(member, type) and issubclass(member, BaseModel):
            field = member.model_fields.get(str(step))
            if field is not None:
                return field.annotation
            rule = member.model_fields.get("rule")
            if rule is not None and step in get_args(rule.annotation):
                return member
    return annotation


def _members(annotation: Any) -> list[Any]:
    """Unfold Annotated and unions into their members."""
    origin = get_origin(annotation)
    if origin is Annotated:
        return _members(get_args(annotation)[0])
    if origin in (Union, types.UnionType):
        return [m for part in get_args(annotation) for m in _members(part)]
    return [] if annotation is type(None) or origin is Literal else [annotation]
