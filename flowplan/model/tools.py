"""Exposure tools and the errors that every mask printed on them takes along."""

from pydantic import Field

from flowplan.model.base import Described
from flowplan.model.marksites import Alignment
from flowplan.model.terms import Size, Term


class Tool(Described):
    """An exposure tool: how well it reads marks, and its own error terms."""

    alignment: Alignment | None = Field(
        None,
        description="Reading marks of an earlier mask, fresh at each exposure and axis: one size, or "
        "`per_mark`, `sites` and `model` of a least-squares fit.",
    )
    wafer_alignment: Size | None = Field(
        None, description="To the notch or flat, for a mask that aligns to `wafer`."
    )
    terms: dict[str, Term] = Field(
        default_factory=dict, description="Named error terms of every exposure on this tool."
    )
