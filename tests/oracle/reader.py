"""Program text to words, for the oracle's own controller; knows letters and numbers, no meaning.

Rules: NISTIR 6556 section 3.3 and appendix E (spaces and tabs mean nothing outside comments, letters in either case,
one sign and one point in a number), widened by what real programs hold: ``;`` comments, ``O`` and ``:`` heads, a line
check ``*nn`` (exclusive or of the bytes before the star; common practice, no source), any of CR, LF, CRLF as line end.
Whatever else is found is an error, never skipped.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import reduce

LETTERS = frozenset("ABCDEFGHIJKLMNPQRSTXYZ")
_LINE_END = re.compile(rb"\r\n|\n|\r")
_WORD = re.compile(r"([A-Z])([+-]?(?:\d+\.?\d*|\.\d+))")
_HEAD = re.compile(r"[O:]\d+")
_DELETE = re.compile(r"/(?:\d(?!\d))?")
_CHECK = re.compile(r"\*(\d+)$")


class ControllerError(ValueError):
    """What a strict controller stops at; ``line`` counts from 1."""

    def __init__(self, line: int, reason: str) -> None:
        super().__init__(f"line {line}: {reason}")
        self.line = line
        self.reason = reason


@dataclass(frozen=True, slots=True)
class Block:
    """One live line: G and M codes times ten in order of writing, every other word once."""

    line: int
    deletable: bool
    gcodes: tuple[int, ...]
    mcodes: tuple[int, ...]
    words: dict[str, float]


def read_blocks(data: bytes) -> Iterator[Block]:
    """Yield the live blocks between the tape marks; blank and comment lines are left out."""
    seen_code = False
    for number, raw in enumerate(_LINE_END.split(data), 1):
        text = _live_text(raw.decode("latin-1"), number)
        if text.strip("|") == "%":
            if seen_code:
                return
            seen_code = True
            continue
        block = _block(text, raw, number)
        if block is not None:
            seen_code = True
            yield block


def _live_text(text: str, line: int) -> str:
    """Upper case without blanks; each ``( )`` comment becomes a bar, so that it parts two words but joins no digits."""
    out: list[str] = []
    at = 0
    while at < len(text):
        mark = text[at]
        if mark == ";":
            break
        if mark == "(":
            end = text.find(")", at)
            if end < 0:
                raise ControllerError(line, "comment is not closed")
            out.append("|")
            at = end
        elif mark not in " \t":
            out.append(mark.upper() if mark.isascii() else mark)
        at += 1
    return "".join(out)


def _block(text: str, raw: bytes, line: int) -> Block | None:
    check = _CHECK.search(text)
    if check:
        if int(check[1]) != reduce(lambda a, b: a ^ b, raw[: raw.rindex(b"*" + check[1].encode())], 0):
            raise ControllerError(line, f"line check {check[0]} is wrong")
        text = text[: check.start()]
    text = text.lstrip("|")
    deletable = text.startswith("/")
    if deletable:
        found = _DELETE.match(text)
        assert found is not None
        text = text[found.end() :].lstrip("|")
    head = _HEAD.match(text)
    if head:
        text = text[head.end() :]
    pairs = _words(text, line)
    return _sorted_block(pairs, line, deletable) if pairs else None


def _words(text: str, line: int) -> list[tuple[str, float]]:
    pairs = []
    at = 0
    while at < len(text):
        if text[at] == "|":
            at += 1
            continue
        found = _WORD.match(text, at)
        if found is None or found[1] not in LETTERS:
            raise ControllerError(line, f"cannot read {text[at : at + 12]!r}")
        pairs.append((found[1], float(found[2])))
        at = found.end()
    return pairs


def _sorted_block(pairs: list[tuple[str, float]], line: int, deletable: bool) -> Block:
    gcodes: list[int] = []
    mcodes: list[int] = []
    words: dict[str, float] = {}
    for letter, value in pairs:
        if letter in "GM":
            tenfold = round(value * 10)
            if abs(value * 10 - tenfold) > 1e-3:
                raise ControllerError(line, f"{letter}{value} is no code")
            (gcodes if letter == "G" else mcodes).append(tenfold)
        elif letter in words:
            raise ControllerError(line, f"two {letter} words")
        else:
            words[letter] = value
    return Block(line, deletable, tuple(gcodes), tuple(mcodes), words)
