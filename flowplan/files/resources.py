"""Where the templates and example flows are: beside the package, or inside an installed one."""

from pathlib import Path

_PACKAGE = Path(__file__).resolve().parent.parent


def resource_folder(name: str) -> Path:
    """Return the folder of packaged data.

    Parameters
    ----------
    name : {'templates', 'flows'}
        Which data.

    Returns
    -------
    Path
        Inside the installed package, or at the top of a source tree.
    """
    inside = _PACKAGE / name
    return inside if inside.is_dir() else _PACKAGE.parent / name
