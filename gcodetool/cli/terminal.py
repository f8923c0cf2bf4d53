"""What a person sees on standard error while a command runs: messages and progress."""

from __future__ import annotations

import os
import sys
import time
from collections.abc import Iterable, Iterator

PATIENCE = 1.0
"""Seconds before a progress bar is shown."""


def say(message: str) -> None:
    """Print a message on standard error, each line behind the name of the tool; never fails.

    Control characters of a program that is quoted are shown as escapes, so that they cannot act on the terminal.
    """
    lines = (f"gcodetool: {printable(line)}\n" for line in message.split("\n"))
    try:
        if sys.stderr is not None:
            sys.stderr.write("".join(lines))
            sys.stderr.flush()
    except OSError:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, 2)
        os.close(nowhere)


def printable(text: str) -> str:
    """Text with everything that could act on a terminal written as an escape."""
    return "".join(mark if mark.isprintable() else ascii(mark)[1:-1] for mark in text)


def watched(lines: Iterable[bytes], total: int | None, label: str) -> Iterable[bytes]:
    """The same lines; work longer than a second gets a progress bar where standard error is a terminal.

    ``total`` is the number of bytes to come, None where nobody knows: then there is no bar.
    """
    if total is None or sys.stderr is None or not sys.stderr.isatty():
        return lines
    return _with_bar(lines, total, label)


def _with_bar(lines: Iterable[bytes], total: int, label: str) -> Iterator[bytes]:
    start, done, source = time.monotonic(), 0, iter(lines)
    for number, line in enumerate(source):
        done += len(line)
        yield line
        if number % 4096 == 0 and time.monotonic() - start > PATIENCE:
            break
    else:
        return
    yield from _draw_bar(source, done, total, label)


def _draw_bar(lines: Iterator[bytes], done: int, total: int, label: str) -> Iterator[bytes]:
    from rich.console import Console
    from rich.progress import Progress

    with Progress(console=Console(stderr=True), transient=True) as progress:
        task = progress.add_task(label, total=total, completed=done)
        for number, line in enumerate(lines):
            done += len(line)
            yield line
            if number % 4096 == 0:
                progress.update(task, completed=done)
