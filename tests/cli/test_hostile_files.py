"""Files made to hurt get one clear message within seconds, and never bring flowplan down.

Each runs in a process of its own: a reader that recurses into them ends the whole process.
"""

import subprocess

import pytest

from tests.cli.terminal import FLOWPLAN

#: No time is measured here; whoever needs this long [s] hangs.
HANGS = 120


def check(text: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [*FLOWPLAN, "check", "-"], input=text, capture_output=True, text=True, check=False, timeout=HANGS
    )


DEEP = {
    "brackets": "[" * 500_000,
    "braces": "{a: " * 400_000,
    "dashes": "- " * 500_000,
    "questions": "? " * 500_000,
    "indented": "".join(" " * i + "a:\n" for i in range(1500)),
    "brackets within a flow": "flow: Estuary\nmasks: " + "[" * 60 + "]" * 60,
}


@pytest.mark.parametrize("text", DEEP.values(), ids=DEEP)
def test_deep_nesting_is_told_at_the_level_that_is_too_deep(text):
    done = check(text)
    assert (done.returncode, done.stdout) == (2, "")
    assert "nested too deeply [FP106]" in done.stderr.splitlines()[0]


def test_aliases_that_unfold_to_billions_are_stopped():
    text = "a0: &a0 [x, x]\n"
    text += "".join(f"a{i}: &a{i} [{', '.join([f'*a{i - 1}'] * 9)}]\n" for i in range(1, 12))
    done = check(text)
    assert done.returncode == 2
    assert "[FP107]" in done.stderr.splitlines()[0]


def test_an_alias_of_itself_is_stopped():
    done = check("flow: &a [*a]\n")
    assert done.returncode == 2
    assert "[FP107]" in done.stderr.splitlines()[0]


def test_more_values_than_a_flow_can_hold_are_told():
    done = check("flow: Estuary\n" + "".join(f"k{i}: 1\n" for i in range(200_000)))
    assert done.returncode == 2
    assert "more than 150000 values, which no flow file needs [FP103]" in done.stderr.splitlines()[0]


def test_a_flood_of_mistakes_is_cut_after_two_hundred():
    masks = "".join(f"  - {{id: M{i}, tool: t{i}, aligns_to: wafer}}\n" for i in range(500))
    done = check("flow: Estuary\ntools: {s: {}}\nmasks:\n" + masks)
    assert done.returncode == 2
    assert done.stderr.count("unknown tool 't") == 199  # the warning that no pair is judged comes first
    assert done.stderr.splitlines()[-2:] == ["… and 1 more", "200 errors, 1 warning"]


def test_one_mistake_in_many_places_is_shown_once():
    masks = "".join(f"  - {{id: M{i}, tool: stepr, aligns_to: wafer}}\n" for i in range(12))
    done = check("flow: Estuary\ntools: {stepper: {}}\nmasks:\n" + masks + "pairs: []\n")
    assert done.stderr.count("unknown tool 'stepr'") == 1
    assert "    the same in 11 more places, lines 5, 6, 7, 8, 9, 10, 11, 12, …" in done.stderr.splitlines()
    assert done.stderr.splitlines()[-1] == "12 errors, 2 warnings"
