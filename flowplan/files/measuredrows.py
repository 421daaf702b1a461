"""The rows of a measurement file as a polars query: fast where the file is clean, patient where not."""

import csv
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, Any

from flowplan.errors import Diagnostic, FlowError, Span
from flowplan.files.headings import HEADINGS, MOST, NUMBERS, WORDS, Columns, find_columns

if TYPE_CHECKING:
    import polars as pl

#: Lines before the first row: the headings.
LINES_BEFORE = 1
_SAMPLE = 65_536
_BLOCK = 1 << 24
_SEPARATORS = ",;\t|"
_DECIMAL_COMMA = re.compile(r"(?<![\d,.])-?\d+,\d+(?![\d,.])")
_PADDED = re.compile(r"[,;\t|] | [,;\t|\r\n]")
#: A sign that no line of text holds, so that a line is read as one piece.
_NOWHERE = "\x1f"


@dataclass(frozen=True, slots=True)
class Layout:
    """How a CSV file is written.

    Attributes
    ----------
    separator : str
        Between columns.
    decimal_comma : bool
        Whether numbers have a comma for their point.
    columns : Columns
        Where each column stands.
    """

    separator: str
    decimal_comma: bool
    columns: Columns


class Source:
    """A measurement file that can be gone through several times.

    Parameters
    ----------
    file : str
        Its name.
    columns : Columns
        Where each column stands.
    layout : Layout or None
        How the CSV is written; None for Parquet.
    query : callable
        Gives the rows as a lazy frame: `row`, then the columns, null where one cannot be read.
    rows : callable
        Gives how many rows there are, about.
    """

    def __init__(
        self,
        file: str,
        columns: Columns,
        layout: Layout | None,
        query: "Callable[[bool], pl.LazyFrame]",
        rows: Callable[[], int],
        *,
        patient: bool = False,
    ) -> None:
        self.file = file
        self.columns = columns
        self.layout = layout
        self.estimated_rows = rows
        self._query = query
        self._patient = patient

    def collect(self, number: int, passes: int) -> "pl.DataFrame":
        """Return the rows of one pass; those that cannot be read come with the first.

        Raises
        ------
        FlowError
            FP701, when the file cannot be read at all.
        """
        import polars as pl

        try:
            try:
                frame = self._collect(number, passes)
                if self._patient or self.layout is None or frame["good"].all():
                    return frame
                # Perhaps only spaces stand around the numbers; only a look at each line tells.
                self._patient = True
                return self._collect(number, passes)
            except (pl.exceptions.ComputeError, pl.exceptions.SchemaError):
                # A row with more fields than headings: look at every line by itself.
                if self._patient or self.layout is None:
                    raise
                self._patient = True
                return self._collect(number, passes)
        except (pl.exceptions.PolarsError, OSError) as error:
            raise unreadable(self.file, str(error).splitlines()[0]) from None

    def _collect(self, number: int, passes: int) -> "pl.DataFrame":
        import polars as pl

        is_good = pl.all_horizontal(
            *(pl.col(name).is_not_null() for name in WORDS), *(pl.col(name).abs() <= MOST for name in NUMBERS)
        ).fill_null(value=False)
        rows = self._query(self._patient).with_columns(good=is_good)
        if passes > 1:
            mixed = pl.lit(0, pl.UInt64)
            for seed, name in enumerate(WORDS):
                mixed = mixed ^ pl.col(name).hash(seed)
            rows = rows.filter(pl.when("good").then(mixed % passes == number).otherwise(pl.lit(number == 0)))
        return rows.with_columns(pl.col(WORDS).cast(pl.Categorical)).collect(engine="streaming")


def open_source(file: str, named: Mapping[str, str]) -> Source:
    """Open a CSV or Parquet file; see `open_measurements`."""
    try:
        with Path(file).open("rb") as stream:
            sample = stream.read(_SAMPLE)
        size = Path(file).stat().st_size
    except (OSError, ValueError) as error:
        raise unreadable(file, getattr(error, "strerror", None) or str(error)) from None
    if file.lower().endswith(".parquet") or sample.startswith(b"PAR1"):
        return _parquet(file, named)
    if sample.startswith((b"\xff\xfe", b"\xfe\xff")) or b"\0" in sample:
        raise unreadable(file, "this is not UTF-8 text")
    text = sample.decode("utf-8-sig", "replace")
    if not text.strip():
        raise unreadable(file, "the file is empty")
    return _csv(file, text, len(sample), size, named)


