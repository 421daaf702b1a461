"""What each mask may read: the candidates among which the best plan is chosen."""

from collections.abc import Iterable
from dataclasses import dataclass

from flowplan.errors import Diagnostic, UsageError, nearest
from flowplan.model.base import AXES, Axis
from flowplan.model.edits import Readings
from flowplan.model.flow import Flow
from flowplan.model.masks import Mask, Reading, References


@dataclass(frozen=True, slots=True)
class Choice:
    """The options of one mask, for the axes on which it chooses at once.

    Attributes
    ----------
    mask : str
        The mask.
    axes : tuple of {'x', 'y'}
        One axis, or both when a mask must take both parts from one candidate.
    options : tuple of tuple of Readings
        What it may read, one entry an axis; the plan of the file comes first, then the candidates in
        the order of the file.
    """

    mask: str
    axes: tuple[Axis, ...]
    options: tuple[tuple[Readings, ...], ...]


def choices_of(
    flow: Flow,
    *,
    free: Iterable[str] = (),
    free_all: bool = False,
    pin: Iterable[str] = (),
    same_reference: bool = False,
) -> tuple[Choice, ...]:
    """Return what every mask may read.

    Parameters
    ----------
    flow : Flow
        A checked flow.
    free : iterable of str
        Masks that may read every earlier mask, unless they carry `may_align_to`.
    free_all : bool
        Whether every mask is free in this way.
    pin : iterable of str
        Masks that keep the plan of the file.
    same_reference : bool
        Whether a mask takes x and y from one candidate.

    Returns
    -------
    tuple of Choice
        In process order, x before y; masks without a choice have a single option.

    Raises
    ------
    UsageError
        When a named mask does not exist (FP601), is both freed and pinned (FP603), or when no mask
        has a choice (FP604).
    """
    freed, pinned = tuple(free), frozenset(pin)
    problems = [d for name in (*freed, *sorted(pinned)) for d in _unknown(flow, name)]
    problems += [_contradiction(name) for name in dict.fromkeys(freed) if name in pinned]
    if problems:
        raise UsageError(dict.fromkeys(problems))
    groups: tuple[tuple[Axis, ...], ...] = (AXES,) if same_reference else tuple((axis,) for axis in AXES)
    found = []
    for i, mask in enumerate(flow.masks):
        references = [mask.aligns_to]
        if mask.id not in pinned:
            references += _candidates(flow, i, free_all or mask.id in freed)
        found += [Choice(mask.id, axes, _distinct(references, axes)) for axes in groups]
    if all(len(choice.options) == 1 for choice in found):
        hint = "give masks `may_align_to`, or free some of them"
        raise UsageError([Diagnostic("FP604", "no mask has a choice of references", hint)])
    return tuple(found)


def _unknown(flow: Flow, name: str) -> list[Diagnostic]:
    masks = [mask.id for mask in flow.masks]
    if name in masks:
        return []
    if name in flow.layers:
        message = f"{name!r} is self-aligned and reads no marks"
        return [Diagnostic("FP601", message, "name a mask: " + nearest(name, masks))]
    return [Diagnostic("FP601", f"unknown mask {name!r}", nearest(name, masks))]


def _contradiction(name: str) -> Diagnostic:
    return Diagnostic("FP603", f"{name!r} is both freed and pinned", "leave it out of one of the two")


def _candidates(flow: Flow, index: int, freed: bool) -> list[References]:
    mask: Mask = flow.masks[index]
    if mask.may_align_to is not None:
        return list(mask.may_align_to)
    if not freed:
        return []
    readings = [(Reading(mask=earlier.id),) for earlier in flow.masks[:index]]
    return [References.model_construct(x=reading, y=reading) for reading in readings]


def same_readings(one: Readings, other: Readings) -> bool:
    """Return whether two references are the same, however their weights are written."""
    return _normal(one) == _normal(other)


def _distinct(references: list[References], axes: tuple[Axis, ...]) -> tuple[tuple[Readings, ...], ...]:
    """Return the parts on these axes, each once, the first that is written so."""
    found: dict[tuple[object, ...], tuple[Readings, ...]] = {}
    for candidate in references:
        parts = tuple(candidate.on(axis) for axis in axes)
        found.setdefault(tuple(_normal(part) for part in parts), parts)
    return tuple(found.values())


def _normal(readings: Readings) -> tuple[tuple[str, float, object], ...]:
    references = References.model_construct(x=readings, y=readings)
    return tuple((r.mask, round(weight, 12), r.alignment) for r, weight in references.weighted("x"))
