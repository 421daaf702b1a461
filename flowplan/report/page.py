"""The report as one self-contained HTML page."""

import base64
import hashlib
from collections.abc import Callable

from flowplan.engine.analysis import Result
from flowplan.files.resources import resource_folder
from flowplan.report.comparison import ComparisonText
from flowplan.report.measuring import Taken
from flowplan.report.view import Extras, package_version, report_view
from flowplan.report.viewmeasured import measured_view

Progress = Callable[[int, int], None]


def render_report(result: Result, progress: Progress | None = None, extras: Extras | None = None) -> str:
    """Return the report of an analysis.

    Parameters
    ----------
    result : Result
        An analysis.
    progress : callable, optional
        Called with (pairs done, pairs in all).
    extras : Extras, optional
        What helps to choose among plans; shown as sections of their own.

    Returns
    -------
    str
        One HTML page with its style sheet, script and drawings inside. A content security policy
        allows exactly these and no request to anywhere; all text of the flow is escaped.
    """
    return _render("report.html.j2", view=report_view(result, progress, extras))


def render_comparison(text: ComparisonText) -> str:
    """Return plans side by side as one HTML page, made like the report.

    Parameters
    ----------
    text : ComparisonText
        As `comparison_text` returns it.
    """
    return _render("compare.html.j2", has_script=False, comparison=text, version=package_version())


def render_measured(taken: Taken) -> str:
    """Return measured overlay beside its plan as one HTML page, made like the report.

    Parameters
    ----------
    taken : Taken
        As `take_measurements` returns it.
    """
    view = measured_view(taken)
    return _render("measured.html.j2", has_script=False, measured=view, version=package_version())


def _render(template: str, *, has_script: bool = True, **values: object) -> str:
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
    script = (folder / "report.js").read_text(encoding="utf-8") if has_script else ""
    policy = content_policy(style, script)
    page = environment.get_template(template)
    return page.render(values, style=style, script=script, policy=policy)


def content_policy(style: str, script: str) -> str:
    """Return the content security policy for a page with one style and one script element.

    Parameters
    ----------
    style, script : str
        The exact text inside the two elements; empty where there is none.
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
    if not text:
        return "'none'"
    digest = base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()
    return f"'sha256-{digest}'"
