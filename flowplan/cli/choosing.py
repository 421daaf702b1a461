"""The commands that help to choose among plans: what they take, and who does the work."""

from collections.abc import Callable
from typing import Annotated

import typer

from flowplan.cli.options import BasisName, CompareForm, GoalName
from flowplan.cli.session import FlowArgument, StrictOption, VariantOption, guarded


@guarded
def compare(
    flows: Annotated[
        list[str],
        typer.Argument(
            metavar="FLOW...", help="One file with variants, or two to four files.", show_default=False
        ),
    ],
    variant: Annotated[
        list[str] | None,
        typer.Option(metavar="NAME", help="Only this variant; may be repeated.", show_default=False),
    ] = None,
    self_align: Annotated[
        list[str] | None,
        typer.Option(
            "--self-align",
            metavar="FEATURE:PARENT[:x|y]",
            help="Try a plan in which a mask's layer follows another by itself; may be repeated.",
            show_default=False,
        ),
    ] = None,
    form: Annotated[
        CompareForm, typer.Option("--format", help="A table, or a format for other programs.")
    ] = CompareForm.TABLE,
    basis: Annotated[
        BasisName | None, typer.Option(help="Judge every plan on this basis.", show_default=False)
    ] = None,
    every_row: Annotated[bool, typer.Option("--all", help="Show the margins that do not move, too.")] = False,
    output: Annotated[
        str | None, typer.Option("-o", "--output", metavar="FILE", help="Write an HTML page instead.")
    ] = None,
) -> None:
    """Lay plans side by side: variants, files or tries."""
    from flowplan.cli.compare import Plans, run_compare

    asked = Plans(
        files=tuple(flows),
        variants=tuple(variant or ()),
        self_align=tuple(self_align or ()),
        basis=basis.value if basis else None,
        form=form.value,
        every_row=every_row,
        output=output,
    )
    run_compare(asked)


@guarded
def propose(
    flow: FlowArgument,
    goal: Annotated[
        GoalName, typer.Option(help="The smallest margin, the fewest failing pairs, or the yield.")
    ] = GoalName.WORST,
    free: Annotated[
        list[str] | None,
        typer.Option(
            metavar="ID", help="A mask that may read any earlier layer; may be repeated.", show_default=False
        ),
    ] = None,
    free_all: Annotated[
        bool, typer.Option("--free-all", help="Every mask may read any earlier layer.")
    ] = False,
    pin: Annotated[
        list[str] | None,
        typer.Option(
            metavar="ID", help="A mask that keeps what it reads; may be repeated.", show_default=False
        ),
    ] = None,
    same_reference: Annotated[
        bool, typer.Option("--same-reference", help="x and y of a mask come from one candidate.")
    ] = False,
    changes: Annotated[
        int | None, typer.Option(metavar="N", min=0, help="Change at most N masks.", show_default=False)
    ] = None,
    rungs: Annotated[bool, typer.Option("--ladder", help="The best plan for 0, 1, 2, ... changes.")] = False,
    time_limit: Annotated[
        float | None,
        typer.Option("--time-limit", metavar="S", min=0, help="Stop after S seconds.", show_default=False),
    ] = None,
    form: Annotated[
        CompareForm, typer.Option("--format", help="A table, or a format for other programs.")
    ] = CompareForm.TABLE,
    output: Annotated[
        str | None,
        typer.Option("-o", "--output", metavar="FILE", help="Write the flow with the new references."),
    ] = None,
    strict: StrictOption = False,
    variant: VariantOption = None,
) -> None:
    """Find the best references, with proof.

    Ctrl-C ends the search with the best plan found so far.
    """
    from flowplan.cli.propose import Wish, run_propose

    wish = Wish(
        goal=goal.value,
        free=tuple(free or ()),
        free_all=free_all,
        pin=tuple(pin or ()),
        same_reference=same_reference,
        changes=changes,
        time_limit=time_limit,
        rungs=rungs,
        form=form.value,
        output=output,
        strict=strict,
    )
    run_propose(flow, variant, wish)


@guarded
def remedies(
    flow: FlowArgument,
    pair: Annotated[
        list[str] | None,
        typer.Option(metavar="NAME", help="Only this pair; may be repeated.", show_default=False),
    ] = None,
    every: Annotated[bool, typer.Option("--all", help="Pairs that pass as well.")] = False,
    each: Annotated[int, typer.Option(metavar="N", min=1, help="Show the best N of each kind.")] = 2,
    form: Annotated[
        CompareForm, typer.Option("--format", help="A table, or a format for other programs.")
    ] = CompareForm.TABLE,
    variant: VariantOption = None,
) -> None:
    """Rank what to do about each pair that fails or is tight."""
    from flowplan.cli.remedies import RemedyChoice
    from flowplan.cli.remedies import remedies as work

    work(flow, variant, RemedyChoice(tuple(pair or ()), every, each, form))


@guarded
def levers(
    flow: FlowArgument,
    size: Annotated[
        list[str] | None,
        typer.Option(
            metavar="PATH",
            help="Only this size, or all under this beginning of a path; may be repeated.",
            show_default=False,
        ),
    ] = None,
    every: Annotated[bool, typer.Option("--all", help="Sizes worth nothing by themselves as well.")] = False,
    form: Annotated[
        CompareForm, typer.Option("--format", help="A table, or a format for other programs.")
    ] = CompareForm.TABLE,
    variant: VariantOption = None,
) -> None:
    """Say what each quoted size is worth, and how large it may be."""
    from flowplan.cli.levers import LeverChoice
    from flowplan.cli.levers import levers as work

    work(flow, variant, LeverChoice(tuple(size or ()), every, form))


#: Each command with an example of its use.
CHOOSING: tuple[tuple[Callable[..., None], str], ...] = (
    (compare, "flowplan compare flows/cmos.yaml --self-align SD:GATE"),
    (remedies, "flowplan remedies flows/cmos.yaml --pair 'contact inside active'"),
    (levers, "flowplan levers flows/logic_backend.yaml --size tools.immersion"),
    (propose, "flowplan propose flows/cmos.yaml --free-all --changes 2 -o better.yaml"),
)
