"""A bar shows on a terminal alone, and only for work that takes longer than a moment."""

import io

import pytest

from flowplan.cli import progress


class Screen(io.StringIO):
    def __init__(self, terminal: bool) -> None:
        super().__init__()
        self.terminal = terminal

    def isatty(self) -> bool:
        return self.terminal


@pytest.mark.parametrize(
    ("terminal", "moment", "shown"), [(True, -1.0, True), (True, 60.0, False), (False, -1.0, False)]
)
def test_long_work_on_a_terminal_shows_a_bar(monkeypatch, terminal, moment, shown):
    screen = Screen(terminal)
    monkeypatch.setattr("sys.stderr", screen)
    monkeypatch.setattr(progress, "_MOMENT", moment)
    monkeypatch.setenv("TERM", "xterm")
    with progress.Bar("margins") as bar:
        for done in range(3):
            bar.step(done, 2)
    assert ("margins" in screen.getvalue()) is shown
