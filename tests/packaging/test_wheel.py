"""The wheel holds everything: installed elsewhere, it works from an empty folder."""

import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]

pytestmark = pytest.mark.slow


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    out = tmp_path_factory.mktemp("wheel")
    subprocess.run(
        [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", str(out), str(ROOT)],
        check=True,
        capture_output=True,
    )
    (built,) = out.glob("*.whl")
    return built


@pytest.fixture(scope="module")
def installed(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    target = tmp_path_factory.mktemp("installed")
    subprocess.run(
        [
            sys.executable,
            "-m",
            "pip",
            "install",
            "--quiet",
            "--no-deps",
            "--no-index",
            "--target",
            str(target),
            str(wheel),
        ],
        check=True,
        capture_output=True,
    )
    return target


def _run(installed: Path, folder: Path, *arguments: str) -> subprocess.CompletedProcess[str]:
    script = f"import sys; sys.path.insert(0, {str(installed)!r}); from flowplan.cli.main import run; run()"
    return subprocess.run(
        [sys.executable, "-I", "-c", script, *arguments],
        cwd=folder,
        capture_output=True,
        text=True,
        check=False,
    )


def test_wheel_holds_templates_flows_and_the_typing_mark(wheel: Path):
    names = set(zipfile.ZipFile(wheel).namelist())
    flows = {f"flowplan/flows/{path.name}" for path in (ROOT / "flows").glob("*.yaml")}
    templates = {
        f"flowplan/templates/{path.name}" for path in (ROOT / "templates").iterdir() if path.is_file()
    }
    assert len(flows) >= 6
    assert flows | templates | {"flowplan/py.typed"} <= names


def test_installed_package_is_the_one_that_runs(installed: Path, tmp_path: Path):
    code = f"import sys; sys.path.insert(0, {str(installed)!r}); import flowplan; print(flowplan.__file__)"
    found = subprocess.run(
        [sys.executable, "-I", "-c", code], cwd=tmp_path, capture_output=True, text=True, check=True
    )
    assert found.stdout.strip() == str(installed / "flowplan" / "__init__.py")


def test_new_check_and_report_work_in_an_empty_folder(installed: Path, tmp_path: Path):
    assert _run(installed, tmp_path, "new", "mine.yaml").returncode == 0
    assert _run(installed, tmp_path, "check", "mine.yaml").returncode == 0
    made = _run(installed, tmp_path, "report", "mine.yaml", "-o", "mine.html")
    assert made.returncode == 0, made.stderr
    assert (tmp_path / "mine.html").read_text(encoding="utf-8").startswith("<!doctype html>")


def test_packaged_example_reports(installed: Path, tmp_path: Path):
    example = installed / "flowplan" / "flows" / "cmos.yaml"
    made = _run(installed, tmp_path, "report", str(example), "-o", "cmos.html")
    assert made.returncode == 0, made.stderr
    assert (
        "default-src &#39;none&#39;" in (page := (tmp_path / "cmos.html").read_text("utf-8"))
        or "default-src 'none'" in page
    )
