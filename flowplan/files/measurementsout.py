"""Writing measured overlay as CSV or Parquet, wafer by wafer."""

import os
import tempfile
from collections.abc import Iterable
from pathlib import Path
from typing import TYPE_CHECKING, BinaryIO, Protocol

import numpy as np
from numpy.typing import NDArray

from flowplan.errors import Diagnostic, OutputError
from flowplan.files.headings import NUMBERS
from flowplan.units import convert

if TYPE_CHECKING:
    import polars as pl

#: Overlay is written to this many places after the point of a nm.
_DECIMALS = 3


class WaferBlock(Protocol):
    """Rows of one reading on one wafer; see `flowplan.engine.measured.synthetic.WaferRows`."""

    @property
    def mask(self) -> str:
        """The mask."""

    @property
    def reference(self) -> str:
        """What it is measured against."""

    @property
    def lot(self) -> int:
        """The lot's number."""

    @property
    def wafer(self) -> int:
        """The wafer's number in its lot."""

    @property
    def positions(self) -> NDArray[np.float64]:
        """X, Y, x, y [mm], shape (n_rows, 4)."""

    @property
    def overlay(self) -> NDArray[np.float64]:
        """Mask minus reference [nm], shape (n_rows, 2)."""


def write_measurements(file: str, blocks: Iterable[WaferBlock], unit: str) -> int:
    """Write measured rows, whole or not at all.

    Parameters
    ----------
    file : str
        Parquet when it ends in ``.parquet``, else CSV.
    blocks : iterable of WaferBlock
        The rows, in order.
    unit : str
        Length unit of dx and dy.

    Returns
    -------
    int
        How many rows were written.

    Raises
    ------
    OutputError
        FP501, when the file cannot be written.
    """
    target = Path(file).resolve()
    try:
        handle, name = tempfile.mkstemp(dir=target.parent, prefix=f".{target.name[:100]}.")
        temporary = Path(name)
        try:
            with os.fdopen(handle, "wb") as stream:
                write = _write_parquet if file.lower().endswith(".parquet") else _write_csv
                count = write(stream, (_frame(block, unit) for block in blocks))
            temporary.chmod(0o644)
            temporary.replace(target)
        finally:
            temporary.unlink(missing_ok=True)
    except OSError as error:
        message = f"cannot write {file!r}: {error.strerror or error}"
        hint = "name a file in a folder that exists and can be written"
        raise OutputError([Diagnostic("FP501", message, hint)]) from None
    return count


def _write_csv(stream: BinaryIO, frames: "Iterable[pl.DataFrame]") -> int:
    count = 0
    for frame in frames:
        frame.write_csv(stream, include_header=not count)
        count += frame.height
    return count


def _write_parquet(stream: BinaryIO, frames: "Iterable[pl.DataFrame]") -> int:
    import polars as pl

    whole = pl.concat(list(frames))
    whole.write_parquet(stream)
    return whole.height


def _frame(block: WaferBlock, unit: str) -> "pl.DataFrame":
    import polars as pl

    decimals = _DECIMALS + max(0, round(np.log10(convert(1.0, unit, "nm"))))
    overlay = np.round(block.overlay * convert(1.0, "nm", unit), decimals) + 0.0
    numbers = np.column_stack([np.round(block.positions, 6) + 0.0, overlay])
    n = len(numbers)
    words = {
        "mask": [block.mask] * n,
        "reference": [block.reference] * n,
        "lot": [f"L{block.lot}"] * n,
        "wafer": [str(block.wafer)] * n,
    }
    return pl.DataFrame(words | {name: numbers[:, i] for i, name in enumerate(NUMBERS)})
