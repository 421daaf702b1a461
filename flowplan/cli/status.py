"""What flowplan's exit status says."""

from enum import IntEnum


class Status(IntEnum):
    """Exit status of every command."""

    DONE = 0
    #: Asked to be strict, and a pair fails.
    FAILS = 1
    #: The flow, the question or the output is at fault.
    INPUT = 2
