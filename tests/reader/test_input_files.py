"""Whatever a name stands for, it is read within bounds or gets one message, and nothing waits for ever."""

import os
import resource
import subprocess
import sys
import threading

import pytest

from flowplan.errors import FlowError
from flowplan.files import inputfile
from flowplan.files.inputfile import MOST_BYTES, read_bytes
from flowplan.files.reader import load, parse, parse_bytes
from tests.reader.cases import FLOW


def refusal(name) -> tuple[str, str]:
    with pytest.raises(FlowError) as error:
        load(name)
    (found,) = error.value.diagnostics
    assert found.hint
    return found.code, f"{found.span.line}:{found.span.column} {found.message}"


def refusal_of(raw: bytes) -> tuple[str, str]:
    with pytest.raises(FlowError) as error:
        parse_bytes(raw, "f.yaml")
    (found,) = error.value.diagnostics
    assert found.hint
    return found.code, f"{found.span.line}:{found.span.column} {found.message}"


def test_an_empty_file_and_one_of_comments_alone(tmp_path):
    for text in ("", "\n\n", "# nothing yet\n", "---\n", "~\n"):
        (tmp_path / "f.yaml").write_text(text)
        assert refusal(tmp_path / "f.yaml") == ("FP108", "1:1 the file is empty")


@pytest.mark.parametrize("text", ["Estuary", "42", "- a\n- b", "true", "[]", '""'])
def test_a_file_that_is_no_mapping(text):
    assert refusal_of(text.encode()) == ("FP108", "1:1 a flow file is a mapping (key: value)")


def test_a_missing_file_a_folder_and_a_device(tmp_path):
    assert refusal(tmp_path / "none.yaml") == ("FP101", "1:1 no such file")
    assert refusal(tmp_path) == ("FP101", "1:1 is a folder, not a flow file")
    for device in ("/dev/zero", "/dev/urandom", "/dev/null", "/dev/tty"):
        assert refusal(device) == ("FP101", "1:1 is a device, not a flow file")


def test_a_link_that_leads_nowhere_or_round_in_a_circle(tmp_path):
    (tmp_path / "broken").symlink_to(tmp_path / "none")
    (tmp_path / "circle").symlink_to(tmp_path / "circle")
    assert refusal(tmp_path / "broken") == ("FP101", "1:1 no such file")
    assert refusal(tmp_path / "circle")[1].startswith("1:1 cannot be read: ")


def test_a_name_that_no_file_can_have():
    assert refusal("a\0b")[0] == "FP101"
    assert refusal("a" * 5000)[1] == "1:1 cannot be read: File name too long"


def test_a_file_without_permission(tmp_path, monkeypatch):
    def forbid(*_args, **_kwargs):
        raise PermissionError(13, "Permission denied")

    (tmp_path / "f.yaml").write_text(FLOW)
    monkeypatch.setattr(inputfile.FilePath, "open", forbid)  # the tests may run as a user whom nothing stops
    assert refusal(tmp_path / "f.yaml") == ("FP101", "1:1 may not be read")


