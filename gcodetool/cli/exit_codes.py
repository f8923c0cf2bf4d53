"""The exit codes of every command, in one place."""

from __future__ import annotations

from enum import IntEnum


class ExitCode(IntEnum):
    """What the shell is told; anything but 0 means that the output, if there is any, must not be run."""

    DONE = 0
    FINDINGS = 1
    """A check found something, or a verification failed."""
    USAGE = 2
    """An option, a machine sheet or an output name is wrong; nothing was done."""
    NOT_UNDERSTOOD = 65
    """The program holds something that is refused."""
    OWN_FAULT = 70
    """The result failed its own proof, or gcodetool broke: a fault of this tool."""
    INPUT_OUTPUT = 74
    """Reading or writing failed."""
    INTERRUPTED = 130
    """Ended from the keyboard."""
    READER_LEFT = 141
    """The reader of the output went away before its end."""
    TERMINATED = 143
    """Ended by another process."""
