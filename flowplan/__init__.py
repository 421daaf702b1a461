"""flowplan: overlay and registration margins of a wafer process, from one flow file."""

from importlib import import_module
from importlib.metadata import PackageNotFoundError, version
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from flowplan.api import Analysis, analyse, load, parse
    from flowplan.errors import Diagnostic, FlowError, FlowplanError
    from flowplan.model.flow import Flow

try:
    __version__ = version("flowplan")
except PackageNotFoundError:  # running from a source tree that is not installed
    __version__ = "0"

_HOMES = {
    "Analysis": "flowplan.api",
    "Diagnostic": "flowplan.errors",
    "Flow": "flowplan.model.flow",
    "FlowError": "flowplan.errors",
    "FlowplanError": "flowplan.errors",
    "analyse": "flowplan.api",
    "load": "flowplan.api",
    "parse": "flowplan.api",
}

__all__ = [
    "Analysis",
    "Diagnostic",
    "Flow",
    "FlowError",
    "FlowplanError",
    "__version__",
    "analyse",
    "load",
    "parse",
]


def __getattr__(name: str) -> Any:
    """Import a public name when it is first used, so that `import flowplan` stays light."""
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    msg = f"module 'flowplan' has no attribute {name!r}"
    raise AttributeError(msg)
