"""The search finds what trying every plan finds."""

import random

import numpy as np
import pytest

from flowplan.engine.propose import GOALS, ReferenceChange, propose
from flowplan.engine.propose.atoms import atoms_of
from flowplan.engine.propose.block import Block
from flowplan.engine.propose.score import Scale
from flowplan.errors import UsageError
from flowplan.model.candidates import choices_of, same_readings
from tests.propose.brute import brute_force, compare, judged, score
from tests.propose.flows import small_flow

SEEDS = range(240)


def case(seed):
    """Return a flow with what is asked of it; None where no mask has a choice."""
    r = random.Random(seed)
    flow = small_flow(seed)
    asked = {"goal": GOALS[seed % 3], "same_reference": r.random() < 0.25}
    if r.random() < 0.5:
        asked["changes"] = r.randint(0, 4)
    return flow, asked


def table_of(flow, choices, goal):
    """Return what every plan gives by the search's own arithmetic; another test holds it to the engine."""
    atoms = atoms_of(flow, choices)

    def values_of(axes, plans):
        found = []
        for axis in axes:
            mine = tuple(c for c in choices if axis in c.axes)
            found.append(np.zeros((len(plans), 0)))
            if len(atoms[axis].rows.room):
                found.append(Block((atoms[axis],), mine, Scale.of(goal, 1.0)).values(plans))
        return np.concatenate(found, axis=1)

    largest = max(float(a.rows.scale.max(initial=0.0)) for a in atoms.values())
    return values_of, 1e-10 if goal == "yield" else 1e-9 * largest


@pytest.mark.parametrize("seed", SEEDS)
def test_the_best_plan_is_that_of_brute_force(seed):
    flow, asked = case(seed)
    try:
        choices = choices_of(flow, same_reference=asked["same_reference"])
    except UsageError:
        pytest.skip("no mask of this random flow has a choice")
    found = propose(flow, **asked)
    values_of, same = table_of(flow, choices, asked["goal"])
    expected, plan = brute_force(choices, asked["goal"], values_of, same, asked.get("changes"))
    assert found.proved
    if asked["goal"] != "yield":
        margins, _ = judged(found.flow)
        assert compare(score(asked["goal"], margins), expected, same) == 0
    assert found.changes == changes_of(flow, choices, plan)


def changes_of(flow, choices, plan):
    """Return the changes that a plan makes."""
    masks = {mask.id: mask for mask in flow.masks}
    return tuple(
        ReferenceChange(c.mask, axis, before, after)
        for c, o in zip(choices, plan, strict=True)
        for axis, after in zip(c.axes, c.options[o], strict=True)
        if not same_readings(before := masks[c.mask].aligns_to.on(axis), after)
    )
