"""Run flowplan with ``python -m flowplan``."""

from flowplan.cli.main import run

run()
