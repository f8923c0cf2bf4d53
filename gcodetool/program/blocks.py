r"""Source lines to blocks and back; every byte is kept, line ends included.

A *block* is one line of the program: its number (counted from 1), its text, and its line end as found (``\r\n``,
``\n``, ``\r`` or, on a last line, nothing).  Text is latin-1, which maps bytes to characters one to one, so odd
bytes in comments come out as they went in.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import NamedTuple


class Block(NamedTuple):
    """One line of a program; ``text + ending`` is the line as found."""

    number: int
    text: str
    ending: str


def blocks(lines: Iterable[bytes]) -> Iterator[Block]:
    """Yield a Block for each line; ``lines`` are bytes with their endings still on."""
    for number, line in enumerate(lines, 1):
        whole = line.decode("latin-1")
        text = whole.rstrip("\r\n")
        yield Block(number, text, whole[len(text) :])


def blocks_of(program: bytes) -> Iterator[Block]:
    """Blocks of a whole program held in memory."""
    return blocks(split_lines(program))


def split_lines(program: bytes) -> list[bytes]:
    """Cut bytes after each line end (CR LF, LF or a lone CR); joining the list gives the bytes back."""
    if b"\r" not in program:
        lines = program.split(b"\n")
        cut = [line + b"\n" for line in lines[:-1]]
        return [*cut, lines[-1]] if lines[-1] else cut
    # bytes.splitlines cuts at CR, LF and CR LF only
    return program.splitlines(keepends=True)
