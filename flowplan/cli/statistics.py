"""The commands about statistics on wafers: what they take, and who does the work."""

from collections.abc import Callable
from typing import Annotated

import typer

from flowplan.cli.options import BoundsName, CompareForm, SignName
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


#: Robust standard deviations beyond which a measured row is an outlier.
BEYOND = 6.0

ColumnsOption = Annotated[
    str | None,
    typer.Option(
        "--columns",
        metavar="COLUMN=HEADING,...",
        help="Headings that the data call otherwise, for example mask=LAYER,dx=OVL_X.",
        show_default=False,
    ),
]
SignOption = Annotated[SignName, typer.Option("--sign", help="Which way dx and dy are counted.")]
KeepOption = Annotated[bool, typer.Option("--keep-outliers", help="Let every measured row count.")]
BeyondOption = Annotated[
    float, typer.Option("--beyond", metavar="K", min=1, help="An outlier lies K robust sigmas off its wafer.")
]


@guarded
def measured(
    flow: FlowArgument,
    data: Annotated[
        str | None,
        typer.Argument(metavar="DATA", help="Measured overlay: CSV, or .parquet.", show_default=False),
    ] = None,
    columns: ColumnsOption = None,
    sign: SignOption = SignName.MASK,
    keep: KeepOption = False,
    beyond: BeyondOption = BEYOND,
    form: Annotated[
        CompareForm, typer.Option("--format", help="A table, or a format for other programs.")
    ] = CompareForm.TABLE,
    output: Annotated[
        str | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            help="Write the flow with the measured alignments, or a page (.html).",
            show_default=False,
        ),
    ] = None,
    made: Annotated[
        str | None,
        typer.Option(
            "--make",
            metavar="FILE",
            help="Write synthetic data, drawn from the flow's own sources, instead.",
            show_default=False,
        ),
    ] = None,
    seed: Annotated[int, typer.Option(metavar="N", min=0, help="For --make.")] = 1,
    lots: Annotated[int, typer.Option(metavar="N", min=1, max=10_000, help="For --make.")] = 4,
    wafers: Annotated[int, typer.Option(metavar="N", min=1, max=10_000, help="For --make: in each lot.")] = 3,
    variant: VariantOption = None,
) -> None:
    """Hold measured overlay against the plan: spread, fit, variances.

    The data have a line of headings: mask, reference, lot, wafer, field_x, field_y (the field's
    centre, mm; or X, Y), site_x, site_y (the site in the field, mm; or x, y), dx, dy (mask minus
    reference, in the flow's unit).
    """
    from flowplan.cli.measured import Making, MeasuredChoice, ask, make
    from flowplan.cli.measured import measured as work

    if made is not None:
        make(flow, variant, data, Making(made, seed, lots, wafers))
        return
    asked = ask(columns, sign, None if keep else beyond)
    work(flow, variant, MeasuredChoice(data, asked, form, output))


#: Each command with an example of its use.
STATISTICS: tuple[tuple[Callable[..., None], str], ...] = (
    (simulate, "flowplan simulate flows/cmos.yaml --samples 1000000 --seed 7"),
    (measured, "flowplan measured flows/cmos.yaml overlay.csv --columns mask=LAYER -o new.yaml"),
)
