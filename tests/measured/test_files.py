"""Reading measured data: headings, signs, units, what cannot be read, Parquet, and bounded memory."""

import numpy as np
import polars as pl
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from flowplan.errors import FlowError, UsageError
from flowplan.files.headings import parse_columns
from flowplan.files.measurements import open_measurements

HEAD = "mask,reference,lot,wafer,field_x,field_y,site_x,site_y,dx,dy\n"
ROW = "GATE,ACTIVE,L1,3,15,-15,1,2,4.5,-6\n"


@pytest.fixture
def read(tmp_path):
    """Return a function that reads text, or a frame, as measured data."""

    def reader(content, unit="nm", columns=None, **more):
        if isinstance(content, pl.DataFrame):
            file = tmp_path / "data.parquet"
            content.write_parquet(file)
        else:
            file = tmp_path / "data.csv"
            file.write_bytes(content.encode() if isinstance(content, str) else content)
        data = open_measurements(file, unit, columns, **more)
        return data, list(data.batches())

    return reader


def test_a_row_comes_as_it_stands(read):
    data, (rows,) = read(HEAD + ROW)
    assert list(data.readings) == [("GATE", "ACTIVE")]
    assert list(data.lots) == ["L1"]
    assert rows.positions.tolist() == [[15, -15, 1, 2]]
    assert rows.overlay.tolist() == [[4.5, -6]]
    assert (data.n_rows, data.n_unreadable) == (1, 0)
    assert data.place(0).endswith("data.csv:2")


def test_overlay_is_in_the_flows_unit_and_its_sign_can_be_turned(read):
    assert read(HEAD + ROW, "um")[1][0].overlay.tolist() == [[4500, -6000]]
    assert read(HEAD + ROW, reversed_sign=True)[1][0].overlay.tolist() == [[-4.5, 6]]


@pytest.mark.parametrize(
    "head",
    [
        "mask,reference,lot,wafer,X,Y,x,y,dx,dy\n",
        "Mask,REFERENCE,Lot,Wafer,Field X,field y,Site_X,site y,DX,Dy\n",
        "\ufeffmask,reference,lot,wafer,field_x,field_y,site_x,site_y,dx,dy\r\n",
    ],
)
def test_known_headings(read, head):
    assert read(head + ROW)[1][0].positions.tolist() == [[15, -15, 1, 2]]


def test_other_headings_are_named(read):
    columns = parse_columns("mask=LAYER, dx=OVL_X,X=CX")
    assert columns == {"mask": "LAYER", "dx": "OVL_X", "field_x": "CX"}
    _, (rows,) = read("junk,LAYER,reference,lot,wafer,CX,Y,x,y,OVL_X,dy\n!," + ROW, columns=columns)
    assert rows.overlay.tolist() == [[4.5, -6]]


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("mask", "'mask' in --columns is not COLUMN=HEADING"),
        ("msk=A", "--columns knows no column 'msk'"),
        ("dx=A,dx=B", "--columns names dx twice"),
    ],
)
def test_columns_that_make_no_sense(text, message):
    with pytest.raises(UsageError, match=message):
        parse_columns(text)


def test_what_is_missing_is_named_all_at_once(read):
    with pytest.raises(FlowError) as caught:
        read("mask,reference,wafer,X,Y,OVL_X,dy\n", columns={"dy": "OVL_Y"})
    assert [d.message for d in caught.value.diagnostics] == ["no column dx", "no column 'OVL_Y' for dy"]
    assert {d.code for d in caught.value.diagnostics} == {"FP702"}
    assert "--columns dx=HEADING" in caught.value.diagnostics[0].hint


def test_without_lot_and_sites_the_rest_is_read(read):
    data, (rows,) = read("mask,reference,wafer,X,Y,dx,dy\nA,B,1,15,0,1,2\n")
    assert data.source.columns.missing == ("lot", "site_x", "site_y")
    assert rows.positions.tolist() == [[15, 0, 0, 0]]


@pytest.mark.parametrize(
    ("line", "column", "message"),
    [
        ("GATE,ACTIVE,L1,3,15,-15,1,2,abc,-6", 29, "dx is not a number: 'abc'"),
        ("GATE,ACTIVE,L1,3,15,-15,1,2,,-6", 29, "dx is empty"),
        (",ACTIVE,L1,3,15,-15,1,2,4,-6", 1, "mask is empty"),
        ("GATE,ACTIVE,L1,3,15,-15,1,2,nan,-6", 29, "dx is not a finite number: 'nan'"),
        ("GATE,ACTIVE,L1,3,15,-15,1,2,4,inf", 31, "dy is not a finite number: 'inf'"),
        ("GATE,ACTIVE,L1,3,15,-1e200,1,2,4,5", 21, "field_y is too large for a wafer: '-1e200'"),
        ("GATE,ACTIVE,L1,3,15,-15,1,2,4", 1, "9 fields where the headings are 10"),
        ("GATE,ACTIVE,L1,3,15,-15,1,2,4,5,-6", 1, "11 fields where the headings are 10"),
        (
            '"GATE, 1",ACTIVE,L1,3,15,-15,1,2,4,5',
            1,
            "11 fields where the headings are 10, those inside quotes counted",
        ),
        ("", 1, "an empty line among the rows"),
    ],
)
@pytest.mark.parametrize("before", [0, 3])
def test_a_row_that_cannot_be_read_is_counted_and_told_with_its_place(read, line, column, message, before):
    data, batches = read(HEAD + ROW * before + line + "\n" + ROW)
    assert (data.n_rows, data.n_unreadable) == (before + 2, 1)
    assert sum(len(rows.row) for rows in batches) == before + 1
    (found,) = data.warnings()
    assert (found.code, found.message) == ("FP703", message)
    assert (found.span.line, found.span.column) == (before + 2, column)


