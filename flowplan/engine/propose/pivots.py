"""On which undecided mask a pair rests first.

While the later mask of a pair is decided, the pair is the same as one between what that mask reads and
the other mask, with something added. Followed down to the first undecided mask, its *pivot*, every pair
tells what it would reach with each of that mask's options; pairs with one pivot share the choice.
"""

from dataclasses import dataclass

import numpy as np

from flowplan.engine.propose.atoms import Reads
from flowplan.engine.sources import BoolArray, IntArray


@dataclass(frozen=True, slots=True)
class Pivots:
    """Pairs that were followed to an undecided mask, shape (n_found,) each.

    Attributes
    ----------
    node, row : ndarray of int
        Which pair of which node.
    late, early : ndarray of int
        The undecided mask, and what it is seen against.
    marks : ndarray of bool
        Whether it is seen against the other's marks, not its frame.
    turned : ndarray of bool
        Whether later minus earlier has the opposite sign of the pair's own.
    """

    node: IntArray
    row: IntArray
    late: IntArray
    early: IntArray
    marks: BoolArray
    turned: BoolArray


def pivots(reads: Reads, allowed: BoolArray, late: IntArray, early: IntArray) -> Pivots:
    """Follow every pair whose later mask is decided.

    Parameters
    ----------
    reads : Reads
        The options of one axis.
    allowed : ndarray of bool, shape (n_nodes, n_masks, n_options)
        The options left.
    late, early : ndarray of int, shape (n_rows,)
        The masks of each pair by process order.

    Returns
    -------
    Pivots
        Pairs that meet an average or no undecided mask are left out.
    """
    decided = allowed.sum(axis=2) == 1
    option = allowed.argmax(axis=2)
    plain = ~(reads.weights[..., 1:] != 0).any(axis=2)
    averaged = ~plain.all(axis=1)
    node, row = np.nonzero(decided[:, late] & (late != early))
    a, e = late[row], early[row]
    marks, turned = np.zeros((2, len(node)), dtype=bool)
    found: list[tuple[IntArray, ...]] = []
    while len(node):
        which = option[node, a]
        go_on = plain[a, which]
        reference = reads.masks[a, which, 0]
        go_on &= reference != e
        node, row, a, e, marks, turned, reference = (
            x[go_on] for x in (node, row, a, e, marks, turned, reference)
        )
        swap = reference < e
        a, e = np.where(swap, e, reference), np.where(swap, reference, e)
        marks, turned = marks | swap, turned ^ swap
        stop = ~decided[node, a]
        usable = stop & ~averaged[a]
        found.append(tuple(x[usable] for x in (node, row, a, e, marks, turned)))
        node, row, a, e, marks, turned = (x[~stop] for x in (node, row, a, e, marks, turned))
    found.append((node, row, a, e, marks, turned))
    return Pivots(*(np.concatenate(parts) for parts in zip(*found, strict=True)))