def unreadable(file: str, reason: str) -> FlowError:
    """Return the error for a file that cannot be read."""
    hint = "measured data are CSV with a line of headings, or Parquet"
    return FlowError([Diagnostic("FP701", f"cannot read the data: {reason}", hint, span=Span(file, 1, 1))])


def _csv(file: str, text: str, sampled: int, size: int, named: Mapping[str, str]) -> Source:
    lines = text.splitlines()
    separator = max(_SEPARATORS, key=lines[0].count)
    headings = next(csv.reader([lines[0]], delimiter=separator))
    columns = find_columns(headings, named, file)
    body = "\n".join(lines[1:])
    comma = separator != "," and bool(_DECIMAL_COMMA.search(body)) and "." not in body
    layout = Layout(separator, comma, columns)

    def rows() -> int:
        return size * len(lines) // max(1, sampled)

    def query(patient: bool) -> "pl.LazyFrame":
        return _patient_rows(file, layout) if patient else _fast_rows(file, layout)

    return Source(file, columns, layout, query, rows, patient=bool(_PADDED.search(body)) or _is_quoted(file))


def _is_quoted(file: str) -> bool:
    """Whether a quote stands anywhere in a file: one without its fellow could swallow all that follows."""
    with Path(file).open("rb") as stream:
        return any(b'"' in block for block in iter(partial(stream.read, _BLOCK), b""))


def _fast_rows(file: str, layout: Layout) -> "pl.LazyFrame":
    import polars as pl

    names = {at: name for name, at in layout.columns.place.items()}
    schema = {
        names.get(i, f"column {i}"): pl.Float64 if names.get(i) in NUMBERS else pl.String
        for i in range(layout.columns.count)
    }
    rows = pl.scan_csv(
        file,
        has_header=False,
        skip_lines=LINES_BEFORE,
        schema=schema,
        separator=layout.separator,
        decimal_comma=layout.decimal_comma,
        quote_char=None,
        encoding="utf8-lossy",
        ignore_errors=True,
        row_index_name="row",
        glob=False,
    )
    return _completed(rows, layout.columns)


def _patient_rows(file: str, layout: Layout) -> "pl.LazyFrame":
    """Return the rows with each line taken apart by itself; a line of too many or few fields is null."""
    import polars as pl

    lines = pl.scan_csv(
        file,
        has_header=False,
        skip_lines=LINES_BEFORE,
        schema={"line": pl.String},
        separator=_NOWHERE,
        quote_char=None,
        encoding="utf8-lossy",
        row_index_name="row",
        glob=False,
    )
    count = layout.columns.count - 1
    line = pl.col("line")
    whole = line.str.count_matches(layout.separator, literal=True) == count
    parts = pl.when(whole).then(line).str.split_exact(layout.separator, count)

    def part(name: str) -> Any:
        text = parts.struct.field(f"field_{layout.columns.place[name]}").str.strip_chars(' "\r')
        if name in WORDS:
            return pl.when(text != "").then(text).alias(name)
        plain = text.str.replace(",", ".", literal=True) if layout.decimal_comma else text
        return plain.cast(pl.Float64, strict=False).alias(name)

    return _completed(lines.select("row", *(part(name) for name in layout.columns.place)), layout.columns)


def _parquet(file: str, named: Mapping[str, str]) -> Source:
    import polars as pl

    try:
        rows = pl.scan_parquet(file, row_index_name="row", glob=False)
        headings = [name for name in rows.collect_schema().names() if name != "row"]
        count = int(rows.select(pl.len()).collect().item())
    except (pl.exceptions.PolarsError, OSError) as error:
        raise unreadable(file, str(error).splitlines()[0]) from None
    columns = find_columns(headings, named, file)

    def query(patient: bool) -> "pl.LazyFrame":  # noqa: ARG001 - Parquet has one way to be read
        chosen = [
            pl.col(headings[at]).cast(pl.String if name in WORDS else pl.Float64, strict=False).alias(name)
            for name, at in columns.place.items()
        ]
        return _completed(rows.select("row", *chosen), columns)

    return Source(file, columns, None, query, lambda: count)


def _completed(rows: "pl.LazyFrame", columns: Columns) -> "pl.LazyFrame":
    """Return the rows with what the file leaves out filled in."""
    import polars as pl

    filled = [(pl.lit("1") if name in WORDS else pl.lit(0.0)).alias(name) for name in columns.missing]
    return rows.with_columns(filled).select("row", *HEADINGS)
