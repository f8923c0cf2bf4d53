"""Every error that gcodetool raises on purpose: one root, then kinds.

An error about a program says where (line number, the words at fault), why, and the way out, so that the person at the
machine can act on it.  All kinds survive pickling.
"""

from __future__ import annotations


class GcodetoolError(Exception):
    """Root of all errors raised on purpose; the text is a plain sentence for the user."""


class SheetError(GcodetoolError, ValueError):
    """A machine sheet, or an option that stands in for one, is wrong."""


class Refusal(GcodetoolError, ValueError):
    """A program holds something that cannot be rewritten or judged safely.

    ``line`` counts from 1, ``words`` is the text at fault as written, ``reason`` says why it is refused and ``way_out``
    what the user can do about it.
    """

    def __init__(self, line: int, words: str, reason: str, way_out: str) -> None:
        super().__init__(line, words, reason, way_out)
        self.line = line
        self.words = words
        self.reason = reason
        self.way_out = way_out

    def __str__(self) -> str:
        """One sentence per part: place and words, reason, way out."""
        return f"line {self.line}: {self.words}: {self.reason}. {self.way_out}."


class ProofError(GcodetoolError):
    """The rewritten program failed its own proof: a fault of this tool, never to be cut."""