def test_at_most_ten_are_told_and_all_are_counted(read):
    data, _ = read(HEAD + ROW + "x\n" * 25)
    assert data.n_unreadable == 25
    assert [w.span.line for w in data.warnings()] == list(range(3, 13))


@pytest.mark.parametrize(
    "text",
    [
        HEAD.replace(",", ";") + "GATE;ACTIVE;L1;3;15;-15;1;2;4,5;-6\n",
        HEAD.replace(",", "\t") + ROW.replace(",", "\t"),
        HEAD + ROW.replace(",", ", "),
        HEAD + '"GATE","ACTIVE","L1","3",15,-15,1,2,"4.5",-6\n',
        HEAD + ROW.strip(),
        (HEAD + ROW).replace("\n", "\r\n"),
    ],
)
def test_other_ways_to_write_the_same(read, text):
    data, (rows,) = read(text)
    assert list(data.readings) == [("GATE", "ACTIVE")]
    assert rows.overlay.tolist() == [[4.5, -6]]


def test_bytes_that_are_no_text_do_not_stop_the_rest(read):
    data, _ = read(HEAD.encode() + b"G\xc4TE,ACTIVE,L1,3,15,-15,1,2,4.5,-6\n" + ROW.encode())
    assert (data.n_rows, len(data.readings)) == (2, 2)


def test_parquet_reads_the_same_and_tells_bad_rows_by_number(read):
    frame = pl.DataFrame(
        {
            "mask": ["A", "A", None], "reference": ["B"] * 3, "lot": [1] * 3, "wafer": [7] * 3, "X": [15] * 3,
            "Y": [0.0] * 3, "dx": [1.5, None, 2.0], "dy": [1, 2, 3],
        }
    )  # fmt: skip
    data, (rows,) = read(frame)
    assert rows.overlay.tolist() == [[1.5, 1]]
    assert data.n_unreadable == 2
    assert [w.span.line for w in data.warnings()] == [2, 3]
    assert data.place(0).endswith("data.parquet, row 1")


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "the file is empty"),
        (b"\xff\xfem\0a\0", "this is not UTF-8 text"),
        (b"PAR1 but not really", "cannot read the data"),
    ],
)
def test_a_file_that_is_none(read, content, message):
    with pytest.raises(FlowError, match=message) as caught:
        read(content)
    assert caught.value.diagnostics[0].code == "FP701"


def test_a_file_that_is_not_there(tmp_path):
    with pytest.raises(FlowError, match="No such file") as caught:
        open_measurements(tmp_path / "none.csv", "nm")
    assert caught.value.diagnostics[0].span.file.endswith("none.csv")


def test_few_rows_at_once_bring_every_row_once_and_no_wafer_twice(read):
    lines = [
        f"M{r},R,L{lot},{w},{15 * f},0,{s},0,{r + s},{lot + w}\n"
        for f in range(3) for s in range(2) for w in range(5) for lot in range(2) for r in range(2)
    ]  # fmt: skip
    data, batches = read(HEAD + "".join(lines) + "bad\n", rows_at_once=20)
    assert len(batches) > 2
    seen = np.concatenate([rows.row for rows in batches])
    assert sorted(seen.tolist()) == list(range(len(lines)))
    assert (data.n_rows, data.n_unreadable) == (len(lines) + 1, 1)
    names = {v: k for k, v in data.readings.items()}
    wafers = []
    for rows in batches:
        inside = {lines[i].rsplit(",", 6)[0] for i in rows.row.tolist()}
        assert all(names[r][0] == lines[i].split(",")[0] for r, i in zip(rows.reading, rows.row, strict=True))
        wafers += sorted(inside)
    assert len(wafers) == len(set(wafers)) == 20


@given(
    st.lists(
        st.text(st.sampled_from('AB1.,;"-+e \t\u00e9#'), max_size=24)
        | st.just(ROW.strip())
        | st.just(ROW.strip().replace("4.5", "1e400")),
        max_size=8,
    )
)
@settings(max_examples=60)
def test_whatever_the_lines_hold_every_row_is_read_or_counted(tmp_path_factory, lines):
    file = tmp_path_factory.mktemp("any") / "data.csv"
    file.write_text(HEAD + "".join(f"{line}\n" for line in lines))
    data = open_measurements(file, "nm")
    good = sum(len(rows.row) for rows in data.batches())
    assert data.n_rows == len(lines)
    assert good + data.n_unreadable == data.n_rows
    assert good >= lines.count(ROW.strip())
    assert len(data.warnings()) == min(data.n_unreadable, 10)


@pytest.mark.parametrize(
    "odd", ['"GATE,ACTIVE,L1,3,15,-15,1,2,4.5,-6', " GATE , ACTIVE,L1,3, 15,-15,1,2, 4.5 ,-6"]
)
def test_what_stands_far_down_in_the_file_is_read_with_the_same_care(read, odd):
    n = 3000
    data, (rows,) = read(HEAD + ROW * n + odd + "\n" + ROW)
    assert (data.n_rows, data.n_unreadable) == (n + 2, 0)
    assert list(data.readings) == [("GATE", "ACTIVE")]
    assert rows.overlay[n:].tolist() == [[4.5, -6]] * 2
