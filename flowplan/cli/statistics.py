"""The commands about statistics on wafers: what they take, and who does the work."""

from collections.abc import Callable
from typing import Annotated

import typer

from flowplan.cli.options import BoundsName, CompareForm
from flowplan.cli.session import FlowArgument, VariantOption, guarded

#: More samples than this take days.
MOST_SAMPLES = 10**10


@guarded
def simulate(
    flow: FlowArgument,
    samples: Annotated[
        int, typer.Option(metavar="N", min=1, max=MOST_SAMPLES, help="Draws of every error.")
    ] = 100_000,
    seed: Annotated[int, typer.Option(metavar="N", min=0, help="The same seed gives the same answer.")] = 1,
    bounds: Annotated[
        BoundsName, typer.Option(help="A bound at its worst sign, or evenly spread over its range.")
    ] = BoundsName.WORST,
    threads: Annotated[
        int | None,
        typer.Option(
            metavar="N",
            min=1,
            max=256,
            help="Threads at work; all processors if left out.",
            show_default=False,
        ),
    ] = None,
    every: Annotated[bool, typer.Option("--all", help="Every pair, not only the likeliest to fail.")] = False,
    form: Annotated[
        CompareForm, typer.Option("--format", help="A table, or a format for other programs.")
    ] = CompareForm.TABLE,
    variant: VariantOption = None,
) -> None:
    """Draw the errors at random: fail fractions, yield, good fields."""
    from flowplan.cli.simulate import SimulateChoice
    from flowplan.cli.simulate import simulate as work
    from flowplan.engine.simulate import Options

    work(flow, variant, SimulateChoice(Options(samples, seed, bounds.value, threads), every, form))


#: Each command with an example of its use.
STATISTICS: tuple[tuple[Callable[..., None], str], ...] = (
    (simulate, "flowplan simulate flows/cmos.yaml --samples 1000000 --seed 7"),
)
