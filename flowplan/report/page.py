"""The report as one self-contained HTML page."""

import base64
import hashlib
from collections.abc import Callable

from flowplan.engine.analysis import Result
from flowplan.files.resources import resource_folder
from flowplan.report.view import report_view

Progress = Callable[[int, int], None]


def render_report(result: Result, progress: Progress | None = None) -> str:
    """Return the report of an analysis.

    Parameters
    ----------
    result : Result
        An analysis.
    progress : callable, optional
        Called with (pairs done, pairs in all).

    Returns
    -------
    str
        One HTML page with its style sheet, script and drawings inside. A content security policy
        allows exactly these and no request to anywhere; all text of the flow is escaped.
    """
    from jinja2 import Environment, FileSystemLoader, StrictUndefined

    folder = resource_folder("templates")
    environment = Environment(
        loader=FileSystemLoader(folder),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    style = (folder / "report.css").read_text(encoding="utf-8")
    script = (folder / "report.js").read_text(encoding="utf-8")
    return environment.get_template("report.html.j2").render(
        view=report_view(result, progress),
        style=style,
        script=script,
        policy=content_policy(style, script),
    )


def content_policy(style: str, script: str) -> str:
    """Return the content security policy for a page with one style and one script element.

    Parameters
    ----------
    style, script : str
        The exact text inside the two elements.
    """
    rules = {
        "default-src": "'none'",
        "style-src": _allow(style),
        "script-src": _allow(script),
        "base-uri": "'none'",
        "form-action": "'none'",
        "require-trusted-types-for": "'script'",
    }
    return "; ".join(f"{name} {value}" for name, value in rules.items())


def _allow(text: str) -> str:
    digest = base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()
    return f"'sha256-{digest}'"