def test_a_pipe_that_nobody_writes_to(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    assert refusal(tmp_path / "pipe") == ("FP101", "1:1 a pipe that nobody writes to")


def test_a_pipe_that_stays_silent_is_given_up(tmp_path, monkeypatch):
    monkeypatch.setattr(inputfile, "PATIENCE", 0.05)
    os.mkfifo(tmp_path / "pipe")
    keeper = os.open(tmp_path / "pipe", os.O_RDWR)
    assert refusal(tmp_path / "pipe") == ("FP101", "1:1 a pipe from which nothing comes")
    os.close(keeper)


def test_a_pipe_is_read_as_it_comes(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    keeper = os.open(tmp_path / "pipe", os.O_RDWR)

    def write_slowly():
        for part in (FLOW[:30], FLOW[30:]):
            threading.Event().wait(0.05)
            os.write(keeper, part.encode())
        os.close(keeper)

    writer = threading.Thread(target=write_slowly)
    writer.start()
    assert load(tmp_path / "pipe").flow == "Estuary"
    writer.join()


def test_a_pipe_without_end_is_cut_off():
    reading, writing = os.pipe()

    def write_on():
        try:
            while True:
                os.write(writing, b"#" * 65536)
        except OSError:
            pass

    writer = threading.Thread(target=write_on)
    writer.start()
    assert len(read_bytes(f"/dev/fd/{reading}")) == MOST_BYTES + 1
    os.close(reading)
    writer.join()
    os.close(writing)


@pytest.mark.parametrize(
    ("raw", "told"),
    [
        ("flow: µm".encode("latin-1"), "1:7 not UTF-8 text: the byte B5 (hexadecimal)"),
        ("flow: µ\r\nnotes: µµ".encode() + b"\xff", "2:10 not UTF-8 text: the byte FF (hexadecimal)"),
        ("\ufeffflow: ".encode() + b"\xe2\x82", "1:7 not UTF-8 text: the byte E2 (hexadecimal)"),
        (FLOW.encode("utf-16"), "1:1 UTF-16 text, not UTF-8"),
        (FLOW.encode("utf-16-le"), "1:1 not text: it holds zero bytes"),
        (FLOW.encode("utf-32"), "1:1 UTF-16 text, not UTF-8"),
        (b"\x7fELF\x02\x01\x01\x00\x00", "1:1 not text: it holds zero bytes"),
        (b"PK\x03\x04\xff\xfe\xfd", "1:5 not UTF-8 text: the byte FF (hexadecimal)"),
    ],
    ids=["latin", "after wide signs", "cut off", "utf-16", "utf-16 unmarked", "utf-32", "program", "archive"],
)
def test_what_is_not_utf8_text(raw, told):
    assert refusal_of(raw) == ("FP102", told)


def test_control_characters_in_the_text():
    assert refusal_of(b"flow: Estuary\nnotes: \x1b[31m\n") == (
        "FP104",
        "2:8 the character U+001B cannot stand in YAML",
    )


def test_an_unusual_character_that_yaml_allows_is_not_blamed():
    assert refusal_of("flow: \u202eEstuary\nnotes: \x07\n".encode())[1] == (
        "2:8 the character U+0007 cannot stand in YAML"
    )


def test_half_a_character_pair_in_a_text_of_a_library_user():
    with pytest.raises(FlowError) as error:
        parse("flow: \ud800")
    assert str(error.value) == "<text>:1:7: the character U+D800 cannot stand in YAML [FP104]"


def test_fifty_megabytes_are_refused_without_being_held(tmp_path):
    big = tmp_path / "big.yaml"
    with big.open("wb") as file:
        file.truncate(50_000_000)
    program = (
        "import resource, sys\n"
        "from flowplan.errors import FlowError\n"
        "from flowplan.files.reader import load\n"
        "before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss\n"
        "try: load(sys.argv[1])\n"
        "except FlowError as error: print(error)\n"
        "print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", program, str(big)], capture_output=True, text=True, check=True, timeout=60
    )
    told, grown = done.stdout.splitlines()
    assert told == f"{big}:1:1: larger than 4 MB, which no flow file needs [FP103]"
    unit = 1024 if sys.platform != "darwin" else 1
    assert int(grown) * unit < 3 * MOST_BYTES
    assert resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss > 0


LARGE = {
    "one long text": "flow: Estuary\nnotes: " + "x" * 3_900_000 + "\n",
    "one long number": "flow: Estuary\nsigma: " + "9" * 3_900_000 + "\n",
    "one long unit": "flow: Estuary\nfield: {x: 3 " + "m" * 3_900_000 + ", y: 2}\n",
    "one long key": "flow: Estuary\n? " + "k" * 3_900_000 + "\n: 1\n",
    "one long id": FLOW.replace("id: B", "id: " + "B" * 3_900_000),
    "many numbers": "flow: Estuary\nmasks: [" + "3," * 140_000 + "]\n",
    "many unknown keys": "flow: Estuary\n" + "".join(f"k{i}: 3\n" for i in range(60_000)),
    "many unknown masks": FLOW.replace(
        "pairs:", "".join(f"  - {{id: M{i}, tool: s, aligns_to: N{i}}}\n" for i in range(2_000)) + "pairs:"
    ),
    "many unknown layers": FLOW.replace(
        "limit: 90}]", "}" + "".join(f", {{rule: overlay, between: [A, Q{i}]}}" for i in range(3_000)) + "]"
    ),
    "many equal aliases": "flow: Estuary\nx: &x [1,2,3,4,5,6,7,8,9]\nmasks: [" + "*x," * 9_000 + "]\n",
    "one average of many": FLOW.replace("aligns_to: A", "aligns_to: [" + "A, " * 20_000 + "]"),
}  # fmt: skip


@pytest.mark.parametrize("text", LARGE.values(), ids=LARGE)
def test_what_is_large_but_within_bounds_is_told_within_seconds(text):
    with pytest.raises(FlowError) as error:
        parse_bytes(text.encode(), "f.yaml")
    assert all(len(d.message) <= 300 and len(d.hint) <= 300 for d in error.value.diagnostics)
