"""How often an error is redrawn: what the file says, or the default of what the error is.

=======  =====================================================================================
level    what varies so by default
=======  =====================================================================================
mask     what a mask's own terms enter into `pattern`: the mask's share repeats in every field
         (SEMI P18); every bound, which is the same on every wafer by definition
lot      the common share of a tool's terms
wafer    alignment, mark reading, and shapes over the wafer
field    the rest
=======  =====================================================================================
"""

from flowplan.model.terms import LEVELS, Kind, Level, SizeParts, Term


def reading_level(size: SizeParts, kind: Kind) -> Level:
    """Return how often an error of reading marks is redrawn."""
    return size.varies or ("mask" if kind == "bound" else "wafer")


def edge_level(size: SizeParts, kind: Kind) -> Level:
    """Return how often an edge error, or half of a CD's, is redrawn."""
    return size.varies or ("mask" if kind == "bound" else "field")


def term_level(term: Term, kind: Kind, *, of_tool: bool, common: bool) -> Level:
    """Return how often one share of a term is redrawn.

    Parameters
    ----------
    term : Term
        The term.
    kind : {'random', 'uniform', 'bound', 'offset'}
        Which of its sizes.
    of_tool : bool
        Whether it is a tool's term rather than a mask's own.
    common : bool
        Whether the share is the one that is common to several masks.

    Returns
    -------
    {'mask', 'lot', 'wafer', 'field'}
        As the file says, or the default.
    """
    if term.varies is not None:
        return term.varies
    if kind == "bound" or (term.enters == "pattern" and not of_tool):
        return "mask"
    if of_tool and common:
        return "lot"
    return "wafer" if term.shape != "shift" and term.over == "wafer" else "field"


def rarer(first: Level, second: Level) -> Level:
    """Return which of two levels is redrawn more rarely."""
    return min(first, second, key=LEVELS.index)
