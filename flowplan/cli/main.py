"""The commands of flowplan: what they are called, what they take, and who does the work.

Each command's module is imported when the command runs, so that a light command starts fast.
"""

import sys
from typing import Annotated

import typer

from flowplan import __version__
from flowplan.cli.choosing import CHOOSING
from flowplan.cli.options import AxisName, BasisName, Form, Order, SignName, TextOrJson, VerdictName
from flowplan.cli.session import FlowArgument, StrictOption, VariantOption, guarded
from flowplan.cli.statistics import (
    BEYOND,
    MOST_SAMPLES,
    STATISTICS,
    BeyondOption,
    ColumnsOption,
    KeepOption,
    SignOption,
)
from flowplan.cli.streams import emit

app = typer.Typer(
    name="flowplan",
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    invoke_without_command=True,
    context_settings={"help_option_names": ["-h", "--help"]},
    epilog="Example: flowplan new my.yaml, then flowplan check my.yaml",
)

_WELCOME = """\
flowplan new my.yaml       write a starter flow, to change into yours
flowplan check my.yaml     find its mistakes, and its worst pair
flowplan report my.yaml    write the report, one HTML page"""


def _version(wanted: bool) -> None:
    if wanted:
        emit(f"flowplan {__version__}")
        raise typer.Exit


@app.callback()
def start(
    context: typer.Context,
    version: Annotated[  # noqa: ARG001 - the callback answers it
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Print the version.")
    ] = False,
) -> None:
    """Overlay and registration margins of a wafer process, from one flow file."""
    if context.invoked_subcommand is None:
        emit(_WELCOME)


@app.command(epilog="Example: flowplan check flows/cmos.yaml --strict")
@guarded
def check(
    flow: FlowArgument,
    strict: StrictOption = False,
    form: Annotated[TextOrJson, typer.Option("--format", help="Text or JSON.")] = TextOrJson.TEXT,
    variant: VariantOption = None,
) -> None:
    """Find every mistake in a flow file; sum up a sound one."""
    from flowplan.cli.check import check as work

    work(flow, variant, strict=strict, as_json=form is TextOrJson.JSON)


@app.command(epilog="Example: flowplan margins flows/cmos.yaml --sort margin --layer GATE")
@guarded
def margins(
    flow: FlowArgument,
    form: Annotated[
        Form, typer.Option("--format", help="A table, or a format for other programs.")
    ] = Form.TABLE,
    basis: Annotated[
        BasisName | None, typer.Option(help="Judge on this basis instead of the file's.", show_default=False)
    ] = None,
    layer: Annotated[
        list[str] | None, typer.Option(help="Only pairs of this layer; may be repeated.", metavar="LAYER")
    ] = None,
    verdict: Annotated[
        list[VerdictName] | None,
        typer.Option(metavar="VERDICT", help="Only pass, tight, fail or unjudged; may be repeated."),
    ] = None,
    sort: Annotated[Order, typer.Option(help="In the file's order, or the least margin first.")] = Order.FILE,
    every_pair: Annotated[
        bool, typer.Option("--every-pair", help="The overlay of every two layers, judged by no limit.")
    ] = False,
    strict: StrictOption = False,
    variant: VariantOption = None,
) -> None:
    """Print the margin of every pair of layers."""
    from flowplan.cli.margins import Choice
    from flowplan.cli.margins import margins as work

    choice = Choice(
        form=form,
        order=sort,
        basis=basis.value if basis else None,
        layers=tuple(layer or ()),
        verdicts=tuple(v.value for v in verdict or ()),
        every_pair=every_pair,
        strict=strict,
    )
    work(flow, variant, choice)


@app.command(epilog="Example: flowplan chain flows/cmos.yaml CONTACT METAL1 --axis x")
@guarded
def chain(
    flow: FlowArgument,
    first: Annotated[str, typer.Argument(metavar="A", help="A layer, or wafer.", show_default=False)],
    second: Annotated[str, typer.Argument(metavar="B", help="Another layer.", show_default=False)],
    axis: Annotated[AxisName | None, typer.Option(help="One axis; both when left out.")] = None,
    form: Annotated[TextOrJson, typer.Option("--format", help="Text or JSON.")] = TextOrJson.TEXT,
    variant: VariantOption = None,
) -> None:
    """Explain the overlay of two layers, source by source."""
    from flowplan.cli.chain import Question
    from flowplan.cli.chain import chain as work

    asked = Question(flow, variant, (first, second), (axis.value,) if axis else ("x", "y"))
    work(asked, as_json=form is TextOrJson.JSON)


@app.command(epilog="Example: flowplan tree flows/cmos.yaml -o tree.svg")
@guarded
def tree(
    flow: FlowArgument,
    output: Annotated[
        str | None,
        typer.Option("-o", "--output", metavar="FILE", help="Draw to this .svg, .png or .dot file instead."),
    ] = None,
    axis: Annotated[AxisName | None, typer.Option(help="One axis; both when left out.")] = None,
    variant: VariantOption = None,
) -> None:
    """Show who aligns to whom."""
    from flowplan.cli.tree import tree as work

    work(flow, variant, output, axis.value if axis else None)


@app.command(epilog="Example: flowplan report flows/cmos.yaml -o cmos.html")
@guarded
def report(
    flow: FlowArgument,
    output: Annotated[
        str | None,
        typer.Option(
            "-o", "--output", metavar="FILE", help="Where to; the flow's name with .html, here, if left out."
        ),
    ] = None,
    samples: Annotated[
        int | None,
        typer.Option(
            "--simulate",
            metavar="N",
            min=1,
            max=MOST_SAMPLES,
            help="Simulate with N samples, and show yield and good fields too.",
            show_default=False,
        ),
    ] = None,
    data: Annotated[
        str | None,
        typer.Option(
            "--measured",
            metavar="DATA",
            help="Hold measured overlay against the plan, too; see `flowplan measured`.",
            show_default=False,
        ),
    ] = None,
    columns: ColumnsOption = None,
    sign: SignOption = SignName.MASK,
    keep: KeepOption = False,
    beyond: BeyondOption = BEYOND,
    strict: StrictOption = False,
    variant: VariantOption = None,
) -> None:
    """Write the report, one HTML page that needs nothing else."""
    from flowplan.cli.report import MeasuredData
    from flowplan.cli.report import report as work

    measured = MeasuredData(data, columns, sign, None if keep else beyond) if data is not None else None
    work(flow, variant, output, strict=strict, samples=samples, data=measured)


for command, example in (*CHOOSING, *STATISTICS):
    app.command(epilog=f"Example: {example}")(command)


@app.command(epilog="Example: flowplan new my.yaml")
@guarded
def new(
    output: Annotated[
        str, typer.Argument(metavar="FILE", help="The file to write; - prints the flow.")
    ] = "flow.yaml",
    force: Annotated[bool, typer.Option("--force", help="Replace a file that exists.")] = False,
) -> None:
    """Write a commented starter flow to change into your own."""
    from flowplan.cli.starter import new as work

    work(output, force=force)


@app.command(epilog="Example: flowplan schema -o flow.schema.json")
@guarded
def schema(
    output: Annotated[
        str | None, typer.Option("-o", "--output", metavar="FILE", help="Write to this file instead.")
    ] = None,
) -> None:
    """Print the JSON Schema of a flow file, for editors."""
    from flowplan.cli.schema import schema as work

    work(output)


def run() -> None:
    """Run flowplan on the command line's arguments and exit with its status."""
    app(sys.argv[1:], prog_name="flowplan")
